"""Numbers as a person reads them: true minus, thin group spaces, a fixed count of decimals.

>>> number_text(-1234567.891, 1)
'−1\N{NARROW NO-BREAK SPACE}234\N{NARROW NO-BREAK SPACE}567.9'
>>> number_text(float("nan"), 2)
''
"""

from __future__ import annotations

import math

MINUS = "\N{MINUS SIGN}"
GROUP = "\N{NARROW NO-BREAK SPACE}"
# Beyond this a fixed count of decimals only pretends; such a number is shown by its power of ten.
_LONGEST_FIXED = 1e15


def number_text(value: float, decimals: int) -> str:
    """`value` with `decimals` decimals; empty for what is not a finite number; no minus before a plain zero."""
    if not math.isfinite(value):
        return ""
    if abs(value) >= _LONGEST_FIXED:
        return f"{value:.6e}".replace("-", MINUS)
    text = f"{value:,.{decimals}f}".replace(",", GROUP)
    if text.startswith("-"):
        digits = text[1:]
        return MINUS + digits if digits.strip(f"0.{GROUP}") else digits
    return text


def trimmed_text(value: float, most_decimals: int, least_decimals: int = 0) -> str:
    """`value` with as many decimals as it needs, between the two counts.

    >>> trimmed_text(7.1, 6, 2), trimmed_text(0.36251, 6, 2)
    ('7.10', '0.36251')
    """
    text = number_text(value, most_decimals)
    whole, point, fraction = text.partition(".")
    if not point or "e" in text:
        return text
    kept = fraction.rstrip("0").ljust(least_decimals, "0")
    return f"{whole}.{kept}" if kept else whole


def compact_text(value: float, digits: int = 4) -> str:
    """`value` to a count of significant digits, without a power of ten unless it is very small or large.

    >>> compact_text(0.0123456), compact_text(-1234.56), compact_text(0.0)
    ('0.01235', '−1\N{NARROW NO-BREAK SPACE}235', '0')
    """
    if value == 0 or not math.isfinite(value):
        return "0" if value == 0 else ""
    magnitude = math.floor(math.log10(abs(value)))
    if magnitude < -6:
        return f"{value:.{digits - 1}e}".replace("-", MINUS)
    return number_text(value, max(0, digits - 1 - magnitude))
