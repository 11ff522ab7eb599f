"""Margrabe's formula (W. Margrabe, "The value of an option to exchange one asset for another", Journal of Finance 33,
1978, 177-186): exact for a strike of zero."""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from functools import partial

import numpy as np
from numpy.typing import ArrayLike

from spreadgui.pricing import ratio_option
from spreadgui.pricing.front import differentiate, price
from spreadgui.pricing.inputs import Array, SpreadColumns
from spreadgui.pricing.legs import LEG_ROWS, Legs, combined, hand_back, orient
from spreadgui.pricing.results import Sensitivities

SCRATCH = LEG_ROWS + 4


def check_strike(columns: SpreadColumns) -> None:
    """Refuse every strike but zero."""
    if np.any(columns.strike != 0.0):
        found = float(columns.strike[columns.strike != 0.0].flat[0])
        raise ValueError(f"strike: Margrabe's formula holds for a strike of zero only, found {found!r}")


def _value(kind: str, block: Sequence[Array], out: Array, work: Array) -> None:
    legs = orient(block, kind, work)
    total, spare = work[LEG_ROWS : LEG_ROWS + 2]
    combined(legs.deviation_first, legs.deviation_second, legs.correlation, total, spare)
    ratio_option.value(legs.first, legs.second, total, legs.sign, out[0], work[-2:])
    hand_back(out, legs)


def _deviation(legs: Legs) -> ratio_option.Deviation:
    a, b, rho = legs.deviation_first, legs.deviation_second, legs.correlation
    total = combined(a, b, rho, np.empty_like(a), np.empty_like(a))
    gap, short = a - b, 1.0 - rho
    by_correlation = -a * b / total
    return ratio_option.Deviation(
        total, None, None, (gap + short * b) / total, (short * a - gap) / total, by_correlation
    )


def _sensitivities(kind: str, block: Sequence[Array], out: Array, work: Array) -> None:
    legs = orient(block, kind, work)
    ratio_option.sensitivities(legs, legs.second, _deviation(legs), out)
    hand_back(out, legs)


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
    """Discounted value by Margrabe's formula, exact for the strike of zero it demands.

    Arrays broadcast together. Forwards (above zero) and strikes are in money per unit of the payoff with leg ratios
    folded in, volatilities (zero or above) and the correlation (-1..1) annualised decimals, `expiry` in years,
    `discount` the factor from payment to today. `kind` is "call" for max(F_long - F_short - K, 0), "put" for max(K -
    F_long + F_short, 0) or "forward" for F_long - F_short - K, one for the whole call. An `executor` is given blocks
    of rows; without one they run inline.

    Returns a float64 array of the broadcast shape, never below the intrinsic value. Raises `ValueError` naming the
    argument for anything outside these bounds, and for any strike but zero. Exact to rounding: over deviations to
    expiry of 0.005..2.5, correlation within 0.9999, long forward within four deviations of the short one, the error
    against 40 digits is, in larger forwards: median 2.2e-18, 99th percentile 1.8e-16, worst 2.4e-16. The Yardstick
    hands a strike of zero to this very formula; just off it, where it integrates along the boundary, the two differ by
    median 2.2e-16, 99th percentile 3.6e-14, worst 1.3e-13 (tests/benchmarks/pricing_accuracy.py).

    >>> print(round(float(value(22.088176, 20.120361, 0.0, 0.20, 0.20, 0.50, 0.10, 0.990050)), 4))
    1.9891
    """
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    return price(partial(_value, kind), given, kind, executor, check=check_strike, scratch=SCRATCH)


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
    of the intrinsic value, one half each at the kink, and every other derivative is zero.

    >>> round(float(sensitivities(110.0, 100.0, 0.0, 0.3, 0.2, 0.5, 1.0).delta_long), 6)
    0.688826
    """
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    return differentiate(partial(_sensitivities, kind), given, kind, executor, check=check_strike, scratch=SCRATCH)
