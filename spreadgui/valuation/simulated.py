"""A position on blends held against a simulation of its true payoff."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from spreadgui.market.blends import horizon, two_legs
from spreadgui.market.quotes import UnknownMarkError
from spreadgui.pricing.simulation import Cancelled, Progress, Simulated, spread_value
from spreadgui.valuation.price import price_rows
from spreadgui.valuation.results import output_row
from spreadgui.valuation.slate import KINDS, Slate


@dataclass(frozen=True)
class SimulatedReading:
    """What a simulation says of one position, per unit of payoff; `matched` is the value by moments (the Yardstick's,
    or Bachelier's under normal forwards)."""

    revision: int
    row: int
    matched: float
    simulated: Simulated

    @property
    def gap(self) -> float:
        """How far the matched value is above the simulated one."""
        return self.matched - self.simulated.value

    @property
    def gap_in_errors(self) -> float:
        """The same in standard errors."""
        error = self.simulated.standard_error
        return self.gap / error if error > 0.0 else 0.0


def can_simulate(slate: Slate, row: int) -> bool:
    """Whether the position holds a blend, has two marked legs and is exercised once, with no mark of its own: only then
    do its parts' marks say all there is to know."""
    position = slate.book.positions[row]
    own = (position.own_forward_long, position.own_forward_short, position.own_vol_long, position.own_vol_short)
    blends = slate.quotes.blend(position.long_leg) is not None or slate.quotes.blend(position.short_leg) is not None
    both = bool(position.long_leg and position.short_leg)
    plain = all(mark is None for mark in (*own, position.own_correlation)) and position.exercise == "once"
    return blends and both and plain and row not in slate.troubles


def simulate(slate: Slate, row: int, progress: Progress, cancelled: Cancelled) -> SimulatedReading:
    """Simulate the position at `row`; ValueError with a sentence where `can_simulate` says no."""
    if not can_simulate(slate, row):
        raise ValueError("only a position on a blend, exercised once and with no marks of its own, can be simulated")
    position = slate.book.positions[row]
    long, short = (position.long_leg, position.long_delivery), (position.short_leg, position.short_delivery)
    try:
        legs = two_legs(slate.quotes, long, short, horizon(position, slate.book.valuation_date))
    except UnknownMarkError as error:
        raise ValueError(str(error)) from None
    one, other = legs.long.leg, legs.short.leg
    tied = np.block([[legs.long.inside, legs.across], [legs.across.T, legs.short.inside]])
    found = spread_value(
        np.concatenate([position.long_ratio * one.weights, -position.short_ratio * other.weights]),
        np.concatenate([one.forwards, other.forwards]),
        np.concatenate([one.shifts, other.shifts]),
        np.concatenate([one.vols, other.vols]),
        tied,
        position.strike,
        float(slate.values("years")[row]),
        float(slate.values("discount")[row]),
        kind=KINDS[slate.kind[row]],
        normal=legs.long.normal,
        progress=progress,
        cancelled=cancelled,
    )
    outputs = price_rows(slate, np.array([row])).outputs[:, 0]
    key = "bachelier" if legs.long.normal else "yardstick"
    return SimulatedReading(slate.revision, row, float(outputs[output_row(key)]), found)
