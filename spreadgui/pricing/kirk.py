"""Kirk's formula (E. Kirk, "Correlation in the energy markets", in Managing Energy Price Risk, Risk Publications,
1995).

The paid lump F2 + K is taken as lognormal with the volatility of F2 diluted by its share q = F2/(F2 + K):

    sigma^2 = sigma1^2 - 2 rho sigma1 sigma2 q + sigma2^2 q^2,

and the option to exchange it for F1 is valued as Margrabe would.
"""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from functools import partial

import numpy as np
from numpy.typing import ArrayLike

from spreadgui.pricing import ratio_option
from spreadgui.pricing.blocks import Kernel
from spreadgui.pricing.front import differentiate, price
from spreadgui.pricing.inputs import Array, SpreadColumns
from spreadgui.pricing.legs import LEG_ROWS, Legs, combined, hand_back, orient, turn
from spreadgui.pricing.results import Sensitivities

VALUE_SCRATCH = 3
SCRATCH = LEG_ROWS


def check_published_strike(columns: SpreadColumns) -> None:
    """Refuse strikes for which the published form, without role exchange, has no paid lump above zero."""
    if columns.strike.size and columns.strike.min() < 0.0:
        lump = columns.forward_short + columns.strike
        if lump.size and lump.min() <= 0.0:
            raise ValueError(
                "strike: the published form needs forward_short + strike above zero; use role_exchange=True"
            )


def deviation(legs: Legs, lump: Array) -> ratio_option.Deviation:
    """Kirk's deviation to expiry and its derivatives."""
    a, b, rho = legs.deviation_first, legs.deviation_second, legs.correlation
    share = legs.second / lump
    p = share * b
    total = combined(a, p, rho, np.empty_like(p), np.empty_like(p))
    inverse = 1.0 / total
    short, gap = 1.0 - rho, a - p
    by_diluted = short * a
    by_diluted -= gap
    by_diluted *= inverse
    by_share = b * by_diluted
    share_slope = legs.strike / lump
    share_slope /= lump
    by_share_twice = b * b
    by_share_twice -= by_share * by_share
    by_share_twice *= inverse
    by_share_twice *= share_slope
    by_share_twice -= 2.0 * by_share / lump
    by_share_twice *= share_slope
    gap += short * p
    gap *= inverse
    share *= by_diluted
    p *= a
    p *= inverse
    np.negative(p, out=p)
    by_share *= share_slope
    return ratio_option.Deviation(total, by_share, by_share_twice, gap, share, p)


def _value(kind: str, role_exchange: bool, block: Sequence[Array], out: Array, work: Array) -> None:
    legs = turn(block, kind, role_exchange)
    lump, total, spare = work
    np.add(legs.second, legs.strike, out=lump)
    diluted = np.divide(legs.second, lump, out=out[0])
    diluted *= legs.vol_second
    combined(legs.vol_first, diluted, legs.correlation, total, spare, legs.expiry)
    ratio_option.value(legs.first, lump, total, legs.sign, out[0], work[2:])
    hand_back(out, legs)


def _sensitivities(kind: str, role_exchange: bool, block: Sequence[Array], out: Array, work: Array) -> None:
    legs = orient(block, kind, work, role_exchange)
    lump = np.add(legs.second, legs.strike, out=np.empty_like(legs.root_time))
    ratio_option.sensitivities(legs, lump, deviation(legs, lump), out)
    hand_back(out, legs)


def value_kernel(kind: str) -> tuple[Kernel, int]:
    """What `value` runs over a block, and the scratch rows it wants; columns of any shapes that broadcast."""
    return partial(_value, kind, True), VALUE_SCRATCH


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
    role_exchange: bool = True,
    executor: Executor | None = None,
) -> Array:
    """Discounted value by Kirk's formula.

    Arrays broadcast together. Forwards (above zero) and strikes are in money per unit of the payoff with leg ratios
    folded in, volatilities (zero or above) and the correlation (-1..1) annualised decimals, `expiry` in years,
    `discount` the factor from payment to today. `kind` is "call" for max(F_long - F_short - K, 0), "put" for max(K -
    F_long + F_short, 0) or "forward" for F_long - F_short - K, one for the whole call. A strike below zero is priced
    as the opposite option on the legs swapped round; `role_exchange=False` keeps the published form, which needs
    F_short + K above zero. An `executor` is given blocks of rows; without one they run inline.

    Returns a float64 array of the broadcast shape, never below the intrinsic value. Raises `ValueError` naming the
    argument for anything outside these bounds. Error against the Yardstick over strikes of -0.5..0.5 short forwards,
    volatilities 10..60 %, 0.1..3 years, correlation -0.9..0.95, long forward within two deviations of the money, in
    short forwards: median 5.5e-4, 99th percentile 1.5e-2, worst 3.6e-2; published form for strikes below zero 1.7e-3,
    4.9e-2 and 1.0e-1 (tests/benchmarks/pricing_accuracy.py).

    >>> round(float(value(122.0, 120.0, 3.0, 0.20, 0.20, 0.5, 0.1, 0.990050)), 4)
    2.5537
    """
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    check = None if role_exchange else check_published_strike
    return price(partial(_value, kind, role_exchange), given, kind, executor, check=check, scratch=VALUE_SCRATCH)


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
    role_exchange: bool = True,
    executor: Executor | None = None,
) -> Sensitivities:
    """Value and derivatives, analytic throughout, as `Sensitivities` of float64 arrays of the broadcast shape.

    Arguments and refusals are those of `value`. Each derivative is per 1.0 of its own argument with all others held;
    theta is minus the derivative in expiry, the discount factor held. Without volatility or time the deltas are those
    of the intrinsic value, one half each at the kink, and every other derivative is zero.

    >>> round(float(sensitivities(122.0, 120.0, 3.0, 0.20, 0.20, 0.5, 0.1).correlation_sensitivity), 4)
    -3.0245
    """
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    check = None if role_exchange else check_published_strike
    return differentiate(
        partial(_sensitivities, kind, role_exchange), given, kind, executor, check=check, scratch=SCRATCH
    )
