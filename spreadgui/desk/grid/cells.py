"""Cell texts, cached: painting asks for the same few hundred cells again and again.

Needs no Qt. A column is formatted 64 rows at a time when one of its cells is asked for; when few rows change, only
their cells are formatted anew, in the columns that have been asked for.
"""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from enum import IntEnum
from typing import NamedTuple

from spreadgui.valuation.column import Column, screen_texts
from spreadgui.valuation.results import LiveResults, State
from spreadgui.valuation.slate import RowArray, Slate
from spreadgui.valuation.trust import beyond

BLOCK_ROWS = 64
# When more rows of a block change than this, formatting it afresh when it is next asked for costs less.
_MOST_PATCHED = 8


class Look(IntEnum):
    """How a cell is painted: what a person may do with it, and how far its content may be relied upon."""

    COMPUTED = 0
    ENTRY = 1
    MARKED = 2  # resolved from Marks; may be overtyped with an own mark
    OWN = 3  # the row's own mark
    PRICING = 4
    INCOMPLETE = 5
    REFUSED = 6
    BEYOND = 7  # a formula gap larger than the book's tolerance


# By state: how a computed cell of such a row looks.
_STATE_LOOKS = (Look.COMPUTED, Look.PRICING, Look.INCOMPLETE, Look.REFUSED)
_STATE_WORDS = tuple(state.word for state in State)
_STATE_COLUMN = "position_value"  # pinned, so always in sight: it spells the state out where there is no value
_CURRENT = int(State.CURRENT)


class Cell(NamedTuple):
    """One cell as it is shown."""

    text: str
    look: Look


class CellCache:
    """The texts of all cells of `columns`, formatted when asked for."""

    def __init__(self, columns: Sequence[Column], slate: Slate, results: LiveResults) -> None:
        self._columns = tuple(columns)
        self._blocks: dict[tuple[int, int], list[Cell]] = {}
        self._slate, self._results = slate, results

    def stand_on(self, slate: Slate) -> None:
        """Read from another slate; forgets nothing by itself."""
        self._slate = slate

    def forget(self) -> None:
        """Drop all texts."""
        self._blocks.clear()

    def renew(self, rows: RowArray, columns: range | None = None) -> None:
        """The cells of `rows` have changed, in some columns or (None) in all."""
        places = range(len(self._columns)) if columns is None else columns
        for block, members in itertools.groupby(rows.tolist(), key=lambda row: row // BLOCK_ROWS):
            changed = list(members)
            for place in places:
                if (block, place) in self._blocks:
                    self._renew_block(block, place, changed)

    def cell(self, row: int, column: int) -> Cell:
        """The cell at `row` (of the book) and `column` (of the columns given)."""
        block = row // BLOCK_ROWS
        cells = self._blocks.get((block, column))
        if cells is None:
            rows = range(block * BLOCK_ROWS, min((block + 1) * BLOCK_ROWS, len(self._slate)))
            cells = self._blocks[block, column] = self._format(self._columns[column], rows)
        return cells[row - block * BLOCK_ROWS]

    def _renew_block(self, block: int, place: int, rows: list[int]) -> None:
        if len(rows) > _MOST_PATCHED:
            del self._blocks[block, place]
            return
        for row in rows:
            (cell,) = self._format(self._columns[place], range(row, row + 1))
            self._blocks[block, place][row - block * BLOCK_ROWS] = cell

    def _format(self, column: Column, rows: range) -> list[Cell]:
        texts = screen_texts(column, self._slate, self._results, rows)
        if column.computed:
            states = self._results.state[rows.start : rows.stop].tolist()
            told = _STATE_WORDS if column.key == _STATE_COLUMN else ("",) * len(_STATE_WORDS)
            if column.gap_of:
                return self._gaps(column, rows, texts, states)
            return [
                Cell(text if state == _CURRENT else told[state], _STATE_LOOKS[state])
                for text, state in zip(texts, states, strict=True)
            ]
        if column.own:
            return [self._mark(column, row, text) for row, text in zip(rows, texts, strict=True)]
        look = Look.COMPUTED if column.field is None else Look.ENTRY
        return [Cell(text, look) for text in texts]

    def _gaps(self, column: Column, rows: range, texts: list[str], states: list[int]) -> list[Cell]:
        off = beyond(column.gap_of, self._slate, self._results, slice(rows.start, rows.stop)).tolist()
        return [
            Cell(text if state == _CURRENT else "", Look.BEYOND if gap and state == _CURRENT else _STATE_LOOKS[state])
            for text, state, gap in zip(texts, states, off, strict=True)
        ]

    def _mark(self, column: Column, row: int, text: str) -> Cell:
        assert column.field is not None
        own = getattr(self._slate.book.positions[row], column.field.key) is not None
        return Cell(text, Look.OWN if own else Look.MARKED)
