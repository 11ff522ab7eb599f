"""Holds parsed JSON against the record types and tells every difference with its place.

msgspec reads a right book at full speed and stops at the first fault of a wrong one; this slower walk then finds them
all, so that a person mends a file in one round.
"""

from __future__ import annotations

import datetime
import functools
import json
import math
import types
import typing
from collections import Counter
from collections.abc import Iterator, Sequence
from typing import Any

import msgspec

from spreadgui.book.entries import quoted, shown
from spreadgui.book.faults import Fault

_EXPECTED = {
    str: "words in quotes",
    float: "a number",
    int: "a whole number",
    datetime.date: 'a day written as "2027-01-15"',
}


class WrittenObject(dict[str, Any]):
    """An object as it stands in a file; `twice` are the keys of it that stand there more than once."""

    def __init__(self, pairs: Sequence[tuple[str, Any]]) -> None:
        super().__init__(pairs)
        counts = Counter(key for key, _ in pairs) if len(pairs) > len(self) else Counter[str]()
        self.twice = [key for key, count in counts.items() if count > 1]


def faults(value: Any, record: type[msgspec.Struct], where: str = "") -> Iterator[Fault]:
    """Every difference between the parsed `value` and the type `record`, in the order of the record's fields."""
    if not isinstance(value, dict):
        yield Fault(where, f"expected an object in braces, got {_shown(value)}")
        return
    hints, fields = _entries_of(record)
    for name, field in fields.items():
        place = f"{where}.{name}" if where else name
        if name in value:
            yield from _value_faults(value[name], hints[field.name], place)
        elif field.required:
            yield Fault(place, "is missing")
    for name in value.twice if isinstance(value, WrittenObject) else ():
        yield Fault(f"{where}.{_key(name)}" if where else _key(name), "stands more than once")
    for name in [name for name in value if name not in fields]:
        yield Fault(f"{where}.{_key(name)}" if where else _key(name), "is not an entry that this file has")


@functools.cache
def _entries_of(record: type[msgspec.Struct]) -> tuple[dict[str, Any], dict[str, msgspec.structs.FieldInfo]]:
    """The types and the fields of a record; looking them up anew for each of 10,000 positions took seconds."""
    return typing.get_type_hints(record), {field.encode_name: field for field in msgspec.structs.fields(record)}


def _value_faults(value: Any, expected: Any, where: str) -> Iterator[Fault]:
    if typing.get_origin(expected) is tuple:
        item = typing.get_args(expected)[0]
        if not isinstance(value, list):
            yield Fault(where, f"expected a list in brackets, got {_shown(value)}")
            return
        for index, one in enumerate(value):
            yield from _value_faults(one, item, f"{where}[{index}]")
        return
    record = _record_in(expected)
    if record is not None and not (value is None and record is not expected):
        yield from faults(value, record, where)
        return
    if not _fits(value, expected):
        yield Fault(where, f"expected {_words(expected)}, got {_shown(value)}")


def _record_in(expected: Any) -> type[msgspec.Struct] | None:
    """The record that an entry holds, alone or where it may be null; None where it holds a plain value."""
    for part in (expected, *typing.get_args(expected)):
        if isinstance(part, type) and issubclass(part, msgspec.Struct):
            return part
    return None


def _fits(value: Any, expected: Any) -> bool:
    if isinstance(value, float) and not math.isfinite(value):
        return False
    try:
        msgspec.convert(value, expected)
        if isinstance(value, str):
            value.encode()  # half a character pair, which the JSON of others can hold
    except (msgspec.ValidationError, OverflowError, UnicodeEncodeError):
        return False
    return True


def _words(expected: Any) -> str:
    origin = typing.get_origin(expected)
    if origin is typing.Literal:
        choices = [f'"{choice}"' for choice in typing.get_args(expected)]
        return choices[0] if len(choices) == 1 else f"one of {', '.join(choices)}"
    if origin in (typing.Union, types.UnionType):
        return " or ".join(_words(part) for part in typing.get_args(expected) if part is not type(None)) + " or null"
    return _EXPECTED.get(expected, "something else")


def _shown(value: Any) -> str:
    if isinstance(value, str):
        return quoted(value)
    if isinstance(value, dict):
        return "an object in braces"
    if isinstance(value, list):
        return "a list in brackets"
    return shown(json.dumps(value))


def _key(name: str) -> str:
    return shown(name) if name.strip() else quoted(name)
