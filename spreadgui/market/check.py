"""Every fault of a book that reads well but does not hold together, with its place."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterator

from spreadgui.book.entries import is_delivery, quoted, shown
from spreadgui.book.faults import Fault
from spreadgui.book.records import Book, Market
from spreadgui.market.contracts import Law, resolve
from spreadgui.market.quotes import Quotes
from spreadgui.market.strips import is_week
from spreadgui.market.zero_curve import curve_faults
from spreadgui.market.zero_rates import ZeroRates

# Ten times the square root of time in a year is beyond any market; such a figure is one in per cent.
_HIGHEST_VOLATILITY = 10.0


def faults_of(book: Book) -> list[Fault]:
    """The faults of `book` in the order of its file: its own, of markets, correlations, then positions."""
    return [
        *_book_faults(book),
        *_market_faults(book),
        *_blend_faults(book),
        *_correlation_faults(book),
        *_position_faults(book),
    ]


def _book_faults(book: Book) -> Iterator[Fault]:
    if not 0 <= book.gap_tolerance < math.inf:
        yield Fault("gap_tolerance", f"is {book.gap_tolerance:g}; it cannot be below zero")
    yield from _curve_faults(book)


def _curve_faults(book: Book) -> Iterator[Fault]:
    points = tuple((point.date, point.rate) for point in book.zero_curve)
    for fault in curve_faults(book.valuation_date, points) if points else ():
        where, _, what = fault.partition(": ")
        yield Fault(where.replace("points", "zero_curve"), what)


def _market_faults(book: Book) -> Iterator[Fault]:
    names = Counter(market.name for market in book.markets)
    for index, market in enumerate(book.markets):
        where = f"markets[{index}]"
        if not market.name.strip():
            yield Fault(f"{where}.name", "a market needs a name")
        elif names[market.name] > 1:
            yield Fault(f"{where}.name", f"the market {quoted(market.name)} is defined {names[market.name]} times")
        yield from _unit_faults(market.unit, book.currency, where)
        if not 0 <= market.tie_strength < math.inf:
            yield Fault(f"{where}.tie_strength", f"is {market.tie_strength:g}; it cannot be below zero")
        yield from _law_faults(market, where)
        if not is_week(market.business_days):
            said = quoted(market.business_days)
            yield Fault(f"{where}.business_days", f"expected a 1 or a 0 for each day from Monday to Sunday, got {said}")
        yield from _mark_faults(market, where)


def _law_faults(market: Market, where: str) -> Iterator[Fault]:
    if not math.isfinite(market.shift):
        yield Fault(f"{where}.shift", f"is {market.shift:g}, which is no amount")
    elif market.shift and market.dynamics != "shifted lognormal":
        yield Fault(f"{where}.shift", f"is {market.shift:g}; {market.dynamics} dynamics have none")


def _mark_faults(market: Market, where: str) -> Iterator[Fault]:
    deliveries = Counter(mark.delivery for mark in market.marks)
    for index, mark in enumerate(market.marks):
        place = f"{where}.marks[{index}]"
        if not is_delivery(mark.delivery):
            yield Fault(
                f"{place}.delivery", f"expected a delivery month written as 2027-01, got {quoted(mark.delivery)}"
            )
        elif deliveries[mark.delivery] > 1:
            count = deliveries[mark.delivery]
            yield Fault(f"{place}.delivery", f"{shown(market.name)} has {count} marks for {mark.delivery}")
        highest = math.inf if market.dynamics == "normal" else _HIGHEST_VOLATILITY
        yield from _volatility_faults(mark.volatility, f"{place}.volatility", highest)
        yield from _volatility_faults(mark.daily_volatility, f"{place}.daily_volatility", highest)


def _unit_faults(unit: str, currency: str, where: str) -> Iterator[Fault]:
    """Values of all markets are added up, so all must be quoted in the book's money."""
    money, slash, counted_by = unit.partition("/")
    if not (money.strip() and slash and counted_by.strip()):
        yield Fault(f"{where}.unit", f"expected money for a quantity, as CRN/MWh, got {quoted(unit)}")
    elif money.strip() != currency:
        yield Fault(
            f"{where}.unit",
            f"is in {shown(money.strip())}, while the book counts in {shown(currency) or 'no currency'}",
        )


def _volatility_faults(volatility: float | None, where: str, highest: float = _HIGHEST_VOLATILITY) -> Iterator[Fault]:
    if volatility is None:
        return
    if volatility < 0:
        yield Fault(where, f"is {volatility:g}; it cannot be below zero")
    elif volatility > highest:
        yield Fault(where, f"is {volatility:g}, which is {100 * volatility:g} %; a volatility of 45 % is written 0.45")


def _blend_faults(book: Book) -> Iterator[Fault]:
    names = Counter([*(market.name for market in book.markets), *(blend.name for blend in book.blends)])
    known = {market.name for market in book.markets}
    for index, blend in enumerate(book.blends):
        where = f"blends[{index}]"
        if not blend.name.strip():
            yield Fault(f"{where}.name", "a blend needs a name")
        elif names[blend.name] > 1:
            yield Fault(f"{where}.name", f"{quoted(blend.name)} is the name of {names[blend.name]} markets or blends")
        yield from _unit_faults(blend.unit, book.currency, where)
        if not blend.parts:
            yield Fault(f"{where}.parts", f"the blend {quoted(blend.name)} has no parts")
        for place, part in enumerate(blend.parts):
            if part.market not in known:
                yield Fault(f"{where}.parts[{place}].market", f"there is no market {quoted(part.market)} in this book")
            if not part.weight > 0.0:
                yield Fault(f"{where}.parts[{place}].weight", f"is {part.weight:g}; a weight is above zero")


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
            yield Fault(where, f"{shown(pair.first)} and {shown(pair.second)} have more than one correlation")
        if abs(pair.correlation) > 1:
            yield Fault(f"{where}.correlation", f"is {pair.correlation:g}, beyond 1 or −1")


def _position_faults(book: Book) -> Iterator[Fault]:
    quotes, rates = Quotes.of(book), ZeroRates.of(book)
    for index, position in enumerate(book.positions):
        resolved = resolve(position, quotes, book.valuation_date, rates)
        for trouble in resolved.troubles:
            yield Fault(f"positions[{index}].{trouble.field}", trouble.sentence)
        highest = math.inf if resolved.law is Law.NORMAL else _HIGHEST_VOLATILITY
        for field in ("own_vol_long", "own_vol_short"):
            volatility = getattr(position, field)
            if volatility is not None and volatility >= 0:  # below zero the row is refused, and told of above
                yield from _volatility_faults(volatility, f"positions[{index}].{field}", highest)
