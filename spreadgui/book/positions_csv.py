"""Positions as CSV: a header row of field keys in any order, then one position a line.

Volatilities and correlations are decimals, numbers have a decimal point, days are written 2027-01-15. Only the needed
fields must have a column; ratios left empty are 1, a strike left empty is 0.
"""

from __future__ import annotations

import codecs
import csv
import io
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path

from spreadgui.book.entries import EntryError, Value, quoted
from spreadgui.book.faults import BookError, Fault
from spreadgui.book.fields import BY_KEY, FIELDS, Field
from spreadgui.book.reading import read_bytes
from spreadgui.book.records import Position


def read_positions(path: Path) -> tuple[Position, ...]:
    """The positions in the CSV file at `path`; raises BookError with every fault otherwise."""
    return parse_positions(read_bytes(path))


def parse_positions(data: bytes) -> tuple[Position, ...]:
    """The positions written in `data` (UTF-8, with or without a byte order mark); raises BookError otherwise."""
    numbered = list(_numbered_rows(_text(data)))
    if not numbered:
        raise BookError([Fault("", "the file is empty")])
    (header_line, header), *rows = numbered
    fields = _fields_of(header, header_line)
    faults: list[Fault] = []
    positions = [_position(line, row, fields, faults) for line, row in rows]
    if faults:
        raise BookError(faults)
    return tuple(positions)


def _text(data: bytes) -> str:
    try:
        text = data.removeprefix(codecs.BOM_UTF8).decode()
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise BookError([Fault(f"line {line}", "this is not text in UTF-8, so not a list of positions")]) from None
    if "\0" in text:
        raise BookError([Fault("", "this is not text, so not a list of positions")])
    return text


def _numbered_rows(text: str) -> Iterator[tuple[int, list[str]]]:
    """Each line that holds anything, with the number it has in the file."""
    # Not splitlines: that also breaks at the line separators that a note may hold.
    reader = csv.reader(io.StringIO(text, newline=""), strict=True)
    line = 1
    try:
        for row in reader:
            if any(cell.strip() for cell in row):
                yield line, row
            line = reader.line_num + 1
    except csv.Error as error:
        raise BookError([Fault(f"line {line}", f"this line cannot be read as CSV: {error}")]) from None


def _fields_of(header: Sequence[str], line: int) -> list[Field]:
    keys = [heading.strip().lower() for heading in header]
    where = f"line {line}"
    faults = [
        Fault(where, f"{quoted(heading)} is not a heading of a list of positions")
        for key, heading in zip(keys, header, strict=True)
        if key not in BY_KEY
    ]
    faults += [
        Fault(where, f"the heading {key} stands {count} times")
        for key, count in Counter(keys).items()
        if count > 1 and key in BY_KEY
    ]
    faults += [
        Fault(where, f"the heading {field.key} is missing")
        for field in FIELDS
        if field.needed and field.key not in keys
    ]
    if faults:
        raise BookError(faults)
    return [BY_KEY[key] for key in keys]


def _position(line: int, row: Sequence[str], fields: Sequence[Field], faults: list[Fault]) -> Position:
    """The position of one line; what is wrong with it is added to `faults`."""
    if len(row) > len(fields):
        faults.append(Fault(f"line {line}", f"has {len(row)} cells under {len(fields)} headings"))
    values: dict[str, Value] = {}
    wrong: dict[str, str] = {}
    padded = [*row, *[""] * (len(fields) - len(row))]
    # The expiry last: whether it is needed depends on the exercise, wherever that stands.
    for field, text in sorted(zip(fields, padded, strict=False), key=lambda cell: cell[0].key == "expiry"):
        try:
            values[field.key] = _read(field, text, values)
        except EntryError as error:
            wrong[field.key] = str(error)
    faults += [Fault(f"line {line}, {field.key}", wrong[field.key]) for field in fields if field.key in wrong]
    return Position(**values)  # type: ignore[arg-type]  # each Field reads the type that its key has in Position


def _read(field: Field, text: str, others: Mapping[str, Value]) -> Value:
    is_strip = others.get("exercise", "once") != "once"  # which has an expiry for each of its days
    if field.needed and not text.strip() and not (is_strip and field.key == "expiry"):
        raise EntryError("is empty, and is needed")
    return field.entry.read(text)
