"""A strip unfolded: one row for each of its days, with what each is valued by and what it comes to. No Qt."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, NamedTuple

from spreadgui.desk.panels.sheets import Cell, Heading, Sheet, number_or_dash, plain_number, shared_decimals

if TYPE_CHECKING:  # its module loads the formulas, which must not hold up the first paint of the window
    from spreadgui.valuation.reading import DayReading, Reading


class _Column(NamedTuple):
    heading: Heading
    number: Callable[[DayReading], float]
    digits: int
    least: int
    most: int
    rank: int


# How many of the columns a sheet may leave out for want of room: none, what a day is valued by, the deltas too.
RANKS = (3, 2, 1)


def days_sheet(reading: Reading, rank: int = RANKS[0]) -> Sheet:
    """The days of a strip; of the lowest of RANKS only the day, its exercise and what it is worth."""
    columns = [column for column in _columns(reading) if column.rank <= rank]
    decimals = [
        shared_decimals([column.number(day) for day in reading.days], column.digits, column.least, column.most)
        for column in columns
    ]
    rows = tuple(
        (
            Cell(str(day.day)),
            Cell(str(day.expiry), tone="muted"),
            *(_cell(column.number(day), places) for column, places in zip(columns, decimals, strict=True)),
        )
        for day in reading.days
    )
    headings = (
        Heading("Day", tip="The day that is delivered."),
        Heading("Exercised", tip="The business day before, on which this day is exercised or lapses."),
        *(column.heading for column in columns),
    )
    return Sheet("Days", headings, rows, copied_days(reading))


def copied_days(reading: Reading) -> tuple[tuple[str, ...], ...]:
    """The lines of a copy: every column, numbers plain."""
    columns = _columns(reading)
    first = ("Day", "Exercised", *(column.heading.text.replace("\n", ", ") for column in columns))
    lines = [
        (str(day.day), str(day.expiry), *(plain_number(column.number(day)) for column in columns))
        for day in reading.days
    ]
    return (first, *lines)


def _columns(reading: Reading) -> list[_Column]:
    vol, percent = ("absolute", 1.0) if reading.absolute_vols else ("% a year", 100.0)
    tip = "What the variance up to this day's exercise comes to: the mark's before the month, the daily one inside it."
    return [
        _Column(Heading(f"Vol long\n{vol}", number=True, tip=tip), lambda day: percent * day.vol_long, 4, 1, 2, 3),
        _Column(Heading(f"Vol short\n{vol}", number=True, tip=tip), lambda day: percent * day.vol_short, 4, 1, 2, 3),
        _Column(Heading("Correlation\n%", number=True, tip=tip), lambda day: 100.0 * day.correlation, 4, 1, 2, 3),
        _Column(
            Heading(f"Unit value\n{reading.unit}".strip(), number=True, tip="Value of one unit of this day's payoff."),
            lambda day: day.unit_value, 5, 3, 6, 1,
        ),
        _Column(
            Heading(f"Value\n{reading.currency}".strip(), number=True, tip="Unit value times the day's quantity."),
            lambda day: day.position_value, 3, 0, 2, 1,
        ),
        _Column(
            Heading("Delta long\nposition", number=True, tip="For the day's quantity, in the long market's units."),
            lambda day: day.delta_long, 3, 0, 2, 2,
        ),
        _Column(
            Heading("Delta short\nposition", number=True, tip="For the day's quantity, in the short market's units."),
            lambda day: day.delta_short, 3, 0, 2, 2,
        ),
    ]  # fmt: skip


def _cell(value: float, decimals: int) -> Cell:
    return Cell(number_or_dash(value, decimals), number=True, tip=plain_number(value))
