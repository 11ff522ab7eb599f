"""A mix of markets as one leg: exact moments, exact limits, exact slopes."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.market.mix import Leg, Matched, matched, vol_of

ONE = np.eye(1)


PARTS = st.tuples(st.floats(0.1, 9.0), st.floats(1.0, 200.0), st.just(0.0), st.floats(0.0, 1.5))


def leg(*parts: tuple[float, float, float, float]) -> Leg:
    return Leg(*(np.array(column) for column in zip(*parts, strict=True)))


CRACK = leg((2 / 3, 82.0, 0.0, 0.38), (1 / 3, 95.0, 0.0, 0.36))
CRUDE = leg((1.0, 71.0, 0.0, 0.35))
CLEAN = leg((7.1, 9.0, 0.0, 0.5), (0.4, 45.0, 0.0, 0.4))
POWER = leg((1.0, -4.0, 20.0, 0.7))
INSIDE = np.array([[1.0, 0.87], [0.87, 1.0]])
ACROSS = np.array([[0.92], [0.9]])


def ends(legs: list[Leg], tied: np.ndarray, years: float) -> tuple[np.ndarray, np.ndarray]:
    """The shifted parts at the expiry on a Gauss-Hermite grid of their normals, (parts, outcomes), and weights."""
    nodes, weights = np.polynomial.hermite_e.hermegauss(24)
    count = len(tied)
    grid = np.array(list(itertools.product(nodes, repeat=count))).T
    chances = np.array([np.prod(one) for one in itertools.product(weights, repeat=count)])
    forwards = np.concatenate([one.forwards + one.shifts for one in legs])
    deviations = np.concatenate([one.vols for one in legs]) * np.sqrt(years)
    normals = np.linalg.cholesky(tied) @ grid
    return (forwards * np.exp(deviations * normals.T - 0.5 * deviations**2)).T, chances / chances.sum()


@pytest.mark.parametrize("years", [0.1, 1.0, 2.5])
@pytest.mark.parametrize("legs", [(CRACK, CRUDE), (CLEAN, POWER)])
def test_the_two_moments_and_the_covariance_are_those_of_the_true_mix(legs: tuple[Leg, Leg], years: float) -> None:
    """Against a Gauss-Hermite sum over the parts' joint law, which shares no formula with the module."""
    long, short = legs
    tied = np.block([[INSIDE, ACROSS], [ACROSS.T, ONE]])
    found = matched(long, short, (INSIDE, ONE), ACROSS, years, normal=False)
    outcomes, chances = ends([long, short], tied, years)
    mix, other = long.weights @ outcomes[:2], short.weights @ outcomes[2:]
    mean, second = chances @ mix, chances @ mix**2
    assert mean == pytest.approx(long.forward + long.shift, rel=1e-12)
    assert found.vol_long == pytest.approx(np.sqrt(np.log(second / mean**2) / years), rel=1e-8)
    covariance = np.log(chances @ (mix * other) / (mean * (chances @ other))) / years
    assert found.correlation == pytest.approx(covariance / (found.vol_long * found.vol_short), rel=1e-8)


def test_one_part_is_the_market_itself_times_its_weight() -> None:
    found = matched(leg((3.0, 9.0, 0.0, 0.5)), POWER, (ONE, ONE), np.array([[0.6]]), 0.7, normal=False)
    assert found.vol_long == pytest.approx(0.5, rel=1e-13)
    assert found.vol_short == pytest.approx(0.7, rel=1e-13)
    assert found.correlation == pytest.approx(0.6, rel=1e-12)
    assert found.long.vol_by_vol[0] == pytest.approx(1.0, rel=1e-12)
    assert abs(found.long.vol_by_forward[0]) < 1e-12


def test_parts_that_move_as_one_are_one() -> None:
    """Full correlation and one volatility: the mix is lognormal, nothing is approximate."""
    alike = leg((2.0, 30.0, 0.0, 0.4), (1.0, 50.0, 0.0, 0.4))
    found = matched(alike, CRUDE, (np.ones((2, 2)), ONE), np.full((2, 1), 0.5), 1.3, normal=False)
    assert found.vol_long == pytest.approx(0.4, rel=1e-12)
    assert found.correlation == pytest.approx(0.5, rel=1e-12)


def test_normal_parts_add_up_exactly() -> None:
    long, short = leg((1.0, -3.0, 0.0, 18.0), (2.0, 4.0, 0.0, 12.0)), leg((1.0, 5.0, 0.0, 9.0))
    found = matched(long, short, (INSIDE, ONE), ACROSS, 0.8, normal=True)
    variance = 18.0**2 + 24.0**2 + 2 * 0.87 * 18.0 * 24.0
    assert found.vol_long == pytest.approx(np.sqrt(variance), rel=1e-14)
    assert found.correlation == pytest.approx((0.92 * 18.0 + 0.9 * 24.0) / np.sqrt(variance), rel=1e-14)
    assert vol_of(long, INSIDE, 0.8, normal=True) == found.vol_long


def test_the_limit_of_no_time_is_reached_from_above() -> None:
    near = matched(CRACK, CRUDE, (INSIDE, ONE), ACROSS, 1e-7, normal=False)
    at = matched(CRACK, CRUDE, (INSIDE, ONE), ACROSS, 0.0, normal=False)
    for key in ("vol_long", "vol_short", "correlation"):
        assert getattr(at, key) == pytest.approx(getattr(near, key), rel=1e-6)
    for mine, theirs in zip((*at.long, *at.short), (*near.long, *near.short), strict=True):
        assert mine == pytest.approx(theirs, rel=1e-5, abs=1e-7)


def moved(which: str, place: int, field: str, step: float, years: float, *, normal: bool) -> Matched:
    legs = {"long": CRACK, "short": CLEAN}
    values = getattr(legs[which], field).copy()
    values[place] += step
    one = legs[which]
    legs[which] = Leg(one.weights, values if field == "forwards" else one.forwards, one.shifts,
                      values if field == "vols" else one.vols)  # fmt: skip
    across = np.array([[0.5, 0.2], [0.4, 0.3]])
    other = np.array([[1.0, 0.46], [0.46, 1.0]])
    return matched(legs["long"], legs["short"], (INSIDE, other), across, years, normal=normal)


@pytest.mark.parametrize("years", [0.0, 0.4, 2.0])
@pytest.mark.parametrize("normal", [False, True])
@pytest.mark.parametrize("which", ["long", "short"])
@pytest.mark.parametrize("place", [0, 1])
@pytest.mark.parametrize("field", ["forwards", "vols"])
def test_the_slopes_are_those_of_the_matched_numbers(
    years: float, normal: bool, which: str, place: int, field: str
) -> None:
    """Against differences of fourth order, good to some ten digits here."""
    step = 1e-3 * (1.0 if field == "forwards" else 0.1)
    found = getattr(moved(which, place, field, 0.0, years, normal=normal), which)
    slopes = {"vol": "vol_by_forward", "tie": "correlation_by_forward"} if field == "forwards" else {
        "vol": "vol_by_vol", "tie": "correlation_by_vol"}  # fmt: skip

    def at(times: float, key: str) -> float:
        return float(getattr(moved(which, place, field, times * step, years, normal=normal), key))

    for key, slope in ((f"vol_{which}", slopes["vol"]), ("correlation", slopes["tie"])):
        difference = (8 * (at(1, key) - at(-1, key)) - (at(2, key) - at(-2, key))) / (12 * step)
        assert getattr(found, slope)[place] == pytest.approx(difference, rel=1e-6, abs=1e-9)


@settings(max_examples=60, deadline=None)
@given(st.lists(PARTS, min_size=1, max_size=3), st.floats(-0.3, 1.0), st.floats(0.0, 3.0))
def test_any_mix_has_a_volatility_between_nothing_and_its_most_volatile_part(
    parts: list[tuple[float, float, float, float]], tie: float, years: float
) -> None:
    some = leg(*parts)
    inside = np.full((len(parts), len(parts)), tie)
    np.fill_diagonal(inside, 1.0)
    vol = vol_of(some, inside, years, normal=False)
    assert 0.0 <= vol <= max(part[3] for part in parts) * (1.0 + 1e-9) + 1e-6  # the root of rounding
