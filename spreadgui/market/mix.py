"""A weighted mix of forwards as one: moments matched, and what each part's marks do to them.

With m_i = w_i (F_i + h_i) the shifted, weighted parts, the mix M = sum m_i has the exact moments

    E[M_T] = sum m_i,      E[M_T^2] = sum m_i m_j exp(rho_ij s_i s_j T),

and it is taken as lognormal with these two (E. Levy, "Pricing European average rate currency options", Journal of
International Money and Finance 11, 1992, 474-491, matches an average so): its volatility is s with s^2 T = ln(E[M^2] /
E[M]^2), its shift the weighted sum of the parts'. Its correlation r with the other leg N, a market or another mix, is
the one that gives the exact covariance, r s_M s_N T = ln(E[M N] / (E[M] E[N])). Under normal forwards the mix is
normal itself, with variance sum w_i w_j rho_ij s_i s_j a year, and nothing is approximate.

The sum of lognormals is no lognormal: how far a value is off is measured by tests/benchmarks/blend_gap.py against a
simulation of the true payoff, and for one position on request in the program.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Leg:
    """The parts of one leg, arrays (n,): weights above zero, forwards, shifts, volatilities (absolute where normal)."""

    weights: FloatArray
    forwards: FloatArray
    shifts: FloatArray
    vols: FloatArray

    @property
    def forward(self) -> float:
        """The forward of the mix."""
        return float(self.weights @ self.forwards)

    @property
    def shift(self) -> float:
        """What has to be added to the mix to make it lognormal."""
        return float(self.weights @ self.shifts)


class Slopes(NamedTuple):
    """What a part's forward and volatility do to the mix's volatility and to its correlation; arrays (n,)."""

    vol_by_forward: FloatArray
    vol_by_vol: FloatArray
    correlation_by_forward: FloatArray
    correlation_by_vol: FloatArray


class Matched(NamedTuple):
    """Two legs as two forwards: volatilities and correlation, and the slopes of either leg's parts."""

    vol_long: float
    vol_short: float
    correlation: float
    long: Slopes
    short: Slopes


def matched(
    long: Leg, short: Leg, inside: tuple[FloatArray, FloatArray], across: FloatArray, years: float, *, normal: bool
) -> Matched:
    """The two legs to an expiry `years` ahead; `inside` are the correlations within either leg, (n, n) and (m, m), and
    `across` those between them, (n, m). At an expiry of zero the limits are taken."""
    moments = _normal if normal else _lognormal
    one, other = moments(long, inside[0], years), moments(short, inside[1], years)
    return _joined(long, short, one, other, across, years, normal=normal)


def vol_of(leg: Leg, inside: FloatArray, years: float, *, normal: bool) -> float:
    """The mix's volatility alone, where there is no other leg."""
    return (_normal if normal else _lognormal)(leg, inside, years).vol


class _Moments(NamedTuple):
    """A mix's volatility, and its slopes in the weighted parts (per unit of m_i) and in the volatilities."""

    vol: float
    by_part: FloatArray
    by_vol: FloatArray
    sizes: FloatArray


def _lognormal(leg: Leg, inside: FloatArray, years: float) -> _Moments:
    sizes = leg.weights * (leg.forwards + leg.shifts)
    total, product = sizes.sum(), inside * np.outer(leg.vols, leg.vols)
    if years > 0.0:
        grown = np.exp(product * years)
        second = sizes @ grown @ sizes
        vol = float(np.sqrt(max(np.log(second / total**2), 0.0) / years))
        by_part = 2.0 * (grown @ sizes) / second - 2.0 / total
        by_vol = 2.0 * sizes * ((grown * inside) @ (sizes * leg.vols)) * years / second
        scale = 2.0 * vol * years
    else:
        variance = sizes @ product @ sizes / total**2
        vol = float(np.sqrt(max(variance, 0.0)))
        by_part = 2.0 * (product @ sizes) / total**2 - 2.0 * variance / total
        by_vol = 2.0 * sizes * (inside @ (sizes * leg.vols)) / total**2
        scale = 2.0 * vol
    return _Moments(vol, _over(by_part, scale), _over(by_vol, scale), sizes)


def _normal(leg: Leg, inside: FloatArray, _years: float) -> _Moments:
    carried = leg.weights * leg.vols
    vol = float(np.sqrt(max(float(carried @ inside @ carried), 0.0)))
    none = np.zeros_like(carried)
    return _Moments(vol, none, _over(leg.weights * (inside @ carried), vol), leg.weights)


def _joined(
    long: Leg, short: Leg, one: _Moments, other: _Moments, across: FloatArray, years: float, *, normal: bool
) -> Matched:
    """The correlation of two mixes from their covariance, with the slopes of both legs' parts."""
    product = across * np.outer(long.vols, short.vols)
    sizes, sold = one.sizes, other.sizes
    # With normal legs, and in the limit of no time, the covariance is a plain sum; else one of logarithms.
    if normal or years <= 0.0:
        scale = 1.0 if normal else 1.0 / (sizes.sum() * sold.sum())
        shared, span = float(sizes @ product @ sold) * scale, 1.0
        by_part, by_sold = product @ sold * scale, product.T @ sizes * scale
        if normal:
            by_part, by_sold = np.zeros_like(sizes), np.zeros_like(sold)
        else:
            by_part, by_sold = by_part - shared / sizes.sum(), by_sold - shared / sold.sum()
        by_vol = sizes * (across @ (sold * short.vols)) * scale
        by_sold_vol = sold * (across.T @ (sizes * long.vols)) * scale
    else:
        grown, span = np.exp(product * years), years
        joint = float(sizes @ grown @ sold)
        shared = float(np.log(joint / (sizes.sum() * sold.sum())))
        by_part, by_sold = grown @ sold / joint - 1.0 / sizes.sum(), grown.T @ sizes / joint - 1.0 / sold.sum()
        by_vol = sizes * ((grown * across) @ (sold * short.vols)) * years / joint
        by_sold_vol = sold * ((grown * across).T @ (sizes * long.vols)) * years / joint
    bound = one.vol * other.vol * span
    tie = shared / bound if bound > 0.0 else 0.0
    slopes = [
        Slopes(
            leg.weights * mine.by_part,
            mine.by_vol,
            leg.weights * (_over(part, bound) - _over(tie * mine.by_part, mine.vol)),
            _over(vol, bound) - _over(tie * mine.by_vol, mine.vol),
        )
        for leg, mine, part, vol in ((long, one, by_part, by_vol), (short, other, by_sold, by_sold_vol))
    ]
    return Matched(one.vol, other.vol, float(np.clip(tie, -1.0, 1.0)), slopes[0], slopes[1])


def _over(numbers: FloatArray, divisor: float) -> FloatArray:
    """Zero where nothing moves."""
    found: FloatArray = numbers / divisor if divisor > 0.0 else np.zeros_like(numbers)
    return found
