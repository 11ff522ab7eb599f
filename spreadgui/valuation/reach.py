"""How large the numbers of a row may be for the formulas to take it."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from spreadgui.pricing.inputs import LARGEST_AMOUNT, LARGEST_RATE, SMALLEST_FORWARD
from spreadgui.valuation.slate import FloatArray


def within_reach(columns: Mapping[str, FloatArray | float], is_forward: NDArray[np.bool_] | bool) -> NDArray[np.bool_]:
    """Which rows the formulas take, as far as size goes, once the ratios are folded in; one that is not stops no other.

    `columns` has an entry for each of INPUTS that a formula takes. A leg that is not there is NaN, and in reach.
    Forwards need no formula: only their amounts matter.
    """
    reachable = ~(np.abs(columns["strike"]) > LARGEST_AMOUNT)
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        for side in ("long", "short"):
            folded = np.multiply(columns[f"forward_{side}"], columns[f"ratio_{side}"])
            reachable &= ~(np.abs(folded) > LARGEST_AMOUNT) & ~np.greater(columns[f"ratio_{side}"], LARGEST_AMOUNT)
            moved = (folded < SMALLEST_FORWARD) | np.greater(columns[f"vol_{side}"], LARGEST_RATE)
            reachable = reachable & (is_forward | ~moved)
    for key in ("years", "discount"):
        reachable = reachable & ~np.greater(columns[key], LARGEST_RATE)
    return np.asarray(reachable)
