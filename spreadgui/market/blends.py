"""Blends as legs: each stands for one contract whose marks are matched to its markets' (market.mix says how).

What a mix comes to depends on how far ahead it is looked at, so it is matched anew for each position: to its expiry,
for a strip to the start of its delivery month; the daily volatility inside the month is the limit of a short time. The
correlation with the other leg, a market or a blend, is matched likewise from the correlations of all the parts.
"""

from __future__ import annotations

import dataclasses
import datetime
from dataclasses import dataclass

import numpy as np

from spreadgui.book.entries import delivery_start, is_delivery, shown
from spreadgui.book.records import Blend, Book, Mark, Market, Position
from spreadgui.market.mix import FloatArray, Leg, Matched, matched, vol_of
from spreadgui.market.quotes import Contract, Quotes, UnknownMarkError
from spreadgui.market.time import years as years_between


@dataclass(frozen=True)
class Parts:
    """One leg taken apart: its contracts, what the mix is made of, and what it is inside its delivery month."""

    contracts: tuple[Contract, ...]
    leg: Leg
    daily: Leg | None
    inside: FloatArray
    normal: bool


@dataclass(frozen=True)
class TwoLegs:
    """Both legs of a position taken apart, and the two forwards that stand for them."""

    long: Parts
    short: Parts
    across: FloatArray
    matched: Matched


def names_a_blend(position: Position, quotes: Quotes) -> bool:
    """Whether a leg of the position is a blend."""
    return quotes.blend(position.long_leg) is not None or quotes.blend(position.short_leg) is not None


def horizon(position: Position, valuation_date: datetime.date) -> float:
    """The years ahead that a position's blends are matched to; 0 where that is not known or past."""
    if position.exercise == "once":
        return 0.0 if position.expiry is None else max(years_between(valuation_date, position.expiry), 0.0)
    months = [month for month in (position.long_delivery, position.short_delivery) if is_delivery(month)]
    return max(years_between(valuation_date, delivery_start(months[0])), 0.0) if months else 0.0


def with_blends(quotes: Quotes, position: Position, years: float) -> Quotes:
    """The quotes with the position's blends in them as markets of their own; a blend that cannot be matched says why
    when it is looked up."""
    marked: dict[str, Market] = {}
    marks: dict[str, dict[str, Mark]] = {}
    broken: dict[str, UnknownMarkError] = {}
    legs = [(position.long_leg, position.long_delivery), (position.short_leg, position.short_delivery)]
    for name, delivery in legs:
        blend = quotes.blend(name)
        if blend is None:
            continue
        try:
            parts = parts_of(quotes, name, delivery)
            marked[name] = _market(blend, parts, quotes)
            marks[name] = {delivery: _mark(delivery, parts, years)}
        except UnknownMarkError as error:
            broken[name] = error
    ties = _tie(quotes, legs[0], legs[1], years)
    return dataclasses.replace(
        quotes,
        _markets={**quotes._markets, **marked},
        _marks={**quotes._marks, **marks},
        _broken=broken,
        _ties=ties,
    )


def two_legs(quotes: Quotes, long: Contract, short: Contract, years: float) -> TwoLegs:
    """Both legs matched; raises UnknownMarkError where a part has no mark or a pair no correlation."""
    one, other = parts_of(quotes, *long), parts_of(quotes, *short)
    if one.normal != other.normal:
        raise UnknownMarkError("one leg is normal and the other is not")
    across = np.array([[quotes.correlation(*a, *b) for b in other.contracts] for a in one.contracts])
    found = matched(one.leg, other.leg, (one.inside, other.inside), across, years, normal=one.normal)
    return TwoLegs(one, other, across, found)


def names_of_legs(book: Book) -> tuple[str, ...]:
    """What a leg can be called: the book's markets, then its blends."""
    return (*(market.name for market in book.markets), *(blend.name for blend in book.blends))


def deliveries_of(book: Book, name: str) -> tuple[str, ...]:
    """The deliveries that a leg of this name can have: those its market is marked for, of a blend all its markets."""
    marked = {market.name: {mark.delivery for mark in market.marks} for market in book.markets}
    parts = next((blend.parts for blend in book.blends if blend.name == name), ())
    months = [marked.get(part.market, set()) for part in parts] if parts else [marked.get(name, set())]
    return tuple(sorted(set.intersection(*months)))


def parts_of(quotes: Quotes, name: str, delivery: str) -> Parts:
    """A leg taken apart, a market being its own only part; raises UnknownMarkError with the reason where it cannot."""
    blend = quotes.blend(name)
    pairs = [(name, 1.0)] if blend is None else [(part.market, part.weight) for part in blend.parts]
    if blend is not None:
        _check(blend, quotes)
    marks = [_part_mark(quotes, blend, market, delivery) for market, _ in pairs]
    markets = [quotes.market(market) for market, _ in pairs]
    contracts = tuple((market, delivery) for market, _ in pairs)
    inside = np.array([[1.0 if a == b else quotes.correlation(*a, *b) for b in contracts] for a in contracts])
    numbers = (
        np.array([weight for _, weight in pairs]),
        np.array([mark.forward for mark in marks]),
        np.array([market.shift if market.dynamics == "shifted lognormal" else 0.0 for market in markets]),
    )
    vols = np.array([mark.volatility for mark in marks])
    dailies = [mark.volatility if mark.daily_volatility is None else mark.daily_volatility for mark in marks]
    has_daily = any(mark.daily_volatility is not None for mark in marks)
    normal = markets[0].dynamics == "normal"
    _check_forwards(blend, numbers, normal)
    daily = Leg(*numbers, np.array(dailies)) if has_daily else None
    return Parts(contracts, Leg(*numbers, vols), daily, inside, normal)


def _check(blend: Blend, quotes: Quotes) -> None:
    name = f"the blend {shown(blend.name)}"
    if not blend.parts:
        raise UnknownMarkError(f"{name} has no parts", missing=True)
    for part in blend.parts:
        if not part.weight > 0.0:
            raise UnknownMarkError(f"{name} holds {part.weight:g} of {shown(part.market)}; a weight is above zero")
    laws = {quotes.market(part.market).dynamics == "normal" for part in blend.parts}
    if len(laws) > 1:
        raise UnknownMarkError(f"{name} mixes normal markets with others, which has no law of its own")


def _check_forwards(blend: Blend | None, numbers: tuple[FloatArray, FloatArray, FloatArray], normal: bool) -> None:
    if blend is None or normal:
        return
    for part, lifted in zip(blend.parts, (numbers[1] + numbers[2]).tolist(), strict=True):
        if not lifted > 0.0:
            raise UnknownMarkError(
                f"{shown(part.market)} in the blend {shown(blend.name)} stands at {lifted:g} with its shift, "
                "not above zero"
            )


def _part_mark(quotes: Quotes, blend: Blend | None, market: str, delivery: str) -> Mark:
    try:
        return quotes.mark(market, delivery)
    except UnknownMarkError as error:
        where = "" if blend is None else f" (in the blend {shown(blend.name)})"
        raise UnknownMarkError(f"{error}{where}", missing=error.missing) from None


def _market(blend: Blend, parts: Parts, quotes: Quotes) -> Market:
    """The blend as a market: its law and shift, and the business days that all its parts have."""
    markets = [quotes.market(name) for name, _ in parts.contracts]
    week = "".join("1" if all(one.business_days[day : day + 1] == "1" for one in markets) else "0" for day in range(7))
    shift = 0.0 if parts.normal else parts.leg.shift
    return Market(
        blend.name,
        blend.unit,
        dynamics="normal" if parts.normal else "shifted lognormal" if shift else "lognormal",
        shift=shift,
        business_days=week,
        holidays=tuple(sorted({day for one in markets for day in one.holidays})),
        note=blend.note,
    )


def _mark(delivery: str, parts: Parts, years: float) -> Mark:
    vol = vol_of(parts.leg, parts.inside, years, normal=parts.normal)
    daily = None if parts.daily is None else vol_of(parts.daily, parts.inside, 0.0, normal=parts.normal)
    return Mark(delivery, parts.leg.forward, vol, daily)


def _tie(quotes: Quotes, long: Contract, short: Contract, years: float) -> dict[tuple[Contract, Contract], float]:
    """The matched correlation of the two legs, where there are two that can be matched."""
    if not (long[0] and short[0]):
        return {}
    try:
        return {(long, short): two_legs(quotes, long, short, years).matched.correlation}
    except UnknownMarkError:
        return {}
