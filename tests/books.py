"""Small books that several tests share. Invented data: nothing here checks a formula."""

from __future__ import annotations

import datetime
from typing import Any

from spreadgui.book.records import Book, Correlation, Mark, Market, Position

DAY = datetime.date(2026, 12, 1)
EXPIRY = datetime.date(2026, 12, 29)
POWER = Market("Ardenmoor South", "CRN/MWh", 0.4, marks=(Mark("2027-01", 108.0, 0.6), Mark("2027-07", 80.0, 0.5)))
GAS = Market("Pellan gas point", "CRN/GJ", 0.3, marks=(Mark("2027-01", 13.0, 0.5), Mark("2027-07", 9.5, 0.4)))


def spark(**changed: Any) -> Position:
    """Power against 7.1 GJ of gas, a strike of 5, with whatever is `changed`."""
    fields: dict[str, Any] = {
        "name": "spark", "quantity": 1000.0, "long_leg": POWER.name, "long_delivery": "2027-01",
        "short_leg": GAS.name, "short_delivery": "2027-01", "short_ratio": 7.1, "strike": 5.0, "expiry": EXPIRY,
    }  # fmt: skip
    return Position(**{**fields, **changed})


def season(**changed: Any) -> Position:
    """A sold put on winter against summer power, its strike below zero."""
    fields: dict[str, Any] = {
        "name": "season", "side": "short", "kind": "put", "quantity": 500.0, "long_leg": POWER.name,
        "long_delivery": "2027-01", "short_leg": POWER.name, "short_delivery": "2027-07", "strike": -2.0,
        "expiry": EXPIRY,
    }  # fmt: skip
    return Position(**{**fields, **changed})


def cap(**changed: Any) -> Position:
    """An outright call on power."""
    fields: dict[str, Any] = {
        "name": "cap", "quantity": 10.0, "long_leg": POWER.name, "long_delivery": "2027-01", "strike": 110.0,
        "expiry": EXPIRY,
    }  # fmt: skip
    return Position(**{**fields, **changed})


def book_of(*positions: Position, **changed: Any) -> Book:
    """A book of two markets with these positions."""
    fields: dict[str, Any] = {
        "title": "Two markets", "currency": "CRN", "valuation_date": DAY, "zero_rate": 0.03,
        "markets": (POWER, GAS), "correlations": (Correlation(POWER.name, GAS.name, 0.65),), "positions": positions,
    }  # fmt: skip
    return Book(**{**fields, **changed})
