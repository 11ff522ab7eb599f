"""The slate: a book's positions as frozen NumPy columns, ready for formulas, stamped with the book's revision.

A slate follows the one before it: positions that are the same records under the same marks keep their numbers, only
the others are resolved anew. One edit in a book of 100,000 rows therefore costs one resolution and a copy.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from spreadgui.book.records import Book, Position
from spreadgui.market.contracts import Readiness, ResolvedPosition, Trouble, resolve
from spreadgui.market.quotes import Quotes

FloatArray = NDArray[np.float64]
RowArray = NDArray[np.intp]
CodeArray = NDArray[np.int8]

KINDS = ("call", "put", "forward")
INPUTS = (
    "quantity",  # signed: below zero for a position that the desk has sold
    "forward_long",
    "forward_short",
    "ratio_long",
    "ratio_short",
    "strike",
    "vol_long",
    "vol_short",
    "correlation",
    "years",
    "discount",
)
_INPUT_ROW = {key: row for row, key in enumerate(INPUTS)}
_NOT_KEPT = -1


@dataclass(frozen=True)
class Slate:
    """What the formulas need of each position. All arrays are read-only and have one entry a position.

    `inputs` has one line for each of INPUTS (NaN where a position has no such input), `kind` holds indices into
    KINDS, `shape` and `readiness` the codes of market.contracts. `troubles` tells why a row is not ready.
    """

    revision: int
    book: Book
    quotes: Quotes
    inputs: FloatArray
    kind: CodeArray
    shape: CodeArray
    readiness: CodeArray
    units: tuple[str, ...]
    troubles: Mapping[int, tuple[Trouble, ...]]

    def __len__(self) -> int:
        return len(self.units)

    def values(self, key: str) -> FloatArray:
        """The column of one of INPUTS."""
        column: FloatArray = self.inputs[_INPUT_ROW[key]]
        return column


@dataclass(frozen=True)
class Succession:
    """A slate and how its rows descend from the slate before: the old row of each new one, −1 where it is new."""

    slate: Slate
    old_rows: RowArray


def build_slate(book: Book, revision: int) -> Slate:
    """The slate of `book`, from nothing."""
    return follow(None, book, revision).slate


def follow(previous: Slate | None, book: Book, revision: int) -> Succession:
    """The slate of `book`, taking over from `previous` whatever still holds."""
    old_rows = _old_rows(previous, book)
    kept = np.flatnonzero(old_rows != _NOT_KEPT)
    count = len(book.positions)
    inputs, codes = np.empty((len(INPUTS), count)), np.empty((3, count), dtype=np.int8)
    units: list[str] = [""] * count
    troubles: dict[int, tuple[Trouble, ...]] = {}
    if previous is not None and kept.size:
        _take_over(previous, old_rows, kept, inputs, codes, units, troubles)
    quotes = previous.quotes if previous is not None and _same_marks(previous.book, book) else Quotes.of(book)
    for row in np.flatnonzero(old_rows == _NOT_KEPT).tolist():
        position = book.positions[row]
        resolved = resolve(position, quotes, book.valuation_date, book.zero_rate)
        inputs[:, row], codes[:, row] = _inputs_of(position, resolved), _codes_of(position, resolved)
        units[row] = resolved.unit
        if resolved.troubles:
            troubles[row] = tuple(resolved.troubles)
    for array in (inputs, codes, old_rows):
        array.setflags(write=False)
    slate = Slate(revision, book, quotes, inputs, codes[0], codes[1], codes[2], tuple(units), troubles)
    return Succession(slate, old_rows)


def _old_rows(previous: Slate | None, book: Book) -> RowArray:
    """For each position the row of `previous` that holds the same record under the same marks, or −1."""
    if previous is None or not _same_marks(previous.book, book):
        return np.full(len(book.positions), _NOT_KEPT, dtype=np.intp)
    return _rows_of_same_records(previous.book.positions, book.positions)


def _rows_of_same_records(old: Sequence[Position], new: Sequence[Position]) -> RowArray:
    row_of = {id(position): row for row, position in enumerate(old)}
    return np.array([row_of.get(id(position), _NOT_KEPT) for position in new], dtype=np.intp)


def _same_marks(old: Book, new: Book) -> bool:
    """Whether everything but the positions is the same, as far as a slate reads it."""
    return (
        old.markets is new.markets
        and old.correlations is new.correlations
        and old.valuation_date == new.valuation_date
        and old.zero_rate == new.zero_rate
        and old.method == new.method
    )


def _take_over(
    previous: Slate,
    old_rows: RowArray,
    kept: RowArray,
    inputs: FloatArray,
    codes: CodeArray,
    units: list[str],
    troubles: dict[int, tuple[Trouble, ...]],
) -> None:
    source = old_rows[kept]
    inputs[:, kept] = previous.inputs[:, source]
    for code, column in zip(codes, (previous.kind, previous.shape, previous.readiness), strict=True):
        code[kept] = column[source]
    for row, old_row in zip(kept.tolist(), source.tolist(), strict=True):
        units[row] = previous.units[old_row]
    if previous.troubles:
        for row, old_row in zip(kept.tolist(), source.tolist(), strict=True):
            if old_row in previous.troubles:
                troubles[row] = previous.troubles[old_row]


def _inputs_of(position: Position, resolved: ResolvedPosition) -> tuple[float, ...]:
    quantity = float("nan") if position.quantity is None else position.quantity
    return (
        quantity if position.side == "long" else -quantity,
        resolved.forward_long,
        resolved.forward_short,
        position.long_ratio,
        position.short_ratio,
        position.strike,
        resolved.vol_long,
        resolved.vol_short,
        resolved.correlation,
        resolved.years,
        resolved.discount,
    )


def _codes_of(position: Position, resolved: ResolvedPosition) -> tuple[int, int, int]:
    readiness = max((trouble.readiness for trouble in resolved.troubles), default=Readiness.READY)
    return KINDS.index(position.kind), resolved.shape, readiness
