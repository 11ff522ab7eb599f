"""A strip: many options under one row, their values and sensitivities added up, and carried back to the marks."""

from __future__ import annotations

import datetime
from typing import Any

import msgspec
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.book.records import Book, Correlation, Mark, Market, Position
from spreadgui.pricing import bachelier, black76, yardstick
from spreadgui.valuation.price import price_rows
from spreadgui.valuation.reading import read_position
from spreadgui.valuation.results import output_row
from spreadgui.valuation.slate import build_slate, follow
from spreadgui.valuation.table import value_book
from tests.books import book_of

DAY = datetime.date(2026, 12, 1)
HOLIDAY = datetime.date(2027, 1, 1)


def markets(**changed: Any) -> tuple[Market, Market]:
    """Power with a daily volatility and a holiday, gas without either."""
    values = {"vol": 0.6, "daily": 1.1, "gas_vol": 0.5, "forward": 108.0, "gas_daily": None, "dynamics": "lognormal"}
    values.update(changed)
    power = Market(
        "Ardenmoor South", "CRN/MWh", 0.4, dynamics=values["dynamics"], holidays=(HOLIDAY,),
        marks=(Mark("2027-01", values["forward"], values["vol"], values["daily"]),),
    )  # fmt: skip
    gas = Market(
        "Pellan gas point", "CRN/GJ", 0.3, dynamics=values["dynamics"],
        marks=(Mark("2027-01", 13.0, values["gas_vol"], values["gas_daily"]),),
    )  # fmt: skip
    return power, gas


def strip(**changed: Any) -> Position:
    fields: dict[str, Any] = {
        "name": "strip", "quantity": 1000.0, "long_leg": "Ardenmoor South", "long_delivery": "2027-01",
        "short_leg": "Pellan gas point", "short_delivery": "2027-01", "short_ratio": 7.1, "strike": 5.0,
        "exercise": "business days",
    }  # fmt: skip
    return Position(**{**fields, **changed})


def book(position: Position, *, correlation: float = 0.65, day: datetime.date = DAY, **changed: Any) -> Book:
    both = markets(**changed)
    tied = (Correlation(both[0].name, both[1].name, correlation),)
    return book_of(position, markets=both, correlations=tied, valuation_date=day)


def found(some: Book) -> dict[str, float]:
    slate = build_slate(some, 1)
    assert not slate.troubles, slate.troubles
    outputs = price_rows(slate, np.array([0])).outputs[:, 0]
    keys = (
        "value", "delta_long", "vega_long", "vega_short", "daily_vega_long", "daily_vega_short",
        "correlation_sensitivity", "theta", "rate_sensitivity", "gamma_cross", "yardstick", "kirk", "bachelier",
    )  # fmt: skip
    return {key: float(outputs[output_row(key)]) for key in keys}


def slope(of: Any, step: float) -> float:
    """The derivative at zero, fourth order."""
    near, far = of(step) - of(-step), of(2.0 * step) - of(-2.0 * step)
    return float((8.0 * near - far) / (12.0 * step))


# --- days


def test_a_business_strip_has_an_option_for_each_business_day_but_the_holiday_exercised_the_business_day_before() -> (
    None
):
    days = build_slate(book(strip()), 1).strips[0]
    assert days.days[0] == np.datetime64("2027-01-04")  # the 1st is a holiday, the 2nd a Saturday
    assert days.expiries[0] == np.datetime64("2026-12-31")
    assert days.expiries[1] == np.datetime64("2027-01-04")
    assert len(days) == 20
    assert days.share == 1.0 / 20.0


def test_a_strip_over_all_days_has_the_month_and_weekends_are_exercised_on_friday() -> None:
    days = build_slate(book(strip(exercise="all days")), 1).strips[0]
    assert len(days) == 31
    weekend = (days.days == np.datetime64("2027-01-09")) | (days.days == np.datetime64("2027-01-10"))
    assert set(days.expiries[weekend].tolist()) == {datetime.date(2027, 1, 8)}


def test_days_that_were_exercised_before_the_valuation_date_are_dropped_and_the_others_keep_their_share() -> None:
    days = build_slate(book(strip(), day=datetime.date(2027, 1, 20)), 1).strips[0]
    assert days.expiries[0] == np.datetime64("2027-01-20")
    assert days.share == 1.0 / 20.0
    assert len(days) < 20


def test_a_strip_that_is_all_past_or_over_two_months_or_over_none_is_told_in_a_sentence() -> None:
    past = build_slate(book(strip(), day=datetime.date(2027, 2, 1)), 1)
    assert "was all exercised before the valuation date 2027-02-01" in past.troubles[0][0].sentence
    own = {"own_forward_long": 1.0, "own_vol_long": 0.1, "own_forward_short": 1.0, "own_vol_short": 0.1}
    own |= {"own_correlation": 0.5, "long_leg": "", "short_leg": "", "long_delivery": "", "short_delivery": ""}
    none = build_slate(book(strip(**own)), 1)
    assert none.troubles[0][0].sentence == "a strip needs a delivery month, whose days it is exercised for"
    both = markets()
    two = msgspec.structs.replace(both[1], marks=(Mark("2027-02", 13.0, 0.5),))
    apart = book_of(strip(short_delivery="2027-02"), markets=(both[0], two))
    assert "a strip needs both legs in one delivery month" in [t.sentence for t in build_slate(apart, 1).troubles[0]]


# --- values


def test_the_value_is_the_sum_of_the_days_each_with_the_variance_up_to_its_own_exercise() -> None:
    days = build_slate(book(strip()), 1).strips[0]
    before, within = days.before, days.within
    long = 0.6**2 * before + 1.1**2 * within
    short = 0.5**2 * (before + within)
    shared = 0.65 * (0.6 * 0.5 * before + 1.1 * 0.5 * within)
    years, discount = before + within, np.exp(-0.03 * (before + within))
    each = yardstick.value(
        108.0, 7.1 * 13.0, 5.0, np.sqrt(long / years), np.sqrt(short / years), shared / np.sqrt(long * short), years,
        discount,
    )  # fmt: skip
    value = found(book(strip()))["value"]
    assert value == pytest.approx(float(each.mean()), rel=1e-12)
    assert (before <= 31 / 365).all()
    assert before[-1] == 31 / 365


def test_without_daily_volatility_every_day_is_the_option_that_expires_then() -> None:
    strip_value = found(book(strip(), daily=None))["value"]
    days = build_slate(book(strip(), daily=None), 1).strips[0]
    once = [
        found(book(strip(exercise="once", expiry=expiry), daily=None))["value"] for expiry in days.expiries.tolist()
    ]
    assert strip_value == pytest.approx(np.mean(once), rel=1e-12)


def test_an_outright_strip_is_black_and_a_normal_one_bachelier() -> None:
    outright = strip(short_leg="", short_delivery="", short_ratio=1.0, strike=100.0)
    days = build_slate(book(outright), 1).strips[0]
    vol = np.sqrt((0.6**2 * days.before + 1.1**2 * days.within) / days.years)
    discount = np.exp(-0.03 * days.years)
    exact = black76.value(108.0, 100.0, vol, days.years, discount)
    assert found(book(outright))["value"] == pytest.approx(float(exact.mean()), rel=1e-13)
    normal = book(strip(), dynamics="normal", vol=30.0, daily=60.0, gas_vol=4.0)
    long = np.sqrt((30.0**2 * days.before + 60.0**2 * days.within) / days.years)
    tied = (30.0 * days.before + 60.0 * days.within) / (long * days.years)
    exact = bachelier.value(108.0, 92.3, 5.0, long, 7.1 * 4.0, 0.65 * tied, days.years, discount)
    assert found(normal)["value"] == pytest.approx(float(exact.mean()), rel=1e-12)


def test_a_day_in_the_reading_adds_up_to_the_row() -> None:
    reading = read_position(build_slate(book(strip(side="short")), 1), 0)
    assert len(reading.days) == 20
    assert sum(day.position_value for day in reading.days) == pytest.approx(reading.position_value, rel=1e-13)
    assert sum(day.quantity for day in reading.days) == pytest.approx(-1000.0, rel=1e-13)
    delta = next(row for row in reading.sensitivity_rows if row.key == "delta_long")
    assert sum(day.delta_long for day in reading.days) == pytest.approx(delta.position_value, rel=1e-12)
    assert reading.days[-1].vol_long > reading.days[0].vol_long == pytest.approx(0.6)


# --- sensitivities, each against what the book says when the mark is moved

CASES = {
    "a daily volatility on one side": {},
    "a daily volatility on both sides": {"gas_daily": 0.9},
    "none": {"daily": None},
    "normal forwards": {"dynamics": "normal", "vol": 30.0, "daily": 60.0, "gas_vol": 4.0},
}


@pytest.mark.parametrize("case", CASES.values(), ids=CASES)
@pytest.mark.parametrize("day", [DAY, datetime.date(2027, 1, 12)])
def test_sensitivities_to_the_marks_are_their_slopes(case: dict[str, Any], day: datetime.date) -> None:
    base = {"vol": 0.6, "daily": 1.1, "gas_vol": 0.5, "gas_daily": None, "forward": 108.0, **case}
    values = found(book(strip(), day=day, **base))

    def moved(key: str) -> Any:
        return lambda step: found(book(strip(), day=day, **{**base, key: base[key] + step}))["value"]

    # A hundredth of a volatility point and of a price: differences of fourth order keep about nine digits.
    scale = 1e-3 if base.get("dynamics") is None else 0.05
    bumps = {"vega_long": "vol", "vega_short": "gas_vol", "delta_long": "forward"}
    if base["daily"] is not None:
        bumps["daily_vega_long"] = "daily"
    else:
        assert values["daily_vega_long"] == 0.0
    for key, mark in bumps.items():
        assert values[key] == pytest.approx(slope(moved(mark), scale), rel=2e-7, abs=2e-7), key
    tied = slope(lambda step: found(book(strip(), day=day, correlation=0.65 + step, **base))["value"], 1e-3)
    assert values["correlation_sensitivity"] == pytest.approx(tied, rel=2e-7, abs=2e-7)


def test_theta_is_what_a_day_does_while_no_day_of_the_strip_is_exercised() -> None:
    start = datetime.date(2026, 12, 10)
    values = [found(book(strip(), day=start + datetime.timedelta(days=ahead)))["value"] for ahead in (-2, -1, 1, 2)]
    day = (8.0 * (values[2] - values[1]) - (values[3] - values[0])) / 12.0
    assert found(book(strip(), day=start))["theta"] / 365.0 == pytest.approx(day, rel=2e-4)


def test_the_rate_sensitivity_of_a_strip_discounts_each_day_for_itself() -> None:
    base = book(strip())
    rates = [msgspec.structs.replace(base, zero_rate=base.zero_rate + step) for step in (1e-4, -1e-4)]
    up, down = (found(some)["value"] for some in rates)
    assert found(base)["rate_sensitivity"] == pytest.approx((up - down) / 2e-4, rel=1e-6)


@settings(max_examples=40, deadline=None)
@given(
    vol=st.floats(0.0, 2.0), daily=st.none() | st.floats(0.0, 3.0), gas=st.floats(0.0, 1.0), tie=st.floats(-1.0, 1.0),
    days=st.integers(0, 55), kind=st.sampled_from(["call", "put", "forward"]),
)  # fmt: skip
def test_any_strip_is_priced_with_finite_numbers_and_no_warning(
    vol: float, daily: float | None, gas: float, tie: float, days: int, kind: str
) -> None:
    some = book(
        strip(kind=kind), vol=vol, daily=daily, gas_vol=gas, correlation=tie, day=DAY + datetime.timedelta(days=days)
    )
    assert all(np.isfinite(number) for key, number in found(some).items() if key != "bachelier")


# --- among other rows


def test_a_strip_among_other_rows_is_summed_for_itself_and_follows_edits() -> None:
    once = strip(exercise="once", expiry=datetime.date(2026, 12, 30), name="once")
    both = markets()
    tied = (Correlation(both[0].name, both[1].name, 0.65),)
    some = book_of(once, strip(), once, strip(exercise="all days"), markets=both, correlations=tied)
    valued = value_book(some)
    alone = [found(msgspec.structs.replace(some, positions=(position,)))["value"] for position in some.positions]
    assert valued.results.values("value").tolist() == pytest.approx(alone, rel=1e-14)
    fewer = msgspec.structs.replace(some, positions=(some.positions[3], some.positions[0]))
    slate = follow(valued.slate, fewer, 2).slate
    assert set(slate.strips) == {0}
    assert slate.strips[0] is valued.slate.strips[3]
