"""Round numbers for a surface: where its ramp begins and ends, and at which values its isolines run. No Qt here."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

# At most so many even steps. A signed quantity often has a narrow ridge, on which every line comes back again.
_MOST_STEPS = {False: 11, True: 8}
# The ramp ends at rounder numbers than the values do, but not so round that much of it goes unused.
_MOST_END_STEPS = 25
# Below the first even line of a quantity that starts at zero, three more are drawn, by the leading figure of the step:
# that is where an option out of the money lives.
_LOW_SHARES = {"1": (0.1, 0.2, 0.5), "2": (0.1, 0.25, 0.5), "5": (0.1, 0.2, 0.4)}
# A surface that varies by less, of its size, is flat: the rest is rounding.
_FLAT = 1e-9
# A value counts as below zero from this share of the largest on.
_SIGN = 1e-6
# An isoline this near to the lowest or highest value, as a share of the range, would only trace a plateau's noise.
_RIM = 2e-3


@dataclass(frozen=True)
class Levels:
    """The `ramp` and the part of it that the surface uses (`used`), from low to high, and the isolines.

    `step` parts the even isolines. A signed quantity has a ramp that is even about zero. A flat surface has no line.
    """

    ramp: tuple[float, float]
    used: tuple[float, float]
    step: float
    lines: FloatArray
    signed: bool
    flat: bool

    @property
    def largest(self) -> float:
        """The size of the numbers at the ends."""
        return max(abs(self.used[0]), abs(self.used[1]))

    @property
    def finest(self) -> float:
        """The least size of an isoline but that of zero, or the step: what labels must be able to tell."""
        sizes = np.abs(self.lines)
        return float(min([self.step, *sizes[sizes > 0.01 * self.step]]))


def levels_of(values: FloatArray, signed: bool, negligible: float = 0.0) -> Levels:
    """Levels for finite values (n, m); `signed` if zero parts two kinds of answer, as it does wherever one is negative.

    Differences up to `negligible` are none, and values up to it are zero.

    >>> found = levels_of(np.array([[0.2, 47.0]]), signed=False)
    >>> found.ramp, found.step, [round(float(line), 9) for line in found.lines[:5]]
    ((0.0, 48.0), 5.0, [0.5, 1.0, 2.0, 5.0, 10.0])
    """
    low, high = float(values.min()), float(values.max())
    if max(abs(low), abs(high)) <= negligible:
        low = high = 0.0
    largest = max(abs(low), abs(high))
    signed = signed or low < -_SIGN * largest
    if high - low <= max(_FLAT * largest, negligible, float(np.finfo(np.float64).tiny)):
        return Levels(_about_zero(largest) if signed else (low, low + (largest or 1.0)), (low, high), 0.0,
                      np.empty(0), signed, True)  # fmt: skip
    step = round_step(high - low, _MOST_STEPS[signed])
    end = round_step(high - low, _MOST_END_STEPS)
    used = (end * math.floor(low / end + 1e-9), end * math.ceil(high / end - 1e-9))
    ramp = _about_zero(max(-used[0], used[1])) if signed else used
    return Levels(ramp, used, step, _lines(low, high, step, signed), signed, False)


def round_step(span: float, most: int) -> float:
    """The smallest of 1, 2 and 5 times a power of ten that goes into `span` at most `most` times.

    >>> round_step(47.0, 10), round_step(0.9, 10)
    (5.0, 0.1)
    """
    least = span / most
    exponent = math.floor(math.log10(least) + 1e-9)
    for lead in (1, 2, 5, 10):
        # From the digits, so that 0.1 is 0.1 and not what a power of ten leaves of it.
        step = float(f"{lead}e{exponent}")
        if step >= least * (1 - 1e-9):
            return step
    return float(f"1e{exponent + 1}")


def multiples(low: float, high: float, step: float) -> FloatArray:
    """The multiples of `step` from `low` to `high`, both included."""
    count = np.arange(math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9) + 1, dtype=np.float64)
    return count * step


def _about_zero(size: float) -> tuple[float, float]:
    return (-size, size) if size > 0 else (-1.0, 1.0)


def _lines(low: float, high: float, step: float, signed: bool) -> FloatArray:
    even = multiples(low, high, step)
    shares = _LOW_SHARES[f"{step:e}"[0]]
    starts_at_zero = not signed and abs(low) < shares[0] * step
    lines = np.concatenate([np.multiply(shares, step), even]) if starts_at_zero else even
    rim = _RIM * (high - low)
    kept: FloatArray = lines[(lines > low + rim) & (lines < high - rim)]
    return kept
