"""The search for the correlation at which a method meets a quote: whole arrays at once, each round the unfinished rows
alone.

Every row is a call out of the money or at it (see `implied`), whose undiscounted value V falls as the correlation
grows. Far from the money V bends by orders of magnitude, next to full correlation it has a square root's corner or an
essential singularity; Newton's method on V itself fails at both. So every value is first turned into the normal
deviation w of the spread that Bachelier's formula would need for it: under normal legs w^2 is a linear function of the
correlation, under lognormal ones nearly so, and Newton's step is taken there,

    step = (w_target^2 - w^2) n(x/w) / (2 w V'),    x the moneyness,

which near the root is Newton's step on V. The bracket starts as -1..1 with ends not yet looked at and closes at every
evaluation. A step beyond an end that has not been looked at goes to that end, where the method is cheap and the answer
decides whether there is a solution at all; where V is flat or rises and gives no step, the end on the target's side is
looked at in the same way; all else is replaced by the middle of the bracket.
A row is done when what its next step would leave, judged by the size of that step beside the room left to the nearer
end, is below the precision asked for; the step is still taken.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from spreadgui.pricing import normal_option
from spreadgui.pricing.inputs import Array

Rows = NDArray[np.intp]
Mask = NDArray[np.bool_]
# Given rows and a correlation for each: value and its derivative in the correlation.
Evaluate = Callable[[Rows, Array], tuple[Array, Array]]

INSIDE, LOW_END, HIGH_END, ADRIFT = 0, 1, 2, 3
# After so many rounds every other step is the middle, so that the bracket halves whatever the method does.
PATIENCE = 20
ROUNDS = 140
NARROW = 2.3e-16


class Goal(NamedTuple):
    """What each row looks for, of shape (rows,): the undiscounted value, the moneyness of its option, what the value
    may be off by in the end, and what separates a target at an end of the reachable range from one inside."""

    target: Array
    moneyness: Array
    precision: Array
    rounding: Array


class Found(NamedTuple):
    """Where the search ended, each of shape (rows,): `outcome` INSIDE, or the end of the reachable range at or beyond
    which the target lies - LOW_END for V(+1), HIGH_END for V(-1) -, or ADRIFT where the bracket closed or the rounds
    ran out before the target was met; `gap` is V less the target and `slope` V' where last evaluated."""

    correlation: Array
    gap: Array
    slope: Array
    outcome: NDArray[np.intp]
    evaluations: NDArray[np.intp]


class _Bracket(NamedTuple):
    """Its ends, and which of them have been evaluated, for all rows; changed in place as the search goes on."""

    low: Array
    high: Array
    low_seen: Mask
    high_seen: Mask

    def close(self, rows: Rows, at: Array, gap: Array) -> None:
        """A value above the target asks for more correlation."""
        above = gap > 0.0
        self.low[rows[above]], self.low_seen[rows[above]] = at[above], True
        self.high[rows[~above]], self.high_seen[rows[~above]] = at[~above], True

    def guarded(self, rows: Rows, at: Array, step: Array, gap: Array, halve: bool) -> Array:
        """Where to look next: where the step ends, an end of the range not looked at so far, or the middle."""
        low, high = self.low[rows], self.high[rows]
        ahead = at + np.where(np.isnan(step), np.where(gap > 0.0, 4.0, -4.0), step)
        under, over = ahead <= low, ahead >= high
        middle = (under & self.low_seen[rows]) | (over & self.high_seen[rows]) | halve
        return np.asarray(np.where(middle, 0.5 * (low + high), np.clip(ahead, low, high)))


def _steps(value: Array, slope: Array, moneyness: Array, wanted: Array) -> Array:
    """Newton's step in the squared normal deviation; NaN where there is none. `wanted` is the target's deviation."""
    with np.errstate(all="ignore"):
        width = normal_option.deviation_of(value, moneyness)
        pace = 2.0 * width * slope / normal_option.density(moneyness, width)
        step = (wanted - width) * (wanted + width) / pace
    return np.asarray(np.where((slope < 0.0) & (wanted > 0.0) & np.isfinite(step), step, np.nan))


def search(evaluate: Evaluate, goal: Goal, start: Array, rounds: int = ROUNDS) -> Found:
    """The correlations; where the `rounds` run out, as far as they have got."""
    count = start.size
    adrift = np.full(count, ADRIFT, dtype=np.intp)
    found = Found(start.copy(), np.zeros(count), np.zeros(count), adrift, np.zeros(count, np.intp))
    bracket = _Bracket(np.full(count, -1.0), np.full(count, 1.0), np.zeros(count, np.bool_), np.zeros(count, np.bool_))
    wanted = normal_option.deviation_of(goal.target, goal.moneyness)
    rows, at = np.arange(count), start.copy()
    for turn in range(rounds):
        if not rows.size:
            break
        value, slope = evaluate(rows, at)
        some = Goal(*(column[rows] for column in goal))
        gap = value - some.target
        found.evaluations[rows] += 1
        found.gap[rows], found.slope[rows] = gap, slope
        low_end, high_end = (at >= 1.0) & (gap >= -some.rounding), (at <= -1.0) & (gap <= some.rounding)
        found.outcome[rows[low_end]], found.outcome[rows[high_end]] = LOW_END, HIGH_END
        step = _steps(value, slope, some.moneyness, wanted[rows])
        close = _is_close(at, step, gap, some.precision)
        bracket.close(rows, at, gap)
        last = np.clip(at + np.nan_to_num(step), bracket.low[rows], bracket.high[rows])
        ahead = bracket.guarded(rows, at, step, gap, turn >= PATIENCE and turn % 2 == 0)
        ended = low_end | high_end
        found.correlation[rows] = np.where(ended, at, np.where(close, last, ahead))
        found.outcome[rows[close & ~ended]] = INSIDE
        going = ~(ended | close | (bracket.high[rows] - bracket.low[rows] <= NARROW))
        rows, at = rows[going], ahead[going]
    return found


def _is_close(at: Array, step: Array, gap: Array, precision: Array) -> Mask:
    room = np.maximum(1.0 - np.maximum(np.abs(at), np.abs(at + step)), 1e-16)
    left = np.abs(gap) * np.abs(step) / room
    return np.asarray((np.abs(gap) <= 0.1 * precision) | ((left <= precision) & (np.abs(step) < 0.5 * room)))
