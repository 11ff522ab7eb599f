"""A position's legs resolved: the numbers a formula needs, from the row's own marks or else from the book's."""

from __future__ import annotations

import datetime
import math
from dataclasses import dataclass, field
from enum import IntEnum

import numpy as np

from spreadgui.book.entries import is_delivery
from spreadgui.book.records import Market, Position
from spreadgui.market.blends import horizon, names_a_blend, with_blends
from spreadgui.market.quotes import Quotes, UnknownMarkError
from spreadgui.market.strips import Strip, calendar_fault, exercises, strip_of
from spreadgui.market.time import discount_factor, years
from spreadgui.market.zero_rates import ZeroRates

_NAN = math.nan


class Shape(IntEnum):
    """Which legs a position has."""

    SPREAD = 0
    LONG_LEG_ONLY = 1
    SHORT_LEG_ONLY = 2


class Law(IntEnum):
    """How the forwards of a position move: with their shift added they are lognormal, or they are normal themselves."""

    LOGNORMAL = 0
    NORMAL = 1


class Readiness(IntEnum):
    """Whether a position can be priced: as it is, not before a gap is filled, or not before a mistake is mended."""

    READY = 0
    INCOMPLETE = 1
    REFUSED = 2


@dataclass(frozen=True)
class Trouble:
    """Why a position cannot be priced: a sentence, and the field of the position where to mend it."""

    readiness: Readiness
    field: str
    sentence: str


@dataclass
class ResolvedPosition:
    """The inputs of one position; NaN where the position has none or it could not be found.

    Forwards and shifts are the markets' own, before the ratios; under a normal law so are the volatilities, which are
    absolute then. `years` may be below zero when the option is past. A position with a `strip` is exercised as that
    says; its `years`, `discount` and `rate` are the means over the days. `rate` is the zero rate to the expiry.
    """

    shape: Shape = Shape.SPREAD
    law: Law = Law.LOGNORMAL
    unit: str = ""
    forward_long: float = _NAN
    forward_short: float = _NAN
    vol_long: float = _NAN
    vol_short: float = _NAN
    correlation: float = _NAN
    correlation_error: float = _NAN
    shift_long: float = 0.0
    shift_short: float = 0.0
    years: float = _NAN
    discount: float = _NAN
    rate: float = _NAN
    strip: Strip | None = None
    troubles: list[Trouble] = field(default_factory=list)


def resolve(
    position: Position, quotes: Quotes, valuation_date: datetime.date, zero_rates: ZeroRates | float
) -> ResolvedPosition:
    """The inputs of `position`, with everything that stands in the way of pricing it listed in the order of the row."""
    rates = zero_rates if isinstance(zero_rates, ZeroRates) else ZeroRates(zero_rates)
    resolved = ResolvedPosition(shape=_shape(position))
    if names_a_blend(position, quotes):
        quotes = with_blends(quotes, position, horizon(position, valuation_date))
    if position.quantity is None:
        _incomplete(resolved, "quantity", "the quantity is missing")
    _resolve_leg(resolved, position, quotes, "long")
    _resolve_leg(resolved, position, quotes, "short")
    _resolve_law(resolved, position, quotes)
    _resolve_correlation(resolved, position, quotes)
    if position.exercise == "once":
        _resolve_time(resolved, position, valuation_date, rates)
    else:
        _resolve_strip(resolved, position, quotes, valuation_date)
        _resolve_strip_time(resolved, rates)
    _check_numbers(resolved, position)
    resolved.troubles.sort(key=lambda trouble: Position.__struct_fields__.index(trouble.field))
    return resolved


def _shape(position: Position) -> Shape:
    has_long, has_short = _speaks_of(position, "long"), _speaks_of(position, "short")
    if has_long == has_short:
        return Shape.SPREAD
    return Shape.LONG_LEG_ONLY if has_long else Shape.SHORT_LEG_ONLY


def _speaks_of(position: Position, side: str) -> bool:
    """Whether anything in the row says that there is such a leg; then one that is not named is missing, not absent."""
    return bool(
        getattr(position, f"{side}_leg")
        or getattr(position, f"{side}_delivery")
        or getattr(position, f"own_forward_{side}") is not None
        or getattr(position, f"own_vol_{side}") is not None
        or getattr(position, f"{side}_ratio") != 1.0
    )


def _resolve_leg(resolved: ResolvedPosition, position: Position, quotes: Quotes, side: str) -> None:
    absent = Shape.SHORT_LEG_ONLY if side == "long" else Shape.LONG_LEG_ONLY
    if resolved.shape is absent:
        return
    leg, delivery = getattr(position, f"{side}_leg"), getattr(position, f"{side}_delivery")
    forward, vol = getattr(position, f"own_forward_{side}"), getattr(position, f"own_vol_{side}")
    if leg:
        _take_unit(resolved, quotes, leg)
    if forward is None or (vol is None and position.kind != "forward"):
        try:
            forward, vol = _marked(quotes, leg, delivery, side, forward, vol)
        except UnknownMarkError as error:
            _trouble_of(resolved, error, _leg_field(quotes, side, leg, forward))
    setattr(resolved, f"forward_{side}", _NAN if forward is None else forward)
    setattr(resolved, f"vol_{side}", _NAN if vol is None else vol)


def _marked(
    quotes: Quotes, leg: str, delivery: str, side: str, forward: float | None, vol: float | None
) -> tuple[float, float]:
    """The leg's forward and volatility, the row's own where it has them."""
    if not leg:
        what = "leg" if forward is None else "volatility"
        raise UnknownMarkError(f"the {side} {what} is missing", missing=True)
    mark = quotes.mark(leg, delivery)
    return mark.forward if forward is None else forward, mark.volatility if vol is None else vol


def _leg_field(quotes: Quotes, side: str, leg: str, forward: float | None) -> str:
    if not leg:
        return f"{side}_leg" if forward is None else f"own_vol_{side}"
    return f"{side}_delivery" if _has_market(quotes, leg) else f"{side}_leg"


def _has_market(quotes: Quotes, leg: str) -> bool:
    try:
        quotes.market(leg)
    except UnknownMarkError:
        return False
    return True


def _take_unit(resolved: ResolvedPosition, quotes: Quotes, leg: str) -> None:
    """The payoff is counted in the unit of the long leg, of the only leg in an outright."""
    if not resolved.unit and _has_market(quotes, leg):
        resolved.unit = quotes.market(leg).unit


def _markets(position: Position, quotes: Quotes) -> dict[str, Market]:
    """The markets of the legs that name one, by side."""
    legs = {side: getattr(position, f"{side}_leg") for side in ("long", "short")}
    return {side: quotes.market(leg) for side, leg in legs.items() if leg and _has_market(quotes, leg)}


def _resolve_law(resolved: ResolvedPosition, position: Position, quotes: Quotes) -> None:
    """Shifted lognormal and lognormal legs go together: the second has a shift of zero. A normal one goes with a normal
    one only. A leg with own marks and no market moves as the other leg does."""
    markets = _markets(position, quotes)
    laws = {side: Law.NORMAL if market.dynamics == "normal" else Law.LOGNORMAL for side, market in markets.items()}
    if len(set(laws.values())) > 1 and position.kind != "forward":
        first, second = (f"{markets[side].name} is {markets[side].dynamics}" for side in ("long", "short"))
        _refused(resolved, "short_leg", f"{first} and {second}: no formula prices the two together")
    resolved.law = next(iter(laws.values()), Law.LOGNORMAL)
    for side, market in markets.items():
        if market.dynamics == "shifted lognormal":
            setattr(resolved, f"shift_{side}", market.shift)


def _resolve_correlation(resolved: ResolvedPosition, position: Position, quotes: Quotes) -> None:
    if resolved.shape is not Shape.SPREAD:
        return
    if position.own_correlation is not None:
        resolved.correlation = position.own_correlation
    elif position.long_leg and position.short_leg:
        try:
            resolved.correlation = quotes.correlation(
                position.long_leg, position.long_delivery, position.short_leg, position.short_delivery
            )
            resolved.correlation_error = quotes.correlation_error(
                position.long_leg, position.long_delivery, position.short_leg, position.short_delivery
            )
        except UnknownMarkError as error:
            _correlation_trouble(resolved, position, error)
    elif position.kind != "forward" and not _waits_for_a_leg(resolved):
        _incomplete(resolved, "own_correlation", "the correlation is missing")


def _waits_for_a_leg(resolved: ResolvedPosition) -> bool:
    """Whether a leg is still to be named, which may bring the book's correlation with it."""
    return any(
        trouble.readiness is Readiness.INCOMPLETE and trouble.field.endswith("_leg") for trouble in resolved.troubles
    )


def _has_leg_trouble(resolved: ResolvedPosition) -> bool:
    return any(trouble.field.endswith(("_leg", "_delivery")) for trouble in resolved.troubles)


def _correlation_trouble(resolved: ResolvedPosition, position: Position, error: UnknownMarkError) -> None:
    if position.kind == "forward":
        return  # needs no correlation
    if error.missing:
        _incomplete(resolved, "own_correlation", str(error))
    elif not _has_leg_trouble(resolved):  # otherwise the leg at fault has been told of already
        _refused(resolved, "own_correlation", f"the correlation cannot be looked up: {error}")


def _resolve_time(
    resolved: ResolvedPosition, position: Position, valuation_date: datetime.date, rates: ZeroRates
) -> None:
    if position.expiry is None:
        _incomplete(resolved, "expiry", "the expiry is missing")
        return
    resolved.years = years(valuation_date, position.expiry)
    resolved.rate = rates.rate(resolved.years)
    resolved.discount = discount_factor(resolved.rate, resolved.years)
    if resolved.years < 0:
        _refused(resolved, "expiry", f"expired on {position.expiry}, before the valuation date {valuation_date}")
    elif rates.fault:
        _refused(resolved, "expiry", rates.fault)
    elif not math.isfinite(resolved.discount):
        _refused(resolved, "expiry", f"the zero rate {resolved.rate:g} gives no discount factor for this expiry")


def _resolve_strip(
    resolved: ResolvedPosition, position: Position, quotes: Quotes, valuation_date: datetime.date
) -> None:
    """The days of a strip, which both legs must deliver in one month."""
    months = {side: getattr(position, f"{side}_delivery") for side in ("long", "short")}
    months = {side: month for side, month in months.items() if month and is_delivery(month)}
    if not months:
        if not _has_leg_trouble(resolved):
            _incomplete(resolved, "long_delivery", "a strip needs a delivery month, whose days it is exercised for")
        return
    if len(set(months.values())) > 1:
        _refused(resolved, "short_delivery", "a strip needs both legs in one delivery month")
        return
    delivery, markets = next(iter(months.values())), list(_markets(position, quotes).values())
    if reason := calendar_fault(markets):
        _refused(resolved, "exercise", reason)
        return
    days, expiries, of_all = exercises(delivery, position.exercise, markets, valuation_date)
    if not len(days):
        past = "has no business day" if not of_all else f"was all exercised before the valuation date {valuation_date}"
        _refused(resolved, "exercise", f"the strip over {delivery} {past}")
        return
    daily = tuple(_daily_volatility(resolved, position, quotes, side) for side in ("long", "short"))
    resolved.strip = strip_of(delivery, days, expiries, of_all, valuation_date, (daily[0], daily[1]))


def _daily_volatility(resolved: ResolvedPosition, position: Position, quotes: Quotes, side: str) -> float:
    """The mark's volatility inside the month; NaN where there is none, so that the leg's other one goes on."""
    leg, delivery = getattr(position, f"{side}_leg"), getattr(position, f"{side}_delivery")
    try:
        daily = quotes.mark(leg, delivery).daily_volatility if leg else None
    except UnknownMarkError:
        return _NAN
    if daily is not None and daily < 0:
        _refused(resolved, f"{side}_delivery", f"the daily volatility of {leg} for {delivery} is {daily:g}, below zero")
    return _NAN if daily is None else daily


def _resolve_strip_time(resolved: ResolvedPosition, rates: ZeroRates) -> None:
    if resolved.strip is None:
        return
    times = resolved.strip.years.tolist()
    each = [rates.rate(time) for time in times]
    discounts = [discount_factor(rate, time) for rate, time in zip(each, times, strict=True)]
    resolved.rate = float(np.mean(each))
    resolved.years = float(np.mean(resolved.strip.years))
    resolved.discount = float(np.mean(discounts))
    if rates.fault:
        _refused(resolved, "exercise", rates.fault)
    elif not math.isfinite(resolved.discount):
        _refused(resolved, "exercise", f"the zero rate {resolved.rate:g} gives no discount factor for this strip")


def _check_numbers(resolved: ResolvedPosition, position: Position) -> None:
    """What a record can hold and a formula cannot take."""
    for side in ("long", "short"):
        vol = getattr(resolved, f"vol_{side}")
        if position.kind != "forward" and resolved.law is Law.LOGNORMAL:
            _check_above_zero(resolved, side)
        if vol < 0:
            _refused(resolved, f"own_vol_{side}", f"the {side} volatility is {vol:g}, below zero")
        if not getattr(position, f"{side}_ratio") > 0:
            _refused(
                resolved, f"{side}_ratio", f"the {side} ratio is {getattr(position, f'{side}_ratio'):g}, not above zero"
            )
    if abs(resolved.correlation) > 1:
        _refused(resolved, "own_correlation", f"the correlation is {resolved.correlation:g}, beyond 1 or −1")
    if position.quantity is not None and position.quantity < 0:
        _refused(resolved, "quantity", f"the quantity is {position.quantity:g}; let the side say short instead")


def _check_above_zero(resolved: ResolvedPosition, side: str) -> None:
    forward, shift = getattr(resolved, f"forward_{side}"), getattr(resolved, f"shift_{side}")
    if forward + shift <= 0:
        _refused(
            resolved,
            f"own_forward_{side}",
            f"the {side} forward is {forward:g} with its shift of {shift:g}; the two must come to more than zero"
            if shift
            else f"the {side} forward is {forward:g}; lognormal formulas need one above zero",
        )


def _trouble_of(resolved: ResolvedPosition, error: UnknownMarkError, where: str) -> None:
    (_incomplete if error.missing else _refused)(resolved, where, str(error))


def _incomplete(resolved: ResolvedPosition, where: str, sentence: str) -> None:
    resolved.troubles.append(Trouble(Readiness.INCOMPLETE, where, sentence))


def _refused(resolved: ResolvedPosition, where: str, sentence: str) -> None:
    resolved.troubles.append(Trouble(Readiness.REFUSED, where, sentence))
