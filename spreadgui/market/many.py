"""Many positions resolved at once: what `contracts.resolve` says of each, for those of which nothing is amiss.

A book of 100,000 positions names some hundred contracts, pairs and days; each is looked up once, and the rest is done
by columns. A position that lacks something, is a strip, has a leg without a market, or that any check refuses, is left
to `contracts.resolve`, which alone finds words for it.
"""

from __future__ import annotations

import datetime
from collections.abc import Hashable, Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from spreadgui.book.records import Position
from spreadgui.market.contracts import Law, Shape
from spreadgui.market.quotes import Quotes, UnknownMarkError
from spreadgui.market.time import discount_factor, years
from spreadgui.market.zero_rates import ZeroRates

FloatArray = NDArray[np.float64]
Flags = NDArray[np.bool_]
Codes = NDArray[np.intp]

_ABSENT = ("", "")
_FIELDS = Position.__struct_fields__


@dataclass(frozen=True)
class ManyResolved:
    """Arrays with one entry a position; only those where `plain` is true mean anything.

    The numbers are those of a `contracts.ResolvedPosition` by the same names, NaN for a leg that is not there.
    """

    plain: Flags
    shape: NDArray[np.int8]
    law: NDArray[np.int8]
    units: list[str]
    numbers: dict[str, FloatArray]


def resolve_many(
    positions: Sequence[Position], quotes: Quotes, valuation_date: datetime.date, zero_rates: ZeroRates | float
) -> ManyResolved:
    """What `contracts.resolve` gives for each of `positions`, as far as it is `plain`."""
    fields: dict[str, list[Any]] = {key: [getattr(position, key) for position in positions] for key in _FIELDS}
    long, short = _Legs.of(fields, "long", quotes), _Legs.of(fields, "short", quotes)
    laws = long.law_beside(short), short.law_beside(long)
    shape = np.select([short.absent, long.absent], [Shape.LONG_LEG_ONLY, Shape.SHORT_LEG_ONLY], Shape.SPREAD)
    correlation, error, tied = _correlations(fields, long, short, quotes)
    rates = zero_rates if isinstance(zero_rates, ZeroRates) else ZeroRates(zero_rates)
    time, discount, rate, timed = _times(fields["expiry"], valuation_date, rates)
    once = np.array([exercise == "once" for exercise in fields["exercise"]], dtype=np.bool_)
    with np.errstate(invalid="ignore"):
        plain = once & timed & tied & (_floats(fields["quantity"]) >= 0.0)
        plain &= ~(long.absent & short.absent) & ((shape != Shape.SPREAD) | (laws[0] == laws[1]))
        plain &= long.taken(laws[0]) & short.taken(laws[1])
    numbers = {
        "forward_long": long.forward, "forward_short": short.forward, "vol_long": long.vol, "vol_short": short.vol,
        "shift_long": long.shift, "shift_short": short.shift, "correlation": correlation, "correlation_error": error,
        "years": time, "discount": discount, "rate": rate,
    }  # fmt: skip
    law = np.nan_to_num(np.where(long.absent, laws[1], laws[0]))
    units = [first or second for first, second in zip(long.units, short.units, strict=True)]
    return ManyResolved(plain, shape.astype(np.int8), law.astype(np.int8), units, numbers)


@dataclass(frozen=True)
class _Legs:
    """One side of every position. `absent` legs are not spoken of, `nameless` ones have no market; `law` is the
    market's, NaN without one."""

    contract: Codes
    names: list[tuple[str, str]]
    absent: Flags
    nameless: Flags
    forward: FloatArray
    vol: FloatArray
    shift: FloatArray
    law: FloatArray
    ratio: FloatArray
    units: list[str]

    @staticmethod
    def of(fields: dict[str, list[Any]], side: str, quotes: Quotes) -> _Legs:
        contract, names = _coded(zip(fields[f"{side}_leg"], fields[f"{side}_delivery"], strict=True))
        marks = [_marked(quotes, *name) for name in names]
        forward, vol, shift, law = np.array([mark[:4] for mark in marks], dtype=np.float64).reshape(-1, 4)[contract].T
        own_forward, own_vol, ratio = (
            _floats(fields[key]) for key in (f"own_forward_{side}", f"own_vol_{side}", f"{side}_ratio")
        )
        nameless = np.array([name[0] == "" for name in names], dtype=np.bool_)[contract]
        unnamed = np.array([name == _ABSENT for name in names], dtype=np.bool_)[contract]
        units = [mark[4] for mark in marks]
        return _Legs(
            contract,
            names,
            unnamed & np.isnan(own_forward) & np.isnan(own_vol) & (ratio == 1.0),
            nameless,
            np.where(np.isnan(own_forward), forward, own_forward),
            np.where(np.isnan(own_vol), vol, own_vol),
            np.where(nameless, 0.0, shift),
            law,
            ratio,
            [units[code] for code in contract.tolist()],
        )

    def law_beside(self, other: _Legs) -> FloatArray:
        """The legs' laws; one without a market moves as the other leg does, two without as lognormals."""
        borrowed = np.where(np.isnan(other.law), float(Law.LOGNORMAL), other.law)
        return np.where(self.nameless, borrowed, self.law)

    def taken(self, law: FloatArray) -> Flags:
        """Which legs no check refuses: absent ones, and those with a forward, a volatility and a ratio as they must
        be. NaN, where something lacks, compares false."""
        lifted = np.isfinite(self.forward) & ((law == Law.NORMAL) | (self.forward + self.shift > 0.0))
        known = np.isfinite(law) & (self.vol >= 0.0) & (self.ratio > 0.0)
        taken: Flags = self.absent | lifted & known
        return taken


def _marked(quotes: Quotes, leg: str, delivery: str) -> tuple[float, float, float, float, str]:
    """Forward, volatility, shift, law and unit of a contract; NaN where the book has no one mark of it.

    A blend's depend on the position, so it has none here.
    """
    try:
        market, mark = quotes.market(leg), quotes.mark(leg, delivery)
    except UnknownMarkError:
        return np.nan, np.nan, np.nan, np.nan, ""
    shift = market.shift if market.dynamics == "shifted lognormal" else 0.0
    law = Law.NORMAL if market.dynamics == "normal" else Law.LOGNORMAL
    return mark.forward, mark.volatility, shift, float(law), market.unit


def _correlations(
    fields: dict[str, list[Any]], long: _Legs, short: _Legs, quotes: Quotes
) -> tuple[FloatArray, FloatArray, Flags]:
    """Of two named legs, the row's own or the book's, with the standard error of the book's; and where there is one, or
    none is needed."""
    own, needed = _floats(fields["own_correlation"]), ~long.absent & ~short.absent
    pairs, place = np.unique(long.contract * len(short.names) + short.contract, return_inverse=True)
    used = np.zeros(len(pairs), dtype=np.bool_)
    used[place[needed & np.isnan(own)]] = True
    found, errors = np.full((2, len(pairs)), np.nan)
    for number in np.flatnonzero(used).tolist():
        first, second = divmod(int(pairs[number]), len(short.names))
        try:
            found[number] = quotes.correlation(*long.names[first], *short.names[second])
            errors[number] = quotes.correlation_error(*long.names[first], *short.names[second])
        except UnknownMarkError:
            continue
    correlation = np.where(needed, np.where(np.isnan(own), found[place], own), np.nan)
    error = np.where(needed & np.isnan(own), errors[place], np.nan)
    with np.errstate(invalid="ignore"):
        return correlation, error, ~needed | (np.abs(correlation) <= 1.0)


def _times(
    expiries: list[datetime.date | None], valuation_date: datetime.date, rates: ZeroRates
) -> tuple[FloatArray, FloatArray, FloatArray, Flags]:
    """Years, discount factor and zero rate to each expiry, and where there is one that is not past."""
    day, days = _coded(expiries)
    time = np.array([np.nan if one is None else years(valuation_date, one) for one in days], dtype=np.float64)
    rate = np.array([rates.rate(one) for one in time.tolist()], dtype=np.float64)
    pairs = zip(rate.tolist(), time.tolist(), strict=True)
    discount = np.array([np.nan if np.isnan(one) else discount_factor(each, one) for each, one in pairs])
    good = (time >= 0.0) & np.isfinite(discount) & (rates.fault == "")
    return time[day], discount[day], rate[day], good[day]


def _coded(values: Iterable[Hashable]) -> tuple[Codes, list[Any]]:
    """Each value's number, and the different values in the order of their numbers."""
    number: dict[Hashable, int] = {}
    codes = [number.setdefault(value, len(number)) for value in values]
    return np.array(codes, dtype=np.intp), list(number)


def _floats(values: list[float | None]) -> FloatArray:
    """As an array, NaN for None."""
    return np.array(values, dtype=np.float64)
