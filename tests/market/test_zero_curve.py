"""Discount factors from zero rates by date: exact at the points, one rate's formula where flat, straight between."""

from __future__ import annotations

import datetime
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.market.time import discount_factor, years
from spreadgui.market.zero_curve import Point, ZeroCurve, curve_faults

PATIENT = settings(deadline=None, max_examples=80)
DAY = datetime.date(2026, 12, 1)
NEAR, MIDDLE, FAR = datetime.date(2027, 3, 1), datetime.date(2027, 12, 1), datetime.date(2029, 11, 30)
CURVE = ZeroCurve(DAY, ((NEAR, 0.021), (MIDDLE, 0.034), (FAR, 0.027)))


def points_of(days: list[int], rates: list[float]) -> tuple[Point, ...]:
    return tuple((DAY + datetime.timedelta(days=day), rate) for day, rate in zip(days, rates, strict=True))


curves = st.lists(st.integers(1, 20_000), min_size=1, max_size=12, unique=True).flatmap(
    lambda days: st.lists(st.floats(-0.2, 0.3), min_size=len(days), max_size=len(days)).map(
        lambda rates: ZeroCurve(DAY, points_of(sorted(days), rates))
    )
)
times = st.lists(st.floats(0.0, 60.0), min_size=1, max_size=20)


@PATIENT
@given(curves)
def test_each_point_has_its_own_rate_and_discount_factor_to_the_last_digit(curve: ZeroCurve) -> None:
    days = np.array([day for day, _ in curve.points], dtype="datetime64[D]")
    assert curve.rate(days).tolist() == [rate for _, rate in curve.points]
    assert curve.discount(days).tolist() == [discount_factor(rate, years(DAY, day)) for day, rate in curve.points]


@PATIENT
@given(st.floats(-0.2, 0.3), st.lists(st.integers(1, 20_000), min_size=1, max_size=9, unique=True), times)
def test_a_flat_curve_is_the_formula_of_one_rate_to_the_last_digit(
    rate: float, days: list[int], when: list[float]
) -> None:
    expected = [discount_factor(rate, time) for time in when]
    assert ZeroCurve.flat(DAY, rate).discount(when).tolist() == expected
    assert ZeroCurve(DAY, points_of(sorted(days), [rate] * len(days))).discount(when).tolist() == expected


@PATIENT
@given(curves, times)
def test_rate_times_time_runs_straight_from_today_over_the_points(curve: ZeroCurve, when: list[float]) -> None:
    nodes = np.array([0.0, *(years(DAY, day) for day, _ in curve.points)])
    heights = nodes * np.array([0.0, *(rate for _, rate in curve.points)])
    inside = np.minimum(when, nodes[-1])
    assert curve.rate(inside) * inside == pytest.approx(np.interp(inside, nodes, heights), rel=1e-12, abs=1e-13)


@PATIENT
@given(curves, st.floats(0.0, 60.0), st.floats(0.0, 1.0))
def test_money_further_off_is_worth_less_where_the_points_say_so(curve: ZeroCurve, time: float, later: float) -> None:
    at_points = curve.discount(np.array([DAY, *(day for day, _ in curve.points)], dtype="datetime64[D]"))
    if np.all(np.diff(at_points) <= 0.0) and curve.points[-1][1] >= 0.0:
        first, second = curve.discount([time, time + later])
        assert second <= first * (1.0 + 1e-14)


def test_the_forward_rate_is_flat_between_points_and_is_that_of_the_two_points() -> None:
    near, middle = years(DAY, NEAR), years(DAY, MIDDLE)
    forward = (0.034 * middle - 0.021 * near) / (middle - near)
    when = np.linspace(near, middle, 9)
    assert -np.diff(np.log(CURVE.discount(when))) / np.diff(when) == pytest.approx(forward, rel=1e-12)


def test_a_worked_case_by_hand() -> None:
    curve = ZeroCurve(DAY, ((MIDDLE, 0.02), (datetime.date(2028, 11, 30), 0.03)))  # at 1 and 2 years to the day
    # Half way, rate times time is (0.02 * 1 + 0.03 * 2) / 2 = 0.04.
    assert curve.discount(1.5).item() == pytest.approx(math.exp(-0.04), rel=1e-15)


def test_before_the_first_point_and_after_the_last_the_rate_is_theirs() -> None:
    assert CURVE.rate([0.0, 0.1, years(DAY, NEAR), 3.0, 40.0]).tolist() == [0.021, 0.021, 0.021, 0.027, 0.027]
    assert CURVE.rate(-1.0).item() == 0.021
    assert CURVE.discount([0.0, -1.0]).tolist() == [1.0, math.exp(0.021)]


def test_days_and_years_say_the_same_in_any_shape() -> None:
    days = np.array([["2026-12-01", "2027-03-01"], ["2028-02-29", "2040-01-01"]], dtype="datetime64[D]")
    when = np.array([[years(DAY, day) for day in row] for row in days.tolist()])
    assert np.array_equal(CURVE.years(days), when)
    assert np.array_equal(CURVE.discount(days), CURVE.discount(when))
    assert CURVE.discount(when).shape == CURVE.rate(days).shape == (2, 2)
    assert CURVE.rate(1.0).shape == CURVE.discount(1.0).shape == ()
    assert CURVE.discount([]).shape == CURVE.rate(np.empty((0, 3))).shape[:1] == (0,)


def test_no_time_has_no_rate_and_time_out_of_reach_makes_no_noise() -> None:
    assert np.isnan(CURVE.rate([np.nan])).all()
    assert np.isnan(CURVE.discount(np.array(["NaT"], dtype="datetime64[D]"))).all()
    assert CURVE.discount([np.inf, -1e6]).tolist() == [0.0, math.inf]


def test_points_that_are_past_count_for_nothing() -> None:
    later = ZeroCurve(datetime.date(2027, 6, 1), CURVE.points)
    ahead = ZeroCurve(datetime.date(2027, 6, 1), CURVE.points[1:])
    when = np.linspace(0.0, 5.0, 21)
    assert np.array_equal(later.discount(when), ahead.discount(when))
    assert ZeroCurve(NEAR, CURVE.points).rate(0.0).item() == 0.034


@pytest.mark.parametrize(
    ("points", "sentences"),
    [
        ((), ("points: there is no zero rate for a day after 2026-12-01",)),
        (((DAY, 0.03),), ("points: there is no zero rate for a day after 2026-12-01",)),
        (((NEAR, 0.03), (NEAR, 0.03)), ("points[1]: there is a zero rate for 2027-03-01 already",)),
        (
            ((MIDDLE, 0.03), (NEAR, math.inf)),
            (
                "points[1]: 2027-03-01 comes after 2027-12-01; the dates have to go up",
                "points[1]: the zero rate of 2027-03-01 is inf, which is no rate",
            ),
        ),
        (((NEAR, math.nan),), ("points[0]: the zero rate of 2027-03-01 is nan, which is no rate",)),
    ],
)
def test_points_that_are_no_curve_are_refused_in_sentences(
    points: tuple[Point, ...], sentences: tuple[str, ...]
) -> None:
    assert curve_faults(DAY, points) == sentences
    with pytest.raises(ValueError) as caught:  # noqa: PT011  # the whole message is compared
        ZeroCurve(DAY, points)
    assert str(caught.value) == sentences[0]


def test_a_sound_curve_has_no_faults_and_equal_curves_are_equal() -> None:
    assert curve_faults(DAY, CURVE.points) == ()
    assert ZeroCurve(DAY, CURVE.points) == CURVE
    assert hash(ZeroCurve(DAY, CURVE.points)) == hash(CURVE)


@pytest.mark.parametrize("when", ["2027-01-01", ["soon"], [True], [1j]])
def test_what_is_no_time_is_refused_by_name(when: object) -> None:
    with pytest.raises(ValueError, match=r"^when: expected years or days"):
        CURVE.rate(when)  # type: ignore[arg-type]  # some of them are of no declared type


def test_a_flat_curve_of_no_rate_is_refused() -> None:
    with pytest.raises(ValueError, match="which is no rate"):
        ZeroCurve.flat(DAY, math.nan)
