"""Discount factors from zero rates by date.

The zero rates are continuous, as decimals a year, and time is ACT/365F from the valuation date. Between two points the
zero rate times time runs straight, that is the logarithm of the discount factor, so the instantaneous forward rate is
flat there. Before the first point and after the last the zero rate is theirs. (Common practice, no source.)

Why this rule and no smoother one: each discount factor depends on the two points around it alone, so that a point
which is mended moves nothing further away; the discount factor has no jump; and it falls between any two points where
the second is the lower, which a straight line through the zero rates does not warrant. Before the first point the rule
is the same one, with a discount factor of one today. After the last it is not: to run the last forward rate on would
rest all long payments on the difference of the last two points.

>>> import datetime
>>> day = datetime.date(2026, 12, 1)
>>> curve = ZeroCurve(day, ((datetime.date(2027, 12, 1), 0.02), (datetime.date(2028, 11, 30), 0.03)))
>>> curve.rate([0.5, 1.0, 1.5, 2.0, 9.0]).round(12).tolist()
[0.02, 0.02, 0.026666666667, 0.03, 0.03]
>>> curve.discount(np.array(["2026-12-01", "2027-12-01"], dtype="datetime64[D]")).round(6).tolist()
[1.0, 0.980199]
"""

from __future__ import annotations

import datetime
import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

from spreadgui.market.time import DAYS_A_YEAR, discount_factor, years

FloatArray = NDArray[np.float64]
Point = tuple[datetime.date, float]


def curve_faults(valuation_date: datetime.date, points: Sequence[Point]) -> tuple[str, ...]:
    """What keeps `points` from being a curve, each as a sentence that begins with its place; empty where nothing does.

    >>> day, rate = datetime.date(2027, 3, 1), 0.03
    >>> curve_faults(datetime.date(2026, 12, 1), [(day, rate), (day, 0.04)])
    ('points[1]: there is a zero rate for 2027-03-01 already',)
    """
    found, seen = [], set[datetime.date]()
    for index, (day, rate) in enumerate(points):
        if day in seen:
            found.append(f"points[{index}]: there is a zero rate for {day} already")
        elif index and day < points[index - 1][0]:
            found.append(f"points[{index}]: {day} comes after {points[index - 1][0]}; the dates have to go up")
        if not math.isfinite(rate):
            found.append(f"points[{index}]: the zero rate of {day} is {rate:g}, which is no rate")
        seen.add(day)
    if not any(day > valuation_date for day, _ in points):
        found.append(f"points: there is no zero rate for a day after {valuation_date}")
    return tuple(found)


@dataclass(frozen=True)
class ZeroCurve:
    """Zero rates by date, seen from `valuation_date`; `points` are (date, zero rate) with dates that go up.

    Points on or before the valuation date are past and count for nothing, so that a curve serves the days after it was
    written too; one point at least has to lie ahead. Raises ValueError with the first of `curve_faults`.
    """

    valuation_date: datetime.date
    points: tuple[Point, ...]

    def __post_init__(self) -> None:
        faults = curve_faults(self.valuation_date, self.points)
        if faults:
            raise ValueError(faults[0])

    @staticmethod
    def flat(valuation_date: datetime.date, rate: float) -> ZeroCurve:
        """The curve with one zero rate for all time; its discount factors are exp(−rate · t) to the last digit.

        Raises ValueError for a rate that is not finite.

        >>> from spreadgui.market.time import discount_factor
        >>> curve = ZeroCurve.flat(datetime.date(2026, 12, 1), 0.03)
        >>> curve.discount(0.7).item() == discount_factor(0.03, 0.7)
        True
        """
        return ZeroCurve(valuation_date, ((valuation_date + datetime.timedelta(days=1), rate),))

    def rate(self, when: ArrayLike) -> FloatArray:
        """The zero rate to each of `when`: years from the valuation date, or days as datetime64; any shape, kept.

        A decimal a year, continuous. Exactly the point's at a point; the first point's for today and for what is past;
        NaN where the time is NaN or NaT.
        """
        time = self.years(when)
        index = np.searchsorted(self._times, time, side="right")
        after = np.minimum(index, len(self._times) - 1)
        before = np.maximum(np.minimum(index, len(self._times)) - 1, 0)
        found = self._rates[before] + self._way(time, before, after) * (self._rates[after] - self._rates[before])
        return np.where(np.isnan(time), np.nan, found)

    def discount(self, when: ArrayLike) -> FloatArray:
        """The value today of one unit of money at each of `when` (as in `rate`): exp(−rate · t).

        Above one for what is past, infinite beyond exp(700) as in `time.discount_factor`, NaN where the time is NaN.
        """
        time, rate = self.years(when), self.rate(when)
        # One by one, by the function that a single rate goes through: arrays round the last digit in their own way.
        each = zip(rate.ravel().tolist(), time.ravel().tolist(), strict=True)
        found = np.array([discount_factor(*one) for one in each], dtype=np.float64).reshape(time.shape)
        return np.where(np.isnan(time), np.nan, found)

    def years(self, when: ArrayLike) -> FloatArray:
        """`when` as years from the valuation date, ACT/365F; numbers are years already.

        Raises ValueError, naming the argument, for what is neither numbers nor datetime64 days.
        """
        given = np.asarray(when)
        if given.dtype.kind == "M":
            days = given.astype("datetime64[D]") - np.datetime64(self.valuation_date, "D")
            return np.asarray(np.where(np.isnat(days), np.nan, days.astype(np.float64)) / DAYS_A_YEAR)
        if given.dtype.kind not in "iuf":
            raise ValueError(f"when: expected years or days, found an array of {given.dtype}")
        return np.asarray(given, dtype=np.float64)

    def _way(self, time: FloatArray, before: NDArray[np.intp], after: NDArray[np.intp]) -> FloatArray:
        """How much of the rate's step from one point to the next is done: with t1 and t2 the points' times,
        t2 (t − t1) / (t (t2 − t1)), which makes rate times time straight; 0 where there is no next point."""
        start, end = self._times[before], self._times[after]
        between = (time > start) & (end > start)
        way = np.zeros(time.shape)
        time, start, end = time[between], start[between], end[between]
        way[between] = end * (time - start) / (time * (end - start))
        return way

    @cached_property
    def _ahead(self) -> tuple[Point, ...]:
        return tuple(point for point in self.points if point[0] > self.valuation_date)

    @cached_property
    def _times(self) -> FloatArray:
        return np.array([years(self.valuation_date, day) for day, _ in self._ahead])

    @cached_property
    def _rates(self) -> FloatArray:
        return np.array([rate for _, rate in self._ahead], dtype=np.float64)
