"""Changes: every edit of a book is one small value that knows how to apply itself and what takes it back.

>>> from spreadgui.book.records import Book, Position
>>> import datetime
>>> book = Book(title="", currency="CRN", valuation_date=datetime.date(2026, 12, 1), positions=(Position("a"),))
>>> change = set_fields(book, {0: {"strike": 5.0}}, "set strike")
>>> change.apply(book).positions[0].strike, change.inverse().apply(change.apply(book)) == book
(5.0, True)
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Protocol

import msgspec

from spreadgui.book.records import Book, Market, Position


class Change(Protocol):
    """One edit. `words` names it for the undo list ("set strike of 3 rows")."""

    @property
    def words(self) -> str: ...

    def apply(self, book: Book) -> Book: ...

    def inverse(self) -> Change: ...


@dataclass(frozen=True)
class PositionsSet:
    """The positions at `rows` become `new`; they were `old`."""

    rows: tuple[int, ...]
    old: tuple[Position, ...]
    new: tuple[Position, ...]
    words: str

    def apply(self, book: Book) -> Book:
        positions = list(book.positions)
        for row, position in zip(self.rows, self.new, strict=True):
            positions[row] = position
        return msgspec.structs.replace(book, positions=tuple(positions))

    def inverse(self) -> PositionsSet:
        return PositionsSet(self.rows, self.new, self.old, self.words)


@dataclass(frozen=True)
class RowsInserted:
    """New positions, each coming to stand at its row of the book as it is afterwards; rows ascending."""

    rows: tuple[int, ...]
    positions: tuple[Position, ...]
    words: str

    def apply(self, book: Book) -> Book:
        positions = list(book.positions)
        for row, position in zip(self.rows, self.positions, strict=True):
            if not 0 <= row <= len(positions):
                raise IndexError(f"no position can come to stand at row {row} of {len(positions)}")
            positions.insert(row, position)
        return msgspec.structs.replace(book, positions=tuple(positions))

    def inverse(self) -> RowsRemoved:
        return RowsRemoved(self.rows, self.positions, self.words)


@dataclass(frozen=True)
class RowsRemoved:
    """The positions at `rows` (ascending) go."""

    rows: tuple[int, ...]
    positions: tuple[Position, ...]
    words: str

    def apply(self, book: Book) -> Book:
        gone = set(self.rows)
        if not gone <= set(range(len(book.positions))):
            raise IndexError(f"not all of the rows {self.rows} are among the book's {len(book.positions)}")
        kept = (position for row, position in enumerate(book.positions) if row not in gone)
        return msgspec.structs.replace(book, positions=tuple(kept))

    def inverse(self) -> RowsInserted:
        return RowsInserted(self.rows, self.positions, self.words)


@dataclass(frozen=True)
class BookSet:
    """One entry of the book itself (its title, day, method, the tuple of its markets) becomes another."""

    field: str
    old: Any
    new: Any
    words: str

    def apply(self, book: Book) -> Book:
        replacement: dict[str, Any] = {self.field: self.new}
        return msgspec.structs.replace(book, **replacement)

    def inverse(self) -> BookSet:
        return BookSet(self.field, self.new, self.old, self.words)


def set_fields(book: Book, cells: Mapping[int, Mapping[str, Any]], words: str) -> PositionsSet:
    """The change that sets fields of some rows: `cells` maps a row to its new field values."""
    rows = tuple(sorted(cells))
    old = tuple(book.positions[row] for row in rows)
    new = tuple(msgspec.structs.replace(before, **cells[row]) for row, before in zip(rows, old, strict=True))
    return PositionsSet(rows, old, new, words)


def insert_rows(book: Book, at: int, positions: Sequence[Position], words: str) -> RowsInserted:
    """The change that puts `positions` before row `at`; at the end where there is no such row."""
    at = min(at, len(book.positions))
    return RowsInserted(tuple(range(at, at + len(positions))), tuple(positions), words)


def remove_rows(book: Book, rows: Sequence[int], words: str) -> RowsRemoved:
    """The change that takes the positions at `rows` out."""
    ordered = tuple(sorted(set(rows)))
    return RowsRemoved(ordered, tuple(book.positions[row] for row in ordered), words)


def set_book(book: Book, field: str, new: Any, words: str) -> BookSet:
    """The change of one entry of the book itself."""
    return BookSet(field, getattr(book, field), new, words)


def set_market(book: Book, place: int, market: Market, words: str) -> BookSet:
    """The change that puts `market` in the place of the one that stands there; all others stay the same records."""
    markets = (*book.markets[:place], market, *book.markets[place + 1 :])
    return BookSet("markets", book.markets, markets, words)


def counted(words: str, rows: int) -> str:
    """`words` for one row, or with the number of rows where there are more."""
    return words if rows == 1 else f"{words} of {rows} rows"
