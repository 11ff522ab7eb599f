"""The marks of a book, looked up: what does this contract stand at, and how do two of them move together."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field

from spreadgui.book.entries import is_delivery, quoted, shown
from spreadgui.book.records import Blend, Book, Mark, Market
from spreadgui.market.time import delivery_years_apart

Contract = tuple[str, str]
"""A market or blend, and a delivery month."""


class UnknownMarkError(LookupError):
    """The book says nothing of a contract or a pair; `missing` tells a gap to fill from a mistake to mend."""

    def __init__(self, sentence: str, *, missing: bool = False) -> None:
        super().__init__(sentence)
        self.missing = missing


@dataclass(frozen=True)
class Quotes:
    """The marks of one book, indexed. Build it anew when the marks change; it never follows them."""

    _markets: dict[str, Market]
    _marks: dict[str, dict[str, Mark]]
    _correlations: dict[frozenset[str], float]
    _twice: frozenset[str]
    _marks_twice: frozenset[tuple[str, str]]
    _pairs_twice: frozenset[frozenset[str]]
    _blends: Mapping[str, Blend] = field(default_factory=dict)
    # What blends have been matched to (market.blends), and why some could not be.
    _broken: Mapping[str, UnknownMarkError] = field(default_factory=dict)
    _ties: Mapping[tuple[Contract, Contract], float] = field(default_factory=dict)
    _errors: Mapping[frozenset[str], float] = field(default_factory=dict)

    @staticmethod
    def of(book: Book) -> Quotes:
        """The index over the marks of `book`."""
        blends = {blend.name: blend for blend in book.blends}
        names = Counter([*(market.name for market in book.markets), *(blend.name for blend in book.blends)])
        contracts = Counter((market.name, mark.delivery) for market in book.markets for mark in market.marks)
        pairs = Counter(frozenset((pair.first, pair.second)) for pair in book.correlations)
        return Quotes(
            {
                **{blend.name: Market(blend.name, blend.unit, note=blend.note) for blend in book.blends},
                **{market.name: market for market in book.markets},
            },
            {market.name: {mark.delivery: mark for mark in market.marks} for market in book.markets},
            {frozenset((pair.first, pair.second)): pair.correlation for pair in book.correlations},
            frozenset(name for name, count in names.items() if count > 1),
            frozenset(contract for contract, count in contracts.items() if count > 1),
            frozenset(pair for pair, count in pairs.items() if count > 1),
            blends,
            _errors={
                frozenset((pair.first, pair.second)): pair.standard_error
                for pair in book.correlations
                if pair.standard_error is not None
            },
        )

    def blend(self, name: str) -> Blend | None:
        """The blend called `name`, or None where that is a market or nothing."""
        return None if name in self._twice else self._blends.get(name)

    def market(self, name: str) -> Market:
        """The market called `name`; raises UnknownMarkError with the reason where there is not exactly one."""
        if name in self._twice:
            raise UnknownMarkError(f"the market {quoted(name)} is defined twice")
        if name in self._broken:
            raise self._broken[name]
        try:
            return self._markets[name]
        except KeyError:
            raise UnknownMarkError(f"there is no market {quoted(name)} in this book") from None

    def mark(self, name: str, delivery: str) -> Mark:
        """The mark of a market's delivery; raises UnknownMarkError where there is not exactly one."""
        self.market(name)
        if not delivery:
            raise UnknownMarkError(f"the delivery of {shown(name)} is missing", missing=True)
        if not is_delivery(delivery):
            raise UnknownMarkError(f"expected a delivery month written as 2027-01, got {quoted(delivery)}")
        if (name, delivery) in self._marks_twice:
            raise UnknownMarkError(f"{shown(name)} has more than one mark for {delivery}")
        try:
            return self._marks[name][delivery]
        except KeyError:
            raise UnknownMarkError(f"{shown(name)} has no mark for {delivery}", missing=True) from None

    def correlation(self, first: str, first_delivery: str, second: str, second_delivery: str) -> float:
        """The correlation of two contracts, as a decimal.

        Two deliveries of one market: exp(-tie strength * years apart). Two markets: their correlation, for
        deliveries apart times exp(-(mean of the two tie strengths) * years apart). Raises UnknownMarkError where the
        book holds not exactly one correlation of the two markets, or a tie strength below zero.
        """
        tie_of_blends = self._ties.get(((first, first_delivery), (second, second_delivery)))
        if tie_of_blends is not None:
            return tie_of_blends
        for delivery in (first_delivery, second_delivery):
            if delivery and not is_delivery(delivery):
                raise UnknownMarkError(f"expected a delivery month written as 2027-01, got {quoted(delivery)}")
        apart = delivery_years_apart(first_delivery, second_delivery) if first_delivery and second_delivery else 0.0
        tie = math.exp(-0.5 * apart * self._tie_strength(first) - 0.5 * apart * self._tie_strength(second))
        if first == second:
            return tie
        pair, names = frozenset((first, second)), f"{shown(first)} and {shown(second)}"
        if pair in self._pairs_twice:
            raise UnknownMarkError(f"the book has more than one correlation of {names}")
        try:
            return self._correlations[pair] * tie
        except KeyError:
            raise UnknownMarkError(f"the book has no correlation of {names}", missing=True) from None

    def correlation_error(self, first: str, first_delivery: str, second: str, second_delivery: str) -> float:
        """One standard error of the correlation of two contracts, decayed as the correlation is; NaN where the markets'
        correlation was not estimated, or the legs are no two different markets."""
        error = self._errors.get(frozenset((first, second))) if first != second else None
        if error is None:
            return math.nan
        apart = delivery_years_apart(first_delivery, second_delivery) if first_delivery and second_delivery else 0.0
        return error * math.exp(-0.5 * apart * self._tie_strength(first) - 0.5 * apart * self._tie_strength(second))

    def _tie_strength(self, name: str) -> float:
        strength = self.market(name).tie_strength
        if not strength >= 0:
            raise UnknownMarkError(f"the tie strength of {shown(name)} is {strength:g}, below zero")
        return strength


def quantity_unit(unit: str) -> str:
    """What a price unit is counted by: "MWh" of "CRN/MWh"; empty where the unit does not say.

    >>> quantity_unit("CRN/t CO2")
    't CO2'
    """
    return unit.partition("/")[2].strip()
