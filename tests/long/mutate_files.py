"""10,000 spoilt book and CSV files: each opens or is refused in sentences, and none takes long. Run by hand:

    python tests/long/mutate_files.py [--files 10000] [--seed 1]

It starts from the sample books, a generated book of 300 positions and CSV lists, and spoils each a little: bits
flipped, entries dropped, doubled or of another type, huge numbers, cuts, blocks doubled. What opens is checked, saved
and opened again as well. Ends with status 1 where anything but BookError came out, a sentence was none, or a file took
longer than LONGEST seconds; the spoilt files of those cases are kept in the folder it names.
"""

from __future__ import annotations

import argparse
import collections
import copy
import csv
import datetime
import io
import json
import random
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

from spreadgui.book.faults import BookError
from spreadgui.book.fields import FIELDS
from spreadgui.book.positions_csv import parse_positions
from spreadgui.book.reading import parse_book
from spreadgui.book.records import Book, Correlation, Mark, Market, Position
from spreadgui.book.writing import book_bytes
from spreadgui.market.check import faults_of

LONGEST = 2.0
ROOT = Path(__file__).parents[2]
UNEXPLAINED = "the file cannot be taken as a book"

JUNK: list[Any] = [
    None, True, False, 0, -1, 7, 2.5, -0.0, 5e-324, 1e308, -1e308, 10**30, 10**400, "", " ", "12,5x", "2027-02-30",
    "2027-W01-1", "\0", "\ud800", "x" * 100_000, "−5", "１２", [], {}, [None], [[]], {"": {}}, {"name": 1},
    float("nan"), float("inf"), datetime.date(2027, 1, 15).isoformat(), "long", "put", "2027-01",
]  # fmt: skip
BLOCKS = [
    b"\0", b"\xff\xfe", b"\xef\xbb\xbf", b"{", b"}", b"[" * 50_000, b'{"a":' * 50_000, b'"', b"\\", b"\\u12", b",",
    b"\n", b"\r", b"\xe2\x80\xa8", b"9" * 6000, b"9" * 200_000, b"1e999", b"-", b"NaN", b'"version": 2,',
    b'"strike": "x",', b'"' + b"x" * 140_000 + b'"', b"," * 20_000, b"/* */",
]  # fmt: skip


def generated_book() -> Book:
    months = [f"2027-{month:02}" for month in range(1, 13)]
    marks = tuple(Mark(month, 50.0 + place, 0.4) for place, month in enumerate(months))
    positions = tuple(
        Position(
            f"position {row}", quantity=float(row), long_leg="North", long_delivery=months[row % 12], short_leg="Gas",
            short_delivery=months[row % 7], short_ratio=7.2, strike=row / 7, expiry=datetime.date(2027, 1, 15),
        )
        for row in range(300)
    )  # fmt: skip
    return Book(
        title="generated", currency="CRN", valuation_date=datetime.date(2026, 12, 1), positions=positions,
        markets=(Market("North", "CRN/MWh", 0.4, marks=marks), Market("Gas", "CRN/GJ", marks=marks)),
        correlations=(Correlation("North", "Gas", 0.6),),
    )  # fmt: skip


def as_csv(book: Book) -> bytes:
    text = io.StringIO()
    writer = csv.writer(text)
    writer.writerow([field.key for field in FIELDS])
    for position in book.positions:
        writer.writerow([field.entry.text(getattr(position, field.key)) for field in FIELDS])
    return text.getvalue().encode()


def flip_bits(data: bytes, rest: random.Random) -> bytes:
    spoilt = bytearray(data)
    for _ in range(rest.choice([1, 1, 2, 5, 50])):
        spoilt[rest.randrange(len(spoilt))] ^= 1 << rest.randrange(8)
    return bytes(spoilt)


def cut(data: bytes, rest: random.Random) -> bytes:
    start, end = sorted(rest.randrange(len(data) + 1) for _ in range(2))
    return rest.choice([data[:end], data[start:], data[:start] + data[end:]])


def double_block(data: bytes, rest: random.Random) -> bytes:
    start, end = sorted(rest.randrange(len(data) + 1) for _ in range(2))
    return data[:end] + data[start:end] * rest.choice([1, 1, 3]) + data[end:]


def double_lines(data: bytes, rest: random.Random) -> bytes:
    lines = data.splitlines(keepends=True)
    start = rest.randrange(len(lines))
    block = lines[start : start + rest.choice([1, 1, 4, 40])]
    place = rest.choice([start, rest.randrange(len(lines) + 1)])
    return b"".join([*lines[:place], *block, *lines[place:]])


def drop_lines(data: bytes, rest: random.Random) -> bytes:
    lines = data.splitlines(keepends=True)
    start = rest.randrange(len(lines))
    return b"".join([*lines[:start], *lines[start + rest.choice([1, 1, 4]) :]])


def insert_junk(data: bytes, rest: random.Random) -> bytes:
    at = rest.randrange(len(data) + 1)
    return data[:at] + rest.choice(BLOCKS) + data[at:]


def recode(data: bytes, rest: random.Random) -> bytes:
    return data.decode().encode(rest.choice(["utf-16", "utf-16-le", "utf-32", "utf-8-sig", "utf-7"]))


def swap_number(data: bytes, rest: random.Random) -> bytes:
    places = [place for place, byte in enumerate(data) if byte in b"0123456789"]
    at = rest.choice(places)
    return data[:at] + rest.choice([b"9" * 400, b"1e400", b"1e-400", b"-", b"", b"0x1", b"9" * 5000]) + data[at + 1 :]


def swap_entries(data: bytes, rest: random.Random) -> bytes:
    """The JSON with some entries dropped, renamed, moved or made of another type; a CSV with junk in its cells."""
    try:
        raw = json.loads(data)
    except ValueError:
        return swap_cells(data, rest)
    for _ in range(rest.choice([1, 1, 2, 5, 40])):
        holder, key = some_place(raw, rest)
        act = rest.randrange(4)
        if act == 0:
            del holder[key]
        elif act == 1 and isinstance(holder, dict):
            holder[rest.choice(["", "Strike", "strike", "a\nb", key + "x"])] = holder.pop(key)
        elif act == 2:
            other, other_key = some_place(raw, rest)
            holder[key] = copy.deepcopy(other[other_key])
        else:
            holder[key] = rest.choice(JUNK)
        if not raw:
            break
    return json.dumps(raw, indent=rest.choice([None, 1])).encode()


def some_place(raw: Any, rest: random.Random) -> tuple[Any, Any]:
    """A random entry of `raw`: what holds it, and its key or number there."""
    holder, key = raw, rest.choice(list(raw))
    while isinstance(holder[key], dict | list) and holder[key] and rest.random() < 0.8:
        holder = holder[key]
        key = rest.choice(list(holder)) if isinstance(holder, dict) else rest.randrange(len(holder))
    return holder, key


def swap_cells(data: bytes, rest: random.Random) -> bytes:
    rows = list(csv.reader(io.StringIO(data.decode(), newline="")))
    for _ in range(rest.choice([1, 2, 10, 200])):
        row = rest.choice(rows)
        if row:
            junk = str(rest.choice(JUNK[:-4])).encode("utf-8", "replace").decode()
            row[rest.randrange(len(row))] = rest.choice([junk, rest.choice(rest.choice(rows) or [""])])
    text = io.StringIO()
    csv.writer(text).writerows(rows)
    return text.getvalue().encode()


SPOILERS: list[Callable[[bytes, random.Random], bytes]] = [
    flip_bits, cut, double_block, double_lines, drop_lines, insert_junk, recode, swap_number, swap_entries,
    swap_entries,
]  # fmt: skip


def complaint(data: bytes, is_csv: bool, seen: collections.Counter[str]) -> str:
    """What is wrong with how `data` was taken; empty where all is well."""
    try:
        if is_csv:
            parse_positions(data)
        else:
            book = parse_book(data)
            told = faults_of(book)
            again = parse_book(book_bytes(book))
            if again != book or any("\n" in str(fault) for fault in told):
                return "opened, and does not come back equal or is told of in several lines"
        seen["opened"] += 1
    except BookError as error:
        seen["refused"] += 1
        if not error.faults or not all(fault.what.strip() and str(fault).isprintable() for fault in error.faults):
            return f"refused without a sentence of one line: {error.faults!r}"[:300]
        if any(fault.what == UNEXPLAINED for fault in error.faults):
            return "refused without a reason"
    except Exception as error:  # whatever else comes out is what this program looks for
        return f"{type(error).__name__}: {error}"[:300]
    return ""


def main() -> int:
    parser = argparse.ArgumentParser(description="Opens spoilt book and CSV files.")
    parser.add_argument("--files", type=int, default=10_000)
    parser.add_argument("--seed", type=int, default=1)
    options = parser.parse_args()
    rest = random.Random(options.seed)
    book = generated_book()
    samples = [path.read_bytes() for path in sorted((ROOT / "sample_books").glob("*.json"))]
    sources = [(data, False) for data in [*samples, book_bytes(book)]] + [(as_csv(book), True)] * 2
    seen: collections.Counter[str] = collections.Counter()
    slowest, slowest_how, bad = 0.0, "", 0
    kept = Path(tempfile.mkdtemp(prefix="spoilt-"))
    for number in range(options.files):
        data, is_csv = rest.choice(sources)
        spoilers = rest.choices(SPOILERS, k=rest.choice([1, 1, 1, 2]))
        for spoiler in spoilers:
            try:
                data = spoiler(data, rest) if data else data
            except UnicodeDecodeError:
                continue  # already no text, so not for the spoilers that need one
            except (csv.Error, RecursionError, ValueError, IndexError):
                continue  # already no JSON or CSV that could be spoilt as such
        how = " then ".join(spoiler.__name__ for spoiler in spoilers) + (" of a CSV" if is_csv else " of a book")
        begun = time.perf_counter()
        wrong = complaint(data, is_csv, seen)
        took = time.perf_counter() - begun
        if took > slowest:
            slowest, slowest_how = took, how
        if wrong or took > LONGEST:
            bad += 1
            (kept / f"{number}{'.csv' if is_csv else '.json'}").write_bytes(data)
            print(f"{number}: {how}: {wrong or f'took {took:.2f} s'}")
    print(
        f"{options.files} spoilt files: {seen['opened']} opened, {seen['refused']} refused in sentences, {bad} bad; "
        f"slowest {slowest:.3f} s ({slowest_how})"
    )
    if bad:
        print(f"the bad ones are in {kept}")
        return 1
    kept.rmdir()
    return 0


if __name__ == "__main__":
    sys.exit(main())
