"""Strips: one option for each day of a delivery month, what each of them has behind it, and what volatility.

A day's option is over that day's share of the month, exercised on the business day before. Up to the first day of the
month its forward moves as the month's does, with the mark's volatility; from there to its exercise with the market's
daily volatility (where it has none, with the mark's). So with t years to the month and u years inside it, the variance
of a leg is vol^2 t + daily^2 u, and the covariance of two legs rho (vol vol' t + daily daily' u): the correlation of
their shocks is the same throughout. The forward of each day is the month's.

Which days are business days is what every market of the position says: its days of the week, less its holidays.
"""

from __future__ import annotations

import calendar
import datetime
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from spreadgui.book.entries import delivery_start, quoted, shown
from spreadgui.book.records import Exercise, Market
from spreadgui.market.time import DAYS_A_YEAR

FloatArray = NDArray[np.float64]
Days = NDArray[np.datetime64]
WEEK = 7


@dataclass(frozen=True)
class Strip:
    """The exercises of a strip that are still to come, in order; arrays with one entry each.

    `days` are delivered, `expiries` exercised. `before` and `within` are the years to an expiry that lie before and in
    the delivery month. `share` is each one's part of the quantity, so that the shares add up to less than one once some
    of the month is past. `daily_long` and `daily_short` are the volatilities inside the month, NaN where a leg has none
    of its own and goes on with its mark's.
    """

    days: Days
    expiries: Days
    before: FloatArray
    within: FloatArray
    share: float
    daily_long: float
    daily_short: float

    def __len__(self) -> int:
        return len(self.days)

    @property
    def years(self) -> FloatArray:
        """Years from the valuation date to each expiry, ACT/365F."""
        return self.before + self.within


def is_week(text: str) -> bool:
    """Whether `text` has a 1 or a 0 for each day of the week, and at least one business day among them."""
    return len(text) == WEEK and set(text) <= {"0", "1"} and "1" in text


def calendar_fault(markets: Sequence[Market]) -> str:
    """Why the markets have no calendar together, as a sentence; empty where they have."""
    for market in markets:
        if not is_week(market.business_days):
            return f"the business days of {shown(market.name)} are {quoted(market.business_days)}, not seven of 1 and 0"
    if markets and not any(all(market.business_days[day] == "1" for market in markets) for day in range(WEEK)):
        return f"{' and '.join(shown(market.name) for market in markets)} have no business day of the week in common"
    return ""


def business_calendar(markets: Sequence[Market]) -> np.busdaycalendar:
    """The days that are business days in every one of `markets`; without any, Monday to Friday.

    >>> import datetime
    >>> from spreadgui.book.records import Market
    >>> north = Market("North", "CRN/MWh", holidays=(datetime.date(2027, 1, 1),))
    >>> bool(np.is_busday("2027-01-01", busdaycal=business_calendar([north])))
    False
    """
    weeks = [market.business_days for market in markets] or ["1111100"]
    week = [all(one[day] == "1" for one in weeks) for day in range(WEEK)]
    return np.busdaycalendar(week, [day for market in markets for day in market.holidays])


def delivery_days(delivery: str, exercise: Exercise, business: np.busdaycalendar) -> Days:
    """The days of a delivery month on which a strip delivers: all of them, or its business days."""
    first = delivery_start(delivery)
    start = np.datetime64(first, "D")
    days = start + np.arange(calendar.monthrange(first.year, first.month)[1])
    return days if exercise == "all days" else days[np.is_busday(days, busdaycal=business)]


def business_days_before(days: Days, business: np.busdaycalendar) -> Days:
    """The last business day before each of `days`.

    >>> week = business_calendar([])
    >>> business_days_before(np.array(["2027-01-03", "2027-01-04", "2027-01-05"], dtype="datetime64[D]"), week).tolist()
    [datetime.date(2027, 1, 1), datetime.date(2027, 1, 1), datetime.date(2027, 1, 4)]
    """
    found: Days = np.busday_offset(days, -1, roll="forward", busdaycal=business)
    return found


def exercises(
    delivery: str, exercise: Exercise, markets: Sequence[Market], valuation_date: datetime.date
) -> tuple[Days, Days, int]:
    """Days and expiries of what is still to come of a strip, and how many days it has in all."""
    business = business_calendar(markets)
    days = delivery_days(delivery, exercise, business)
    expiries = business_days_before(days, business)
    ahead = expiries >= np.datetime64(valuation_date, "D")
    return days[ahead], expiries[ahead], len(days)


def strip_of(
    delivery: str,
    days: Days,
    expiries: Days,
    of_all: int,
    valuation_date: datetime.date,
    daily: tuple[float, float],
) -> Strip:
    """The strip over these exercises; `daily` are the two legs' volatilities inside the month."""
    today, start = np.datetime64(valuation_date, "D"), np.datetime64(delivery_start(delivery), "D")
    years = (expiries - today).astype(np.float64) / DAYS_A_YEAR
    to_month = max(float((start - today).astype(np.float64)) / DAYS_A_YEAR, 0.0)
    before = np.minimum(years, to_month)
    return Strip(days, expiries, before, years - before, 1.0 / of_all, *daily)
