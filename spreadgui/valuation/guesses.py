"""What a value owes to a guess: the same position with its estimated correlation one standard error off, either way.

Only correlations that come from the book and carry a standard error are guesses in this sense; own correlations, and
those that blends are matched to, are taken as they are.
"""

from __future__ import annotations

from concurrent.futures import Executor

import numpy as np

from spreadgui.market.contracts import Law, Shape
from spreadgui.pricing.methods import NORMAL_METHODS
from spreadgui.pricing.methods import method as method_of
from spreadgui.valuation.exercises import Exercises, expand
from spreadgui.valuation.group import groups
from spreadgui.valuation.results import LiveResults, State, output_row
from spreadgui.valuation.slate import KINDS, FloatArray, RowArray, Slate


def guess(slate: Slate, rows: RowArray, outputs: FloatArray, executor: Executor | None) -> None:
    """Put the values at either end into `outputs`, (len(OUTPUTS), rows), by the method behind each row's value."""
    error, marked = slate.values("correlation_error")[rows], slate.values("correlation")[rows]
    is_option = (slate.shape[rows] == Shape.SPREAD) & (slate.kind[rows] != KINDS.index("forward"))
    places = np.flatnonzero(np.isfinite(error) & is_option & np.isfinite(outputs[output_row("value")]))
    if not places.size:
        return
    for key, sign in (("guess_low", -1.0), ("guess_high", 1.0)):
        moved = np.clip(marked[places] + sign * error[places], -1.0, 1.0)
        outputs[output_row(key), places] = _values(slate, expand(slate, rows[places], moved), executor)


def _values(slate: Slate, lines: Exercises, executor: Executor | None) -> FloatArray:
    each = np.full(len(lines.owner), np.nan)
    for members, group in groups(lines):
        method = NORMAL_METHODS[0] if group.law is Law.NORMAL else method_of(slate.book.method)
        each[members] = method.value(*group.spread_arguments, kind=group.kind, executor=executor)
    return np.asarray(np.bincount(lines.owner, weights=lines.share * each, minlength=lines.rows), dtype=np.float64)


def guess_total(slate: Slate, results: LiveResults) -> tuple[int, float, float]:
    """How many priced positions rest on an estimated correlation; the sum of their bands, as if every guess were wrong
    the same way for the desk, in the book's currency; and that as a part of the book's value without signs."""
    current = results.state == State.CURRENT
    quantity = slate.values("quantity")
    bands = np.abs(quantity * (results.values("guess_high") - results.values("guess_low")))
    known = current & np.isfinite(bands)
    worth = float(np.abs(quantity * results.values("value"))[current].sum())
    cost = float(bands[known].sum())
    return int(np.count_nonzero(known)), cost, cost / worth if worth > 0.0 else 0.0
