"""Time is ACT/365F and discounting continuous. Expected figures are worked out here by hand."""

from __future__ import annotations

import datetime
import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.market.time import delivery_years_apart, discount_factor, years

PATIENT = settings(deadline=None, max_examples=60)
DAY = datetime.date


def test_a_year_is_365_days_even_where_the_calendar_has_366() -> None:
    assert years(DAY(2027, 1, 1), DAY(2028, 1, 1)) == 1.0
    assert years(DAY(2028, 1, 1), DAY(2029, 1, 1)) == 366 / 365
    assert years(DAY(2028, 2, 28), DAY(2028, 3, 1)) == 2 / 365


def test_no_time_passes_within_a_day_and_it_runs_backwards_before() -> None:
    assert years(DAY(2026, 12, 1), DAY(2026, 12, 1)) == 0.0
    assert years(DAY(2026, 12, 1), DAY(2026, 11, 30)) == -1 / 365


@PATIENT
@given(st.dates(), st.dates())
def test_years_there_and_back_cancel(start: datetime.date, end: datetime.date) -> None:
    assert years(start, end) == -years(end, start)
    assert years(start, end) * 365 == pytest.approx((end - start).days, abs=1e-6)


def test_a_discount_factor_is_the_exponential_of_minus_rate_times_time() -> None:
    assert discount_factor(0.05, 2.0) == pytest.approx(0.9048374180359595, rel=1e-15)  # exp(-0.1), by hand
    assert discount_factor(-0.05, 2.0) == pytest.approx(1.1051709180756477, rel=1e-15)  # exp(0.1), by hand
    assert discount_factor(0.0, 9.0) == 1.0
    assert discount_factor(0.5, 0.0) == 1.0


@PATIENT
@given(st.floats(allow_nan=False, allow_infinity=False), st.floats(0.0, 8000.0))
def test_any_rate_of_a_file_gives_a_number_or_infinity_and_never_raises(rate: float, time: float) -> None:
    factor = discount_factor(rate, time)
    assert factor >= 0.0
    assert rate < 0.0 or factor <= 1.0


def test_a_rate_out_of_reach_gives_infinity() -> None:
    assert discount_factor(-1e308, 1.0) == math.inf
    assert discount_factor(1e308, 1.0) == 0.0


@pytest.mark.parametrize(
    ("first", "second", "apart"),
    [
        ("2027-01", "2027-01", 0.0),
        ("2027-01", "2027-02", 1 / 12),
        ("2026-12", "2027-01", 1 / 12),
        ("2027-01", "2028-01", 1.0),
        ("2027-10", "2026-07", 1.25),
    ],
)
def test_deliveries_are_apart_by_twelfths_either_way(first: str, second: str, apart: float) -> None:
    assert delivery_years_apart(first, second) == apart
    assert delivery_years_apart(second, first) == apart
