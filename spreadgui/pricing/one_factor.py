"""The spread option when one normal factor is all there is: correlation one or minus one, or a leg without volatility.

With z the factor, S1 = F1 exp(a z - a^2/2) and S2 = F2 exp(b z - b^2/2), b signed by the correlation, the logarithm of
S1/(S2 + K) is

    h(z) = ln F1 + a z - a^2/2 - ln(F2 exp(b z - b^2/2) + K),

a line less a convex function, hence concave: the option is exercised on one interval between at most two roots. Outside
the interval a tangent lies above h and its own root stops short of the interval's end, so that Newton's method, started
where the outer asymptote of h crosses zero, closes in from outside and never steps past. A right end exists for b > a
alone; there h has its peak where the short leg's share of S1 is a/b, and no peak above zero means no exercise at all.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import expit, ndtr

from spreadgui.pricing.inputs import Array

NEWTON_STEPS = 100
CLOSE = 4e-16

Mask = NDArray[np.bool_]


class _Height(NamedTuple):
    """h and what it is made of, with ln F1 taken as the origin."""

    a: Array
    b: Array
    log_short: Array
    log_strike: Array

    def share(self, z: Array) -> Array:
        return np.asarray(expit(self.log_short + self.b * z - 0.5 * self.b * self.b - self.log_strike))

    def at(self, z: Array) -> Array:
        log_second = self.log_short + self.b * z - 0.5 * self.b * self.b
        return np.asarray(self.a * z - 0.5 * self.a * self.a - np.logaddexp(log_second, self.log_strike))


def _root(height: _Height, z: Array, wanted: Mask) -> Array:
    """The end of the exercise interval reached from outside; untouched where not wanted."""
    for _ in range(NEWTON_STEPS):
        step = height.at(z) / (height.a - height.b * height.share(z))
        z = np.where(wanted & np.isfinite(step), z - step, z)
        # A row that has arrived stays where it is, however long its neighbours take.
        wanted = wanted & (np.abs(step) > CLOSE * (1.0 + np.abs(z)))
        if not wanted.any():
            break
    return z


def _peak(height: _Height) -> Array:
    """The largest h where b > a > 0."""
    share = height.a / height.b
    odds = np.log(share) - np.log1p(-share)
    return height.at((odds + height.log_strike - height.log_short) / height.b + 0.5 * height.b)


def integrate(first: Array, second: Array, strike: Array, a: Array, b: Array, side: Array) -> Array:
    """Layers (6, n): exercised (side +1) or other (side -1) mass under the unit weight and under either leg, then the
    three edge layers of `Masses`. Strikes above zero; b signed, and not negative where a is zero."""
    height = _Height(a, b, np.log(second / first), np.log(strike / first))
    bounded = b > a
    moving = (a > 0.0) | (b > 0.0)
    ever = (
        np.where(bounded, np.where(a > 0.0, _peak(height) > 0.0, first > strike), (a != b) | (first > second)) & moving
    )
    has_left, has_right = ever & (a > 0.0), ever & bounded
    from_left = np.where(
        b < 0.0,
        0.5 * (a + b) + height.log_short / np.where(b < 0.0, a - b, 1.0),
        0.5 * a + height.log_strike / np.where(a > 0.0, a, 1.0),
    )
    from_right = 0.5 * (a + b) + height.log_short / np.where(bounded, a - b, 1.0)
    left = _root(height, np.where(has_left, from_left, 0.0), has_left)
    right = _root(height, np.where(has_right, from_right, 0.0), has_right)
    out = np.zeros((6, first.size))
    still = 0.5 * (1.0 + side * np.sign(first - second - strike))
    low = np.where(has_left, left, np.where(ever, -np.inf, np.inf))
    high = np.where(has_right, right, np.inf)
    for layer, shift in enumerate((0.0, a, b)):
        out[layer] = np.where(moving, _mass(low - shift, high - shift, side), still)
    for z, has in ((left, has_left), (right, has_right)):
        out[3:] += _edges(height, z, has)
    return out


def _mass(low: Array, high: Array, side: Array) -> Array:
    """Normal mass between two points, or outside them."""
    flip = low > 0.0
    between = np.where(flip, ndtr(-low) - ndtr(-high), ndtr(high) - ndtr(low))
    return np.asarray(np.where(side > 0.0, np.maximum(between, 0.0), ndtr(low) + ndtr(-high)))


def _edges(height: _Height, z: Array, has: Mask) -> Array:
    """What one root gives to the edge layers; a root at which h only touches zero carries a point mass and is left
    out."""
    share = height.share(z)
    slope = np.abs(height.a - height.b * share)
    live = has & (slope > 0.0)
    gap = z - height.a
    density = np.where(live, np.exp(-0.5 * gap * gap) / np.sqrt(2.0 * np.pi) / np.where(live, slope, 1.0), 0.0)
    return np.stack((density, density * share, density * share * share))
