"""The slate: a book's positions as frozen NumPy columns, ready for formulas, stamped with the book's revision.

A slate follows the one before it: positions that are the same records under the same marks keep their numbers, only
the others are resolved anew. One edit in a book of 100,000 rows therefore costs one resolution and a copy.
"""

from __future__ import annotations

import math
import operator
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from spreadgui.book.records import Book, Position
from spreadgui.market.contracts import Readiness, ResolvedPosition, Trouble, resolve
from spreadgui.market.many import resolve_many
from spreadgui.market.quotes import Quotes
from spreadgui.market.strips import Strip
from spreadgui.market.touched import all_alike, touches
from spreadgui.market.zero_rates import ZeroRates

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
    "shift_long",
    "shift_short",
    "rate",
    "correlation_error",
    "quoted_premium",
)
_INPUT_ROW = {key: row for row, key in enumerate(INPUTS)}
_NOT_KEPT = -1
# From so many new rows on it pays to look each contract up once and to do the rest by columns.
MANY = 32


@dataclass(frozen=True)
class Slate:
    """What the formulas need of each position. All arrays are read-only and have one entry a position.

    `inputs` has one line for each of INPUTS (NaN where a position has no such input), `kind` holds indices into
    KINDS, `shape`, `law` and `readiness` the codes of market.contracts. `strips` has the exercises of each row that has
    more than one. `troubles` tells why a row is not ready.
    """

    revision: int
    book: Book
    quotes: Quotes
    inputs: FloatArray
    kind: CodeArray
    shape: CodeArray
    law: CodeArray
    readiness: CodeArray
    units: tuple[str, ...]
    strips: Mapping[int, Strip]
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
    columns = _Columns.taken_over(previous, old_rows)
    quotes = previous.quotes if previous is not None and _same_quotes(previous.book, book) else Quotes.of(book)
    fresh = np.flatnonzero(old_rows == _NOT_KEPT)
    rates = ZeroRates.of(book)
    left = columns.put_many(fresh, book, quotes, rates) if len(fresh) >= MANY else fresh
    for row in left.tolist():
        position = book.positions[row]
        columns.put(row, position, resolve(position, quotes, book.valuation_date, rates))
    old_rows.setflags(write=False)
    return Succession(columns.slate(revision, book, quotes), old_rows)


def _old_rows(previous: Slate | None, book: Book) -> RowArray:
    """For each position the row of `previous` that holds the same record, if no mark of it is another; or −1."""
    if previous is None or not all_alike(previous.book, book):
        return np.full(len(book.positions), _NOT_KEPT, dtype=np.intp)
    rows = _rows_of_same_records(previous.book.positions, book.positions)
    if not _same_quotes(previous.book, book):
        touched = touches(previous.book, book)
        moved = np.fromiter(map(touched, book.positions), dtype=np.bool_, count=len(book.positions))
        rows[moved] = _NOT_KEPT
    return rows


def _rows_of_same_records(old: Sequence[Position], new: Sequence[Position]) -> RowArray:
    if len(old) == len(new):  # an edit: nearly all stand where they stood, which costs a tenth of looking them up
        same = np.fromiter(map(operator.is_, old, new), dtype=np.bool_, count=len(new))
        if not same.all() and len(new) - np.count_nonzero(same) <= len(new) // 8 + 1:
            strangers = _found({id(old[row]): row for row in np.flatnonzero(~same).tolist()}, new, same)
            return np.where(same, np.arange(len(new)), strangers)
        if same.all():
            return np.arange(len(new))
    row_of = {id(position): row for row, position in enumerate(old)}
    return np.array([row_of.get(id(position), _NOT_KEPT) for position in new], dtype=np.intp)


def _found(row_of: Mapping[int, int], new: Sequence[Position], same: NDArray[np.bool_]) -> RowArray:
    """Where the records that do not stand where they stood come from."""
    rows = np.full(len(new), _NOT_KEPT, dtype=np.intp)
    for row in np.flatnonzero(~same).tolist():
        rows[row] = row_of.get(id(new[row]), _NOT_KEPT)
    return rows


def _same_quotes(old: Book, new: Book) -> bool:
    """Whether what is looked up for a position stands in the same records."""
    return old.markets is new.markets and old.correlations is new.correlations and old.blends is new.blends


@dataclass
class _Columns:
    """The columns of a slate while it is being made."""

    inputs: FloatArray
    codes: CodeArray  # kind, shape, law, readiness
    units: list[str]
    strips: dict[int, Strip]
    troubles: dict[int, tuple[Trouble, ...]]

    @staticmethod
    def taken_over(previous: Slate | None, old_rows: RowArray) -> _Columns:
        """Filled where a row descends from one of `previous`, and open elsewhere."""
        count = len(old_rows)
        columns = _Columns(np.empty((len(INPUTS), count)), np.empty((4, count), dtype=np.int8), [""] * count, {}, {})
        kept = np.flatnonzero(old_rows != _NOT_KEPT)
        if previous is None or not kept.size:
            return columns
        source = old_rows[kept]
        codes = (previous.kind, previous.shape, previous.law, previous.readiness)
        if len(previous) == count and np.array_equal(source, kept):  # all in place: copy whole columns
            columns.inputs[...] = previous.inputs
            columns.codes[...] = codes
            columns.units = list(previous.units)
        else:
            columns.inputs[:, kept] = previous.inputs[:, source]
            columns.codes[:, kept] = np.stack(codes)[:, source]
            for row, old_row in zip(kept.tolist(), source.tolist(), strict=True):
                columns.units[row] = previous.units[old_row]
        new_rows = _descendants(old_rows, [*previous.strips, *previous.troubles])
        columns.strips = {row: strip for old, strip in previous.strips.items() for row in new_rows.get(old, ())}
        columns.troubles = {row: told for old, told in previous.troubles.items() for row in new_rows.get(old, ())}
        return columns

    def put_many(self, rows: RowArray, book: Book, quotes: Quotes, rates: ZeroRates) -> RowArray:
        """The positions at `rows` that can be resolved by columns; gives the rows that are left."""
        positions = [book.positions[row] for row in rows.tolist()]
        many = resolve_many(positions, quotes, book.valuation_date, rates)
        plain = np.flatnonzero(many.plain)
        chosen, some = rows[plain], [positions[place] for place in plain.tolist()]
        for line, key in enumerate(INPUTS):
            column = many.numbers[key][plain] if key in many.numbers else _typed_column(some, key)
            self.inputs[line, chosen] = column
        kinds = np.array([KINDS.index(position.kind) for position in some], dtype=np.int8)
        ready = np.full(len(some), Readiness.READY, dtype=np.int8)
        self.codes[:, chosen] = np.stack([kinds, many.shape[plain], many.law[plain], ready])
        for row, place in zip(chosen.tolist(), plain.tolist(), strict=True):
            self.units[row] = many.units[place]
        return rows[~many.plain]

    def put(self, row: int, position: Position, resolved: ResolvedPosition) -> None:
        """A position that has just been resolved."""
        self.inputs[:, row], self.codes[:, row] = _inputs_of(position, resolved), _codes_of(position, resolved)
        self.units[row] = resolved.unit
        if resolved.strip is not None:
            self.strips[row] = resolved.strip
        if resolved.troubles:
            self.troubles[row] = tuple(resolved.troubles)

    def slate(self, revision: int, book: Book, quotes: Quotes) -> Slate:
        """What has been gathered, closed to changes."""
        for array in (self.inputs, self.codes):
            array.setflags(write=False)
        kind, shape, law, readiness = self.codes
        told = (tuple(self.units), self.strips, self.troubles)
        return Slate(revision, book, quotes, self.inputs, kind, shape, law, readiness, *told)


def _descendants(old_rows: RowArray, of: Sequence[int]) -> dict[int, list[int]]:
    """The new rows that descend from each of the old rows `of`."""
    found: dict[int, list[int]] = {}
    for row in np.flatnonzero(np.isin(old_rows, of)).tolist() if of else ():
        found.setdefault(int(old_rows[row]), []).append(row)
    return found


def _typed_column(positions: Sequence[Position], key: str) -> FloatArray:
    """One of INPUTS that stands in the positions themselves."""
    if key == "quantity":
        return np.array([one.quantity if one.side == "long" else -(one.quantity or 0.0) for one in positions])
    field = {"ratio_long": "long_ratio", "ratio_short": "short_ratio"}.get(key, key)
    return np.array([getattr(position, field) for position in positions], dtype=np.float64)


def _inputs_of(position: Position, resolved: ResolvedPosition) -> tuple[float, ...]:
    quantity = math.nan if position.quantity is None else position.quantity
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
        resolved.shift_long,
        resolved.shift_short,
        resolved.rate,
        resolved.correlation_error,
        math.nan if position.quoted_premium is None else position.quoted_premium,
    )


def _codes_of(position: Position, resolved: ResolvedPosition) -> tuple[int, int, int, int]:
    readiness = max((trouble.readiness for trouble in resolved.troubles), default=Readiness.READY)
    return KINDS.index(position.kind), resolved.shape, resolved.law, readiness
