"""Texts typed on screens, where volatilities, correlations and rates are in per cent, against values in code units."""

from __future__ import annotations

from decimal import Decimal

from spreadgui.book.entries import EntryError, Value, number, plain_digits, quoted
from spreadgui.valuation.column import Column


def read_typed(column: Column, text: str, scale: float | None = None) -> Value:
    """The value, in code units, of a text typed into a column; raises EntryError with a sentence.

    `scale` is the column's own unless the row has another (`Column.scale_at`): at 1 nothing is in per cent.

    >>> from spreadgui.valuation.columns import BY_COLUMN_KEY
    >>> read_typed(BY_COLUMN_KEY["vol_long"], "45 %"), read_typed(BY_COLUMN_KEY["vol_long"], "")
    (0.45, None)
    """
    assert column.field is not None
    entry = column.field.entry
    if not column.field.in_percent or scale == 1.0 or not text.strip():
        return entry.read(text)
    value = number_in_percent(text)
    try:
        return entry.read(repr(value))
    except EntryError:
        raise EntryError(f"expected {column.field.in_percent}, got {quoted(text)}") from None


def typed_text(column: Column, value: Value, scale: float | None = None) -> str:
    """How a value, in code units, would be typed into a column, to the last digit; `scale` as for `read_typed`.

    >>> from spreadgui.valuation.columns import BY_COLUMN_KEY
    >>> typed_text(BY_COLUMN_KEY["vol_long"], 0.57)
    '57'
    """
    assert column.field is not None
    if column.field.in_percent and scale != 1.0 and isinstance(value, float | int):
        return percent_text(value)
    return column.field.entry.text(value)


def number_in_percent(text: str) -> float:
    """The decimal that a number in per cent means, with or without the sign; raises EntryError.

    >>> number_in_percent("3.2"), number_in_percent("7 %")
    (0.032, 0.07)
    """
    bare = text.strip().removesuffix("%").strip()
    number(bare)
    return float(Decimal(plain_digits(bare)).scaleb(-2))


def percent_text(value: float) -> str:
    """A decimal as a number in per cent, to the last digit.

    >>> percent_text(0.032), percent_text(0.0)
    ('3.2', '0')
    """
    if value == 0:
        return "0"
    return f"{Decimal(repr(float(value))).scaleb(2).normalize():f}"
