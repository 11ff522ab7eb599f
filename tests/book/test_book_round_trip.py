"""A book comes back from its file as it was, and the same book is always the same bytes."""

from __future__ import annotations

import datetime
import difflib
import json
from pathlib import Path
from typing import Any

import msgspec
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from spreadgui.book.reading import parse_book, read_book
from spreadgui.book.records import Blend, Book, Correlation, Mark, Market, Part, Position, ZeroPoint
from spreadgui.book.writing import book_bytes, write_book

PATIENT = settings(deadline=None, max_examples=60, suppress_health_check=[HealthCheck.too_slow])

words = st.text(max_size=12)
finite = st.floats(allow_nan=False, allow_infinity=False)
maybe = finite | st.none()
marks = st.builds(Mark, delivery=words, forward=finite, volatility=finite, daily_volatility=maybe, note=words)
markets = st.builds(
    Market,
    name=words,
    unit=words,
    tie_strength=finite,
    dynamics=st.sampled_from(["lognormal", "shifted lognormal", "normal"]),
    shift=finite,
    business_days=words,
    holidays=st.lists(st.dates(), max_size=3).map(tuple),
    lot_size=finite,
    lot_rule=st.sampled_from(["fixed", "per hour", "per day"]),
    note=words,
    marks=st.lists(marks, max_size=3).map(tuple),
)
parts = st.builds(Part, market=words, weight=finite)
blends = st.builds(Blend, name=words, unit=words, parts=st.lists(parts, max_size=3).map(tuple), note=words)
correlations = st.builds(Correlation, first=words, second=words, correlation=finite, standard_error=maybe, note=words)
positions = st.builds(
    Position,
    name=words,
    side=st.sampled_from(["long", "short"]),
    kind=st.sampled_from(["call", "put", "forward"]),
    quantity=maybe,
    long_leg=words,
    long_delivery=words,
    long_ratio=finite,
    short_leg=words,
    short_delivery=words,
    short_ratio=finite,
    strike=finite,
    expiry=st.dates() | st.none(),
    exercise=st.sampled_from(["once", "business days", "all days"]),
    own_forward_long=maybe,
    own_forward_short=maybe,
    own_vol_long=maybe,
    own_vol_short=maybe,
    own_correlation=maybe,
    quoted_premium=maybe,
    note=words,
)
books = st.builds(
    Book,
    title=words,
    currency=words,
    valuation_date=st.dates(),
    zero_rate=finite,
    method=st.sampled_from(["kirk", "modified_kirk", "bjerksund_stensland", "yardstick"]),
    gap_tolerance=finite,
    note=words,
    markets=st.lists(markets, max_size=3).map(tuple),
    zero_curve=st.lists(st.builds(ZeroPoint, date=st.dates(), rate=finite), max_size=3).map(tuple),
    blends=st.lists(blends, max_size=2).map(tuple),
    correlations=st.lists(correlations, max_size=3).map(tuple),
    positions=st.lists(positions, max_size=4).map(tuple),
)

BOOK = Book(
    title="Winter",
    currency="CRN",
    valuation_date=datetime.date(2026, 12, 1),
    zero_rate=0.03,
    markets=(
        Market("Ardenmoor North", "CRN/MWh", 0.4, marks=(Mark("2027-01", 81.5, 0.52), Mark("2027-02", 77.0, 0.49))),
        Market("Pellan gas point", "CRN/GJ", marks=(Mark("2027-01", 9.25, 0.6),)),
    ),
    correlations=(Correlation("Ardenmoor North", "Pellan gas point", 0.7),),
    positions=(
        Position("spark 1", quantity=744.0, long_leg="Ardenmoor North", long_delivery="2027-01", strike=4.5),
        Position("spark 2", "short", "put", 744.0, note='a "quoted" note\nof two lines, č, −, 🜂'),
        Position(),
    ),
)


def changed_lines(before: bytes, after: bytes) -> int:
    """How many lines of `before` were replaced by others."""
    match = difflib.SequenceMatcher(None, before.splitlines(), after.splitlines(), autojunk=False)
    edits = [(i2 - i1, j2 - j1) for tag, i1, i2, j1, j2 in match.get_opcodes() if tag != "equal"]
    assert all(old == new for old, new in edits)
    return sum(old for old, _ in edits)


@PATIENT
@given(books)
def test_any_book_comes_back_equal_and_a_second_save_gives_the_same_bytes(book: Book) -> None:
    written = book_bytes(book)
    opened = parse_book(written)
    assert opened == book
    assert book_bytes(opened) == written


@PATIENT
@given(books)
def test_the_file_is_json_that_any_reader_takes_with_one_record_a_line(book: Book) -> None:
    written = book_bytes(book)
    raw = json.loads(written)
    assert list(raw) == list(Book.__struct_fields__)
    assert raw["positions"] == json.loads(msgspec.json.encode(book.positions))
    assert written.endswith(b"}\n")
    lines = written.count(b"\n")
    flat = len(book.positions) + len(book.correlations) + len(book.zero_curve)
    opened = sum(map(market_lines, book.markets)) + sum(map(blend_lines, book.blends))
    assert lines == 1 + 14 + 1 + 5 + flat + opened


def market_lines(market: Market) -> int:
    """A market without marks takes one line; one with marks is opened up."""
    if not market.marks:
        return 1
    fields = ("tie_strength", "dynamics", "shift", "business_days", "holidays", "lot_size", "lot_rule", "note")
    written = sum(getattr(market, field) != getattr(Market("", ""), field) for field in fields)
    return 2 + 2 + written + 2 + len(market.marks)


def blend_lines(blend: Blend) -> int:
    """A blend, like a market, is opened up once it has parts."""
    return 2 + 2 + (blend.note != "") + 2 + len(blend.parts) if blend.parts else 1


def test_save_open_save_leaves_the_file_as_it_was(tmp_path: Path) -> None:
    first, second = tmp_path / "first.json", tmp_path / "second.json"
    write_book(BOOK, first)
    opened = read_book(first)
    write_book(opened, second)
    assert opened == BOOK
    assert first.read_bytes() == second.read_bytes()


def test_two_equal_books_built_apart_are_the_same_bytes() -> None:
    again = msgspec.json.decode(msgspec.json.encode(BOOK), type=Book)
    assert again is not BOOK
    assert book_bytes(again) == book_bytes(BOOK)


ONE_CELL_EDITS: list[tuple[str, Any]] = [
    ("strike", 5.25),
    ("name", "another"),
    ("side", "short"),
    ("expiry", datetime.date(2027, 1, 15)),
    ("own_correlation", -0.2),
    ("note", "x"),
    ("short_ratio", 7.2),
    ("exercise", "all days"),
    ("quoted_premium", 8.25),
]


@pytest.mark.parametrize("row", [0, 1, 2])
@pytest.mark.parametrize(("key", "value"), ONE_CELL_EDITS)
def test_an_edit_of_one_cell_differs_in_exactly_one_line(row: int, key: str, value: object) -> None:
    rows = list(BOOK.positions)
    rows[row] = msgspec.structs.replace(rows[row], **{key: value})
    edited = msgspec.structs.replace(BOOK, positions=tuple(rows))
    expected = 0 if edited == BOOK else 1  # the row may have stood at that value
    assert changed_lines(book_bytes(BOOK), book_bytes(edited)) == expected


def test_an_edit_of_one_mark_or_of_the_book_itself_differs_in_exactly_one_line() -> None:
    north, gas = BOOK.markets
    moved = msgspec.structs.replace(north, marks=(north.marks[0], Mark("2027-02", 78.0, 0.49)))
    for edited in (
        msgspec.structs.replace(BOOK, markets=(moved, gas)),
        msgspec.structs.replace(BOOK, title="Summer"),
        msgspec.structs.replace(BOOK, valuation_date=datetime.date(2026, 12, 2)),
        msgspec.structs.replace(BOOK, correlations=(Correlation("Ardenmoor North", "Pellan gas point", 0.71),)),
    ):
        assert changed_lines(book_bytes(BOOK), book_bytes(edited)) == 1


def test_a_new_row_in_the_middle_adds_exactly_one_line() -> None:
    first, *rest = BOOK.positions
    longer = msgspec.structs.replace(BOOK, positions=(first, Position("new"), *rest))
    before, after = book_bytes(BOOK).splitlines(), book_bytes(longer).splitlines()
    assert [line for line in difflib.ndiff(before_text(before), before_text(after)) if line[0] in "+-"] == [
        '+     {"name": "new"},'
    ]


def before_text(lines: list[bytes]) -> list[str]:
    return [line.decode() for line in lines]


def test_every_float_keeps_its_last_digit() -> None:
    for value in (0.1 + 0.2, 1e-300, 5e-324, 1.7976931348623157e308, 123456789012345.67, 1 / 3):
        book = msgspec.structs.replace(BOOK, positions=(Position(strike=value),))
        assert parse_book(book_bytes(book)).positions[0].strike == value


@pytest.mark.parametrize("value", [float("nan"), float("inf"), float("-inf")])
@pytest.mark.parametrize("key", ["quantity", "strike"])
def test_a_book_that_its_file_could_not_give_back_is_not_written_over_a_good_one(
    tmp_path: Path, key: str, value: float
) -> None:
    path = tmp_path / "book.json"
    write_book(BOOK, path)
    spoilt = msgspec.structs.replace(BOOK, positions=(Position(**{key: value}),))
    with pytest.raises(ValueError, match="could not give back"):
        write_book(spoilt, path)
    with pytest.raises(ValueError, match="surrogates not allowed"):
        write_book(msgspec.structs.replace(BOOK, title="\ud800"), path)
    assert read_book(path) == BOOK
    assert list(tmp_path.iterdir()) == [path]
