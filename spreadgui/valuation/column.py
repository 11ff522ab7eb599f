"""What a column is, and its cells as texts for files and for screens."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from spreadgui.book.fields import Field
from spreadgui.market.contracts import Law
from spreadgui.valuation.results import LiveResults
from spreadgui.valuation.shown import trimmed_text
from spreadgui.valuation.slate import FloatArray, RowArray, Slate

Rows = slice | RowArray
Numbers = Callable[[Slate, LiveResults, Rows], FloatArray]
Words = Callable[[Slate, LiveResults, int], str]
ALL_ROWS = slice(None)


@dataclass(frozen=True)
class Column:
    """One column. Exactly one of `numbers` (some rows at once, code units) and `words` (one cell) reads it.

    On screens a number is multiplied by `scale` and shown with `decimals` (at least `least_decimals` where those
    differ). A column with a `vol_of` speaks of that leg's volatility: where the forwards of a row are normal that is an
    amount in the market's unit, and shown as it is. One with a `gap_of` tells that method's formula gap. `computed`
    columns show the state of their row when it is not current. `own` columns show what the row uses and, typed into,
    set the row's own mark.
    """

    key: str
    heading: str
    help: str
    unit: str = ""
    field: Field | None = None
    numbers: Numbers | None = None
    words: Words | None = None
    scale: float = 1.0
    decimals: int = 2
    least_decimals: int | None = None
    computed: bool = False
    pinned: bool = False
    on_screen: bool = True
    vol_of: str = ""
    gap_of: str = ""

    @property
    def numeric(self) -> bool:
        return self.numbers is not None

    @property
    def own(self) -> bool:
        """Whether typing into the column sets an own mark that wins over the book's."""
        return self.field is not None and self.field.key.startswith("own_")

    def scale_at(self, slate: Slate, row: int) -> float:
        """What a number of this column is multiplied by on screens, in one row."""
        return 1.0 if self.vol_of and slate.law[row] == Law.NORMAL else self.scale

    def shown(self, value: float, scale: float | None = None) -> str:
        """A number of this column as the screen writes it."""
        least = self.decimals if self.least_decimals is None else self.least_decimals
        return trimmed_text(value * (self.scale if scale is None else scale), self.decimals, least)


def exact_texts(column: Column, slate: Slate, results: LiveResults, rows: range) -> list[str]:
    """The cells of `rows` for files: numbers in code units to the last digit, empty where there is none."""
    if column.numbers is None:
        return _words_of(column, slate, results, rows)
    numbers = column.numbers(slate, results, slice(rows.start, rows.stop)).tolist()
    return [repr(number) if math.isfinite(number) else "" for number in numbers]


def screen_texts(column: Column, slate: Slate, results: LiveResults, rows: range) -> list[str]:
    """The cells of `rows` for screens; one without a number is empty, its state being told beside it."""
    if column.numbers is None:
        return _words_of(column, slate, results, rows)
    numbers = column.numbers(slate, results, slice(rows.start, rows.stop)).tolist()
    return [_shown(column, slate, number, row) for number, row in zip(numbers, rows, strict=True)]


def _shown(column: Column, slate: Slate, number: float, row: int) -> str:
    """A number on the screen; an absolute volatility, or what goes by one, says so among others in per cent."""
    text = column.shown(number, column.scale_at(slate, row))
    return f"{text} abs." if text and column.vol_of and slate.law[row] == Law.NORMAL else text


def _words_of(column: Column, slate: Slate, results: LiveResults, rows: range) -> list[str]:
    assert column.words is not None
    return [column.words(slate, results, row) for row in rows]
