"""The Reading of one position: every method against the formulas called by hand, the gaps, the units, the reasons."""

import datetime
import math

import pytest
from msgspec.structs import replace

from spreadgui.book.records import Book, Correlation, Mark, Market, Position
from spreadgui.pricing import bjerksund_stensland, black76, kirk, margrabe, modified_kirk, yardstick
from spreadgui.pricing.methods import LOGNORMAL_METHODS, METHODS
from spreadgui.valuation.columns import BY_COLUMN_KEY
from spreadgui.valuation.reading import Reading, SensitivityReading, read_position
from spreadgui.valuation.results import SENSITIVITIES, State
from spreadgui.valuation.slate import build_slate

POWER = Market("Ardenmoor South", "CRN/MWh", marks=(Mark("2027-12", 87.5, 0.34),))
GAS = Market("Pellan gas point", "CRN/GJ", marks=(Mark("2027-12", 9.2, 0.41),))
BARE = Market("Storrow index", "points", marks=(Mark("2027-12", 90.0, 0.25),))
SPARK = Position(
    name="Spark", side="long", kind="call", quantity=74_400.0, long_leg="Ardenmoor South", long_delivery="2027-12",
    short_leg="Pellan gas point", short_delivery="2027-12", short_ratio=7.1, strike=12.0,
    expiry=datetime.date(2027, 11, 28),
)  # fmt: skip
OUTRIGHT = replace(SPARK, short_leg="", short_delivery="", short_ratio=1.0, strike=90.0)
PUT_BELOW_ZERO = replace(SPARK, kind="put", side="short", strike=-3.5)
ZERO_RATE = 0.032
YEARS = (datetime.date(2027, 11, 28) - datetime.date(2026, 12, 1)).days / 365.0
DISCOUNT = math.exp(-ZERO_RATE * YEARS)
CORRELATION = 0.8
MODULES = {
    "margrabe": margrabe, "kirk": kirk, "modified_kirk": modified_kirk,
    "bjerksund_stensland": bjerksund_stensland, "yardstick": yardstick,
}  # fmt: skip


def read(position: Position, method: str = "kirk") -> Reading:
    book = Book(
        title="One row", currency="CRN", valuation_date=datetime.date(2026, 12, 1), zero_rate=ZERO_RATE, method=method,
        markets=(POWER, GAS, BARE), correlations=(Correlation("Ardenmoor South", "Pellan gas point", CORRELATION),),
        positions=(position,),
    )  # fmt: skip
    return read_position(build_slate(book, 7), 0)


def arguments(position: Position) -> tuple[float, ...]:
    """What a formula takes for a spark position, the heat rate folded into the gas forward."""
    return 87.5, position.short_ratio * 9.2, position.strike, 0.34, 0.41, CORRELATION, YEARS, DISCOUNT


def rows_of(reading: Reading) -> dict[str, SensitivityReading]:
    return {row.key: row for row in reading.sensitivity_rows}


@pytest.mark.parametrize("position", [SPARK, PUT_BELOW_ZERO, replace(SPARK, strike=0.0)])
def test_every_method_says_what_its_formula_says(position: Position) -> None:
    reading = read(position)
    assert [method.key for method in reading.methods] == [method.key for method in LOGNORMAL_METHODS]
    for method in reading.methods:
        if method.key == "margrabe" and position.strike != 0.0:
            continue
        expected = MODULES[method.key].value(*arguments(position), kind=position.kind)
        assert method.unit_value == pytest.approx(float(expected), rel=1e-12)


@pytest.mark.parametrize("chosen", ["kirk", "modified_kirk", "bjerksund_stensland", "yardstick"])
def test_the_value_and_the_sensitivities_are_those_of_the_books_method(chosen: str) -> None:
    reading = read(SPARK, chosen)
    expected = MODULES[chosen].sensitivities(*arguments(SPARK), kind="call")
    assert reading.method == next(method.name for method in METHODS if method.key == chosen)
    assert [method.key for method in reading.methods if method.chosen] == [chosen]
    assert reading.unit_value == pytest.approx(float(expected.value), rel=1e-12)
    assert reading.position_value == pytest.approx(74_400.0 * float(expected.value), rel=1e-12)
    # By the chain rule, from the folded gas forward to the market's own.
    factor = {"delta_short": 7.1, "gamma_short": 7.1**2, "gamma_cross": 7.1}
    for key, found in zip(SENSITIVITIES, reading.sensitivities, strict=True):
        carried = ZERO_RATE * float(expected.value) if key == "theta" else 0.0
        assert found == pytest.approx(factor.get(key, 1.0) * float(getattr(expected, key)) + carried, rel=1e-9)


@pytest.mark.parametrize("position", [SPARK, PUT_BELOW_ZERO])
def test_a_gap_is_the_method_minus_the_yardstick_in_three_countings(position: Position) -> None:
    reading = read(position)
    quantity = 74_400.0 if position.side == "long" else -74_400.0
    reference = float(yardstick.value(*arguments(position), kind=position.kind))
    for method in reading.methods:
        if method.reference or method.key == "margrabe":
            assert math.isnan(method.gap)
            continue
        gap = float(MODULES[method.key].value(*arguments(position), kind=position.kind)) - reference
        assert method.gap == pytest.approx(gap, abs=1e-12)
        assert method.position_gap == pytest.approx(quantity * gap, abs=1e-6)
        assert method.gap_share == pytest.approx(gap / reference, abs=1e-12)


def test_a_method_that_does_not_cover_the_strike_says_where_it_applies() -> None:
    found = read(SPARK).methods[0]
    assert found.key == "margrabe"
    assert math.isnan(found.unit_value)
    assert math.isnan(found.gap)
    assert "zero" in found.remark


def test_a_premium_below_the_yardsticks_accuracy_has_no_share() -> None:
    reading = read(replace(SPARK, strike=5_000.0))
    for method in reading.methods[1:-1]:
        assert math.isfinite(method.gap)
        assert math.isnan(method.gap_share)
        assert method.remark == "premium too small for a share"


def test_screen_scalings_and_units_follow_the_legs_own_markets() -> None:
    reading = read(replace(SPARK, side="short"))
    found = rows_of(reading)
    expected = {
        "delta_long": ("per 1.00", 1.0, "MWh"), "delta_short": ("per 1.00", 1.0, "GJ"),
        "gamma_long": ("per 1.00", 1.0, "MWh"), "gamma_short": ("per 1.00", 1.0, "GJ"),
        "gamma_cross": ("per 1.00", 1.0, "MWh"), "vega_long": ("per 1 vol point", 0.01, "CRN"),
        "vega_short": ("per 1 vol point", 0.01, "CRN"), "correlation_sensitivity": ("per 0.01", 0.01, "CRN"),
        "theta": ("per calendar day", 1 / 365, "CRN"),
    }  # fmt: skip
    assert tuple(found) == SENSITIVITIES
    for key, plain in zip(SENSITIVITIES, reading.sensitivities, strict=True):
        row, (scaling, scale, unit) = found[key], expected[key]
        assert (row.scaling, row.unit, row.name) == (scaling, unit, BY_COLUMN_KEY[key].heading)
        assert row.unit_value == pytest.approx(scale * plain, rel=1e-14)
        assert row.position_value == pytest.approx(-74_400.0 * scale * plain, rel=1e-14)


@pytest.mark.parametrize(("market", "key"), [(0, "delta_long"), (1, "delta_short")])
def test_a_position_delta_is_the_money_that_a_moved_mark_makes(market: int, key: str) -> None:
    """The unit is right if the number of units times a small move of that market's own forward is the P&L."""
    step = 1e-3

    def value_at(move: float) -> float:
        markets = [POWER, GAS]
        mark = markets[market].marks[0]
        markets[market] = replace(markets[market], marks=(replace(mark, forward=mark.forward + move),))
        book = Book(
            title="", currency="CRN", valuation_date=datetime.date(2026, 12, 1), zero_rate=ZERO_RATE, method="kirk",
            markets=tuple(markets), correlations=(Correlation(POWER.name, GAS.name, CORRELATION),), positions=(SPARK,),
        )  # fmt: skip
        return read_position(build_slate(book, 1), 0).position_value

    pnl_per_unit = (value_at(step) - value_at(-step)) / (2 * step)
    assert rows_of(read(SPARK))[key].position_value == pytest.approx(pnl_per_unit, rel=1e-5)


def test_a_leg_without_a_market_counts_as_the_payoff_only_at_a_ratio_of_one() -> None:
    own = {"short_leg": "", "short_delivery": "", "own_vol_short": 0.3, "own_correlation": 0.6}
    mixed = rows_of(read(replace(SPARK, own_forward_short=70.0, short_ratio=1.0, **own)))
    assert mixed["delta_short"].unit == "MWh"
    other = rows_of(read(replace(SPARK, own_forward_short=10.0, short_ratio=7.1, **own)))
    assert other["delta_short"].unit == "units"


def test_a_market_whose_unit_names_no_quantity_is_counted_in_units() -> None:
    reading = read(replace(OUTRIGHT, long_leg="Storrow index"))
    assert reading.quantity_unit == ""
    assert rows_of(reading)["delta_long"].unit == "units"
    assert reading.subject == "Spark · long call · 74\N{NARROW NO-BREAK SPACE}400"


def test_an_outright_is_read_by_black_and_has_no_second_leg() -> None:
    reading = read(OUTRIGHT)
    expected = black76.sensitivities(87.5, 90.0, 0.34, YEARS, DISCOUNT, kind="call")
    assert [(method.key, method.name) for method in reading.methods] == [("black76", "Black-76")]
    assert reading.method == "Black-76"
    assert reading.unit_value == pytest.approx(float(expected.value), rel=1e-12)
    found = rows_of(reading)
    assert found["delta_long"].unit_value == pytest.approx(float(expected.delta), rel=1e-12)
    for key in ("delta_short", "gamma_short", "vega_short"):
        assert found[key].absence == "no short leg"
        assert math.isnan(found[key].unit_value)
        assert math.isnan(found[key].position_value)
    assert found["gamma_cross"].absence == found["correlation_sensitivity"].absence == "one leg only"
    assert found["theta"].absence == ""


def test_a_short_leg_alone_has_no_long_leg() -> None:
    lone = replace(OUTRIGHT, long_leg="", long_delivery="", short_leg="Pellan gas point", short_delivery="2027-12")
    reading = read(replace(lone, kind="put", strike=-9.0))
    found = rows_of(reading)
    assert found["vega_long"].absence == "no long leg"
    assert found["delta_short"].absence == ""
    assert (reading.unit, found["delta_short"].unit) == ("CRN/GJ", "GJ")


def test_a_forward_is_no_option() -> None:
    reading = read(replace(SPARK, kind="forward", side="short"))
    assert reading.unit_value == pytest.approx(DISCOUNT * (87.5 - 7.1 * 9.2 - 12.0), rel=1e-12)
    assert math.isnan(reading.intrinsic)
    assert math.isnan(reading.time_value)
    assert [method.key for method in reading.methods] == ["forward"]
    found = rows_of(reading)
    assert found["delta_short"].position_value == pytest.approx(74_400.0 * 7.1 * DISCOUNT, rel=1e-12)
    absent = {key for key, row in found.items() if row.absence == "none in a forward"}
    assert absent == set(SENSITIVITIES) - {"delta_long", "delta_short", "theta"}


@pytest.mark.parametrize(("kind", "strike", "payoff"), [("call", 12.0, 10.18), ("put", 12.0, 0.0), ("put", 30.0, 7.82)])
def test_intrinsic_is_the_discounted_payoff_of_standing_forwards(kind: str, strike: float, payoff: float) -> None:
    reading = read(replace(SPARK, kind=kind, strike=strike))
    assert reading.intrinsic == pytest.approx(DISCOUNT * payoff, abs=1e-9)
    assert reading.time_value == pytest.approx(reading.unit_value - reading.intrinsic, abs=1e-12)


def test_an_incomplete_row_names_every_gap() -> None:
    reading = read(replace(SPARK, quantity=None, expiry=None))
    assert reading.state is State.INCOMPLETE
    assert reading.reason == "the quantity is missing; the expiry is missing"
    assert reading.subject == "Spark · long call"
    assert math.isnan(reading.unit_value)
    assert reading.methods == reading.sensitivity_rows == ()


def test_a_refused_row_says_what_is_wrong() -> None:
    reading = read(replace(SPARK, quantity=None, short_ratio=-7.1))
    assert reading.state is State.REFUSED
    assert "the short ratio is -7.1" in reading.reason


def test_a_value_out_of_reach_is_refused_not_shown() -> None:
    reading = read(replace(SPARK, own_forward_long=1e308, long_ratio=1e10))
    assert reading.state is State.REFUSED
    assert "out of the machine's reach" in reading.reason


def test_a_reading_is_stamped_and_a_nameless_position_gets_its_number() -> None:
    reading = read(replace(SPARK, name=""))
    assert (reading.revision, reading.row) == (7, 0)
    assert reading.subject == "Position 1 · long call · 74\N{NARROW NO-BREAK SPACE}400 MWh"


def test_a_row_that_is_not_there_is_an_error() -> None:
    with pytest.raises(IndexError):
        read_position(build_slate(Book(title="", currency="CRN", valuation_date=datetime.date(2026, 12, 1)), 1), 0)
