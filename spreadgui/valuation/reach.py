"""How large the numbers of a row may be for the formulas to take it."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from spreadgui.pricing.inputs import LARGEST_AMOUNT, LARGEST_RATE, SMALLEST_FORWARD
from spreadgui.valuation.slate import FloatArray

Flags = NDArray[np.bool_]


def within_reach(columns: Mapping[str, FloatArray | float], is_forward: Flags | bool, is_normal: Flags | bool) -> Flags:
    """Which rows the formulas take, as far as size goes, once ratios and shifts are folded in; one that is not stops no
    other.

    `columns` has an entry for each of INPUTS that a formula takes. A leg that is not there is NaN, and in reach.
    Forwards need no formula: only their amounts matter. Under a normal law forwards may have either sign, and
    volatilities are amounts.
    """
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        reachable = ~(np.abs(columns["strike"]) > LARGEST_AMOUNT)
        for side in ("long", "short"):
            ratio, vol = columns[f"ratio_{side}"], columns[f"vol_{side}"]
            folded = np.multiply(np.add(columns[f"forward_{side}"], columns[f"shift_{side}"]), ratio)
            amounts = (folded, ratio, np.multiply(columns[f"shift_{side}"], ratio))
            for amount in amounts:
                reachable = reachable & ~(np.abs(amount) > LARGEST_AMOUNT)
            lognormal = (folded < SMALLEST_FORWARD) | np.greater(vol, LARGEST_RATE)
            normal = np.abs(np.multiply(vol, ratio)) > LARGEST_AMOUNT
            reachable = reachable & (is_forward | ~np.where(is_normal, normal, lognormal))
    for key in ("years", "discount"):
        reachable = reachable & ~np.greater(columns[key], LARGEST_RATE)
    return np.asarray(reachable)
