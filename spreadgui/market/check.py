"""Every fault of a book that reads well but does not hold together, with its place."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterator

from spreadgui.book.entries import is_delivery, quoted
from spreadgui.book.faults import Fault
from spreadgui.book.records import Book, Market
from spreadgui.market.contracts import resolve
from spreadgui.market.quotes import Quotes


def faults_of(book: Book) -> list[Fault]:
    """The faults of `book` in the order of its file: of the markets, the correlations, then of each position."""
    return [*_market_faults(book), *_correlation_faults(book), *_position_faults(book)]


def _market_faults(book: Book) -> Iterator[Fault]:
    names = Counter(market.name for market in book.markets)
    for index, market in enumerate(book.markets):
        where = f"markets[{index}]"
        if not market.name.strip():
            yield Fault(f"{where}.name", "a market needs a name")
        elif names[market.name] > 1:
            yield Fault(f"{where}.name", f"the market {quoted(market.name)} is defined {names[market.name]} times")
        if not 0 <= market.tie_strength < math.inf:
            yield Fault(f"{where}.tie_strength", f"is {market.tie_strength:g}; it cannot be below zero")
        yield from _mark_faults(market, where)


def _mark_faults(market: Market, where: str) -> Iterator[Fault]:
    deliveries = Counter(mark.delivery for mark in market.marks)
    for index, mark in enumerate(market.marks):
        place = f"{where}.marks[{index}]"
        if not is_delivery(mark.delivery):
            yield Fault(
                f"{place}.delivery", f"expected a delivery month written as 2027-01, got {quoted(mark.delivery)}"
            )
        elif deliveries[mark.delivery] > 1:
            yield Fault(f"{place}.delivery", f"{market.name} has {deliveries[mark.delivery]} marks for {mark.delivery}")
        if mark.volatility < 0:
            yield Fault(f"{place}.volatility", f"is {mark.volatility:g}; it cannot be below zero")


def _correlation_faults(book: Book) -> Iterator[Fault]:
    known = {market.name for market in book.markets}
    pairs = Counter(frozenset((pair.first, pair.second)) for pair in book.correlations)
    for index, pair in enumerate(book.correlations):
        where = f"correlations[{index}]"
        for side in ("first", "second"):
            if getattr(pair, side) not in known:
                yield Fault(f"{where}.{side}", f"there is no market {quoted(getattr(pair, side))} in this book")
        if pair.first == pair.second:
            yield Fault(
                where, f"ties {quoted(pair.first)} to itself; its deliveries are tied by the market's tie strength"
            )
        elif pairs[frozenset((pair.first, pair.second))] > 1:
            yield Fault(where, f"{pair.first} and {pair.second} have more than one correlation")
        if abs(pair.correlation) > 1:
            yield Fault(f"{where}.correlation", f"is {pair.correlation:g}, beyond 1 or −1")


def _position_faults(book: Book) -> Iterator[Fault]:
    quotes = Quotes.of(book)
    for index, position in enumerate(book.positions):
        for trouble in resolve(position, quotes, book.valuation_date, book.zero_rate).troubles:
            yield Fault(f"positions[{index}].{trouble.field}", trouble.sentence)
