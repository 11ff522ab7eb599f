"""An option to exchange one lognormal lump for another, and the chain rule through its deviation.

Margrabe, Kirk and modified Kirk are one formula: with F received, G paid and the deviation v of ln(F/G) to expiry,

    value = sign (F N(sign d1) - G N(sign d2)),   d1 = ln(F/G)/v + v/2,   d2 = d1 - v,

as Black (1976) has it. They differ in v alone. Each method hands over v and its derivatives; here they pass through the
formula, whose own derivatives are all built from phi(d1), since F phi(d1) = G phi(d2).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from spreadgui.pricing.inputs import Array
from spreadgui.pricing.legs import PEAK, Legs, all_calls, signed_tail, still_rows


class Deviation(NamedTuple):
    """Deviation v to expiry, at least `STILL`, and its derivatives in the forwards, the volatilities' deviations and
    the correlation.

    The paid lump is F2 + K, so its derivative in F2 is one. When both volatilities grow by one factor so does v; that
    is what time does to them. None stands for a derivative that is zero for every row.
    """

    total: Array
    by_second: Array | None
    by_second_twice: Array | None
    by_deviation_first: Array
    by_deviation_second: Array
    by_correlation: Array
    by_first: Array | None = None
    by_first_twice: Array | None = None
    by_both: Array | None = None


def value(first: Array, lump: Array, total: Array, sign: Array, out: Array, work: Array) -> None:
    """Undiscounted value into `out`, with one row of scratch space; a deviation at its floor gives the intrinsic
    value."""
    upper, lower = work[0], out
    np.divide(first, lump, out=upper)
    np.log(upper, out=upper)
    upper /= total
    np.multiply(total, 0.5, out=lower)
    upper += lower
    np.subtract(upper, total, out=lower)
    signed_tail(sign, upper, upper)
    signed_tail(sign, lower, lower)
    upper *= first
    lower *= lump
    np.subtract(upper, lower, out=out)
    if not all_calls(sign):
        out *= sign
    floor_at_intrinsic(first, lump, sign, out, upper)


def floor_at_intrinsic(first: Array, lump: Array, sign: Array, out: Array, spare: Array) -> None:
    """Lift undiscounted values that rounding or the approximation has left below sign (F1 - G) or zero, in place."""
    np.subtract(first, lump, out=spare)
    if not all_calls(sign):
        spare *= sign
    np.maximum(out, spare, out=out)
    np.maximum(out, 0.0, out=out)


def sensitivities(legs: Legs, lump: Array, v: Deviation, out: Array) -> None:
    """Undiscounted value and derivatives per oriented leg into `out`, in the order of `Sensitivities`.

    Where the deviation is zero everything past the deltas is zero: the true limit off the kink, and at the kink, where
    gamma is a point mass and vega jumps, the rule of this package; the deltas there are one half each.
    """
    first, sign, total = legs.first, legs.sign, v.total
    inverse = 1.0 / total
    upper = np.log(np.divide(first, lump, out=np.empty_like(total)))
    upper *= inverse
    upper += 0.5 * total
    lower = upper - total
    in_first, in_lump = signed_tail(sign, upper, np.empty_like(upper)), signed_tail(sign, lower, np.empty_like(upper))
    if not all_calls(sign):
        in_first *= sign
        in_lump *= sign
    density = upper * upper
    density *= -0.5
    np.exp(density, out=density)
    density *= PEAK
    vega = first * density
    np.multiply(first, in_first, out=out[0])
    out[0] -= lump * in_lump
    floor_at_intrinsic(first, lump, sign, out[0], out[1])
    np.multiply(density, inverse, out=out[3])
    out[3] /= first
    np.multiply(vega, inverse, out=out[4])
    out[4] /= lump
    np.negative(out[4], out=out[5])
    out[4] /= lump
    out[5] /= first
    out[1] = in_first
    np.negative(in_lump, out=out[2])
    _through_forwards(first, lump, v, (vega, upper, lower, inverse), out)
    np.multiply(vega, v.by_deviation_first, out=out[6])
    np.multiply(vega, v.by_deviation_second, out=out[7])
    out[6] *= legs.root_time
    out[7] *= legs.root_time
    np.multiply(vega, v.by_correlation, out=out[8])
    np.divide(total, legs.root_time, out=out[9])
    out[9] /= legs.root_time
    out[9] *= vega
    out[9] *= -0.5
    settle(total, in_first, in_lump, out)


def settle(total: Array, in_first: Array, in_paid: Array, out: Array) -> None:
    """The limits of rows without deviation."""
    rows = still_rows(total)
    if rows.size:
        out[1, rows], out[2, rows] = in_first[rows], -in_paid[rows]
        out[3:, rows] = 0.0


def _through_forwards(
    first: Array, lump: Array, v: Deviation, formula: tuple[Array, Array, Array, Array], out: Array
) -> None:
    """What reaches deltas and gammas through the deviation's own dependence on the forwards."""
    vega, upper, lower, inverse = formula
    if v.by_second is None or v.by_second_twice is None:
        return
    first_vega = vega * lower
    first_vega *= inverse
    vega_twice = first_vega * upper
    first_vega /= -first
    lump_vega = vega * upper
    lump_vega *= inverse
    lump_vega /= lump
    out[2] += vega * v.by_second
    pull = vega_twice * v.by_second
    pull += lump_vega
    out[4] += (pull + lump_vega) * v.by_second
    out[4] += vega * v.by_second_twice
    out[5] += first_vega * v.by_second
    if v.by_first is None or v.by_first_twice is None or v.by_both is None:
        return
    out[1] += vega * v.by_first
    out[3] += (2.0 * first_vega + vega_twice * v.by_first) * v.by_first
    out[3] += vega * v.by_first_twice
    out[5] += pull * v.by_first
    out[5] += vega * v.by_both
