"""Positions as CSV: any order of headings, every fault with its line, and nothing read differently than it stands."""

from __future__ import annotations

import codecs
import csv
import datetime
import io
import random
from pathlib import Path

import msgspec
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from spreadgui.book.faults import BookError
from spreadgui.book.fields import BY_KEY, FIELDS
from spreadgui.book.positions_csv import parse_positions, read_positions
from spreadgui.book.records import Position

PATIENT = settings(deadline=None, max_examples=50, suppress_health_check=[HealthCheck.too_slow])

NEEDED = "side,kind,quantity,expiry"
LINE = "long,call,10,2027-01-15"
SIMPLE = Position(side="long", kind="call", quantity=10.0, expiry=datetime.date(2027, 1, 15))

FULL_HEADER = (
    "name,side,kind,quantity,long_leg,long_delivery,long_ratio,short_leg,short_delivery,short_ratio,strike,expiry,"
    "exercise,own_forward_long,own_forward_short,own_vol_long,own_vol_short,own_correlation,quoted_premium,note"
)
# What other systems were told to write; none of it may go.
PROMISED_HEADER = (
    "name,side,kind,quantity,long_leg,long_delivery,long_ratio,short_leg,short_delivery,short_ratio,strike,expiry,"
    "own_forward_long,own_forward_short,own_vol_long,own_vol_short,own_correlation,note"
)
FULL = Position(
    name="spark, January",
    side="short",
    kind="put",
    quantity=744.0,
    long_leg="North",
    long_delivery="2027-01",
    long_ratio=0.98,
    short_leg="Gas",
    short_delivery="2027-01",
    short_ratio=7.2,
    strike=-4.5,
    expiry=datetime.date(2027, 1, 15),
    exercise="business days",
    own_forward_long=80.0,
    own_forward_short=9.0,
    own_vol_long=0.5,
    own_vol_short=0.6,
    own_correlation=-0.25,
    quoted_premium=8.125,
    note='says "wait",\nthen more',
)


def table(keys: list[str], positions: list[Position]) -> bytes:
    """`positions` under the headings `keys`, written by the standard library's CSV writer."""
    text = io.StringIO()
    writer = csv.writer(text)
    writer.writerow(keys)
    for position in positions:
        writer.writerow([BY_KEY[key].entry.text(getattr(position, key)) for key in keys])
    return text.getvalue().encode()


def faults_of(text: str | bytes) -> list[str]:
    with pytest.raises(BookError) as caught:
        parse_positions(text if isinstance(text, bytes) else text.encode())
    return [str(fault) for fault in caught.value.faults]


def test_the_needed_columns_alone_make_a_position_with_the_defaults() -> None:
    assert parse_positions(f"{NEEDED}\n{LINE}\n".encode()) == (SIMPLE,)


def test_the_whole_header_of_the_file_format_is_taken() -> None:
    assert FULL_HEADER.split(",") == [field.key for field in FIELDS]
    assert parse_positions(table(FULL_HEADER.split(","), [FULL, SIMPLE])) == (FULL, SIMPLE)


def test_the_header_that_was_promised_to_others_is_taken() -> None:
    (position,) = parse_positions(table(PROMISED_HEADER.split(","), [FULL]))
    assert position == msgspec.structs.replace(FULL, exercise="once", quoted_premium=None)


def test_only_a_strip_may_leave_its_expiry_empty_wherever_the_exercise_stands() -> None:
    for header, row in (("expiry,exercise", ",all days"), ("exercise,expiry", "business days,")):
        (strip,) = parse_positions(f"side,kind,quantity,{header}\nlong,call,10,{row}\n".encode())
        assert strip.expiry is None
        assert strip.exercise != "once"
    assert faults_of("side,kind,quantity,expiry,exercise\nlong,call,10,,\n") == [
        "line 2, expiry: is empty, and is needed"
    ]


@pytest.mark.parametrize("seed", range(8))
def test_the_order_of_the_headings_does_not_matter(seed: int) -> None:
    keys = FULL_HEADER.split(",")
    random.Random(seed).shuffle(keys)
    assert parse_positions(table(keys, [FULL, SIMPLE])) == (FULL, SIMPLE)


words = st.text(st.characters(exclude_categories=["Cs"], exclude_characters="\0"), max_size=8).map(str.strip)
at_least_zero = st.floats(min_value=0.0, allow_infinity=False)
above_zero = st.floats(min_value=5e-324, allow_infinity=False)
finite = st.floats(allow_nan=False, allow_infinity=False)
months = st.dates().map(lambda day: day.isoformat()[:7]) | st.just("")
positions = st.builds(
    Position,
    name=words,
    side=st.sampled_from(["long", "short"]),
    kind=st.sampled_from(["call", "put", "forward"]),
    quantity=at_least_zero,
    long_leg=words,
    long_delivery=months,
    long_ratio=above_zero,
    short_leg=words,
    short_delivery=months,
    short_ratio=above_zero,
    strike=finite,
    expiry=st.dates(),
    own_forward_long=finite | st.none(),
    own_forward_short=finite | st.none(),
    own_vol_long=at_least_zero | st.none(),
    own_vol_short=at_least_zero | st.none(),
    own_correlation=st.floats(-1.0, 1.0) | st.none(),
    exercise=st.sampled_from(["once", "business days", "all days"]),
    quoted_premium=finite | st.none(),
    note=words,
)


@PATIENT
@given(st.lists(positions, max_size=3), st.permutations(FULL_HEADER.split(",")))
def test_positions_written_by_any_csv_writer_come_back_as_they_were(rows: list[Position], keys: list[str]) -> None:
    assert parse_positions(table(keys, rows)) == tuple(rows)


@pytest.mark.parametrize("separator", ["\u2028", "\u2029", "\x85", "\x0b", "\x0c", "\x1c"])
def test_a_separator_that_is_no_line_break_stays_inside_its_cell(separator: str) -> None:
    (position,) = parse_positions(f"{NEEDED},note\n{LINE},a{separator}b\n".encode())
    assert position.note == f"a{separator}b"


def test_headings_may_be_spaced_and_capital() -> None:
    assert parse_positions(f" Side ,KIND,quantity,Expiry\n{LINE}\n".encode()) == (SIMPLE,)


@pytest.mark.parametrize("line_break", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("mark", [b"", codecs.BOM_UTF8])
@pytest.mark.parametrize("ending", ["", "\n", "\n\n \n"])
def test_line_breaks_of_any_system_and_a_byte_order_mark_are_taken(line_break: str, mark: bytes, ending: str) -> None:
    text = f"{NEEDED}\n{LINE}\n{LINE}{ending}".replace("\n", line_break)
    assert parse_positions(mark + text.encode()) == (SIMPLE, SIMPLE)


def test_blank_lines_are_passed_over_and_still_counted() -> None:
    assert parse_positions(f"\n\n{NEEDED}\n\n{LINE}\n,,,\n  \n{LINE}\n".encode()) == (SIMPLE, SIMPLE)
    assert faults_of(f"\n{NEEDED}\n\n{LINE}\n\n , \nlong,call,x,2027-01-15\n") == [
        'line 7, quantity: expected a number, got "x"'
    ]


def test_a_header_alone_is_a_list_of_no_positions() -> None:
    assert parse_positions(f"{NEEDED}\n".encode()) == ()


@pytest.mark.parametrize("data", [b"", b"\n \n", codecs.BOM_UTF8, b",,,\n"])
def test_a_file_with_nothing_in_it_is_called_empty(data: bytes) -> None:
    assert faults_of(data) == ["the file is empty"]


def test_every_missing_unknown_and_repeated_heading_is_told_at_once() -> None:
    assert faults_of("name,colour,side,side,NAME,shape\nx\n") == [
        'line 1: "colour" is not a heading of a list of positions',
        'line 1: "shape" is not a heading of a list of positions',
        "line 1: the heading name stands 2 times",
        "line 1: the heading side stands 2 times",
        "line 1: the heading kind is missing",
        "line 1: the heading quantity is missing",
        "line 1: the heading expiry is missing",
    ]


@pytest.mark.parametrize("key", [field.key for field in FIELDS if field.needed])
def test_each_needed_heading_is_missed(key: str) -> None:
    header = ",".join(other for other in NEEDED.split(",") if other != key)
    assert faults_of(f"{header}\n") == [f"line 1: the heading {key} is missing"]


@pytest.mark.parametrize("key", NEEDED.split(","))
def test_each_needed_value_is_missed_on_its_line(key: str) -> None:
    cells = dict(zip(NEEDED.split(","), LINE.split(","), strict=True), **{key: " "})
    assert faults_of(f"{NEEDED}\n{LINE}\n{','.join(cells.values())}\n") == [f"line 3, {key}: is empty, and is needed"]


def test_another_separator_is_seen_as_one_unknown_heading() -> None:
    first, *rest = faults_of(f"{NEEDED}\n{LINE}\n".replace(",", ";"))
    assert first == 'line 1: "side;kind;quantity;expiry" is not a heading of a list of positions'
    assert len(rest) == 4


def test_a_header_of_very_many_cells_is_refused() -> None:
    assert len(faults_of(",".join(f"h{number}" for number in range(30_000)))) == 30_004
    assert len(faults_of("," * 30_000 + "x")) == 30_005


def test_all_faults_of_all_lines_are_told_with_their_line_and_heading() -> None:
    text = (
        f"name,{NEEDED},strike,long_ratio,own_correlation,long_delivery\n"
        "a,buy,swap,-5,15.1.2027,12,5x,0,2,Jan\n"
        "b,long,call,1,2027-01-15,0,1,0.5,2027-01\n"
        'c,long,call,1,2027-02-30,"12,5x",-1,-1.5,2027-13\n'
    )
    assert faults_of(text) == [
        "line 2: has 10 cells under 9 headings",
        'line 2, side: expected one of long, short, got "buy"',
        'line 2, kind: expected one of call, put, forward, got "swap"',
        'line 2, quantity: expected a quantity of zero or more (the side says long or short), got "-5"',
        'line 2, expiry: expected a day written as 2027-01-15, got "15.1.2027"',
        'line 2, long_ratio: expected a number, got "5x"',
        'line 2, long_delivery: expected a delivery month written as 2027-01, got "2"',
        'line 4, expiry: expected a day written as 2027-01-15, got "2027-02-30"',
        'line 4, strike: expected a number, got "12,5x"',
        'line 4, long_ratio: expected a ratio above zero, got "-1"',
        'line 4, own_correlation: expected a correlation from −1 to 1, got "-1.5"',
        'line 4, long_delivery: expected a delivery month written as 2027-01, got "2027-13"',
    ]


def test_cells_left_off_at_the_end_of_a_line_are_empty_ones() -> None:
    header = f"{NEEDED},strike,long_ratio,own_vol_long,note"
    assert parse_positions(f"{header}\n{LINE}\n{LINE},,,,\n".encode()) == (SIMPLE, SIMPLE)
    assert faults_of(f"{header}\nlong,call\n") == [
        "line 2, quantity: is empty, and is needed",
        "line 2, expiry: is empty, and is needed",
    ]


def test_a_cell_too_many_is_refused() -> None:
    assert faults_of(f"{NEEDED}\n{LINE},x\n") == ["line 2: has 5 cells under 4 headings"]


@pytest.mark.parametrize(
    ("text", "line"),
    [
        (f'{NEEDED},note\n{LINE},"a"b\n', 2),
        (f'{NEEDED},note\n{LINE},ok\n{LINE},"never closed\n{LINE},ok\n', 3),
        (f'{NEEDED},note\n{LINE},"two\nlines"\n{LINE},"x" y\n', 4),
        (f'"{NEEDED}\n{LINE}\n', 1),
    ],
)
def test_wrong_quoting_is_told_with_the_line_it_begins_on(text: str, line: int) -> None:
    (fault,) = faults_of(text)
    assert fault.startswith(f"line {line}: this line cannot be read as CSV: ")


def test_a_cell_of_a_length_that_csv_does_not_take_is_refused_with_its_line() -> None:
    (fault,) = faults_of(f"{NEEDED},note\n{LINE},{'x' * 200_000}\n")
    assert fault.startswith("line 2: this line cannot be read as CSV: ")


def test_a_quoted_line_break_is_counted_as_a_line_of_the_file() -> None:
    text = f'{NEEDED},note\n{LINE},"one\r\ntwo\nthree"\nlong,call,x,2027-01-15,\n'
    assert faults_of(text) == ['line 5, quantity: expected a number, got "x"']


@pytest.mark.parametrize(
    ("data", "fault"),
    [
        (f"{NEEDED}\n".encode() + b"\xff\n", "line 2: this is not text in UTF-8, so not a list of positions"),
        (f"{NEEDED}\n".encode("utf-16"), "line 1: this is not text in UTF-8, so not a list of positions"),
        (f"{NEEDED}\n".encode("utf-16-le"), "this is not text, so not a list of positions"),
        (b"\0" * 100, "this is not text, so not a list of positions"),
    ],
)
def test_what_is_no_text_is_called_so(data: bytes, fault: str) -> None:
    assert faults_of(data) == [fault]


def test_a_file_is_read_and_an_absent_one_refused(tmp_path: Path) -> None:
    path = tmp_path / "positions.csv"
    path.write_bytes(table(FULL_HEADER.split(","), [FULL]))
    assert read_positions(path) == (FULL,)
    with pytest.raises(BookError, match=r"^there is no such file$"):
        read_positions(tmp_path / "absent.csv")


def test_ten_thousand_lines_come_in_order() -> None:
    lines = "".join(f"{row},{LINE}\n" for row in range(10_000))
    read = parse_positions(f"name,{NEEDED}\n{lines}".encode())
    assert [position.name for position in read] == [str(row) for row in range(10_000)]
