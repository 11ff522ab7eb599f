"""The two legs as the formulas want them: standard deviations to expiry, strike at zero or above, one sign per row.

Role exchange. The holder of a call with a strike below zero receives F_long + |K| and pays F_short, which is what
the holder of a put on the legs swapped round holds: max(F_long - F_short - K, 0) = max(|K| - (F_short - F_long), 0).
The identity is exact. For an approximation built around a strike at zero or above it is more than a convenience,
because the lump F_short + K, which the approximation treats as lognormal, never comes near zero.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from spreadgui.pricing.inputs import Array

# Below this total standard deviation a row is its own limit. The logarithm of two doubles that differ is at least
# 1.1e-16, so every distribution function has saturated long before, and a larger bound would cost accuracy at the
# money.
STILL = 1e-18
# Scratch rows taken by `orient`, first in the kernel's scratch space.
LEG_ROWS = 3
PEAK = 1.0 / np.sqrt(2.0 * np.pi)


class Legs(NamedTuple):
    """One block, oriented: `first` is received by the holder of a call, `second` paid; `sign` is +1 for a call, -1
    for a put, one number where all rows agree."""

    first: Array
    second: Array
    strike: Array
    vol_first: Array
    vol_second: Array
    correlation: Array
    deviation_first: Array
    deviation_second: Array
    root_time: Array
    discount: Array
    sign: Array
    swapped: NDArray[np.bool_] | None


class Turned(NamedTuple):
    """One block after role exchange, before any formula: what `Legs` calls by the same names, and the expiry."""

    first: Array
    second: Array
    strike: Array
    vol_first: Array
    vol_second: Array
    correlation: Array
    expiry: Array
    discount: Array
    sign: Array
    swapped: NDArray[np.bool_] | None


def turn(block: Sequence[Array], kind: str, role_exchange: bool = True) -> Turned:
    """The block with every strike at zero or above; with `role_exchange` False as it was given."""
    first, second, strike, vol_first, vol_second, correlation, expiry, discount = block
    sign = np.array([1.0 if kind == "call" else -1.0])
    swapped = None
    if role_exchange and strike.min() < 0.0:
        swapped = strike < 0.0
        first, second = np.where(swapped, second, first), np.where(swapped, first, second)
        vol_first, vol_second = np.where(swapped, vol_second, vol_first), np.where(swapped, vol_first, vol_second)
        sign = np.where(swapped, -sign, sign)
        strike = np.abs(strike)
    return Turned(first, second, strike, vol_first, vol_second, correlation, expiry, discount, sign, swapped)


def room(row: Array, *columns: Array) -> Array | None:
    """The row as the place for a result of these columns, None where all of them are shorter: their result is then
    best left as short, in a place of its own."""
    return row if max(column.size for column in columns) >= row.size else None


def orient(block: Sequence[Array], kind: str, work: Array, role_exchange: bool = True, *, spread: bool = True) -> Legs:
    """The turned block with its deviations to expiry, which take the first `LEG_ROWS` of the scratch space; unless
    `spread`, what depends on no long column stays as short as its columns are."""
    first, second, strike, vol_first, vol_second, correlation, expiry, discount, sign, swapped = turn(
        block, kind, role_exchange
    )
    rows = (
        list(work[:LEG_ROWS])
        if spread
        else [room(work[0], expiry), room(work[1], vol_first, expiry), room(work[2], vol_second, expiry)]
    )
    root_time = np.sqrt(expiry, out=rows[0])
    deviation_first = np.multiply(vol_first, root_time, out=rows[1])
    deviation_second = np.multiply(vol_second, root_time, out=rows[2])
    return Legs(
        first,
        second,
        strike,
        vol_first,
        vol_second,
        correlation,
        deviation_first,
        deviation_second,
        root_time,
        discount,
        sign,
        swapped,
    )


def hand_back(out: Array, legs: Legs | Turned) -> None:
    """Turn results per oriented leg, undiscounted, into discounted results per leg as the caller named them, in place.

    The order is that of `Sensitivities`; a value alone is one layer. Adding zero turns a negative zero into zero.
    """
    out *= legs.discount
    name_legs(out, legs)


def name_legs(out: Array, legs: Legs | Turned) -> None:
    """Turn discounted results per oriented leg into results per leg as the caller named them, in place."""
    out += 0.0
    if legs.swapped is None or len(out) == 1:
        return
    for one, other in ((1, 2), (3, 4), (6, 7)):
        kept = np.where(legs.swapped, out[other], out[one])
        np.copyto(out[other], out[one], where=legs.swapped)
        out[one] = kept


def still_rows(total: Array) -> NDArray[np.intp]:
    """Rows of a deviation floored at `STILL` that stand at the floor."""
    return np.flatnonzero(total <= STILL) if total.min() <= STILL else np.empty(0, dtype=np.intp)


def combined(
    one: Array, other: Array, correlation: Array, out: Array, spare: Array, expiry: Array | None = None
) -> Array:
    """sqrt(one^2 - 2 correlation one other + other^2) into `out`, at least `STILL`; with an `expiry` the two are a
    year's and the root is taken of their sum until then, one pass and one root less than with both carried there.

    Summed so that nothing cancels: the squared difference of the two deviations, plus what their correlation falls
    short of one. The plain sum of squares loses all digits, and can turn negative, as the correlation nears one.
    """
    np.subtract(1.0, correlation, out=spare)
    spare *= one
    spare *= other
    spare += spare
    np.subtract(one, other, out=out)
    out *= out
    out += spare
    if expiry is not None:
        out *= expiry
    np.sqrt(out, out=out)
    return np.maximum(out, STILL, out=out)


def all_calls(sign: Array) -> bool:
    """Whether no row of the block needs its sign."""
    return bool(sign.size == 1 and sign[0] == 1.0)


def signed_tail(sign: Array, point: Array, out: Array) -> Array:
    """N(sign point) into `out`, without a product where all rows are calls."""
    if all_calls(sign):
        return np.asarray(ndtr(point, out=out))
    return np.asarray(ndtr(np.multiply(sign, point, out=out), out=out))
