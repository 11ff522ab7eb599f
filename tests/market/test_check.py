"""Every fault of a book that reads well and does not hold together, with its place, in the order of the file."""

from __future__ import annotations

import datetime
import json

import msgspec
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from spreadgui.book.records import Book, Correlation, Mark, Market, Position
from spreadgui.book.writing import book_bytes
from spreadgui.market.check import faults_of

PATIENT = settings(deadline=None, max_examples=80, suppress_health_check=[HealthCheck.too_slow])
EMPTY = Book(title="", currency="CRN", valuation_date=datetime.date(2026, 12, 1))

NORTH = Market("North", "CRN/MWh", 0.4, marks=(Mark("2027-01", 80.0, 0.5),))
GAS = Market("Gas", "CRN/GJ", marks=(Mark("2027-01", 9.0, 0.6),))
SPARK = Position(
    quantity=1.0,
    long_leg="North",
    long_delivery="2027-01",
    short_leg="Gas",
    short_delivery="2027-01",
    expiry=datetime.date(2027, 1, 15),
)
GOOD = msgspec.structs.replace(
    EMPTY, markets=(NORTH, GAS), correlations=(Correlation("North", "Gas", 0.7),), positions=(SPARK,)
)


def told(book: Book) -> list[str]:
    return [str(fault) for fault in faults_of(book)]


def with_markets(*markets: Market) -> Book:
    return msgspec.structs.replace(EMPTY, markets=markets)


def test_a_book_that_holds_together_has_no_faults() -> None:
    assert told(GOOD) == []
    assert told(EMPTY) == []


def test_markets_need_a_name_of_their_own() -> None:
    assert told(with_markets(Market("", "CRN/t"), NORTH, Market(" ", "CRN/t"), NORTH, GAS)) == [
        "markets[0].name: a market needs a name",
        'markets[1].name: the market "North" is defined 2 times',
        "markets[2].name: a market needs a name",
        'markets[3].name: the market "North" is defined 2 times',
    ]


def test_a_tie_strength_and_a_volatility_cannot_be_below_zero() -> None:
    assert told(
        with_markets(Market("A", "CRN/t", -0.5, marks=(Mark("2027-01", 1.0, -0.2), Mark("2027-02", -1.0, 0.0))))
    ) == [
        "markets[0].tie_strength: is -0.5; it cannot be below zero",
        "markets[0].marks[0].volatility: is -0.2; it cannot be below zero",
    ]


def test_a_volatility_that_looks_like_per_cent_is_told_of_in_marks_and_in_the_row() -> None:
    book = msgspec.structs.replace(
        GOOD,
        markets=(NORTH, msgspec.structs.replace(GAS, marks=(Mark("2027-01", 9.0, 60.0),))),
        positions=(
            SPARK,
            msgspec.structs.replace(SPARK, own_vol_long=10.0, own_vol_short=45.0),
            msgspec.structs.replace(SPARK, own_vol_short=-45.0),
        ),
    )
    assert told(book) == [
        "markets[1].marks[0].volatility: is 60, which is 6000 %; a volatility of 45 % is written 0.45",
        "positions[1].own_vol_short: is 45, which is 4500 %; a volatility of 45 % is written 0.45",
        "positions[2].own_vol_short: the short volatility is -45, below zero",
    ]


def test_every_market_is_quoted_in_the_money_of_the_book_for_some_quantity() -> None:
    units = ["CRN/MWh", "CRN / t CO2", "", "CRN", "/MWh", "CRN/", " / ", "OTH/MWh", "crn/MWh", "O\nH/t"]
    assert told(with_markets(*(Market(f"m{row}", unit) for row, unit in enumerate(units)))) == [
        'markets[2].unit: expected money for a quantity, as CRN/MWh, got ""',
        'markets[3].unit: expected money for a quantity, as CRN/MWh, got "CRN"',
        'markets[4].unit: expected money for a quantity, as CRN/MWh, got "/MWh"',
        'markets[5].unit: expected money for a quantity, as CRN/MWh, got "CRN/"',
        'markets[6].unit: expected money for a quantity, as CRN/MWh, got " / "',
        "markets[7].unit: is in OTH, while the book counts in CRN",
        "markets[8].unit: is in crn, while the book counts in CRN",
        "markets[9].unit: is in O\N{REPLACEMENT CHARACTER}H, while the book counts in CRN",
    ]
    no_money = msgspec.structs.replace(EMPTY, currency="", markets=(NORTH,))
    assert told(no_money) == ["markets[0].unit: is in CRN, while the book counts in no currency"]


def test_marks_stand_at_deliveries_of_the_calendar_each_once() -> None:
    marks = tuple(Mark(delivery, 1.0, 0.1) for delivery in ("2027-01", "2027-13", "2027-01", "", "2027-02", "2027-01"))
    assert told(with_markets(Market("A", "CRN/t", marks=marks))) == [
        "markets[0].marks[0].delivery: A has 3 marks for 2027-01",
        'markets[0].marks[1].delivery: expected a delivery month written as 2027-01, got "2027-13"',
        "markets[0].marks[2].delivery: A has 3 marks for 2027-01",
        'markets[0].marks[3].delivery: expected a delivery month written as 2027-01, got ""',
        "markets[0].marks[5].delivery: A has 3 marks for 2027-01",
    ]


def test_correlations_tie_two_markets_of_the_book_each_pair_once() -> None:
    pairs = (
        Correlation("North", "Gas", 0.7),
        Correlation("Gas", "North", 0.6),
        Correlation("North", "West", 0.1),
        Correlation("East", "East", 0.1),
        Correlation("North", "North", 1.0),
    )
    assert told(msgspec.structs.replace(GOOD, correlations=pairs, positions=())) == [
        "correlations[0]: North and Gas have more than one correlation",
        "correlations[1]: Gas and North have more than one correlation",
        'correlations[2].second: there is no market "West" in this book',
        'correlations[3].first: there is no market "East" in this book',
        'correlations[3].second: there is no market "East" in this book',
        'correlations[3]: ties "East" to itself; its deliveries are tied by the market\'s tie strength',
        'correlations[4]: ties "North" to itself; its deliveries are tied by the market\'s tie strength',
    ]


def test_a_correlation_lies_between_minus_one_and_one() -> None:
    for value in (1.0, -1.0, 0.0):
        pair = (Correlation("North", "Gas", value),)
        assert told(msgspec.structs.replace(GOOD, correlations=pair)) == []
    beyond = msgspec.structs.replace(GOOD, correlations=(Correlation("North", "Gas", -1.5),), positions=())
    assert told(beyond) == ["correlations[0].correlation: is -1.5, beyond 1 or −1"]


def test_faults_of_all_parts_come_in_the_order_of_the_file_and_of_the_row() -> None:
    book = msgspec.structs.replace(
        EMPTY,
        markets=(NORTH, Market("Calm", "CRN/t", marks=(Mark("2027-01", 1.0, -1.0),))),
        correlations=(Correlation("North", "West", 2.0),),
        positions=(
            SPARK,
            msgspec.structs.replace(SPARK, short_leg="", short_delivery=""),
            msgspec.structs.replace(SPARK, quantity=-1.0, long_delivery="2029-01", expiry=None),
        ),
    )
    assert told(book) == [
        "markets[1].marks[0].volatility: is -1; it cannot be below zero",
        'correlations[0].second: there is no market "West" in this book',
        "correlations[0].correlation: is 2, beyond 1 or −1",
        'positions[0].short_leg: there is no market "Gas" in this book',
        "positions[2].quantity: the quantity is -1; let the side say short instead",
        "positions[2].long_delivery: North has no mark for 2029-01",
        'positions[2].short_leg: there is no market "Gas" in this book',
        "positions[2].expiry: the expiry is missing",
    ]


def test_every_place_leads_to_an_entry_that_the_record_has() -> None:
    broken = msgspec.structs.replace(
        GOOD,
        markets=(Market("North", "", -1.0, marks=(Mark("x", 0.0, -1.0),)),),
        positions=(Position(), msgspec.structs.replace(SPARK, long_ratio=0.0)),
    )
    raw = json.loads(book_bytes(broken))
    for fault in faults_of(broken):
        path, _, entry = fault.where.rpartition(".")
        index = {"markets": Market, "correlations": Correlation, "positions": Position}
        record = Mark if ".marks[" in path else index[path.partition("[")[0]]
        assert entry in record.__struct_fields__, fault
        assert int(path.partition("[")[2].partition("]")[0]) < len(raw[path.partition("[")[0]])


words = st.sampled_from(["", "North", "Gas", " ", "x\ny", "2027-01"])
finite = st.floats(allow_nan=False, allow_infinity=False)
markets = st.builds(
    Market,
    name=words,
    unit=words | st.sampled_from(["CRN/MWh", "a\nb/t"]),
    tie_strength=finite,
    marks=st.lists(st.builds(Mark, st.sampled_from(["2027-01", "2027-02", "x"]), finite, finite), max_size=2).map(
        tuple
    ),
)
positions = st.builds(
    Position,
    quantity=finite | st.none(),
    long_leg=words,
    long_delivery=words,
    short_leg=words,
    short_delivery=st.sampled_from(["2027-01", "2031-07", ""]),
    expiry=st.dates() | st.none(),
    own_vol_short=finite | st.none(),
)


@PATIENT
@given(
    st.lists(markets, max_size=3),
    st.lists(st.builds(Correlation, words, words, finite), max_size=3),
    st.lists(positions, max_size=3),
    finite,
)
def test_any_book_that_reads_well_is_checked_without_raising(
    some_markets: list[Market], pairs: list[Correlation], rows: list[Position], rate: float
) -> None:
    book = msgspec.structs.replace(
        EMPTY, markets=tuple(some_markets), correlations=tuple(pairs), positions=tuple(rows), zero_rate=rate
    )
    places = [fault.where for fault in faults_of(book)]
    assert all(fault.what and "\n" not in fault.what for fault in faults_of(book))
    parts = [place.partition("[")[0] for place in places]
    assert parts == sorted(parts, key=["markets", "correlations", "positions"].index)
