"""The correlations of all contracts of a book in one matrix, and whether they can exist together.

Each correlation of two contracts is the markets' times exp(−mean tie strength · years apart). A matrix of such numbers,
each of them sensible, need not be one that any prices could show: it has to be positive semi-definite, else some mix of
the contracts would have a variance below zero. There are two ways to miss that:

- The markets' own matrix (one delivery) is none: A and B at 0.9, B and C at 0.9, A and C at −0.5.
- The markets' matrix is one, and tie strengths are too unlike. The factors exp(−mean tie strength · years apart) are
  positive semi-definite of themselves only where all tie strengths are the same, so the product rule does not carry the
  property over from markets to contracts. Two markets with tie strengths a and b bear correlations up to
  sqrt(a b (3 a + b) (a + 3 b)) / (a + b)² whatever the deliveries, and little beyond where these are many and close:
  0.95 where one is twice the other, 0.52 where it is ten times. (From the spectral densities of the three decays; own
  derivation, measured in tests/market/test_tied.py.) With a = 0, where all deliveries of one market are as good as one
  contract, and b > 0, they bear none.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from spreadgui.book.entries import is_delivery
from spreadgui.book.records import Book
from spreadgui.market.quotes import Quotes, UnknownMarkError
from spreadgui.market.time import delivery_years_apart

FloatArray = NDArray[np.float64]
Members = tuple[int, ...]
Contract = tuple[str, str]
"""A market's name and a delivery month."""

_EPOCH = "0001-01"
_STEPS = 10_000


def contracts_in_use(book: Book) -> tuple[Contract, ...]:
    """The contracts that legs of the positions name, alone or in a blend, in the order of the book's markets, then by
    delivery.

    A leg whose market the book has not exactly once, or with a tie strength that is none, or whose delivery is no
    month, names no contract; `market.check.faults_of` says why.

    >>> import datetime
    >>> from spreadgui.book.records import Market, Position
    >>> book = Book(title="", currency="CRN", valuation_date=datetime.date(2026, 12, 1),
    ...     markets=(Market("Power", "CRN/MWh"), Market("Gas", "CRN/GJ")),
    ...     positions=(Position(long_leg="Gas", long_delivery="2027-02", short_leg="Power", short_delivery="2027-01"),))
    >>> contracts_in_use(book)
    (('Power', '2027-01'), ('Gas', '2027-02'))
    """
    named_by_legs = {(one.long_leg, one.long_delivery) for one in book.positions}
    named_by_legs |= {(one.short_leg, one.short_delivery) for one in book.positions}
    parts = {blend.name: [part.market for part in blend.parts] for blend in book.blends}
    legs = {(market, month) for leg, month in named_by_legs for market in parts.get(leg, [leg])}
    quotes, place = Quotes.of(book), {market.name: index for index, market in enumerate(book.markets)}
    named = [(leg, month) for leg, month in legs if is_delivery(month) and np.isfinite(_tie_strength(quotes, leg))]
    return tuple(sorted(named, key=lambda contract: (place[contract[0]], contract[1])))


def matrix_of(marks: Book | Quotes, contracts: Sequence[Contract]) -> FloatArray:
    """The correlations of `contracts`, n by n, as decimals, each as `Quotes.correlation` has it.

    NaN where the book has none: the markets have not exactly one correlation, one of them is not there exactly once or
    has a tie strength that is none, or a delivery is no month.
    """
    return Tied.of(marks, contracts).matrix()


@dataclass(frozen=True)
class Tied:
    """Contracts by market, and the two factors of their correlations. `owner` has a contract's market by its place in
    `markets`, `between` (markets by markets) the markets' correlations, `decay` (contracts by contracts) the tie."""

    contracts: tuple[Contract, ...]
    markets: tuple[str, ...]
    tie_strengths: tuple[float, ...]
    owner: NDArray[np.intp]
    between: FloatArray
    decay: FloatArray

    @staticmethod
    def of(marks: Book | Quotes, contracts: Sequence[Contract]) -> Tied:
        """The contracts' correlations as the marks have them, NaN where there is none."""
        quotes = Quotes.of(marks) if isinstance(marks, Book) else marks
        markets = tuple(dict.fromkeys(name for name, _ in contracts))
        place = {name: index for index, name in enumerate(markets)}
        owner = np.array([place[name] for name, _ in contracts], dtype=np.intp)
        ties = tuple(_tie_strength(quotes, name) for name in markets)
        months = np.array([_months(month) for _, month in contracts], dtype=np.float64)
        half = 0.5 * (np.abs(months[:, None] - months) / 12.0)
        strength = np.array(ties, dtype=np.float64)[owner]
        decay = np.exp(-half * strength[:, None] - half * strength)
        return Tied(tuple(contracts), markets, ties, owner, _between(quotes, markets), decay)

    def matrix(self, members: Members | None = None) -> FloatArray:
        """The correlations of all contracts, or of those of the markets at the places `members`."""
        every = np.arange(len(self.owner))
        taken = every if members is None else every[np.isin(self.owner, members)]
        owner = self.owner[taken]
        return np.asarray(self.between[np.ix_(owner, owner)] * self.decay[np.ix_(taken, taken)])

    def with_between(self, between: FloatArray) -> Tied:
        """The same contracts with other correlations of the markets."""
        return replace(self, between=between)

    def shrunk(self, members: Members, share: float) -> Tied:
        """With the correlations between any two of the markets at `members` cut down to a `share` of theirs."""
        between, cells = self.between.copy(), np.ix_(members, members)
        kept = np.where(np.eye(len(members), dtype=np.bool_), 1.0, share)
        between[cells] = between[cells] * kept
        return self.with_between(between)

    def eigenvalue(self, members: Members) -> float:
        """The smallest eigenvalue of the contracts of the markets at `members`, whose pairs all have a correlation."""
        return float(np.linalg.eigvalsh(self.matrix(members))[0])

    def holds(self, members: Members) -> bool:
        """Whether the contracts of these markets can exist together, to rounding."""
        return self.eigenvalue(members) >= -self.tolerance

    @property
    def tolerance(self) -> float:
        """How far below zero an eigenvalue counts as zero: 1e-12 for each contract. What rounding leaves of a zero was
        at most 3e-15 for each (measured on singular matrices of up to 300), and a correlation too large by 1e-4 shows
        with some 1e-9 even where the tie strengths leave no room at all."""
        return 1e-12 * max(len(self.contracts), 1)


def largest_share(holds: Callable[[float], bool]) -> float:
    """The largest multiple of 1e-4 from 0 to 1 at which something `holds` that does at 0, and ceases to once only.

    >>> largest_share(lambda share: share <= 0.5 ** 0.5)
    0.7071
    """
    low, high = 0, _STEPS + 1
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (middle, high) if holds(middle / _STEPS) else (low, middle)
    return low / _STEPS


def _between(quotes: Quotes, markets: tuple[str, ...]) -> FloatArray:
    found = np.array([[_correlation(quotes, one, other) for other in markets] for one in markets], dtype=np.float64)
    return found.reshape(len(markets), len(markets))


def _correlation(quotes: Quotes, first: str, second: str) -> float:
    if not (np.isfinite(_tie_strength(quotes, first)) and np.isfinite(_tie_strength(quotes, second))):
        return np.nan
    try:
        return quotes.correlation(first, "", second, "")
    except UnknownMarkError:
        return np.nan


def _tie_strength(quotes: Quotes, name: str) -> float:
    """NaN where there is none that correlations could decay by."""
    try:
        strength = quotes.market(name).tie_strength
    except UnknownMarkError:
        return np.nan
    return strength if 0.0 <= strength < np.inf else np.nan


def _months(delivery: str) -> float:
    """A month's number, whole so that differences are exact; NaN for what is no month."""
    return round(12.0 * delivery_years_apart(delivery, _EPOCH)) if is_delivery(delivery) else np.nan
