"""The closed form of P. Bjerksund and G. Stensland, "Closed form spread option valuation" (NHH discussion paper 2006;
Quantitative Finance 14, 2014, 1785-1794).

They value the rule "exercise when S1 is at least a power of S2": with G = F2 + K and q = F2/G,

    exercise when S1 >= G S2^q / E[S2^q],

a straight line in the plane of the two normals. The value of following it is F1 N(d1) - F2 N(d2) - K N(d3) with

    d1 = (l + v^2/2)/v,   d3 = d1 - a (a - rho p)/v,   d2 = d3 + b (rho a - p)/v,

where a and b are the legs' deviations to expiry, p = q b, v^2 = a^2 - 2 rho a p + p^2 and l = ln(F1/G). The put
values the opposite rule. No rule is worth more than the best one: the formula stays below the true value.
"""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from functools import partial
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from spreadgui.pricing.front import differentiate, price
from spreadgui.pricing.inputs import Array
from spreadgui.pricing.kirk import check_published_strike
from spreadgui.pricing.legs import LEG_ROWS, PEAK, Legs, combined, hand_back, orient, signed_tail
from spreadgui.pricing.ratio_option import floor_at_intrinsic, settle
from spreadgui.pricing.results import Sensitivities

VALUE_SCRATCH = LEG_ROWS + 7
SCRATCH = LEG_ROWS + 16


class _Points(NamedTuple):
    """The lump, its short share, the deviation v, the two legs' projections on the direction of exercise and d1, d2,
    d3."""

    lump: Array
    share: Array
    total: Array
    ahead: Array
    behind: Array
    d1: Array
    d2: Array
    d3: Array


class _Weights(NamedTuple):
    """w1, w2, w3, their sum, and the sum of w_i d_i."""

    w1: Array
    w2: Array
    w3: Array
    sum_w: Array
    sum_wd: Array


def _points(legs: Legs, work: Array) -> _Points:
    """With p = q b: ahead (a - rho p)/v and behind (rho a - p)/v, so that d3 = d1 - a ahead and d2 = d3 + b behind."""
    lump, share, total, ahead, behind, d1, d2 = work
    d3 = share  # the share is spent once d2 is known; kept apart by the caller where it is wanted
    a, b = legs.deviation_first, legs.deviation_second
    np.add(legs.second, legs.strike, out=lump)
    np.divide(legs.second, lump, out=share)
    p = np.multiply(share, b, out=d1)
    combined(a, p, legs.correlation, total, d2)
    np.subtract(1.0, legs.correlation, out=d2)
    np.subtract(a, p, out=ahead)
    np.multiply(d2, a, out=behind)
    np.subtract(ahead, behind, out=behind)
    d2 *= p
    ahead += d2
    ahead /= total
    behind /= total
    np.divide(legs.first, lump, out=d1)
    np.log(d1, out=d1)
    d1 /= total
    np.multiply(total, 0.5, out=d2)
    d1 += d2
    return _Points(lump, share, total, ahead, behind, d1, d2, d3)


def _value(kind: str, role_exchange: bool, block: Sequence[Array], out: Array, work: Array) -> None:
    legs = orient(block, kind, work, role_exchange)
    lump, _, _, ahead, behind, d1, d2, d3 = _points(legs, work[LEG_ROWS:])
    ahead *= legs.deviation_first
    behind *= legs.deviation_second
    np.subtract(d1, ahead, out=d3)
    np.add(d3, behind, out=d2)
    for point, amount in ((d1, legs.first), (d2, legs.second), (d3, legs.strike)):
        signed_tail(legs.sign, point, point)
        point *= amount
    d1 -= d2
    np.subtract(d1, d3, out=out[0])
    if legs.sign.size > 1 or legs.sign[0] != 1.0:
        out[0] *= legs.sign
    floor_at_intrinsic(legs.first, lump, legs.sign, out[0], d1)
    hand_back(out, legs)


def _sensitivities(kind: str, role_exchange: bool, block: Sequence[Array], out: Array, work: Array) -> None:
    """Derivatives of the formula as it stands.

    Its exercise rule is not the best one, so the derivatives of d1, d2, d3 do not cancel between the terms as they do
    in Margrabe's formula. With w_i the amounts F1, -F2, -K times phi(d_i), a first derivative is the explicit one
    plus the sum of w_i times the derivative of d_i, and second derivatives follow by phi' = -d phi. Each d_i is m_i/v
    with m1 = l + v^2/2, m3 = l + (p^2 - a^2)/2, m2 = m3 + rho a b - p b and l = ln(F1/G).
    """
    legs = orient(block, kind, work, role_exchange)
    _in_forwards_and_volatilities(legs, out, work[LEG_ROWS:])
    hand_back(out, legs)


def _in_forwards_and_volatilities(legs: Legs, out: Array, work: Array) -> None:
    f1, f2, k, a, b = legs.first, legs.second, legs.strike, legs.deviation_first, legs.deviation_second
    share, n1, n2, w1, w2, w3, sum_w, sum_wd, spare = work[7:16]
    at = _points(legs, work[:7])
    lump, total, ahead, behind, d1, d2 = at.lump, at.total, at.ahead, at.behind, at.d1, at.d2
    share[...] = at.share
    d3 = np.multiply(a, ahead, out=at.d3)
    np.subtract(d1, d3, out=d3)
    np.multiply(b, behind, out=d2)
    d2 += d3
    out[0] = 0.0
    for point, amount, weight, tail in ((d1, f1, w1, n1), (d2, -f2, w2, n2), (d3, -k, w3, sum_w)):
        signed_tail(legs.sign, point, tail)
        tail *= legs.sign
        np.multiply(tail, amount, out=spare)
        out[0] += spare
        np.multiply(point, point, out=weight)
        weight *= -0.5
        np.exp(weight, out=weight)
        weight *= PEAK
        weight *= amount
    floor_at_intrinsic(f1, lump, legs.sign, out[0], spare)
    np.add(w1, w2, out=sum_w)
    sum_w += w3
    np.multiply(w1, d1, out=sum_wd)
    for weight, point in ((w2, d2), (w3, d3)):
        np.multiply(weight, point, out=spare)
        sum_wd += spare
    weights = _Weights(w1, w2, w3, sum_w, sum_wd)
    inverse = np.divide(1.0, total, out=spare)
    _by_volatilities(legs, at._replace(share=share, d3=d3), weights, inverse, out)
    _by_forwards(legs, at._replace(share=share, d3=d3), weights, inverse, out)
    out[1] += n1
    out[2] -= n2
    settle(total, n1, n2, out)


def _by_volatilities(legs: Legs, at: _Points, weights: _Weights, inverse: Array, out: Array) -> None:
    a, b, rho = legs.deviation_first, legs.deviation_second, legs.correlation
    w1, w2, w3, _, sum_wd = weights
    both = w2 + w3
    by_first = out[6]
    np.multiply(w1, at.total, out=by_first)
    by_first -= sum_wd
    by_first *= at.ahead
    by_first -= both * a
    w2_rho = w2 * rho
    by_first += w2_rho * b
    by_first *= inverse
    by_second = out[7]
    np.multiply(w1, at.total, out=by_second)
    by_second -= sum_wd
    by_second *= at.behind
    p = at.share * b
    both *= p
    by_second -= both
    both = w2 * p
    both *= 2.0
    by_second *= -at.share
    w2_rho *= a
    w2_rho -= both
    by_second += w2_rho
    by_second *= inverse
    pull = sum_wd * inverse
    pull -= w1
    pull *= p
    w2_rho = w2 * b
    pull += w2_rho
    pull *= a
    np.multiply(pull, inverse, out=out[8])
    np.multiply(by_first, legs.vol_first, out=out[9])
    out[9] += by_second * legs.vol_second
    out[9] /= legs.root_time
    out[9] *= -0.5
    by_first *= legs.root_time
    by_second *= legs.root_time


def _by_forwards(legs: Legs, at: _Points, weights: _Weights, inverse: Array, out: Array) -> None:
    """Deltas but for their explicit part, and gammas. g_i and h_i are the first and second derivatives of d_i in F2."""
    f1, f2, b = legs.first, legs.second, legs.deviation_second
    w1, w2, w3, sum_w, sum_wd = weights
    by_first = inverse / f1
    np.multiply(sum_w, by_first, out=out[1])
    np.multiply(sum_wd, by_first, out=out[3])
    np.subtract((2.0 * w1 - sum_w) / f1, out[3], out=out[3])
    out[3] *= by_first
    per_lump = 1.0 / at.lump
    slope = legs.strike * per_lump
    slope *= per_lump
    v_share = at.behind * -b
    v_second = v_share * slope
    v_twice = b * b
    square = v_twice * slope
    v_twice -= v_share * v_share
    v_twice *= inverse
    v_twice *= slope
    v_twice -= 2.0 * v_share * per_lump
    v_twice *= slope
    level = per_lump * per_lump
    level += square * slope
    bend = -2.0 * slope * per_lump
    p = at.share * b
    leaps = (at.total * v_share, b * (p - b), b * p)
    np.multiply(sum_w, v_second, out=out[5])
    out[5] *= inverse
    out[5] -= w2 / f2
    np.negative(out[5], out=out[5])
    out[4] = 0.0
    out[2] = 0.0
    for weight, point, leap in zip((w1, w2, w3), (at.d1, at.d2, at.d3), leaps, strict=True):
        g = slope * leap
        g -= per_lump
        g -= point * v_second
        g *= inverse
        h = bend * leap
        h += level
        h -= (2.0 * g) * v_second
        h -= point * v_twice
        h *= inverse
        if weight is w1:
            first_gain = g * w1
            first_gain /= f1
        elif weight is w2:
            out[4] += (2.0 / f2) * (w2 * g)
        g_weight = g * weight
        out[2] += g_weight
        g *= point
        g *= g_weight
        h *= weight
        h -= g
        out[4] += h
        g_weight *= point
        out[5] -= g_weight
    out[5] *= by_first
    out[5] += first_gain


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
    """Discounted value by the Bjerksund-Stensland formula.

    Arrays broadcast together. Forwards (above zero) and strikes are in money per unit of the payoff with leg ratios
    folded in, volatilities (zero or above) and the correlation (-1..1) annualised decimals, `expiry` in years,
    `discount` the factor from payment to today. `kind` is "call" for max(F_long - F_short - K, 0), "put" for max(K -
    F_long + F_short, 0) or "forward" for F_long - F_short - K, one for the whole call. A strike below zero is priced
    as the opposite option on the legs swapped round; `role_exchange=False` keeps the published form, which needs
    F_short + K above zero. An `executor` is given blocks of rows; without one they run inline.

    Returns a float64 array of the broadcast shape, lifted to the intrinsic value where the formula falls short of it.
    Raises `ValueError` naming the argument for anything outside these bounds. Error against the Yardstick over the box
    named in `kirk.value`, in short forwards: median 3.6e-5, 99th percentile 2.7e-3, worst 1.5e-2, from below; published
    form for strikes below zero 1.0e-4, 1.1e-2 and 4.2e-2.

    >>> round(float(value(110.0, 100.0, 15.0, 0.30, 0.25, 0.5, 1.0)), 4)
    9.6708
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
    of the intrinsic value, one half each at the kink, and every other derivative is zero. Where the value has been
    lifted to its intrinsic one the derivatives are still the formula's.
    """
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    check = None if role_exchange else check_published_strike
    return differentiate(
        partial(_sensitivities, kind, role_exchange), given, kind, executor, check=check, scratch=SCRATCH
    )
