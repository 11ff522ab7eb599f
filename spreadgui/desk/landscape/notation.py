"""How the numbers of one axis are written: all with the same decimals and the same power of ten. No Qt here."""

from __future__ import annotations

import math
from dataclasses import dataclass

from spreadgui.valuation.shown import number_text, trimmed_text

_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
# Between these a number is written out; beyond, its axis takes a power of ten.
_LEAST_PLAIN, _MOST_PLAIN = 1e-3, 1e6
_MOST_DECIMALS = 12
# A desk reads prices to the cent, from where a cent is little to where cents are lost in the figure.
_CENTS_FROM, _CENTS_BELOW = 0.5, 1e5


@dataclass(frozen=True)
class Notation:
    """`decimals` after the point, once a number is divided by ten to the power `exponent`."""

    decimals: int = 2
    exponent: int = 0

    def text(self, value: float) -> str:
        """The number alone, with a true minus and thin group spaces.

        >>> Notation(1, 6).text(-2_350_000.0)
        '−2.4'
        """
        return number_text(_scaled(value, -self.exponent), self.decimals)

    def trimmed(self, value: float) -> str:
        """The number without the zeros that end its decimals.

        >>> Notation(2).trimmed(0.5), Notation(2).trimmed(20.0)
        ('0.5', '20')
        """
        return trimmed_text(_scaled(value, -self.exponent), self.decimals)

    def power(self) -> str:
        """The power of ten that goes before the unit; empty where numbers are written out.

        >>> Notation(1, -6).power()
        '10⁻⁶'
        """
        return f"10{str(self.exponent).translate(_RAISED)}" if self.exponent else ""

    def unit(self, unit: str) -> str:
        """The unit with its power of ten."""
        return " ".join(filter(None, (self.power(), unit)))

    def phrase(self, value: float, unit: str = "") -> str:
        """The number with its power of ten and its unit, as a sentence says it.

        >>> Notation(2, -6).phrase(1.5e-6, "CRN/GJ"), Notation(2).phrase(25.128, "CRN/GJ")
        ('1.50 × 10⁻⁶ CRN/GJ', '25.13 CRN/GJ')
        """
        power = f"× {self.power()}" if self.exponent and value else ""
        return " ".join(filter(None, (self.text(value), power, unit)))


def notation_for(largest: float, resolution: float) -> Notation:
    """For numbers up to `largest` in size of which steps of `resolution` must be told apart.

    >>> notation_for(75.0, 0.5), notation_for(2.5e7, 1e5)
    (Notation(decimals=1, exponent=0), Notation(decimals=1, exponent=6))
    """
    exponent = 0
    if largest > 0 and not _LEAST_PLAIN <= largest < _MOST_PLAIN:
        exponent = 3 * math.floor(_order(largest) / 3)
    step = _scaled(resolution, -exponent)
    decimals = -_order(step) if step > 0 else 0
    return Notation(min(max(decimals, 0), _MOST_DECIMALS), exponent)


def finer(largest: float, step: float) -> Notation:
    """For reading values off: a tenth of the `step` between two isolines, four figures of `largest`, and cents."""
    if largest <= 0:
        return Notation()
    steps = [10.0 ** (_order(largest) - 3)]
    if step > 0:
        steps.append(step / 10.0)
    if _CENTS_FROM <= largest < _CENTS_BELOW:
        steps.append(0.01)
    return notation_for(largest, min(steps))


def for_forwards(low: float, high: float) -> Notation:
    """For reading forwards off an axis: to the cent, and finer where the axis is shorter than four."""
    largest = max(abs(low), abs(high))
    found = notation_for(largest, (high - low) / 400.0)
    if found.exponent or largest >= _CENTS_BELOW:
        return found
    return Notation(max(found.decimals, 2))


def _order(number: float) -> int:
    """The power of ten of the first figure; the hair is for steps such as 0.1, whose logarithm falls short."""
    return math.floor(math.log10(number) + 1e-9)


def _scaled(value: float, power: int) -> float:
    """`value` times ten to a power, in two strides so that no power by itself is out of reach."""
    half = power // 2
    return float(value * 10.0**half * 10.0 ** (power - half))
