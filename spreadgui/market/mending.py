"""A change of a book's correlations to offer where they cannot exist together; nothing here changes a book.

While the check fails, the set of markets with the least eigenvalue is mended, in one of two ways:

- Where the markets' own matrix (one delivery) is none that can be, it gives way to the nearest that can, by Higham's
  method (`market.nearest`).
- Where it is one, the tie strengths are at odds with the correlations, and those of the markets at odds (of whom none
  can be spared) come down by the same share, to the largest multiple of 1e-4 at which their contracts can exist
  together. Being positive semi-definite does not carry over from markets to contracts (`market.tied`), while contracts
  of markets with no correlation always can be. This is one way of many and not the nearest; where tie strengths are far
  apart, or one of them zero, to bring those closer is the better mend, and it is the desk's to choose.

New correlations have four decimals, as a person would write them. What rounding may take from an eigenvalue of n
markets, at most (n − 1) half units of the last decimal, is given beforehand by the floor. An entry that would move by
less than that half unit stays as the book has it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from spreadgui.book.entries import shown
from spreadgui.book.records import Book, Correlation
from spreadgui.market.nearest import nearest_correlation
from spreadgui.market.tied import FloatArray, Members, Tied, contracts_in_use, largest_share
from spreadgui.market.together import Together, check_tied, complete_sets, without_the_spare

DECIMALS = 4
_HALF_UNIT = 0.5 * 10.0**-DECIMALS


@dataclass(frozen=True)
class Move:
    """One correlation of two markets, as the book has it and as it would be."""

    first: str
    second: str
    old: float
    new: float


@dataclass(frozen=True)
class Mend:
    """What would make a book's correlations possible: all its entries anew, and those that move.

    `correlations` are the book's entries in its order, the same objects where nothing moves; `moves` tell the others,
    in the same order. `before` and `after` are the checks without and with them.
    """

    correlations: tuple[Correlation, ...]
    moves: tuple[Move, ...]
    before: Together
    after: Together

    @property
    def sentence(self) -> str:
        """How many move and which the furthest; says so where none has to."""
        if not self.moves:
            return "no correlation has to move"
        most = max(self.moves, key=lambda move: abs(move.new - move.old))
        count = f"{len(self.moves)} of {len(self.correlations)} correlations would move, the furthest"
        return (
            f"{count if len(self.moves) > 1 else '1 correlation would move,'} that of {shown(most.first)} and "
            f"{shown(most.second)}, from {_figure(most.old)} to {_figure(most.new)}"
        )


def mended(book: Book, *, smallest_eigenvalue: float = 0.0, rounds: int = 30) -> Mend:
    """The change to offer for `book`, after which `together.check` passes; none where it passes already.

    `smallest_eigenvalue`, from 0 to 0.5, is the least that the markets' own matrix shall have where Higham's method is
    used; a larger one takes the correlations further from the brink, and moves them more. Only correlations between
    markets whose contracts positions name can move. An entry that the book has twice for a pair is left alone. Sets of
    markets may share pairs, and what mends one may spoil another: after so many `rounds` all correlations that are left
    come down by the same share.

    Raises ValueError, naming the argument, for a `smallest_eigenvalue` out of its range and for `rounds` below 0.

    >>> import datetime
    >>> from spreadgui.book.records import Market, Position
    >>> names = ("North", "South", "Quill")
    >>> book = Book(title="", currency="CRN", valuation_date=datetime.date(2026, 12, 1),
    ...     markets=tuple(Market(name, "CRN/MWh") for name in names),
    ...     correlations=(Correlation("North", "South", 1.0), Correlation("South", "Quill", 1.0),
    ...         Correlation("North", "Quill", 0.0)),
    ...     positions=tuple(Position(long_leg=name, long_delivery="2027-01") for name in names))
    >>> [(move.first, move.second, move.old, move.new) for move in mended(book).moves]
    [('North', 'South', 1.0, 0.7606), ('South', 'Quill', 1.0, 0.7606), ('North', 'Quill', 0.0, 0.1574)]
    """
    if not 0.0 <= smallest_eigenvalue <= 0.5:
        raise ValueError(f"smallest_eigenvalue: expected a number from 0 to 0.5, found {smallest_eigenvalue:g}")
    if rounds < 0:
        raise ValueError(f"rounds: expected zero or more, found {rounds}")
    tied = Tied.of(book, contracts_in_use(book))
    before = check_tied(tied)
    between = tied.between if before.possible else _possible(tied, smallest_eigenvalue, rounds).between
    entries = tuple(_entry(pair, tied, between) for pair in book.correlations)
    moves = tuple(
        Move(old.first, old.second, old.correlation, new.correlation)
        for old, new in zip(book.correlations, entries, strict=True)
        if new is not old
    )
    return Mend(entries, moves, before, check_tied(tied.with_between(between)) if moves else before)


def _possible(given: Tied, smallest_eigenvalue: float, rounds: int) -> Tied:
    """`given` with correlations that can exist together; at the latest they do where all are zero."""
    tied = given.with_between(np.clip(given.between, -1.0, 1.0))
    sets = complete_sets(tied)
    for _ in range(rounds):
        worst = min(sets, key=tied.eigenvalue)
        if tied.holds(worst):
            return tied
        tied = _step(tied, given, worst, smallest_eigenvalue)
    return _down(tied, tuple(range(len(tied.markets))))


def _step(tied: Tied, given: Tied, worst: Members, smallest_eigenvalue: float) -> Tied:
    cells = np.ix_(worst, worst)
    if float(np.linalg.eigvalsh(tied.between[cells])[0]) >= -tied.tolerance:
        return _down(tied, without_the_spare(tied, worst))
    floor = smallest_eigenvalue + len(worst) * _HALF_UNIT
    nearest = nearest_correlation(tied.between[cells], smallest_eigenvalue=floor).matrix
    between = tied.between.copy()
    between[cells] = _written(nearest, given.between[cells])
    return tied.with_between(between)


def _written(between: FloatArray, given: FloatArray) -> FloatArray:
    """Rounded, and as `given` where that is as near as rounding would be."""
    as_given = (np.abs(between - given) <= _HALF_UNIT) & (np.abs(given) <= 1.0)
    return np.where(as_given, given, np.round(between, DECIMALS) + 0.0)


def _down(tied: Tied, members: Members) -> Tied:
    """All correlations between `members` brought down by the same share, as far as their contracts need."""
    sets = [tuple(place for place in one if place in members) for one in complete_sets(tied)]
    share = largest_share(lambda share: all(_cut(tied, members, share).holds(one) for one in sets if one))
    return _cut(tied, members, share)


def _cut(tied: Tied, members: Members, share: float) -> Tied:
    """As `Tied.shrunk`, with decimals beyond the last dropped: rounding must not take them up again."""
    shrunk = tied.shrunk(members, share)
    units = np.trunc(np.round(shrunk.between * 10.0**DECIMALS, 6))
    cells = np.ix_(members, members)
    between = shrunk.between.copy()
    between[cells] = (units / 10.0**DECIMALS + 0.0)[cells]
    return shrunk.with_between(between)


def _entry(pair: Correlation, tied: Tied, between: FloatArray) -> Correlation:
    """The book's entry, or a new one where it moves."""
    if pair.first == pair.second or not {pair.first, pair.second} <= set(tied.markets):
        return pair
    new = float(between[tied.markets.index(pair.first), tied.markets.index(pair.second)])
    return pair if np.isnan(new) or new == pair.correlation else Correlation(pair.first, pair.second, new)


def _figure(value: float) -> str:
    return f"{value:.{DECIMALS + 2}g}".replace("-", "−")
