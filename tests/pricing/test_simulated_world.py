"""The world the formulas speak of, simulated: two factors, forwards that are martingales, payoffs averaged.

Correlated shocks come from independent ones by w2 = rho b1 + sqrt(1 - rho^2) b2 (common practice, no source). Seeds are
fixed, so that a run decides nothing by luck; the criterion is one that another seed fails about once in five hundred.
With z the estimate less the theory in its own standard errors, independent from case to case: no |z| above 4.5, and the
sum of z^2 within the central 99.8 % of its chi-square distribution - too large says the theory is off, too small that
the standard errors are.
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.stats import chi2

from spreadgui.pricing import bachelier, black76, shifted, yardstick

Array = NDArray[np.float64]
FARTHEST = 4.5
TAIL = 1e-3


def consistent(z: Array) -> bool:
    low, high = chi2.ppf((TAIL, 1.0 - TAIL), z.size)
    return bool(np.all(np.abs(z) <= FARTHEST) and low <= np.sum(z * z) <= high)


def shocks(draw: np.random.Generator, correlation: float, shape: tuple[int, ...]) -> tuple[Array, Array]:
    """Two arrays of unit normals with that correlation."""
    one, other = draw.standard_normal((2, *shape))
    return one, correlation * one + np.sqrt((1.0 - correlation) * (1.0 + correlation)) * other


CORRELATIONS = [-0.9999, -0.95, -0.7, -0.3, 0.0, 0.2, 0.5, 0.8, 0.95, 0.9999]


def test_correlated_shocks_have_the_variance_and_the_correlation_they_are_meant_to_have() -> None:
    """Standard errors: sqrt(2/n) of a unit normal's variance; 1/sqrt(n - 3) of a sample correlation's Fisher z."""
    draw, count = np.random.default_rng(41), 100_000
    mean, variance, sample = [], [], []
    for correlation in CORRELATIONS:
        one, other = shocks(draw, correlation, (count,))
        mean.append(np.mean(other) * np.sqrt(count))
        variance.append((np.var(other, ddof=1) - 1.0) / np.sqrt(2.0 / count))
        sample.append((np.arctanh(np.corrcoef(one, other)[0, 1]) - np.arctanh(correlation)) * np.sqrt(count - 3.0))
    # One sample's variance and correlation are not independent of each other.
    for z in (mean, variance, sample):
        assert consistent(np.array(z))


def test_steps_add_up_to_the_variance_and_the_correlation_of_the_whole_time() -> None:
    """Twelve steps of a month: the sums have variance 1 and the same correlation, step by step and over the year."""
    draw, count, steps = np.random.default_rng(42), 50_000, 12
    variance, sample = [], []
    for correlation in CORRELATIONS:
        one, other = (column.sum(axis=0) / steps**0.5 for column in shocks(draw, correlation, (steps, count)))
        variance.append((np.var(other, ddof=1) - 1.0) / np.sqrt(2.0 / count))
        sample.append((np.arctanh(np.corrcoef(one, other)[0, 1]) - np.arctanh(correlation)) * np.sqrt(count - 3.0))
    # One sample's variance and correlation are not independent of each other.
    assert consistent(np.array(variance))
    assert consistent(np.array(sample))


@pytest.mark.parametrize("shift", [0.0, 60.0])
def test_forwards_stay_where_they_are_on_average_month_by_month(shift: float) -> None:
    """Each month's mean growth, on paths of their own, so that the z are independent; lognormal in forward + shift."""
    draw, count, month = np.random.default_rng(43), 60_000, 1.0 / 12.0
    z = []
    for correlation in CORRELATIONS:
        first, second = np.full(count, 112.0), np.full(count, 31.0 - 0.8 * shift)
        for vols in ((0.35, 0.8), (0.6, 0.25), (0.2, 0.5)):
            for forward, vol, shock in zip((first, second), vols, shocks(draw, correlation, (count,)), strict=True):
                before = forward.copy()
                forward += shift
                forward *= np.exp(vol * month**0.5 * shock - 0.5 * vol * vol * month)
                forward -= shift
                gain = forward - before
                z.append(np.mean(gain) / (np.std(gain, ddof=1) / count**0.5))
    # The legs of one month are correlated; of each month only every other z is free of its neighbour.
    assert consistent(np.array(z[::2]))
    assert consistent(np.array(z[1::2]))


class Market(NamedTuple):
    """Options with a payment of a year or so from today; for normal legs the volatilities are absolute."""

    forward_long: Array
    forward_short: Array
    strike: Array
    vol_long: Array
    vol_short: Array
    correlation: Array
    expiry: Array
    discount: Array


def lognormal_market(draw: np.random.Generator, count: int) -> Market:
    """Strikes of either sign, within one and a half deviations of the money; some so far below zero that nothing of
    the short forward is left to pay, where the short leg has to rise by a quarter for a put to be worth something."""
    short, expiry = draw.uniform(20.0, 200.0, count), draw.uniform(0.1, 2.5, count)
    # Not next to full correlation, where a payoff near the money may have no path that reaches it.
    vols, correlation = draw.uniform(0.05, 0.7, (2, count)), draw.choice(CORRELATIONS[1:-1], count)
    strike = short * draw.uniform(-1.15, 1.0, count)
    beyond = short + strike < 0.1 * short
    expiry, vols[1] = np.where(beyond, expiry + 0.5, expiry), np.where(beyond, vols[1] + 0.3, vols[1])
    # Deviations are those of the ratio of what is received to what is paid, either with its part of the strike.
    one = vols[0] * np.where(strike < 0.0, np.maximum(short + strike, 0.1 * short) / short, 1.0)
    other = vols[1] * np.where(strike > 0.0, short / (short + strike), 1.0)
    width = np.sqrt(((one - other) ** 2 + 2.0 * one * other * (1.0 - correlation)) * expiry)
    growth = np.exp(draw.uniform(-1.5, 1.5, count) * width)
    long = np.where(strike > 0.0, (short + strike) * growth, np.maximum(short * growth + strike, 0.1 * short))
    return Market(long, short, strike, *vols, correlation, expiry, draw.uniform(0.8, 1.0, count))


def normal_market(draw: np.random.Generator, count: int) -> Market:
    """Forwards and strikes of either sign, within one and a half deviations of the money."""
    long, short = draw.uniform(-60.0, 120.0, (2, count))
    vols, correlation = draw.uniform(3.0, 60.0, (2, count)), draw.choice(CORRELATIONS, count)
    expiry = draw.uniform(0.1, 2.5, count)
    width = np.sqrt(((vols[0] - vols[1]) ** 2 + 2.0 * vols[0] * vols[1] * (1.0 - correlation)) * expiry)
    strike = long - short + draw.uniform(-1.5, 1.5, count) * width
    return Market(long, short, strike, *vols, correlation, expiry, draw.uniform(0.8, 1.0, count))


def lognormal_leg(forward: float, deviation: float, shock: Array) -> Array:
    return np.asarray(forward * np.exp(deviation * shock - 0.5 * deviation * deviation))


def normal_leg(forward: float, deviation: float, shock: Array) -> Array:
    return forward + deviation * shock


def simulated(
    draw: np.random.Generator, market: Market, kinds: list[str], leg: Any, shifts: tuple[float, float], pairs: int
) -> tuple[Array, Array]:
    """Discounted mean payoff of each option and its standard error, from antithetic pairs: each pair's mean is one
    observation."""
    means, errors = np.empty((2, market.strike.size))
    for row, kind in enumerate(kinds):
        long, short, strike, vol_long, vol_short, correlation, expiry, discount = (float(one[row]) for one in market)
        one, other = shocks(draw, correlation, (pairs,))
        payoff = np.zeros(pairs)
        for sign in (1.0, -1.0):
            first = leg(long + shifts[0], vol_long * expiry**0.5, sign * one) - shifts[0]
            second = leg(short + shifts[1], vol_short * expiry**0.5, sign * other) - shifts[1]
            spread = first - second - strike
            payoff += 0.5 * discount * np.maximum(spread if kind == "call" else -spread, 0.0)
        means[row], errors[row] = np.mean(payoff), np.std(payoff, ddof=1) / pairs**0.5
    return means, errors


def alternating(count: int) -> list[str]:
    return ["call" if row % 2 == 0 else "put" for row in range(count)]


def by_kind(value: Any, market: Market, kinds: list[str], **named: Any) -> Array:
    calls, puts = (value(*market, kind=kind, **named) for kind in ("call", "put"))
    return np.where(np.array(kinds) == "call", calls, puts)


@pytest.fixture(scope="module")
def hundred() -> tuple[Market, list[str], Array, Array]:
    """A hundred options on lognormal legs with their simulated values, 80,000 antithetic pairs each."""
    draw = np.random.default_rng(44)
    market, kinds = lognormal_market(draw, 100), alternating(100)
    return market, kinds, *simulated(draw, market, kinds, lognormal_leg, (0.0, 0.0), 80_000)


def test_the_yardstick_is_within_the_error_of_the_simulation_on_a_hundred_options(
    hundred: tuple[Market, list[str], Array, Array],
) -> None:
    market, kinds, mean, error = hundred
    z = (mean - by_kind(yardstick.value, market, kinds)) / error
    assert consistent(z)
    # A fair share of the hundred is on either side, and the band is narrow enough to say something.
    assert 30 <= np.sum(z > 0.0) <= 70
    assert np.median(error / mean) < 0.01


@pytest.mark.parametrize(
    ("name", "moved"), [("correlation", -0.02), ("vol_long", 0.01), ("vol_short", 0.01), ("strike", 0.5)]
)
def test_the_same_criterion_turns_down_a_yardstick_of_a_slightly_different_world(
    hundred: tuple[Market, list[str], Array, Array], name: str, moved: float
) -> None:
    """The simulation could not tell otherwise whether the test above can fail."""
    market, kinds, mean, error = hundred
    other = market._replace(
        **{name: np.clip(getattr(market, name) + moved, -1.0 if name == "correlation" else None, None)}
    )
    assert not consistent((mean - by_kind(yardstick.value, other, kinds)) / error)


def test_bachelier_is_within_the_error_of_a_simulation_of_normal_legs() -> None:
    draw = np.random.default_rng(45)
    market, kinds = normal_market(draw, 24), alternating(24)
    mean, error = simulated(draw, market, kinds, normal_leg, (0.0, 0.0), 40_000)
    assert consistent((mean - by_kind(bachelier.value, market, kinds)) / error)
    wider = market._replace(vol_long=1.03 * market.vol_long)
    assert not consistent((mean - by_kind(bachelier.value, wider, kinds)) / error)


def test_the_yardstick_on_shifted_legs_is_within_the_error_of_a_simulation_of_them() -> None:
    """Forwards of -20..100 with shifts of 45 and 70, so that both legs print below zero now and then."""
    draw = np.random.default_rng(46)
    count, shifts = 24, (45.0, 70.0)
    long, short = draw.uniform(-20.0, 100.0, (2, count))
    vols, correlation = draw.uniform(0.1, 0.5, (2, count)), draw.choice(CORRELATIONS[1:-1], count)
    rest = (correlation, draw.uniform(0.2, 2.0, count), draw.uniform(0.8, 1.0, count))
    one, other = vols[0] * (long + shifts[0]), vols[1] * (short + shifts[1])
    width = np.sqrt(((one - other) ** 2 + 2.0 * one * other * (1.0 - correlation)) * rest[1])
    strike = long - short + draw.uniform(-1.2, 1.2, count) * width
    market, kinds = Market(long, short, strike, *vols, *rest), alternating(count)
    mean, error = simulated(draw, market, kinds, lognormal_leg, shifts, 40_000)

    def found(*arguments: Any, **named: Any) -> Array:
        return shifted.value(yardstick.value, *arguments, shift_long=shifts[0], **named)

    assert consistent((mean - by_kind(found, market, kinds, shift_short=shifts[1])) / error)
    assert not consistent((mean - by_kind(found, market, kinds, shift_short=shifts[1] + 2.0)) / error)


def test_black76_is_within_the_error_of_a_simulation_of_one_leg() -> None:
    """The short leg nearly worthless and the strike doing its work."""
    draw = np.random.default_rng(47)
    count = 24
    market = lognormal_market(draw, count)
    width = market.vol_long * np.sqrt(market.expiry)
    strike = market.forward_long * np.exp(draw.uniform(-1.5, 1.5, count) * width)
    market = market._replace(forward_short=np.full(count, 1e-9), strike=strike)
    kinds = alternating(count)
    mean, error = simulated(draw, market, kinds, lognormal_leg, (0.0, 0.0), 40_000)

    def found(long: Array, _short: Array, strike: Array, vol: Array, *rest: Array, kind: str) -> Array:
        return black76.value(long, strike, vol, *rest[2:], kind=kind)

    z = (mean - by_kind(found, market, kinds)) / error
    assert consistent(z)
