"""A position's sensitivities to the blends it holds, passed through to their markets.

A blend's forward, matched volatility and matched correlation are functions of its parts' marks, so by the chain rule a
part's delta is its weight times the blend's, and what its forward does to the matched volatility and correlation times
the position's vega and correlation sensitivity; a part's vega likewise. For a strip these are the vegas up to the start
of the delivery month.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from spreadgui.market.blends import Parts, TwoLegs, horizon, names_a_blend, two_legs
from spreadgui.market.mix import Slopes
from spreadgui.market.quotes import UnknownMarkError
from spreadgui.valuation.results import output_row
from spreadgui.valuation.slate import FloatArray, Slate


@dataclass(frozen=True)
class PartReading:
    """One market of a leg that is a blend. `delta` is per 1.00 of its forward and `vega` per 1.0 of its volatility,
    both for one unit of payoff; `forward` and `vol` are its marks."""

    side: str
    market: str
    delivery: str
    weight: float
    forward: float
    vol: float
    delta: float
    vega: float


def part_readings(slate: Slate, row: int, outputs: FloatArray) -> tuple[PartReading, ...]:
    """The parts of the blends in a row, with what the row's `outputs` come to for each; none where it has no blend, or
    where one leg has no market to match it with."""
    position = slate.book.positions[row]
    if not (position.long_leg and position.short_leg and names_a_blend(position, slate.quotes)):
        return ()
    ahead = horizon(position, slate.book.valuation_date)
    try:
        legs = two_legs(
            slate.quotes, (position.long_leg, position.long_delivery),
            (position.short_leg, position.short_delivery), ahead,
        )  # fmt: skip
    except UnknownMarkError:
        return ()
    blends = {side for side in ("long", "short") if slate.quotes.blend(getattr(position, f"{side}_leg")) is not None}
    return tuple(reading for side in ("long", "short") if side in blends for reading in _of_side(legs, side, outputs))


def _of_side(legs: TwoLegs, side: str, outputs: FloatArray) -> list[PartReading]:
    parts: Parts = getattr(legs, side)
    slopes: Slopes = getattr(legs.matched, side)
    delta, vega, tied = (
        float(outputs[output_row(key)]) for key in (f"delta_{side}", f"vega_{side}", "correlation_sensitivity")
    )
    deltas = delta * parts.leg.weights + vega * slopes.vol_by_forward + tied * slopes.correlation_by_forward
    vegas = vega * slopes.vol_by_vol + tied * slopes.correlation_by_vol
    columns = (parts.leg.weights, parts.leg.forwards, parts.leg.vols, deltas, vegas)
    return [
        PartReading(side, market, delivery, *numbers)
        for (market, delivery), numbers in zip(parts.contracts, np.stack(columns).T.tolist(), strict=True)
    ]
