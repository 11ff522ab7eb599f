"""Which positions an edit of the marks can move: those that read a mark, market or correlation that is another now."""

from __future__ import annotations

from collections.abc import Callable

import msgspec

from spreadgui.book.records import Book, Market, Position

Touches = Callable[[Position], bool]


def all_alike(old: Book, new: Book) -> bool:
    """Whether what holds for every position - day, rate, method, blends - is the same in both books."""
    return (
        old.valuation_date == new.valuation_date
        and old.zero_rate == new.zero_rate
        and old.zero_curve == new.zero_curve
        and old.method == new.method
        and old.blends == new.blends
    )


def touches(old: Book, new: Book) -> Touches:
    """A test of positions, for two books that are `all_alike`: whether the marks of `new` say anything else of one.

    It may say yes of a position that comes out the same, never no of one that does not.
    """
    contracts, markets = _changed_contracts(old, new)
    pairs = _changed_pairs(old, new)
    if not (contracts or markets or pairs):
        return lambda _position: False

    def touched(position: Position) -> bool:
        long, short = position.long_leg, position.short_leg
        if long in markets or short in markets:
            return True
        if (long, position.long_delivery) in contracts or (short, position.short_delivery) in contracts:
            return True
        return bool(pairs) and frozenset((long, short)) in pairs

    return touched


def _changed_contracts(old: Book, new: Book) -> tuple[set[tuple[str, str]], set[str]]:
    """Contracts whose mark is another, and markets that are others altogether; as seen from blends too."""
    if old.markets is new.markets:
        return set(), set()
    contracts: set[tuple[str, str]] = set()
    before, after = _by_name(old), _by_name(new)
    if before is None or after is None:  # a name twice over: nothing can be told apart
        return set(), {market.name for market in (*old.markets, *new.markets)}
    markets = set(before) ^ set(after)
    for name in set(before) & set(after):
        if before[name] is after[name]:
            continue
        if msgspec.structs.replace(before[name], marks=()) != msgspec.structs.replace(after[name], marks=()):
            markets.add(name)
        contracts |= {(name, mark.delivery) for mark in set(before[name].marks) ^ set(after[name].marks)}
    return _with_blends(new, contracts, markets)


def _with_blends(
    book: Book, contracts: set[tuple[str, str]], markets: set[str]
) -> tuple[set[tuple[str, str]], set[str]]:
    """The same for blends that hold one of these, or of which none can be told apart from another."""
    held = {
        (blend.name, delivery)
        for blend in book.blends
        for part in blend.parts
        for market, delivery in contracts
        if part.market == market
    }
    mixed = {blend.name for blend in book.blends for part in blend.parts if part.market in markets}
    return contracts | held, markets | mixed


def _changed_pairs(old: Book, new: Book) -> set[frozenset[str]]:
    """Pairs of leg names whose correlation is another; a blend's is made of its markets'."""
    if old.correlations is new.correlations:
        return set()
    changed = {frozenset((pair.first, pair.second)) for pair in set(old.correlations) ^ set(new.correlations)}
    names = {market.name: {market.name} for market in new.markets}
    names |= {blend.name: {part.market for part in blend.parts} for blend in new.blends}
    return {
        frozenset((first, second))
        for first, ones in names.items()
        for second, others in names.items()
        if any(frozenset((one, other)) in changed for one in ones | others for other in ones | others)
    }


def _by_name(book: Book) -> dict[str, Market] | None:
    found = {market.name: market for market in book.markets}
    return found if len(found) == len(book.markets) else None
