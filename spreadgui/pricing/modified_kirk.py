"""Kirk's formula with the skew correction of E. Alòs and J. A. León, "On the short-maturity behaviour of the implied
volatility skew for random strike options and applications to option pricing approximation", Quantitative Finance 16,
2016, 31-42.

Seen from the paid lump G = F2 + K, the ratio X = F1/G has Kirk's volatility sigma = sigma(q), q = F2/G, which moves
as F2 does. That is a stochastic volatility tied to X, and at short times its implied volatility has at the money the
slope, in ln X,

    -(1/2) d<sigma, ln X>/dt / sigma^2 = (1/2) (q sigma2 - rho sigma1)^2 sigma2^2 q (1 - q) / sigma^3,

since sigma moves by (q sigma2 - rho sigma1) sigma2 q (1 - q)/sigma per unit of ln F2, whose covariance with ln X is
sigma2 (rho sigma1 - q sigma2) a year. The corrected volatility is the line through Kirk's at the money,

    I = sigma + slope (ln F1 - ln(F2 + K)).

In deviations to expiry, with p = q b, u = (p - rho a)/v and g = u^2/v, the slope is (1/2) b^2 q (1 - q) g. Its level
is Kirk's, so that at the money itself nothing is gained; the gain is away from it.
"""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from functools import partial

import numpy as np
from numpy.typing import ArrayLike

from spreadgui.pricing import kirk, ratio_option
from spreadgui.pricing.blocks import Kernel
from spreadgui.pricing.front import differentiate, price
from spreadgui.pricing.inputs import Array
from spreadgui.pricing.kirk import check_published_strike
from spreadgui.pricing.legs import LEG_ROWS, STILL, Legs, combined, hand_back, orient
from spreadgui.pricing.results import Sensitivities

SCRATCH = LEG_ROWS + 4


def _correction(legs: Legs, lump: Array, total: Array) -> tuple[Array, Array, Array, Array, Array]:
    """Share of the short leg in the lump, u, u^2/v, half b^2 q(1-q), and ln(F1/G)."""
    a, b, rho = legs.deviation_first, legs.deviation_second, legs.correlation
    share = legs.second / lump
    u = ((1.0 - rho) * a - (a - share * b)) / total
    return share, u, u * u / total, 0.5 * b * b * share * (legs.strike / lump), np.log(legs.first / lump)


def deviation(legs: Legs, lump: Array) -> ratio_option.Deviation:
    """The corrected deviation to expiry, at least `STILL`, and its derivatives."""
    plain = kirk.deviation(legs, lump)
    a, b, rho, first = legs.deviation_first, legs.deviation_second, legs.correlation, legs.first
    share, u, g, mixing, log_ratio = _correction(legs, lump, plain.total)
    inverse = 1.0 / plain.total
    half, tilt, swing = 0.5 * b * b, 1.0 - 2.0 * share, mixing * u * inverse * inverse
    g_share = b * u * (2.0 - 3.0 * u * u) * inverse * inverse
    g_share_twice = b * b * (2.0 + 15.0 * u * u * (u * u - 1.0)) * inverse * inverse * inverse
    slope = mixing * g
    by_share = half * tilt * g + mixing * g_share
    by_share_twice = 2.0 * half * (tilt * g_share - g) + mixing * g_share_twice
    share_slope = legs.strike / lump / lump
    by_second = by_share * share_slope
    by_second_twice = share_slope * (by_share_twice * share_slope - 2.0 * by_share / lump)
    assert plain.by_second is not None
    assert plain.by_second_twice is not None
    return ratio_option.Deviation(
        total=np.maximum(plain.total + slope * log_ratio, STILL),
        by_first=slope / first,
        by_second=plain.by_second + by_second * log_ratio - slope / lump,
        by_first_twice=-slope / first / first,
        by_second_twice=plain.by_second_twice + by_second_twice * log_ratio + (slope / lump - 2.0 * by_second) / lump,
        by_both=by_second / first,
        by_deviation_first=plain.by_deviation_first
        - swing * (2.0 * rho + 3.0 * u * plain.by_deviation_first) * log_ratio,
        by_deviation_second=plain.by_deviation_second
        + share * (legs.strike / lump) * b * (g + 0.5 * share * g_share) * log_ratio,
        by_correlation=plain.by_correlation - swing * (2.0 * a + 3.0 * u * plain.by_correlation) * log_ratio,
    )


def _value(kind: str, role_exchange: bool, block: Sequence[Array], out: Array, work: Array) -> None:
    legs = orient(block, kind, work, role_exchange)
    lump, total, diluted, spare = work[LEG_ROWS:]
    np.add(legs.second, legs.strike, out=lump)
    np.multiply(legs.second / lump, legs.deviation_second, out=diluted)
    combined(legs.deviation_first, diluted, legs.correlation, total, spare)
    _, _, g, mixing, log_ratio = _correction(legs, lump, total)
    total += mixing * g * log_ratio
    np.maximum(total, STILL, out=total)
    ratio_option.value(legs.first, lump, total, legs.sign, out[0], work[-1:])
    hand_back(out, legs)


def _sensitivities(kind: str, role_exchange: bool, block: Sequence[Array], out: Array, work: Array) -> None:
    legs = orient(block, kind, work, role_exchange)
    lump = np.add(legs.second, legs.strike, out=np.empty_like(legs.root_time))
    ratio_option.sensitivities(legs, lump, deviation(legs, lump), out)
    hand_back(out, legs)


def value_kernel(kind: str) -> tuple[Kernel, int]:
    """What `value` runs over a block, and the scratch rows it wants; columns of any shapes that broadcast."""
    return partial(_value, kind, True), SCRATCH


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
    """Discounted value by Kirk's formula with the Alòs-León skew.

    Arrays broadcast together. Forwards (above zero) and strikes are in money per unit of the payoff with leg ratios
    folded in, volatilities (zero or above) and the correlation (-1..1) annualised decimals, `expiry` in years,
    `discount` the factor from payment to today. `kind` is "call" for max(F_long - F_short - K, 0), "put" for max(K -
    F_long + F_short, 0) or "forward" for F_long - F_short - K, one for the whole call. A strike below zero is priced
    as the opposite option on the legs swapped round; `role_exchange=False` keeps the published form, which needs
    F_short + K above zero. An `executor` is given blocks of rows; without one they run inline.

    Where the corrected volatility is not above zero, far out of the money, it is taken as zero and the value is the
    intrinsic one. Where Kirk's own volatility comes near zero (legs that all but hedge each other: equal volatilities,
    correlation next to one, a small strike) the correction has no limit, and a value says little.

    Returns a float64 array of the broadcast shape, never below the intrinsic value. Raises `ValueError` naming the
    argument for anything outside these bounds. Error against the Yardstick over the box named in `kirk.value`, in
    short forwards: median 1.7e-4, 99th percentile 9.3e-3, worst 3.5e-2; published form for strikes below zero 7.9e-4,
    3.5e-2 and 1.0e-1.

    >>> round(float(value(110.0, 100.0, 15.0, 0.30, 0.25, 0.5, 1.0)), 4)
    9.6719
    """
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    check = None if role_exchange else check_published_strike
    return price(partial(_value, kind, role_exchange), given, kind, executor, check=check, scratch=SCRATCH)


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
    of the intrinsic value, one half each at the kink, and every other derivative is zero. The same where the
    corrected volatility is not above zero.
    """
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    check = None if role_exchange else check_published_strike
    return differentiate(
        partial(_sensitivities, kind, role_exchange), given, kind, executor, check=check, scratch=SCRATCH
    )
