"""What came out: values and sensitivities by row, the state of each row, and the live results of a book at work."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from spreadgui.market.contracts import Readiness
from spreadgui.pricing.methods import METHODS
from spreadgui.valuation.slate import CodeArray, FloatArray, RowArray, Slate, Succession

SENSITIVITIES = (
    "delta_long",
    "delta_short",
    "gamma_long",
    "gamma_short",
    "gamma_cross",
    "vega_long",
    "vega_short",
    "correlation_sensitivity",
    "theta",
)
# What only some rows have: the strips' sensitivities to the volatilities inside the delivery month, what is known of
# the Yardstick's own error, what a quoted premium implies (`implied_status` is an index into IMPLIED_WORDS), and the
# value with an estimated correlation one standard error lower and higher.
EXTRAS = (
    "daily_vega_long",
    "daily_vega_short",
    "rate_sensitivity",
    "carry",
    "yardstick_error",
    "implied_correlation",
    "implied_correlation_error",
    "implied_status",
    "guess_low",
    "guess_high",
)
IMPLIED_WORDS = ("solved", "below floor", "above ceiling", "not identified")
OUTPUTS = (*(method.key for method in METHODS), "value", *SENSITIVITIES, *EXTRAS)
# A row without any of these has no price.
NEEDED = slice(len(METHODS), len(METHODS) + 1 + len(SENSITIVITIES))
_OUTPUT_ROW = {key: row for row, key in enumerate(OUTPUTS)}


def output_row(key: str) -> int:
    """Where one of OUTPUTS stands in the outputs of a part or of live results."""
    return _OUTPUT_ROW[key]


class State(IntEnum):
    """The state of a computed cell. Only a current one shows a number that may be relied upon."""

    CURRENT = 0
    PRICING = 1
    INCOMPLETE = 2
    REFUSED = 3

    @property
    def word(self) -> str:
        return self.name.lower()


@dataclass(frozen=True)
class Part:
    """Priced rows of one slate, on their way back: `outputs` has one line for each of OUTPUTS, per unit of payoff.

    The sensitivities are those of the book's method, to the markets' own forwards (the ratios are in them); NaN where
    a method does not cover a row. `refused` tells which rows could not be priced after all, and why.
    """

    revision: int
    rows: RowArray
    outputs: FloatArray
    refused: Mapping[int, str]


@dataclass
class LiveResults:
    """The results of a book at work: follows every slate, takes every part that still speaks of its rows.

    Lives on one thread, and changes only through `follow` and `accept`. A part of an older slate is taken for the rows
    that no edit has touched since, so that a long run under a busy hand still comes to its end; for touched rows it is
    dropped.
    """

    slate: Slate | None = None
    outputs: FloatArray = field(default_factory=lambda: np.empty((len(OUTPUTS), 0)))
    state: CodeArray = field(default_factory=lambda: np.empty(0, dtype=np.int8))
    reasons: dict[int, str] = field(default_factory=dict)
    _touched: NDArray[np.int64] = field(default_factory=lambda: np.empty(0, dtype=np.int64))
    _failed: RowArray = field(default_factory=lambda: np.empty(0, dtype=np.intp))
    _rows_moved_at: int = 0

    def follow(self, succession: Succession) -> None:
        """Stand on a new slate: rows that descend unchanged keep their results, the others await pricing."""
        self._retry_failed()
        slate, old_rows = succession.slate, succession.old_rows
        kept = np.flatnonzero(old_rows >= 0)
        source = old_rows[kept]
        if len(self.state) == len(slate) and np.array_equal(source, kept):
            self._reopen(slate, np.flatnonzero(old_rows < 0))
        else:
            self._move(slate, kept, source)
        self.slate = slate
        self._settle_unready(np.flatnonzero(old_rows < 0))

    def _reopen(self, slate: Slate, rows: RowArray) -> None:
        """Every row is in its place, and `rows` are new: an edit costs no copy of all the others."""
        self.outputs[:, rows], self.state[rows], self._touched[rows] = np.nan, State.PRICING, slate.revision
        for row in rows.tolist() if self.reasons else ():
            self.reasons.pop(row, None)

    def _move(self, slate: Slate, kept: RowArray, source: RowArray) -> None:
        """Rows have come, gone or changed places."""
        outputs = np.full((len(OUTPUTS), len(slate)), np.nan)
        state = np.full(len(slate), State.PRICING, dtype=np.int8)
        touched = np.full(len(slate), slate.revision, dtype=np.int64)
        outputs[:, kept], state[kept], touched[kept] = (
            self.outputs[:, source],
            self.state[source],
            self._touched[source],
        )
        self.reasons = {int(row): self.reasons[int(old)] for row, old in self._reasoned(kept, source)}
        self._rows_moved_at = slate.revision
        self.outputs, self.state, self._touched = outputs, state, touched

    def accept(self, part: Part) -> RowArray:
        """Take a part; gives the rows whose cells are now current (or refused) through it."""
        if part.revision < self._rows_moved_at:
            return part.rows[:0]
        fresh = (self._touched[part.rows] <= part.revision) & (self.state[part.rows] == State.PRICING)
        rows: RowArray = part.rows[fresh]
        self.outputs[:, rows] = part.outputs[:, fresh]
        self.state[rows] = State.CURRENT
        for row in rows.tolist():
            if row in part.refused:
                self.state[row], self.reasons[row] = State.REFUSED, part.refused[row]
        return rows

    def fail(self, sentence: str) -> RowArray:
        """Pricing broke: every row that awaits it is refused with `sentence`, until the next slate tries it again."""
        rows = self.pending()
        self.state[rows] = State.REFUSED
        self.reasons.update((row, sentence) for row in rows.tolist())
        self._failed = rows
        return rows

    def pending(self) -> RowArray:
        """The rows that await pricing."""
        return np.flatnonzero(self.state == State.PRICING)

    def values(self, key: str) -> FloatArray:
        """The column of one of OUTPUTS, per unit of payoff; NaN wherever the row is not current."""
        column: FloatArray = self.outputs[_OUTPUT_ROW[key]]
        return column

    def total_value(self) -> float:
        """The sum of the position values of all current rows, in the book's currency."""
        if self.slate is None:
            return 0.0
        values = self.slate.values("quantity") * self.values("value")
        return float(values[self.state == State.CURRENT].sum())

    def reason(self, row: int) -> str:
        """Why a row is incomplete or refused, as one sentence; empty for the others."""
        return self.reasons.get(row, "")

    def _retry_failed(self) -> None:
        self.state[self._failed] = State.PRICING
        for row in self._failed.tolist():
            del self.reasons[row]
        self._failed = self._failed[:0]

    def _settle_unready(self, rows: RowArray) -> None:
        """Rows that cannot be priced need no pricing thread to say so."""
        assert self.slate is not None
        for row in rows[self.slate.readiness[rows] != Readiness.READY].tolist():
            troubles = self.slate.troubles[row]
            refused = any(trouble.readiness is Readiness.REFUSED for trouble in troubles)
            self.state[row] = State.REFUSED if refused else State.INCOMPLETE
            self.reasons[row] = "; ".join(trouble.sentence for trouble in troubles)

    def _reasoned(self, kept: RowArray, source: RowArray) -> list[tuple[int, int]]:
        if not self.reasons:
            return []
        held = np.isin(source, list(self.reasons))
        return list(zip(kept[held].tolist(), source[held].tolist(), strict=True))
