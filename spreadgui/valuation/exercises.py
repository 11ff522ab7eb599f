"""From rows of a slate to what the formulas price: one line for each exercise, and back to one a row.

A position that is exercised once is its own line. A strip has a line for each of its days, whose volatilities and
correlation are those that its variance comes to (market.strips says how), and its value and sensitivities are the sums
over the days. What a formula says of a line's volatilities is carried back to the mark's, the one before the delivery
month and the one inside it, by the chain rule.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from spreadgui.market.strips import Strip
from spreadgui.market.time import discount_factor
from spreadgui.market.zero_rates import ZeroRates
from spreadgui.pricing.results import Sensitivities
from spreadgui.valuation.results import output_row
from spreadgui.valuation.slate import INPUTS, CodeArray, FloatArray, RowArray, Slate

_LINE = {key: line for line, key in enumerate(INPUTS)}


@dataclass(frozen=True)
class Exercises:
    """Lines for the formulas, those of each row together and in the order of the rows.

    `inputs`, `kind`, `shape` and `law` are as in a slate, with one entry a line; `owner` is the place of a line's row
    among the rows asked for, `share` its part of the row's quantity. `chain` is there where some rows are strips.
    """

    inputs: FloatArray
    kind: CodeArray
    shape: CodeArray
    law: CodeArray
    owner: RowArray
    share: FloatArray
    rows: int
    chain: Chain | None = None

    def gathered(self, outputs: FloatArray) -> FloatArray:
        """Outputs by line, (k, lines), as outputs by row: (k, rows)."""
        if self.chain is None:
            return outputs
        starts = np.searchsorted(self.owner, np.arange(self.rows))
        found: FloatArray = np.add.reduceat(self.share * self.chain.carried_back(outputs), starts, axis=1)
        return found


class Chain(NamedTuple):
    """Derivatives of what a line's formula was given by what a mark says, each with one entry a line.

    With A, B the variances of the two legs to the expiry, C their covariance and r their effective correlation, a
    volatility of the mark moves the line's own volatility and, because A and C do not grow alike, r: a pair (by the
    volatility, by the correlation) for each. Time moves all three at the pace of the mark's volatilities.
    """

    vega_long: tuple[FloatArray, FloatArray]
    vega_short: tuple[FloatArray, FloatArray]
    daily_long: tuple[FloatArray, FloatArray]
    daily_short: tuple[FloatArray, FloatArray]
    correlation: FloatArray
    time: tuple[FloatArray, FloatArray, FloatArray]
    once: NDArray[np.bool_]

    def carried_back(self, outputs: FloatArray) -> FloatArray:
        """The outputs with sensitivities to the marks in place of those to what the formulas were given."""
        carried = outputs.copy()
        long, short, tied = (outputs[output_row(key)] for key in ("vega_long", "vega_short", "correlation_sensitivity"))
        for key, (by_long, by_short, by_tie) in self._factors().items():
            line = output_row(key)
            carried[line] = np.where(self.once, outputs[line], by_long * long + by_short * short + by_tie * tied)
        return carried

    def at(self, line: int, key: str, found: Sensitivities) -> FloatArray:
        """One sensitivity to the marks, of what a formula says of many places of one line."""
        factors = self._factors().get(key)
        if factors is None or self.once[line]:
            return np.asarray(getattr(found, key))
        by_long, by_short, by_tie = (one if isinstance(one, float) else float(one[line]) for one in factors)
        sensitivities = (found.vega_long, found.vega_short, found.correlation_sensitivity)
        return np.asarray(by_long * sensitivities[0] + by_short * sensitivities[1] + by_tie * sensitivities[2])

    def _factors(self) -> dict[str, tuple[FloatArray | float, FloatArray | float, FloatArray | float]]:
        """By which the formula's two vegas and its correlation sensitivity add up to each one to the marks."""
        by_long, by_short, by_tie = self.time
        return {
            "vega_long": (self.vega_long[0], 0.0, self.vega_long[1]),
            "vega_short": (0.0, self.vega_short[0], self.vega_short[1]),
            "daily_vega_long": (self.daily_long[0], 0.0, self.daily_long[1]),
            "daily_vega_short": (0.0, self.daily_short[0], self.daily_short[1]),
            "correlation_sensitivity": (0.0, 0.0, self.correlation),
            "theta": (-by_long, -by_short, -by_tie),
        }


def expand(slate: Slate, rows: RowArray, correlation: FloatArray | None = None) -> Exercises:
    """The exercises of `rows`, which must be ready; with another marked `correlation` for each, if one is given."""
    inputs, codes = slate.inputs[:, rows], (slate.kind[rows], slate.shape[rows], slate.law[rows])
    if correlation is not None:
        inputs[_LINE["correlation"]] = correlation
    strips = [slate.strips.get(row) for row in rows.tolist()] if slate.strips else []
    if not any(strips):
        everyone = np.arange(len(rows))
        return Exercises(inputs, *codes, everyone, np.ones(len(rows)), len(rows))
    counts = np.array([1 if strip is None else len(strip) for strip in strips])
    owner = np.repeat(np.arange(len(rows)), counts)
    inputs, timing = inputs[:, owner], _Timing.of(strips, counts, ZeroRates.of(slate.book), inputs)
    for key in ("years", "discount", "rate"):
        inputs[_LINE[key]] = np.where(timing.once, inputs[_LINE[key]], getattr(timing, key))
    chain = _with_effective(inputs, timing)
    kind, shape, law = (code[owner] for code in codes)
    return Exercises(inputs, kind, shape, law, owner, timing.share, len(rows), chain)


def of_strip(slate: Slate, row: int) -> Exercises:
    """The exercises of one row, for whoever shows them by day."""
    return expand(slate, np.array([row]))


@dataclass(frozen=True)
class _Timing:
    """When each line is exercised; arrays with one entry a line."""

    once: NDArray[np.bool_]
    before: FloatArray
    within: FloatArray
    discount: FloatArray
    share: FloatArray
    daily_long: FloatArray
    daily_short: FloatArray
    rate: FloatArray

    @property
    def years(self) -> FloatArray:
        return self.before + self.within

    @staticmethod
    def of(strips: list[Strip | None], counts: RowArray, rates: ZeroRates, inputs: FloatArray) -> _Timing:
        lines = np.full((7, int(counts.sum())), np.nan)
        once = np.zeros(lines.shape[1], dtype=np.bool_)
        start = 0
        for place, (strip, count) in enumerate(zip(strips, counts.tolist(), strict=True)):
            part = lines[:, start : start + count]
            if strip is None:
                once[start] = True
                part[:4, 0] = inputs[_LINE["years"], place], 0.0, inputs[_LINE["discount"], place], 1.0
            else:
                part[0], part[1], part[3] = strip.before, strip.within, strip.share
                times = strip.years.tolist()
                part[6] = [rates.rate(years) for years in times]
                part[2] = [discount_factor(rate, years) for rate, years in zip(part[6].tolist(), times, strict=True)]
                part[4], part[5] = strip.daily_long, strip.daily_short
            start += count
        return _Timing(once, *lines)


def _with_effective(inputs: FloatArray, timing: _Timing) -> Chain:
    """Put the volatilities and the correlation that each line's variance comes to into `inputs`; the chain back."""
    vols = [inputs[_LINE[key]].copy() for key in ("vol_long", "vol_short")]
    goes_on = [np.isnan(timing.daily_long), np.isnan(timing.daily_short)]
    dailies = [
        np.where(goes_on[0], vols[0], timing.daily_long),
        np.where(goes_on[1], vols[1], timing.daily_short),
    ]
    marked = inputs[_LINE["correlation"]].copy()
    with np.errstate(divide="ignore", invalid="ignore"):
        line = _Line.of(vols, dailies, marked, timing)
        for key, found in zip(("vol_long", "vol_short", "correlation"), line.effective(vols), strict=True):
            inputs[_LINE[key]] = np.where(timing.once, inputs[_LINE[key]], found)
        outer = [line.moved(leg, vols, timing.before) for leg in (0, 1)]
        inner = [line.moved(leg, dailies, timing.within) for leg in (0, 1)]
        time = line.paced([np.where(timing.before > 0.0, vols[leg], dailies[leg]) for leg in (0, 1)])
    marks: list[tuple[FloatArray, FloatArray]] = []
    insides: list[tuple[FloatArray, FloatArray]] = []
    for on, (by_vol, by_tie), (daily_by_vol, daily_by_tie) in zip(goes_on, outer, inner, strict=True):
        # Without a volatility of its own inside the month, the mark's rules there as well.
        marks.append((by_vol + np.where(on, daily_by_vol, 0.0), by_tie + np.where(on, daily_by_tie, 0.0)))
        insides.append((np.where(on, 0.0, daily_by_vol), np.where(on, 0.0, daily_by_tie)))
    return Chain(marks[0], marks[1], insides[0], insides[1], line.tied, time, timing.once)


class _Line(NamedTuple):
    """Variances of the two legs to each expiry, their covariance over the root of both (at a correlation of one), the
    marked correlation, and the years."""

    variances: tuple[FloatArray, FloatArray]
    product: FloatArray
    tied: FloatArray
    marked: FloatArray
    years: FloatArray

    @staticmethod
    def of(vols: list[FloatArray], dailies: list[FloatArray], marked: FloatArray, timing: _Timing) -> _Line:
        before, within = timing.before, timing.within
        long, short = (vol**2 * before + daily**2 * within for vol, daily in zip(vols, dailies, strict=True))
        product = np.sqrt(long) * np.sqrt(short)
        shared = (vols[0] * vols[1] * before + dailies[0] * dailies[1] * within) / product
        # Rounding could leave the quotient a digit above one; where nothing moves it does not matter.
        tied = np.where(product > 0.0, np.minimum(shared, 1.0), 1.0)
        return _Line((long, short), product, tied, marked, timing.years)

    def effective(self, vols: list[FloatArray]) -> tuple[FloatArray, FloatArray, FloatArray]:
        """The two volatilities and the correlation that a formula is given."""
        long, short = (
            np.where(self.years > 0.0, np.sqrt(variance / self.years), vol)
            for variance, vol in zip(self.variances, vols, strict=True)
        )
        return long, short, self.marked * self.tied

    def moved(self, leg: int, vols: list[FloatArray], span: FloatArray) -> tuple[FloatArray, FloatArray]:
        """What a leg's volatility that rules for `span` years does to its effective one and to the correlation."""
        vol, other, variance = vols[leg], vols[1 - leg], self.variances[leg]
        tied = self.marked * (other / self.product - self.tied * vol / variance)
        return _number(vol * span / np.sqrt(variance * self.years)), _number(tied * span)

    def paced(self, pace: list[FloatArray]) -> tuple[FloatArray, FloatArray, FloatArray]:
        """What a year at these volatilities does to either effective volatility and to the correlation.

        As in the formulas, an expiry that moves away stretches the variance; here it stretches at the pace of the
        volatilities that rule now.
        """
        long, short = (one**2 / variance for one, variance in zip(pace, self.variances, strict=True))
        by_vol = [
            _number(share * np.sqrt(variance / self.years) / 2.0)
            for share, variance in zip((long, short), self.variances, strict=True)
        ]
        tied = self.marked * (pace[0] * pace[1] / self.product - self.tied * (long + short) / 2.0)
        return by_vol[0], by_vol[1], _number(tied)


def _number(found: FloatArray) -> FloatArray:
    """Zero where there is no leg, no time or no variance: nothing moves there."""
    return np.where(np.isfinite(found), found, 0.0)
