"""How text becomes a value: one kind of entry for each kind of cell, the same for typing, pasting and CSV.

`read` gives the value or raises `EntryError` with a sentence that says what was expected and what came.
`text` writes the value so that `read` gives it back, to the last digit.

>>> NUMBER.read("1 250.5"), NUMBER.text(1250.5)
(1250.5, '1250.5')
>>> NUMBER.read("12,5x")
Traceback (most recent call last):
spreadgui.book.entries.EntryError: expected a number, got "12,5x"
"""

from __future__ import annotations

import datetime
import math
import re
from collections.abc import Callable
from dataclasses import dataclass

Value = str | float | datetime.date | None

_GROUPED = re.compile(r"[+-]?\d{1,3}(?:[ \u00a0\u2009\u202f]\d{3})+(?:\.\d*)?", re.ASCII)
# One way only to match each text: `\d+\.?\d*` tries all pairs of cuts in a long run of digits, minutes for one cell.
_PLAIN = re.compile(r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d{1,4})?", re.ASCII)
_DAY = re.compile(r"\d{4}-\d\d-\d\d", re.ASCII)
_DELIVERY = re.compile(r"(\d{4})-(0[1-9]|1[0-2])", re.ASCII)
_LONGEST = 60


class EntryError(ValueError):
    """A text that is not what its cell needs; the message is a whole sentence for the user."""


def shown(text: object) -> str:
    """`text` as a message of one line can hold it: control characters made visible, cut where it is long."""
    visible = "".join(character if character.isprintable() else "\N{REPLACEMENT CHARACTER}" for character in str(text))
    return visible if len(visible) <= _LONGEST else visible[:_LONGEST] + "…"


def quoted(text: object) -> str:
    """`text` as `shown`, in quotes."""
    return f'"{shown(text)}"'


@dataclass(frozen=True)
class Entry:
    """A kind of cell: its word for messages, how it reads, how it writes, and its choices where they are few."""

    read: Callable[[str], Value]
    text: Callable[[Value], str]
    choices: tuple[str, ...] = ()
    numeric: bool = False


def number(text: str) -> float:
    """A finite decimal number with a point; digits may be grouped in threes by spaces."""
    value = float(plain_digits(text))
    if not math.isfinite(value):
        raise EntryError(f"expected a number within reach of the machine, got {quoted(text)}")
    return value


def plain_digits(text: str) -> str:
    """The number written in `text` without its grouping and with a plain minus."""
    bare = text.strip().replace("\N{MINUS SIGN}", "-")
    if _GROUPED.fullmatch(bare):
        bare = re.sub(r"[ \u00a0\u2009\u202f]", "", bare)
    if not _PLAIN.fullmatch(bare):
        raise EntryError(f"expected a number, got {quoted(text)}")
    return bare


def date(text: str) -> datetime.date:
    """A calendar day written 2027-01-15."""
    bare = text.strip()
    try:
        if not _DAY.fullmatch(bare):  # fromisoformat alone takes weeks too: 2027-W01-1
            raise ValueError
        return datetime.date.fromisoformat(bare)
    except ValueError:
        raise EntryError(f"expected a day written as 2027-01-15, got {quoted(text)}") from None


def words(text: str) -> str:
    """Any text, without the blanks around it; half a character pair is refused, for no file could hold it."""
    bare = text.strip()
    if any("\ud800" <= character <= "\udfff" for character in bare):
        raise EntryError(f"expected whole characters, got {quoted(text)}")
    return bare


def delivery(text: str) -> str:
    """A delivery month written 2027-01."""
    bare = text.strip()
    if not is_delivery(bare):
        raise EntryError(f"expected a delivery month written as 2027-01, got {quoted(text)}")
    return bare


def is_delivery(text: str) -> bool:
    """Whether `text` is a month that the calendar has."""
    return _DELIVERY.fullmatch(text) is not None and not text.startswith("0000")


def delivery_start(text: str) -> datetime.date:
    """The first day of a delivery month."""
    return datetime.date(int(text[:4]), int(text[5:7]), 1)


def _number_text(value: Value) -> str:
    if not isinstance(value, float | int):
        return ""
    return repr(int(value)) if value == int(value) and abs(value) < 1e15 else repr(float(value))


def _words_text(value: Value) -> str:
    return "" if value is None else str(value)


def _optional(read: Callable[[str], Value], empty: Value) -> Callable[[str], Value]:
    return lambda text: read(text) if text.strip() else empty


def _within(read: Callable[[str], float], lowest: float, highest: float, words: str) -> Callable[[str], Value]:
    def read_within(text: str) -> float:
        value = read(text)
        if not lowest <= value <= highest:
            raise EntryError(f"expected {words}, got {quoted(text)}")
        return value

    return read_within


def _one_of(choices: tuple[str, ...]) -> Callable[[str], Value]:
    def read_choice(text: str) -> str:
        bare = text.strip().lower()
        if bare not in choices:
            raise EntryError(f"expected one of {', '.join(choices)}, got {quoted(text)}")
        return bare

    return read_choice


def choice(*choices: str) -> Entry:
    """An entry that is one of a few words."""
    return Entry(_one_of(choices), _words_text, choices)


def choice_or_else(otherwise: str, *choices: str) -> Entry:
    """An entry that is one of a few words, and `otherwise` where it is left empty."""
    every = (otherwise, *choices)
    return Entry(_optional(_one_of(every), otherwise), _words_text, every)


WORDS = Entry(words, _words_text)
NUMBER = Entry(number, _number_text, numeric=True)
OPTIONAL_NUMBER = Entry(_optional(number, None), _number_text, numeric=True)
ZERO_NUMBER = Entry(_optional(number, 0.0), _number_text, numeric=True)
RATIO = Entry(_optional(_within(number, 5e-324, math.inf, "a ratio above zero"), 1.0), _number_text, numeric=True)
QUANTITY = Entry(
    _optional(_within(number, 0.0, math.inf, "a quantity of zero or more (the side says long or short)"), None),
    _number_text,
    numeric=True,
)
VOLATILITY = Entry(
    _optional(_within(number, 0.0, math.inf, "a volatility of zero or more"), None), _number_text, numeric=True
)
CORRELATION = Entry(
    _optional(_within(number, -1.0, 1.0, "a correlation from −1 to 1"), None), _number_text, numeric=True
)
DATE = Entry(_optional(date, None), _words_text)
DELIVERY = Entry(_optional(delivery, ""), _words_text)
