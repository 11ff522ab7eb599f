"""Whether a book's correlations can exist together, and which markets are at odds where they cannot.

What cannot be is told of the markets that alone are enough to make it so. Where the book lacks the correlation of two
markets, which it may where no position needs it, their contracts cannot be checked in one matrix; then every largest
set of markets that has all its correlations is checked for itself. If they all pass, the missing correlations could
still be such that nothing fits them (R. Grone, C. R. Johnson, E. M. Sa and H. Wolkowicz, "Positive definite completions
of partial Hermitian matrices", Linear Algebra and its Applications 58 (1984) 109-124; cited from memory).
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass

import numpy as np

from spreadgui.book.entries import shown
from spreadgui.book.records import Book
from spreadgui.market.tied import Contract, FloatArray, Members, Tied, contracts_in_use, largest_share

LARGEST_SET_SEARCHED = 4
_MOST_SETS_SEARCHED = 5_000
_MOST_SETS_CHECKED = 200
_MOST_NAMES = 6


@dataclass(frozen=True)
class Together:
    """What the check of a book's correlations found.

    `smallest_eigenvalue` is the least of all sets checked (1 where the book uses no contract), and `possible` whether
    it is not below zero by more than `tolerance`. Where it is, `offenders` are the markets at odds and `sentence` says
    why; else both are empty. `checked` are the sets of markets that were checked, each complete; `missing` the pairs of
    markets in use that the book has no (or more than one) correlation of.
    """

    contracts: tuple[Contract, ...]
    smallest_eigenvalue: float
    tolerance: float
    possible: bool
    offenders: tuple[str, ...]
    sentence: str
    checked: tuple[tuple[str, ...], ...]
    missing: tuple[tuple[str, str], ...]

    @property
    def remark(self) -> str:
        """What could not be checked, as a sentence; empty where all was."""
        if not self.missing:
            return ""
        pairs = [f"{shown(first)} with {shown(second)}" for first, second in self.missing]
        return f"not checked, for want of a correlation: {_listed(pairs)}"


def check(book: Book) -> Together:
    """Whether the correlations of all contracts in use by `book` can exist together.

    `offenders` are found in the set of markets with the least eigenvalue. From it one market after another is left out
    while the rest still cannot be, those first that weigh least in the eigenvector; of what remains none can be spared.
    Then all smaller sets of at most LARGEST_SET_SEARCHED markets are searched, size by size while a size has no more
    than 5,000 sets, so that up to that size there is no smaller set of offenders. A position's own correlation is its
    row's affair and not looked at. Of the sets with all correlations the first 200 are checked, far beyond any desk.

    >>> import datetime
    >>> from spreadgui.book.records import Correlation, Market, Position
    >>> names = ("North", "South", "Quill")
    >>> book = Book(title="", currency="CRN", valuation_date=datetime.date(2026, 12, 1),
    ...     markets=tuple(Market(name, "CRN/MWh") for name in names),
    ...     correlations=(Correlation("North", "South", 0.9), Correlation("South", "Quill", 0.9),
    ...         Correlation("North", "Quill", -0.5)),
    ...     positions=tuple(Position(long_leg=name, long_delivery="2027-01") for name in names))
    >>> print(check(book).sentence)
    the correlations of North, South and Quill cannot exist together: with 0.9 between North and South and −0.5 \
between North and Quill, that of South and Quill has to be from −0.827 to −0.073, and the book has 0.9
    """
    return check_tied(Tied.of(book, contracts_in_use(book)))


def check_tied(tied: Tied) -> Together:
    """`check` for contracts whose correlations are at hand; those of a market without a tie strength are left out."""
    sets = complete_sets(tied)
    lowest, worst = min(((tied.eigenvalue(members), members) for members in sets), default=(1.0, ()))
    possible = lowest >= -tied.tolerance
    offenders = () if possible else offending(tied, worst)
    known = np.isfinite(tied.between)
    missing = [pair for pair in itertools.combinations(range(len(tied.markets)), 2) if not known[pair]]
    return Together(
        tied.contracts,
        lowest,
        tied.tolerance,
        possible,
        _names(tied, offenders),
        _why(tied, offenders) if offenders else "",
        tuple(_names(tied, members) for members in sets),
        tuple((tied.markets[first], tied.markets[second]) for first, second in missing),
    )


def complete_sets(tied: Tied) -> list[Members]:
    """The sets of markets that have all their correlations and that no other market could join, at most 200.

    C. Bron and J. Kerbosch, "Algorithm 457: finding all cliques of an undirected graph", Communications of the ACM 16
    (1973) 575-577, with a pivot, and a stack in place of the recursion.
    """
    known = np.isfinite(tied.between)
    beside = [set(np.flatnonzero(row).tolist()) - {place} for place, row in enumerate(known)]
    start = {place for place in range(len(known)) if known[place, place]}
    stack: list[tuple[set[int], set[int], set[int]]] = [(set(), start, set())] if start else []
    found: list[Members] = []
    while stack and len(found) < _MOST_SETS_CHECKED:
        chosen, free, done = stack.pop()
        if not free and not done:
            found.append(tuple(sorted(chosen)))
            continue
        pivot = max(sorted(free | done), key=lambda place: len(beside[place] & free))
        for place in sorted(free - beside[pivot]):
            stack.append((chosen | {place}, free & beside[place], done & beside[place]))
            free, done = free - {place}, done | {place}
    return sorted(found, key=lambda members: (-len(members), members))


def offending(tied: Tied, members: Members) -> Members:
    """The fewest of `members`, which cannot exist together, that cannot already, as told in `check`."""
    spare = without_the_spare(tied, members)
    for size in range(2, min(len(spare), LARGEST_SET_SEARCHED + 1)):
        if math.comb(len(members), size) > _MOST_SETS_SEARCHED:
            break
        failing = [some for some in itertools.combinations(members, size) if not tied.holds(some)]
        if failing:
            return min(failing, key=tied.eigenvalue)
    return spare


def without_the_spare(tied: Tied, members: Members) -> Members:
    """Of `members`, which cannot exist together, some of whom none can be spared for that; found by leaving out one
    after another, those first that weigh least in the eigenvector."""
    _, vectors = np.linalg.eigh(tied.matrix(members))
    owner = tied.owner[np.isin(tied.owner, members)]
    weight = {place: float(np.sum(vectors[owner == place, 0] ** 2)) for place in members}
    kept = members
    for place in sorted(members, key=lambda place: weight[place]):
        fewer = tuple(other for other in kept if other != place)
        if fewer and not tied.holds(fewer):
            kept = fewer
    return kept


def _why(tied: Tied, offenders: Members) -> str:
    names = [shown(name) for name in _names(tied, offenders)]
    between = tied.between[np.ix_(offenders, offenders)]
    if np.max(np.abs(between)) > 1.0:
        first, second = divmod(int(np.argmax(np.abs(between))), len(names))
        most = _figure(between[first, second])
        return f"the correlation of {names[first]} and {names[second]} is {most}, beyond 1 or −1"
    if len(offenders) == 2:
        return _of_two(tied, offenders, float(between[0, 1]))
    return f"the correlations of {_listed(names)} cannot exist together: {_reason(tied, offenders, between, names)}"


def _of_two(tied: Tied, offenders: Members, held: float) -> str:
    """Two markets are at odds only through their tie strengths: what these leave to their correlation."""
    share = largest_share(lambda share: tied.shrunk(offenders, share).holds(offenders))
    most = _figure(share * abs(held), math.floor)
    room = f"cannot be beyond {most} or −{most}" if most != "0" else "has to be 0"
    return (
        f"the correlation of {_listed([shown(name) for name in _names(tied, offenders)])} cannot hold across the "
        f"deliveries in use: with tie strengths of {_ties(tied, offenders)} it {room}, and the book has {_figure(held)}"
    )


def _reason(tied: Tied, offenders: Members, between: FloatArray, names: list[str]) -> str:
    impossible = float(np.linalg.eigvalsh(between)[0]) < -tied.tolerance
    if impossible and len(offenders) == 3:
        return _third_of_three(between, names)
    if impossible:
        return f"a mix of the {len(names)} would have a variance below zero, so at least one of them has to move"
    share = largest_share(lambda share: tied.shrunk(offenders, share).holds(offenders))
    return (
        f"for one delivery they could, but not with tie strengths of {_ties(tied, offenders)} across the deliveries in "
        f"use, unless they came down to {_figure(100.0 * share, math.floor)} % of what they are or the tie strengths "
        f"were more alike"
    )


def _ties(tied: Tied, members: Members) -> str:
    return _listed([f"{tied.tie_strengths[place]:g}" for place in members])


def _third_of_three(between: FloatArray, names: list[str]) -> str:
    """The pair that would have to move least, and the range that the other two leave it: x y ± sqrt((1 − x²)(1 − y²)),
    from the determinant."""
    options = []
    for pivot, first, second in ((0, 1, 2), (1, 0, 2), (2, 0, 1)):
        one, other = float(between[pivot, first]), float(between[pivot, second])
        half = math.sqrt((1.0 - one * one) * (1.0 - other * other))
        low, high, held = one * other - half, one * other + half, float(between[first, second])
        options.append((max(low - held, held - high), pivot, first, second, low, high))
    _, pivot, first, second, low, high = min(options)
    return (
        f"with {_figure(between[pivot, first])} between {names[pivot]} and {names[first]} and "
        f"{_figure(between[pivot, second])} between {names[pivot]} and {names[second]}, that of {names[first]} and "
        f"{names[second]} has to be from {_figure(low, math.ceil)} to {_figure(high, math.floor)}, and the book has "
        f"{_figure(between[first, second])}"
    )


def _names(tied: Tied, members: Iterable[int]) -> tuple[str, ...]:
    return tuple(tied.markets[place] for place in members)


def _listed(names: list[str]) -> str:
    if len(names) > _MOST_NAMES:
        return f"{', '.join(names[: _MOST_NAMES - 1])} and {len(names) - _MOST_NAMES + 1} others"
    return " and ".join([", ".join(names[:-1]), names[-1]] if len(names) > 1 else names)


def _figure(value: float, rounded: Callable[[float], float] = round) -> str:
    """To three decimals; a bound is `rounded` to its own side, so that the figure that is read keeps it."""
    return f"{rounded(1000.0 * value) / 1000.0:g}".replace("-", "−")
