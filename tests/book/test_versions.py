"""Books of earlier versions of the format open as they were meant, and are saved in this one."""

from __future__ import annotations

import json
from pathlib import Path

import msgspec
import pytest

from spreadgui.book.faults import BookError
from spreadgui.book.reading import parse_book, read_book
from spreadgui.book.records import VERSION, Market, Position
from spreadgui.book.writing import book_bytes
from spreadgui.market.check import faults_of

# The demo book as the first version of the program wrote it, kept as it was.
FIRST = Path(__file__).with_name("version_1.json")


def test_a_book_of_the_first_version_opens_with_what_was_meant_then() -> None:
    book = read_book(FIRST)
    assert book.version == VERSION == 2
    assert len(book.positions) == 50
    assert {market.dynamics for market in book.markets} == {"lognormal"}
    assert {position.exercise for position in book.positions} == {"once"}
    assert {position.quoted_premium for position in book.positions} == {None}
    assert faults_of(book) == []


def test_saving_it_changes_the_version_and_adds_the_tolerance_and_nothing_else() -> None:
    before, after = FIRST.read_text().splitlines(), book_bytes(read_book(FIRST)).decode().splitlines()
    assert [line for line in after if line not in before] == [
        '  "version": 2,', '  "gap_tolerance": 0.01,', '  "zero_curve": [', '  "blends": [',
    ]  # fmt: skip
    assert [line for line in before if line not in after] == ['  "version": 1,']


def test_what_the_second_version_added_comes_back_from_its_file() -> None:
    book = read_book(FIRST)
    mark = msgspec.structs.replace(book.markets[0].marks[0], daily_volatility=1.2)
    market = msgspec.structs.replace(
        book.markets[0], dynamics="shifted lognormal", shift=12.5, business_days="1111110",
        holidays=(book.valuation_date,), marks=(mark,),
    )  # fmt: skip
    position = msgspec.structs.replace(book.positions[0], exercise="all days", quoted_premium=3.25, expiry=None)
    changed = msgspec.structs.replace(book, gap_tolerance=0.02, markets=(market,), positions=(position,))
    assert parse_book(book_bytes(changed)) == changed
    assert b'"holidays": ["2026-12-01"],' in book_bytes(changed)


def test_what_means_nothing_costs_no_line() -> None:
    assert msgspec.to_builtins(Position()) == {}
    assert set(msgspec.to_builtins(Market("North", "CRN/MWh"))) == {"name", "unit"}


def test_a_third_version_is_refused_in_a_sentence() -> None:
    newer = json.loads(FIRST.read_text()) | {"version": 3}
    with pytest.raises(BookError) as refused:
        parse_book(json.dumps(newer).encode())
    assert str(refused.value.faults[0]) == (
        "this book is of version 3, written by a newer program; this one reads up to version 2"
    )


def test_a_wrong_holiday_is_told_at_its_place() -> None:
    raw = json.loads(FIRST.read_text()) | {"version": 2}
    raw["markets"][0]["holidays"] = ["2026-12-25", "Christmas"]
    with pytest.raises(BookError) as refused:
        parse_book(json.dumps(raw).encode())
    assert [str(fault) for fault in refused.value.faults] == [
        'markets[0].holidays[1]: expected a day written as "2027-01-15", got "Christmas"'
    ]
