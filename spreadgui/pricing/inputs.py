"""Checks and broadcasting of the arguments every method takes.

Each argument is checked at its own shape, before broadcasting, so that a scalar volatility beside a million strikes
costs one comparison. A refusal is a `ValueError` whose message begins with the argument's name.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

KINDS = ("call", "put", "forward")
CHUNK = 65536
# Outside these the squares and cubes in second derivatives would run over or under; no market comes near them.
LARGEST_AMOUNT = 1e60
SMALLEST_FORWARD = 1e-60
LARGEST_RATE = 1e6


class SpreadColumns(NamedTuple):
    """The eight arguments of a spread option as float64 arrays, each still at its own shape."""

    forward_long: Array
    forward_short: Array
    strike: Array
    vol_long: Array
    vol_short: Array
    correlation: Array
    expiry: Array
    discount: Array


class OutrightColumns(NamedTuple):
    """The five arguments of an option on one forward as float64 arrays, each still at its own shape."""

    forward: Array
    strike: Array
    vol: Array
    expiry: Array
    discount: Array


def check_kind(kind: str) -> None:
    """Refuse a payoff name that is none of call, put and forward."""
    if not isinstance(kind, str) or kind not in KINDS:
        raise ValueError(f"kind: expected one of {', '.join(KINDS)}, found {kind!r}")


def as_floats(name: str, given: ArrayLike) -> Array:
    """The argument as a float64 array; `ValueError` naming it where it holds anything but real numbers."""
    try:
        plain = np.asarray(given)
        if plain.dtype.kind == "c":
            raise TypeError("complex numbers")
        return np.asarray(plain, dtype=np.float64)
    except (TypeError, ValueError, OverflowError) as fault:
        raise ValueError(f"{name}: expected real numbers ({fault})") from fault


def _refuse(name: str, column: Array, bad: NDArray[np.bool_], demand: str) -> None:
    place = tuple(int(axis[0]) for axis in np.nonzero(np.atleast_1d(bad)))
    found = float(np.atleast_1d(column)[place])
    where = f" at index {place[0] if len(place) == 1 else place}" if column.ndim else ""
    raise ValueError(f"{name}: must be {demand}, found {found!r}{where}")


def _check_finite(name: str, column: Array) -> tuple[float, float]:
    """Smallest and largest entry of a column that is not empty. Minimum and maximum pass a NaN on, so two reductions
    find every bad number; in chunks, so that the second finds the chunk still in the cache."""
    if column.ndim == 1 and column.size > CHUNK:
        chunks = [column[start : start + CHUNK] for start in range(0, column.size, CHUNK)]
        ends = np.array([(chunk.min(), chunk.max()) for chunk in chunks])
    else:
        ends = np.array([(column.min(), column.max())])
    low, high = float(ends[:, 0].min()), float(ends[:, 1].max())
    if not (np.isfinite(low) and np.isfinite(high)):
        _refuse(name, column, ~np.isfinite(column), "finite")
    return low, high


def check_positive(name: str, column: Array) -> None:
    """Refuse forwards that are zero, negative, NaN, infinite or beyond what double precision carries through."""
    if not column.size:
        return
    low, high = _check_finite(name, column)
    if low <= 0.0:
        _refuse(name, column, column <= 0.0, "above zero")
    if low < SMALLEST_FORWARD or high > LARGEST_AMOUNT:
        outside = (column < SMALLEST_FORWARD) | (column > LARGEST_AMOUNT)
        _refuse(name, column, outside, f"between {SMALLEST_FORWARD:g} and {LARGEST_AMOUNT:g}")


def check_not_negative(name: str, column: Array) -> None:
    """Refuse volatilities, expiries and discount factors that are negative, NaN, infinite or beyond any use."""
    if not column.size:
        return
    low, high = _check_finite(name, column)
    if low < 0.0:
        _refuse(name, column, column < 0.0, "zero or above")
    if high > LARGEST_RATE:
        _refuse(name, column, column > LARGEST_RATE, f"at most {LARGEST_RATE:g}")


def check_finite(name: str, column: Array) -> None:
    """Refuse NaN and infinite entries."""
    if column.size:
        _check_finite(name, column)


def check_strike(name: str, column: Array) -> None:
    """Refuse strikes that are NaN, infinite or beyond what double precision carries through."""
    if column.size:
        low, high = _check_finite(name, column)
        if max(high, -low) > LARGEST_AMOUNT:
            _refuse(name, column, np.abs(column) > LARGEST_AMOUNT, f"within {LARGEST_AMOUNT:g} of zero")


def check_correlation(name: str, column: Array) -> None:
    """Refuse entries outside -1..1, NaN and infinite ones."""
    if column.size:
        low, high = _check_finite(name, column)
        if low < -1.0 or high > 1.0:
            _refuse(name, column, np.abs(column) > 1.0, "between -1 and 1")


def common_shape(columns: Mapping[str, Array]) -> tuple[int, ...]:
    """The broadcast shape of all columns; the first that does not fit those before it is named."""
    shape: tuple[int, ...] = ()
    for name, column in columns.items():
        try:
            shape = np.broadcast_shapes(shape, column.shape)
        except ValueError:
            raise ValueError(
                f"{name}: shape {column.shape} does not broadcast with {shape}, the shape of the arguments before it"
            ) from None
    return shape


# What each argument of a spread option must be, and the bounds that say the same of a block without saying where.
SPREAD_CHECKS: tuple[Callable[[str, Array], None], ...] = (
    check_positive,
    check_positive,
    check_strike,
    check_not_negative,
    check_not_negative,
    check_correlation,
    check_not_negative,
    check_not_negative,
)
SPREAD_BOUNDS = (
    (SMALLEST_FORWARD, LARGEST_AMOUNT),
    (SMALLEST_FORWARD, LARGEST_AMOUNT),
    (-LARGEST_AMOUNT, LARGEST_AMOUNT),
    (0.0, LARGEST_RATE),
    (0.0, LARGEST_RATE),
    (-1.0, 1.0),
    (0.0, LARGEST_RATE),
    (0.0, LARGEST_RATE),
)


def spread_floats(given: Sequence[ArrayLike]) -> SpreadColumns:
    """The eight arguments of a spread option as float64 arrays, their numbers not yet checked."""
    return SpreadColumns(*(as_floats(name, one) for name, one in zip(SpreadColumns._fields, given, strict=True)))


def check_spread(columns: SpreadColumns, left_out: Collection[int] = ()) -> None:
    """Refuse bad numbers in every column but those whose places are left out."""
    for place, (check, name) in enumerate(zip(SPREAD_CHECKS, SpreadColumns._fields, strict=True)):
        if place not in left_out:
            check(name, columns[place])


def within_bounds(places: Sequence[int], block: Sequence[Array]) -> bool:
    """Whether the block's columns at these places, none of them empty, would pass `check_spread`; a NaN does not."""
    for place in places:
        low, high = SPREAD_BOUNDS[place]
        column = block[place]
        if not (np.minimum.reduce(column) >= low and np.maximum.reduce(column) <= high):
            return False
    return True


def spread_columns(
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    correlation: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike,
) -> tuple[SpreadColumns, tuple[int, ...]]:
    """The checked columns of a spread option under lognormal legs, and their common shape."""
    columns = spread_floats((forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount))
    check_spread(columns)
    return columns, common_shape(columns._asdict())


def outright_columns(
    forward: ArrayLike, strike: ArrayLike, vol: ArrayLike, expiry: ArrayLike, discount: ArrayLike
) -> tuple[OutrightColumns, tuple[int, ...]]:
    """The checked columns of an option on one lognormal forward, and their common shape."""
    given = (forward, strike, vol, expiry, discount)
    columns = OutrightColumns(*(as_floats(name, one) for name, one in zip(OutrightColumns._fields, given, strict=True)))
    check_positive("forward", columns.forward)
    check_strike("strike", columns.strike)
    for name in ("vol", "expiry", "discount"):
        check_not_negative(name, getattr(columns, name))
    return columns, common_shape(columns._asdict())
