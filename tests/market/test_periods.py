"""Quarters, seasons and years: what they say of their months, and how marking one spreads."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.book.records import Mark, Market
from spreadgui.market.periods import (
    Period,
    periods_of,
    spread_to_months,
    value_of,
    with_delivery,
    with_marks,
    without_deliveries,
)

MONTHS = tuple(f"{year}-{month:02d}" for year in (2027, 2028) for month in range(1, 13))


def market(**changed: object) -> Market:
    marks = tuple(
        Mark(month, 50.0 + place, 0.6 - 0.01 * place, 1.0 + 0.1 * place) for place, month in enumerate(MONTHS)
    )
    return Market(**{"name": "A", "unit": "CRN/MWh", "lot_rule": "per hour", "marks": marks, **changed})  # type: ignore[arg-type]


def named(some: Market, name: str) -> Period:
    return next(period for period in periods_of(some) if period.name == name)


def test_months_stand_under_the_periods_that_begin_with_them() -> None:
    names = [period.name for period in periods_of(market())]
    assert names[:8] == ["2027", "winter 2026/27", "2027 Q1", "2027-01", "2027-02", "2027-03", "summer 2027", "2027 Q2"]
    assert names[-3:] == ["2028-10", "2028-11", "2028-12"][-3:]
    assert len(names) == 24 + 8 + 5 + 2
    assert named(market(), "winter 2027/28").deliveries == (*MONTHS[9:15],)


def test_a_period_of_one_marked_month_is_that_month_alone() -> None:
    few = market(marks=(Mark("2027-01", 50.0, 0.5), Mark("2027-07", 40.0, 0.4)))
    assert [period.name for period in periods_of(few)] == ["2027", "2027-01", "2027-07"]


def test_a_period_is_the_mean_of_its_months_by_what_a_lot_delivers() -> None:
    """A flat quarter of base power is worth its months by their hours (common practice, no source)."""
    hours = [31, 28, 31]
    mean = sum(day * (50.0 + place) for place, day in enumerate(hours)) / sum(hours)
    assert value_of(market(), named(market(), "2027 Q1"), "forward") == pytest.approx(mean)
    fixed = market(lot_rule="fixed")
    assert value_of(fixed, named(fixed, "2027 Q1"), "forward") == pytest.approx(51.0)
    assert value_of(fixed, named(fixed, "2027 Q1"), "volatility") == pytest.approx(0.59)


@settings(max_examples=60, deadline=None)
@given(
    st.sampled_from(["2027", "summer 2027", "2028 Q3", "2027-05"]),
    st.sampled_from(["forward", "volatility", "daily_volatility"]),
    st.floats(0.01, 300.0), st.sampled_from(["fixed", "per day", "per hour"]),
)  # fmt: skip
def test_a_period_marked_stands_where_it_was_marked_and_keeps_its_shape(
    name: str, field: str, value: float, rule: str
) -> None:
    before = market(lot_rule=rule)
    period = named(before, name)
    after = spread_to_months(before, period, field, value)  # type: ignore[arg-type]
    assert value_of(after, period, field) == pytest.approx(value)  # type: ignore[arg-type]
    inside = [
        (old, new) for old, new in zip(before.marks, after.marks, strict=True) if old.delivery in period.deliveries
    ]
    ratios = [getattr(new, field) / getattr(old, field) for old, new in inside]
    assert ratios == pytest.approx([ratios[0]] * len(ratios))
    outside = [
        (old, new) for old, new in zip(before.marks, after.marks, strict=True) if old.delivery not in period.deliveries
    ]
    assert all(old is new for old, new in outside)


@pytest.mark.parametrize("value", [-20.0, 0.0, 75.0])
def test_a_normal_market_moves_by_the_same_amount_throughout(value: float) -> None:
    before = market(dynamics="normal")
    period = named(before, "2027 Q1")
    after = spread_to_months(before, period, "forward", value)
    moves = [new.forward - old.forward for old, new in zip(before.marks, after.marks, strict=True)][:3]
    assert moves == pytest.approx([moves[0]] * 3)
    assert value_of(after, period, "forward") == pytest.approx(value)


def test_a_forward_through_zero_moves_by_amounts_even_where_the_market_is_lognormal() -> None:
    before = market(marks=(Mark("2027-01", -5.0, 0.5), Mark("2027-02", 15.0, 0.5)), lot_rule="fixed")
    after = spread_to_months(before, named(before, "2027"), "forward", 8.0)
    assert [mark.forward for mark in after.marks] == pytest.approx([-2.0, 18.0])


def test_a_daily_volatility_can_be_given_to_months_that_have_none_and_taken_away() -> None:
    none = market(marks=tuple(Mark(month, 50.0, 0.5) for month in MONTHS))
    period = named(none, "2027 Q1")
    assert value_of(none, period, "daily_volatility") is None
    given_ = spread_to_months(none, period, "daily_volatility", 1.4)
    assert [mark.daily_volatility for mark in given_.marks[:4]] == [1.4, 1.4, 1.4, None]
    assert spread_to_months(given_, period, "daily_volatility", None) == none


def test_a_volatility_that_is_typed_over_forgets_where_it_came_from() -> None:
    noted = market(marks=(Mark("2027-01", 50.0, 0.5, None, "EWMA to 2026-12-01"),))
    assert with_marks(noted, {"2027-01": {"forward": 51.0}}).marks[0].note == "EWMA to 2026-12-01"
    assert with_marks(noted, {"2027-01": {"volatility": 0.6}}).marks[0].note == ""
    assert with_marks(noted, {"2027-01": {"volatility": 0.5}}).marks[0] is noted.marks[0]


def test_a_new_month_starts_as_its_nearest_neighbour_in_its_place() -> None:
    gap = without_deliveries(market(), ["2027-05", "2027-06"])
    filled = with_delivery(gap, "2027-05")
    assert [mark.delivery for mark in filled.marks] == [*MONTHS[:5], *MONTHS[6:]]
    assert filled.marks[4] == Mark("2027-05", 53.0, 0.57, 1.3)
    assert with_delivery(filled, "2027-05") is filled
    assert with_delivery(Market("B", "CRN/t"), "2027-01").marks == (Mark("2027-01", 0.0, 0.0),)
