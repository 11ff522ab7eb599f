"""A position resolved: every number a formula needs, or every reason why not, with the cell where to mend it."""

from __future__ import annotations

import dataclasses
import datetime
import math
from typing import Any

import msgspec
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from spreadgui.book.records import Book, Correlation, Mark, Market, Position
from spreadgui.market.contracts import Readiness, ResolvedPosition, Shape, resolve
from spreadgui.market.quotes import Quotes

PATIENT = settings(deadline=None, max_examples=150, suppress_health_check=[HealthCheck.too_slow])

TODAY = datetime.date(2026, 12, 1)
RATE = 0.03
INCOMPLETE, REFUSED = Readiness.INCOMPLETE, Readiness.REFUSED

MARKETS = (
    Market("North", "CRN/MWh", 0.4, marks=(Mark("2027-01", 80.0, 0.5), Mark("2027-07", 60.0, 0.4))),
    Market("Gas", "CRN/GJ", marks=(Mark("2027-01", 9.0, 0.6),)),
    Market("Spring", "CRN/MWh", marks=(Mark("2027-01", -2.0, 0.5), Mark("2027-02", 0.0, 0.5))),
    Market("Calm", "CRN/MWh", marks=(Mark("2027-01", 50.0, -0.1),)),
    Market("Backwards", "CRN/MWh", -1.0, marks=(Mark("2027-01", 50.0, 0.3), Mark("2027-07", 50.0, 0.3))),
    Market("the delivery market", "CRN/t", marks=(Mark("2027-01", 50.0, 0.3),)),
    Market("Quill", "CRN/MWh", marks=(Mark("2027-01", 70.0, 0.5),)),
    Market("Quill", "CRN/MWh", marks=(Mark("2027-01", 71.0, 0.5),)),
)
CORRELATIONS = (
    Correlation("North", "Gas", 0.7),
    Correlation("Spring", "Gas", 0.2),
    Correlation("Calm", "Gas", 0.2),
    Correlation("North", "the delivery market", 1.5),
)
QUOTES = Quotes.of(Book(title="", currency="CRN", valuation_date=TODAY, markets=MARKETS, correlations=CORRELATIONS))

SPARK = Position(
    "spark",
    quantity=744.0,
    long_leg="North",
    long_delivery="2027-01",
    short_leg="Gas",
    short_delivery="2027-01",
    short_ratio=7.2,
    expiry=datetime.date(2027, 1, 15),
)
OWN = Position(
    "own",
    quantity=1.0,
    expiry=datetime.date(2027, 12, 1),
    own_forward_long=112.0,
    own_forward_short=103.0,
    own_vol_long=0.3,
    own_vol_short=0.45,
    own_correlation=0.25,
)


def resolved(
    position: Position, *, rate: float = RATE, today: datetime.date = TODAY, **fields: Any
) -> ResolvedPosition:
    return resolve(msgspec.structs.replace(position, **fields), QUOTES, today, rate)


def troubles(position: Position, **fields: Any) -> list[tuple[Readiness, str, str]]:
    return [(one.readiness, one.field, one.sentence) for one in resolved(position, **fields).troubles]


def test_a_spread_takes_forwards_volatilities_and_correlation_from_the_book() -> None:
    got = resolved(SPARK)
    assert got.troubles == []
    assert got.shape is Shape.SPREAD
    assert got.unit == "CRN/MWh"
    assert (got.forward_long, got.vol_long) == (80.0, 0.5)
    assert (got.forward_short, got.vol_short) == (9.0, 0.6)  # before the ratio
    assert got.correlation == 0.7
    assert got.years == 45 / 365
    assert got.discount == pytest.approx(math.exp(-0.03 * 45 / 365), rel=1e-15)


def test_a_calendar_spread_takes_its_correlation_from_the_tie_strength() -> None:
    got = resolved(SPARK, short_leg="North", short_delivery="2027-07")
    assert got.troubles == []
    assert got.correlation == pytest.approx(math.exp(-0.4 * 0.5), rel=1e-15)


@pytest.mark.parametrize(
    ("field", "value", "into"),
    [
        ("own_forward_long", 90.0, "forward_long"),
        ("own_forward_short", 8.0, "forward_short"),
        ("own_vol_long", 0.0, "vol_long"),
        ("own_vol_short", 0.99, "vol_short"),
        ("own_correlation", -0.4, "correlation"),
        ("own_correlation", 0.0, "correlation"),
    ],
)
def test_an_own_mark_wins_over_the_book_and_only_for_itself(field: str, value: float, into: str) -> None:
    book, own = dataclasses.asdict(resolved(SPARK)), dataclasses.asdict(resolved(SPARK, **{field: value}))
    assert own.pop(into) == value
    assert book.pop(into) != value
    assert own == book


def test_a_position_with_all_its_own_marks_needs_no_book() -> None:
    got = resolved(OWN)
    assert got.troubles == []
    assert (got.forward_long, got.forward_short, got.vol_long, got.vol_short) == (112.0, 103.0, 0.3, 0.45)
    assert (got.correlation, got.years, got.unit) == (0.25, 1.0, "")


@pytest.mark.parametrize("delivery", ["", "2027-01", "2055-01", "whenever"])
def test_legs_in_free_words_are_taken_where_the_own_marks_are_complete(delivery: str) -> None:
    words = {"long_leg": "a mix of three", "short_leg": "some gas", "long_delivery": delivery}
    got = resolved(OWN, **words)
    assert got.troubles == []
    assert got.forward_long == 112.0
    assert troubles(OWN, **words, own_correlation=None, short_delivery=delivery) != []


def test_the_unit_is_that_of_the_long_leg_or_else_of_the_short() -> None:
    assert resolved(SPARK, long_leg="Gas", short_leg="North").unit == "CRN/GJ"
    assert resolved(OWN, short_leg="Gas").unit == "CRN/GJ"
    assert resolved(OWN, long_leg="in words", short_leg="Gas").unit == "CRN/GJ"


def test_an_outright_has_only_the_numbers_of_its_leg() -> None:
    long = resolved(SPARK, short_leg="", short_delivery="", short_ratio=1.0)
    assert long.troubles == []
    assert long.shape is Shape.LONG_LEG_ONLY
    assert (long.forward_long, long.vol_long) == (80.0, 0.5)
    assert all(map(math.isnan, (long.forward_short, long.vol_short, long.correlation)))
    short = resolved(SPARK, long_leg="", long_delivery="")
    assert short.troubles == []
    assert short.shape is Shape.SHORT_LEG_ONLY
    assert (short.forward_short, short.vol_short, short.unit) == (9.0, 0.6, "CRN/GJ")
    assert all(map(math.isnan, (short.forward_long, short.vol_long, short.correlation)))


@pytest.mark.parametrize(
    "left",
    [{"short_delivery": "2027-01"}, {"short_ratio": 7.2}, {"own_vol_short": 0.6}],
)
def test_a_spread_half_filled_in_is_not_taken_for_an_outright(left: dict[str, Any]) -> None:
    outright = {"short_leg": "", "short_delivery": "", "short_ratio": 1.0}
    assert troubles(SPARK, **outright) == []
    assert troubles(SPARK, **{**outright, **left}) == [(INCOMPLETE, "short_leg", "the short leg is missing")]


@pytest.mark.parametrize("side", ["long", "short"])
def test_an_outright_may_stand_on_own_marks_alone(side: str) -> None:
    other = "short" if side == "long" else "long"
    got = resolved(OWN, **{f"own_forward_{other}": None, f"own_vol_{other}": None, "own_correlation": None})
    assert got.troubles == []
    assert got.shape is (Shape.LONG_LEG_ONLY if side == "long" else Shape.SHORT_LEG_ONLY)


def test_a_forward_needs_neither_volatilities_nor_a_correlation() -> None:
    bare = {"own_vol_long": None, "own_vol_short": None, "own_correlation": None, "kind": "forward"}
    assert troubles(OWN, **bare) == []
    assert troubles(OWN, **bare, long_leg="in words", short_leg="in others") == []
    assert troubles(SPARK, kind="forward", short_leg="the delivery market", own_correlation=0.0) == []
    uncorrelated = resolved(SPARK, kind="forward", long_leg="Gas", short_leg="the delivery market")
    assert uncorrelated.troubles == []
    assert (uncorrelated.forward_long, uncorrelated.forward_short) == (9.0, 50.0)


def test_a_forward_may_stand_at_zero_or_below() -> None:
    assert troubles(SPARK, kind="forward", long_leg="Spring") == []
    assert troubles(SPARK, kind="forward", long_leg="Spring", long_delivery="2027-02") == []
    assert troubles(OWN, kind="forward", own_forward_long=-5.0) == []


def test_a_zero_volatility_and_a_correlation_of_one_are_taken() -> None:
    assert troubles(OWN, own_vol_long=0.0, own_vol_short=0.0, own_correlation=1.0) == []
    assert troubles(OWN, own_correlation=-1.0) == []
    assert troubles(OWN, quantity=0.0) == []


GAPS: list[tuple[Position, dict[str, Any], str, str]] = [
    (SPARK, {"quantity": None}, "quantity", "the quantity is missing"),
    (SPARK, {"expiry": None}, "expiry", "the expiry is missing"),
    (SPARK, {"long_delivery": ""}, "long_delivery", "the delivery of North is missing"),
    (SPARK, {"short_delivery": ""}, "short_delivery", "the delivery of Gas is missing"),
    (SPARK, {"long_delivery": "2028-01"}, "long_delivery", "North has no mark for 2028-01"),
    (SPARK, {"short_delivery": "2028-01"}, "short_delivery", "Gas has no mark for 2028-01"),
    (
        SPARK,
        {"long_leg": "Gas", "short_leg": "the delivery market"},
        "own_correlation",
        "the book has no correlation of Gas and the delivery market",
    ),
    (OWN, {"own_vol_long": None}, "own_vol_long", "the long volatility is missing"),
    (OWN, {"own_vol_short": None}, "own_vol_short", "the short volatility is missing"),
    (OWN, {"own_correlation": None}, "own_correlation", "the correlation is missing"),
    (OWN, {"own_correlation": None, "short_leg": "some gas"}, "own_correlation", "the correlation is missing"),
    (
        SPARK,
        {"short_leg": "", "own_forward_short": 9.0, "own_vol_short": 0.6},
        "own_correlation",
        "the correlation is missing",
    ),
]


@pytest.mark.parametrize(("position", "fields", "field", "sentence"), GAPS)
def test_each_gap_makes_the_position_incomplete_at_its_cell(
    position: Position, fields: dict[str, Any], field: str, sentence: str
) -> None:
    assert troubles(position, **fields) == [(INCOMPLETE, field, sentence)]


NO_WEST = 'there is no market "West" in this book'
NO_MONTH = 'expected a delivery month written as 2027-01, got "Jan"'
MISTAKES: list[tuple[Position, dict[str, Any], str, str]] = [
    (SPARK, {"long_leg": "West"}, "long_leg", NO_WEST),
    (SPARK, {"short_leg": "West"}, "short_leg", NO_WEST),
    (SPARK, {"long_leg": "no delivery"}, "long_leg", 'there is no market "no delivery" in this book'),
    (SPARK, {"long_leg": "Quill"}, "long_leg", 'the market "Quill" is defined twice'),
    (SPARK, {"long_delivery": "Jan"}, "long_delivery", NO_MONTH),
    (SPARK, {"short_delivery": "Jan"}, "short_delivery", NO_MONTH),
    (SPARK, {"quantity": -1.0}, "quantity", "the quantity is -1; let the side say short instead"),
    (SPARK, {"long_ratio": 0.0}, "long_ratio", "the long ratio is 0, not above zero"),
    (SPARK, {"short_ratio": -7.2}, "short_ratio", "the short ratio is -7.2, not above zero"),
    (
        SPARK,
        {"expiry": datetime.date(2026, 11, 30)},
        "expiry",
        "expired on 2026-11-30, before the valuation date 2026-12-01",
    ),
    (
        SPARK,
        {"long_leg": "Spring"},
        "own_forward_long",
        "the long forward is -2; lognormal formulas need one above zero",
    ),
    (
        OWN,
        {"own_forward_short": 0.0},
        "own_forward_short",
        "the short forward is 0; lognormal formulas need one above zero",
    ),
    (OWN, {"own_vol_long": -0.1}, "own_vol_long", "the long volatility is -0.1, below zero"),
    (SPARK, {"long_leg": "Calm"}, "own_vol_long", "the long volatility is -0.1, below zero"),
    (OWN, {"own_vol_short": -0.1}, "own_vol_short", "the short volatility is -0.1, below zero"),
    (OWN, {"own_correlation": 1.01}, "own_correlation", "the correlation is 1.01, beyond 1 or −1"),
    (OWN, {"own_correlation": -2.0}, "own_correlation", "the correlation is -2, beyond 1 or −1"),
    (SPARK, {"short_leg": "the delivery market"}, "own_correlation", "the correlation is 1.5, beyond 1 or −1"),
    (
        SPARK,
        {"long_leg": "Backwards", "short_leg": "Backwards", "short_delivery": "2027-07"},
        "own_correlation",
        "the correlation cannot be looked up: the tie strength of Backwards is -1, below zero",
    ),
    (
        OWN,
        {"own_correlation": None, "long_leg": "West", "short_leg": "Gas"},
        "own_correlation",
        f"the correlation cannot be looked up: {NO_WEST}",
    ),
]


@pytest.mark.parametrize(("position", "fields", "field", "sentence"), MISTAKES)
def test_each_mistake_makes_the_position_refused_at_its_cell(
    position: Position, fields: dict[str, Any], field: str, sentence: str
) -> None:
    assert troubles(position, **fields) == [(REFUSED, field, sentence)]


def test_an_expiry_on_the_valuation_date_is_fine() -> None:
    got = resolved(SPARK, expiry=TODAY)
    assert got.troubles == []
    assert (got.years, got.discount) == (0.0, 1.0)


def test_a_zero_rate_that_gives_no_discount_factor_is_refused() -> None:
    assert [(one.readiness, one.field, one.sentence) for one in resolved(OWN, rate=-1e6).troubles] == [
        (REFUSED, "expiry", "the zero rate -1e+06 gives no discount factor for this expiry")
    ]


def test_a_blank_row_names_what_to_fill_in_from_left_to_right() -> None:
    assert troubles(Position()) == [
        (INCOMPLETE, "quantity", "the quantity is missing"),
        (INCOMPLETE, "long_leg", "the long leg is missing"),
        (INCOMPLETE, "short_leg", "the short leg is missing"),
        (INCOMPLETE, "expiry", "the expiry is missing"),
    ]


def test_one_gap_does_not_hide_another() -> None:
    assert troubles(OWN, quantity=None, own_correlation=None, own_vol_long=None, expiry=None) == [
        (INCOMPLETE, "quantity", "the quantity is missing"),
        (INCOMPLETE, "expiry", "the expiry is missing"),
        (INCOMPLETE, "own_vol_long", "the long volatility is missing"),
        (INCOMPLETE, "own_correlation", "the correlation is missing"),
    ]


def test_many_troubles_are_all_told_in_the_order_of_the_row() -> None:
    wrong = {
        "quantity": -1.0,
        "long_leg": "West",
        "short_delivery": "",
        "short_ratio": 0.0,
        "expiry": datetime.date(2020, 1, 1),
        "own_correlation": 3.0,
    }
    assert [field for _, field, _ in troubles(SPARK, **wrong)] == [
        "quantity",
        "long_leg",
        "short_delivery",
        "short_ratio",
        "expiry",
        "own_correlation",
    ]


number = st.none() | st.floats(allow_nan=False, allow_infinity=False)
legs = st.sampled_from(["", *(market.name for market in MARKETS), "West"])
deliveries = st.sampled_from(["", "2027-01", "2027-07", "2031-01", "Jan"])
positions = st.builds(
    Position,
    kind=st.sampled_from(["call", "put", "forward"]),
    quantity=number,
    long_leg=legs,
    long_delivery=deliveries,
    long_ratio=st.floats(allow_nan=False, allow_infinity=False),
    short_leg=legs,
    short_delivery=deliveries,
    short_ratio=st.floats(allow_nan=False, allow_infinity=False),
    expiry=st.dates() | st.none(),
    own_forward_long=number,
    own_forward_short=number,
    own_vol_long=number,
    own_vol_short=number,
    own_correlation=number,
)


@PATIENT
@given(positions, st.dates(), st.floats(allow_nan=False, allow_infinity=False))
def test_any_position_resolves_to_numbers_a_formula_takes_or_to_a_reason(
    position: Position, today: datetime.date, rate: float
) -> None:
    got = resolve(position, QUOTES, today, rate)
    assert all(one.field in Position.__struct_fields__ and one.sentence for one in got.troubles)
    if got.troubles:
        return
    assert got.years >= 0.0
    assert 0.0 <= got.discount < math.inf
    legs_held = [
        side
        for side, absent in (("long", Shape.SHORT_LEG_ONLY), ("short", Shape.LONG_LEG_ONLY))
        if got.shape is not absent
    ]
    for side in legs_held:
        forward, vol = getattr(got, f"forward_{side}"), getattr(got, f"vol_{side}")
        assert math.isfinite(forward)
        assert position.kind == "forward" or (forward > 0 and 0 <= vol < math.inf)
    if got.shape is Shape.SPREAD and position.kind != "forward":
        assert abs(got.correlation) <= 1
