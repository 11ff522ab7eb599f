"""Quoted premiums as the inversions want them: flat, undiscounted, out of the money.

A premium in the money is intrinsic value and a little; what it implies is all in the little. Put-call parity takes
the intrinsic value off and leaves the option out of the money. Where that is the put, it is the call on the legs
swapped round with the strike turned: max(K - (F_long - F_short), 0) = max(F_short - F_long - (-K), 0). Every row is a
call then.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from spreadgui.pricing.inputs import Array, SpreadColumns, as_floats, check_not_negative, check_strike, common_shape

Rows = NDArray[np.intp]
Mask = NDArray[np.bool_]

# In units of the larger forward: the price tolerance where none is given, and the Yardstick's own error, which none can
# undercut.
TOLERANCE = 1e-10
LEAST_TOLERANCE = 2e-12


class Quotes(NamedTuple):
    """Flat columns of one shape. `target` is the undiscounted value out of the money, `size` the larger forward."""

    target: Array
    first: Array
    second: Array
    strike: Array
    vol_first: Array
    vol_second: Array
    expiry: Array
    discount: Array
    size: Array
    tolerance: Array

    def only(self, rows: Rows | Mask) -> Quotes:
        return Quotes(*(column[rows] for column in self))

    def moneyness(self) -> Array:
        """Zero or below."""
        return self.first - self.second - self.strike

    def allowed(self) -> Array:
        """The tolerance on the undiscounted value, never less than the methods' own error."""
        return np.asarray(np.maximum(self.tolerance / self.discount, LEAST_TOLERANCE * self.size))


def _tolerances(tolerance: ArrayLike | None, size: Array, shape: tuple[int, ...]) -> Array:
    if tolerance is None:
        return TOLERANCE * size
    column = as_floats("tolerance", tolerance)
    check_strike("tolerance", column)
    check_not_negative("tolerance", np.minimum(column, 1.0))
    try:
        return np.broadcast_to(column, shape).reshape(-1)
    except ValueError:
        raise ValueError(
            f"tolerance: shape {column.shape} does not broadcast into {shape}, the shape of the quotes"
        ) from None


def _size(flat: SpreadColumns, method: str | None) -> Array:
    """The larger forward; under normal legs, whose forwards may be nothing, a strike or a deviation may stand for
    it."""
    size = np.maximum(np.abs(flat.forward_long), np.abs(flat.forward_short))
    if method not in (None, "bachelier"):
        return np.asarray(size)
    deviation = (flat.vol_long + flat.vol_short) * np.sqrt(flat.expiry)
    return np.asarray(np.maximum(np.maximum(size, np.abs(flat.strike)), deviation))


def turned(
    premium: ArrayLike, columns: SpreadColumns, kind: str, tolerance: ArrayLike | None, method: str | None
) -> tuple[Quotes, tuple[int, ...]]:
    """The quotes turned to calls out of the money, flat, and their common shape."""
    quoted = as_floats("premium", premium)
    check_strike("premium", quoted)
    shape = common_shape({**columns._asdict(), "premium": quoted})
    flat = SpreadColumns(*(np.broadcast_to(column, shape).reshape(-1) for column in columns))
    moneyness = flat.forward_long - flat.forward_short - flat.strike
    sign = -1.0 if kind == "put" else 1.0
    with np.errstate(all="ignore"):
        outer = np.broadcast_to(quoted, shape).reshape(-1) / flat.discount
    swap = moneyness > 0.0
    size = _size(flat, method)
    quotes = Quotes(
        outer - np.maximum(sign * moneyness, 0.0),
        np.where(swap, flat.forward_short, flat.forward_long),
        np.where(swap, flat.forward_long, flat.forward_short),
        np.where(swap, -flat.strike, flat.strike),
        np.where(swap, flat.vol_short, flat.vol_long),
        np.where(swap, flat.vol_long, flat.vol_short),
        flat.expiry,
        flat.discount,
        size,
        _tolerances(tolerance, size, shape),
    )
    return quotes, shape
