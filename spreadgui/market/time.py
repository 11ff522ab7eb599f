"""Time and discounting: ACT/365F, continuous rates.

>>> import datetime
>>> years(datetime.date(2026, 12, 1), datetime.date(2027, 12, 1))
1.0
"""

from __future__ import annotations

import datetime
import math

DAYS_A_YEAR = 365.0


def years(start: datetime.date, end: datetime.date) -> float:
    """The years from `start` to `end`, actual days over 365; below zero where `end` comes first."""
    return (end - start).days / DAYS_A_YEAR


def discount_factor(zero_rate: float, time: float) -> float:
    """The value today of one unit of money after `time` years at a continuous `zero_rate`; infinite if out of reach."""
    exponent = -zero_rate * time
    return math.exp(exponent) if exponent < 700.0 else math.inf


def delivery_years_apart(first: str, second: str) -> float:
    """The years between two delivery months written 2027-01, a month being a twelfth.

    >>> delivery_years_apart("2027-01", "2026-07")
    0.5
    """
    return abs(_months(first) - _months(second)) / 12.0


def _months(delivery: str) -> int:
    return 12 * int(delivery[:4]) + int(delivery[5:7])
