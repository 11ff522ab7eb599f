"""The quarters, seasons and years of a market's marks, and what it means to mark one of them.

Traders quote longer periods than months. A period stands for those of its months that are marked, two at least. Its
forward is their mean, each month weighing as much as its lot delivers: its hours or days where the lot is per hour or
per day, alike where the lot is fixed; its volatilities are means by the same weights (common practice, no source;
a period of its own has a lower volatility, for its months do not move as one).

Marking a period spreads over its months by one rule: each month moves in the proportion in which the period does, so
that the shape of the curve stays. Where the forward is zero or below, or the market's forwards are normal, proportions
mean nothing, and each month moves by the same amount. Seasons are those of gas and power: summer from April to
September, winter from October to March.
"""

from __future__ import annotations

import calendar
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

import msgspec

from spreadgui.book.records import Mark, Market

Span = Literal["month", "quarter", "season", "year"]
MarkField = Literal["forward", "volatility", "daily_volatility"]
SPANS: tuple[Span, ...] = ("year", "season", "quarter", "month")


@dataclass(frozen=True)
class Period:
    """A row of Marks: one month, or some months together. `deliveries` are those that are marked, ascending."""

    span: Span
    name: str
    deliveries: tuple[str, ...]


def periods_of(market: Market) -> tuple[Period, ...]:
    """The market's months, and before the first month of each longer period that period itself; by time."""
    months = sorted({mark.delivery for mark in market.marks})
    rows: list[Period] = []
    told: set[str] = set()
    for month in months:
        for span in SPANS[:-1]:
            name = _name(span, month)
            members = tuple(one for one in months if _name(span, one) == name)
            if name not in told and len(members) > 1:
                rows.append(Period(span, name, members))
            told.add(name)
        rows.append(Period("month", month, (month,)))
    return tuple(rows)


def _name(span: Span, delivery: str) -> str:
    year, month = int(delivery[:4]), int(delivery[5:7])
    if span == "year":
        return f"{year}"
    if span == "quarter":
        return f"{year} Q{(month + 2) // 3}"
    if 4 <= month <= 9:
        return f"summer {year}"
    first = year if month >= 10 else year - 1
    return f"winter {first}/{(first + 1) % 100:02d}"


def weight(market: Market, delivery: str) -> float:
    """How much a month weighs beside others: the units that a lot delivers in it.

    >>> weight(Market("North", "CRN/MWh", lot_rule="per hour"), "2027-02")
    672.0
    """
    days = calendar.monthrange(int(delivery[:4]), int(delivery[5:7]))[1]
    return market.lot_size * {"fixed": 1.0, "per day": float(days), "per hour": 24.0 * days}[market.lot_rule]


def value_of(market: Market, period: Period, field: MarkField) -> float | None:
    """The period's forward or volatility; None where one of its months has none."""
    marks = _marks(market, period)
    values = [getattr(mark, field) for mark in marks]
    if any(value is None for value in values):
        return None
    weights = [weight(market, mark.delivery) or 1.0 for mark in marks]
    total: float = sum(one * value for one, value in zip(weights, values, strict=True))
    return total / sum(weights)


def spread_to_months(market: Market, period: Period, field: MarkField, value: float | None) -> Market:
    """The market with the period marked at `value`, spread over its months as the module says."""
    marks, old = _marks(market, period), value_of(market, period, field)
    keeps_shape = value is not None and old is not None and old > 0.0 and value > 0.0
    if field == "forward":
        keeps_shape = keeps_shape and market.dynamics != "normal" and all(mark.forward > 0.0 for mark in marks)
    changed: dict[str, float | None] = {}
    for mark in marks:
        before = getattr(mark, field)
        if len(marks) == 1 or value is None or old is None:
            changed[mark.delivery] = value
        elif keeps_shape:
            changed[mark.delivery] = before * (value / old)
        else:
            changed[mark.delivery] = before + (value - old)
    return with_marks(market, {delivery: {field: one} for delivery, one in changed.items()})


def with_marks(market: Market, changes: Mapping[str, Mapping[str, object]]) -> Market:
    """The market with some marks' fields changed; untouched marks stay the same records.

    A volatility typed or spread is no estimate any more, so the note of where it came from goes.
    """
    return msgspec.structs.replace(
        market, marks=tuple(_changed(mark, changes.get(mark.delivery)) for mark in market.marks)
    )


def _changed(mark: Mark, fields: Mapping[str, object] | None) -> Mark:
    if not fields or all(getattr(mark, field) == value for field, value in fields.items()):
        return mark
    forgets = "volatility" in fields and "note" not in fields
    return msgspec.structs.replace(mark, **{**({"note": ""} if forgets else {}), **fields})


def with_delivery(market: Market, delivery: str) -> Market:
    """The market with one more month, which starts as a copy of the marked month nearest to it (the earlier of two);
    marks stay in the order of their deliveries."""
    if any(mark.delivery == delivery for mark in market.marks):
        return market
    nearest = min(
        market.marks, key=lambda mark: (abs(_months(mark.delivery) - _months(delivery)), mark.delivery), default=None
    )
    new = Mark(delivery, 0.0, 0.0) if nearest is None else msgspec.structs.replace(nearest, delivery=delivery, note="")
    return msgspec.structs.replace(market, marks=_ordered((*market.marks, new)))


def without_deliveries(market: Market, deliveries: Sequence[str]) -> Market:
    """The market without the marks of these deliveries."""
    gone = set(deliveries)
    return msgspec.structs.replace(market, marks=tuple(mark for mark in market.marks if mark.delivery not in gone))


def _ordered(marks: Sequence[Mark]) -> tuple[Mark, ...]:
    return tuple(sorted(marks, key=lambda mark: mark.delivery))


def _marks(market: Market, period: Period) -> list[Mark]:
    return [mark for mark in market.marks if mark.delivery in period.deliveries]


def _months(delivery: str) -> int:
    return 12 * int(delivery[:4]) + int(delivery[5:7])
