"""The Yardstick: the value of a spread option on two lognormal forwards, by integration along the exercise boundary.

`boundary` lays the geometry, `hermite`, `trapezoid` and `panels` are three ways to walk it, `one_factor` is the case
where the plane collapses to a line, and `engine` chooses. Here exercise masses become values and derivatives. The
deltas are the masses themselves. The second derivatives are integrals over the boundary of the density there, and the
rest follows from them, because the density of ln S1, ln S2 spreads by the heat equation: with a, b the deviations and
rho the correlation,

    dV/da = a F1^2 gamma_long + rho b F1 F2 gamma_cross,      dV/drho = a b F1 F2 gamma_cross,

dV/db alike, and time moves a and b together.
"""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from functools import partial
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from spreadgui.pricing.blocks import run
from spreadgui.pricing.engine import ROUNDING, Masses, masses
from spreadgui.pricing.front import differentiate, price
from spreadgui.pricing.inputs import Array, check_kind, spread_columns
from spreadgui.pricing.legs import LEG_ROWS, STILL, Legs, hand_back, orient
from spreadgui.pricing.results import Sensitivities, forward_sensitivities, forward_value, named

BLOCK_ROWS = 8192


class Estimate(NamedTuple):
    """A value and the bound on its own error, both discounted, in money."""

    value: Array
    error: Array


def _spread(legs: Legs, found: Masses) -> tuple[Array, Array]:
    """Undiscounted value, the sum over the smaller side with the forward on top where that is not the side asked for;
    and what had to be cut off to keep it between its intrinsic value and what the holder can receive at most."""
    first, second, strike = legs.first, legs.second, legs.strike
    forward = first - second - strike
    summed = found.side * (first * found.in_first - second * found.in_second - strike * found.plain)
    most = np.where(found.side > 0.0, first, second + strike)
    smaller = np.clip(summed, np.maximum(found.side * forward, 0.0), most)
    other = found.side != legs.sign
    value = np.maximum(smaller + np.where(other, legs.sign * forward, 0.0), 0.0)
    return value, np.abs(smaller - summed)


def _fill(legs: Legs, found: Masses, out: Array) -> None:
    """All undiscounted results per oriented leg."""
    first, second = legs.first, legs.second
    out[0], _ = _spread(legs, found)
    if len(out) == 1:
        return
    other = np.where(found.side != legs.sign, legs.sign, 0.0)
    out[1] = found.side * found.in_first + other
    out[2] = -found.side * found.in_second - other
    out[3] = found.edge_first / first
    out[4] = found.edge_second * (first / second) / second
    out[5] = -found.edge_both / second
    a, b, rho, root_time = legs.deviation_first, legs.deviation_second, legs.correlation, legs.root_time
    curve_first, curve_both, curve_second = (
        first * found.edge_first,
        -first * found.edge_both,
        first * found.edge_second,
    )
    out[6] = root_time * (a * curve_first + rho * b * curve_both)
    out[7] = root_time * (b * curve_second + rho * a * curve_both)
    out[8] = a * b * curve_both
    pace = np.maximum(root_time, STILL)
    vol_first, vol_second = a / pace, b / pace
    out[9] = -0.5 * (
        vol_first * vol_first * curve_first
        + 2.0 * rho * vol_first * vol_second * curve_both
        + vol_second * vol_second * curve_second
    )


def _kernel(kind: str, block: Sequence[Array], out: Array, work: Array) -> None:
    legs = orient(block, kind, work)
    _fill(legs, masses(legs, out.shape[1], len(out) > 1), out)
    hand_back(out, legs)


def _estimate_kernel(kind: str, block: Sequence[Array], out: Array, work: Array) -> None:
    """The error in the last line of `out`; before it the value, and all else where there are lines for it."""
    legs = orient(block, kind, work)
    found = masses(legs, out.shape[1], len(out) > 2)
    _fill(legs, found, out[:-1])
    _, cut = _spread(legs, found)
    size = legs.first + legs.second + legs.strike
    out[-1] = found.error * np.maximum(legs.first, legs.second) + ROUNDING * size
    out[-1] += np.where(cut > out[-1], size, 0.0)
    hand_back(out[:-1], legs)
    hand_back(out[-1:], legs)


def value(
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    correlation: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
    executor: Executor | None = None,
) -> Array:
    """Discounted value by integration along the exercise boundary.

    Arrays broadcast together. Forwards (above zero) and strikes are in money per unit of the payoff with leg ratios
    folded in, volatilities (zero or above) and the correlation (-1..1) annualised decimals, `expiry` in years,
    `discount` the factor from payment to today. `kind` is "call" for max(F_long - F_short - K, 0), "put" for max(K -
    F_long + F_short, 0) or "forward" for F_long - F_short - K, one for the whole call. An `executor` is given blocks
    of rows; without one they run inline.

    Returns a float64 array of the broadcast shape, never below the intrinsic value. Raises `ValueError` naming the
    argument for anything outside these bounds. Over 10,000 options of a hard box (correlation within 0.9999,
    deviations to expiry 0.005..2.5, strikes within two short forwards) the worst error against an independent
    integration is 1.7e-11 of the larger of the value and a hundredth of the larger forward, 99th percentile 2.5e-13;
    over an ordinary box 5.3e-12 (tests/benchmarks/pricing_accuracy.py). Limits are routed to their own formulas: no
    strike, a leg without volatility, full correlation. Between 1e-4 and 1e-15 away from full correlation the same
    worst error is 6.4e-12, 99th percentile 4.8e-14, over 5,000 options with deviations to 2.5; with deviations to 10 it
    is 2.2e-9, 99th percentile 6.1e-13, where an option leaves the money at both ends of an interval and the correlation
    is within 1e-10 of one; `estimate` says so, none of these errors is above its own bound.

    >>> round(float(value(105.12711, 100.92203, 4.0, 0.20, 0.10, 0.5, 1.0, 0.904837)), 4)
    6.6531
    """
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    return price(partial(_kernel, kind), given, kind, executor, scratch=LEG_ROWS, block_rows=BLOCK_ROWS)


def sensitivities(
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    correlation: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
    executor: Executor | None = None,
) -> Sensitivities:
    """Value and derivatives, analytic throughout, as `Sensitivities` of float64 arrays of the broadcast shape.

    Arguments and refusals are those of `value`. Each derivative is per 1.0 of its own argument with all others held;
    theta is minus the derivative in expiry, the discount factor held. Without volatility or time the deltas are those
    of the intrinsic value, one half each at the kink, and every other derivative is zero. Theta and vegas follow from
    the gammas.
    """
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    return differentiate(partial(_kernel, kind), given, kind, executor, scratch=LEG_ROWS, block_rows=BLOCK_ROWS)


def estimate(
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    correlation: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
    executor: Executor | None = None,
) -> Estimate:
    """Discounted value, the same as `value` gives, and a bound on its error.

    Arguments and refusals are those of `value`. The bound adds what the rule in use can have missed, measured row by
    row where the trapezoid rule is in use, the weight left outside the range of integration, and rounding; about
    6e-13 of the larger forward. Where the integral had to be cut back to the bounds any value keeps, the error says
    the value is unknown.

    >>> value, error = estimate(105.12711, 100.92203, 4.0, 0.20, 0.10, 0.5, 1.0, 0.904837)
    >>> bool(error < 1e-10)
    True
    """
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    check_kind(kind)
    columns, shape = spread_columns(*given)
    if kind == "forward":
        exact = forward_value(columns, shape)
        return Estimate(exact, ROUNDING * np.abs(exact))
    results = run(
        partial(_estimate_kernel, kind), columns, shape, 2, scratch=LEG_ROWS, executor=executor, block_rows=BLOCK_ROWS
    )
    return Estimate(results[0, ...], results[1, ...])


def sensitivities_with_error(
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    correlation: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
    executor: Executor | None = None,
) -> tuple[Sensitivities, Array]:
    """What `sensitivities` gives and the bound of `estimate` on the value's error, for the cost of the first alone.

    >>> found, error = sensitivities_with_error(105.12711, 100.92203, 4.0, 0.20, 0.10, 0.5, 1.0, 0.904837)
    >>> bool(error < 1e-10 * found.value)
    True
    """
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    check_kind(kind)
    columns, shape = spread_columns(*given)
    if kind == "forward":
        exact = forward_sensitivities(columns, shape)
        return exact, ROUNDING * np.abs(exact.value)
    layers = len(Sensitivities._fields)
    results = run(
        partial(_estimate_kernel, kind), columns, shape, layers + 1, scratch=LEG_ROWS, executor=executor,
        block_rows=BLOCK_ROWS,
    )  # fmt: skip
    return named(results[:layers]), results[layers, ...]
