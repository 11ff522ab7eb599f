"""Each change does what its words say and its inverse takes it back exactly."""

from __future__ import annotations

import datetime

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.book.changes import (
    BookSet,
    Change,
    PositionsSet,
    RowsInserted,
    RowsRemoved,
    counted,
    insert_rows,
    remove_rows,
    set_book,
    set_fields,
)
from spreadgui.book.records import Book, Position

PATIENT = settings(deadline=None, max_examples=60)


def book_of(*names: str) -> Book:
    return Book(
        title="Winter",
        currency="CRN",
        valuation_date=datetime.date(2026, 12, 1),
        positions=tuple(Position(name) for name in names),
    )


def names(book: Book) -> str:
    return "".join(position.name for position in book.positions)


def test_setting_fields_touches_only_the_named_rows_and_fields() -> None:
    book = book_of("a", "b", "c")
    after = set_fields(book, {2: {"strike": 5.0, "note": "x"}, 0: {"side": "short"}}, "set").apply(book)
    assert after.positions[0] == Position("a", side="short")
    assert after.positions[1] is book.positions[1]
    assert after.positions[2] == Position("c", strike=5.0, note="x")
    assert names(book) == "abc"
    assert book.positions[0].side == "long"


def test_inserted_rows_come_to_stand_before_the_given_row_in_their_order() -> None:
    book = book_of("a", "b", "c")
    new = [Position("x"), Position("y")]
    assert names(insert_rows(book, 0, new, "").apply(book)) == "xyabc"
    assert names(insert_rows(book, 2, new, "").apply(book)) == "abxyc"
    assert names(insert_rows(book, 3, new, "").apply(book)) == "abcxy"
    assert names(insert_rows(book, 99, new, "").apply(book)) == "abcxy"


def test_rows_inserted_apart_come_to_stand_at_their_final_rows() -> None:
    book = book_of("a", "b", "c")
    change = RowsInserted((0, 2, 5), (Position("x"), Position("y"), Position("z")), "")
    assert names(change.apply(book)) == "xaybcz"


def test_removed_rows_may_be_named_in_any_order_and_twice() -> None:
    book = book_of("a", "b", "c", "d")
    change = remove_rows(book, [3, 0, 3], "")
    assert names(change.apply(book)) == "bc"
    assert change.inverse().apply(change.apply(book)) == book


@pytest.mark.parametrize(
    ("field", "new"),
    [
        ("title", "Summer"),
        ("valuation_date", datetime.date(2026, 12, 2)),
        ("zero_rate", -0.01),
        ("method", "kirk"),
        ("note", "x"),
    ],
)
def test_an_entry_of_the_book_itself_is_set_and_set_back(field: str, new: str | float | datetime.date) -> None:
    book = book_of("a")
    change = set_book(book, field, new, f"set {field}")
    after = change.apply(book)
    assert getattr(after, field) == new
    assert after.positions is book.positions
    assert change.inverse().apply(after) == book


@pytest.mark.parametrize(
    "change",
    [
        PositionsSet((0,), (Position("a"),), (Position("x"),), "set name"),
        RowsInserted((1,), (Position("x"),), "insert row"),
        RowsRemoved((1,), (Position("b"),), "remove row"),
        BookSet("title", "Winter", "Summer", "set title"),
    ],
)
def test_the_inverse_keeps_the_words_and_its_inverse_is_the_change(change: Change) -> None:
    assert change.inverse().words == change.words
    assert change.inverse().inverse() == change


@st.composite
def books_with_changes(draw: st.DrawFn) -> tuple[Book, Change]:
    book = book_of(*draw(st.text("abcdefgh", max_size=8)))
    size = len(book.positions)
    rows = st.sets(st.integers(0, size - 1)) if size else st.just(set[int]())
    kind = draw(st.sampled_from(["set", "insert", "insert apart", "remove", "book"]))
    if kind == "set":
        return book, set_fields(book, {row: {"strike": draw(st.floats(-9, 9))} for row in draw(rows)}, "")
    if kind == "insert":
        new = [Position(name) for name in draw(st.text("xyz", max_size=4))]
        return book, insert_rows(book, draw(st.integers(0, size + 2)), new, "")
    if kind == "insert apart":
        after = size + 4
        at = tuple(sorted(draw(st.sets(st.integers(0, after - 1), min_size=4, max_size=4))))
        return book, RowsInserted(at, tuple(map(Position, "wxyz")), "")
    if kind == "remove":
        return book, remove_rows(book, list(draw(rows)), "")
    return book, set_book(book, "title", draw(st.text(max_size=3)), "")


@PATIENT
@given(books_with_changes())
def test_the_inverse_takes_any_change_back_exactly(case: tuple[Book, Change]) -> None:
    book, change = case
    after = change.apply(book)
    assert change.inverse().apply(after) == book
    assert change.inverse().inverse().apply(book) == after


@pytest.mark.parametrize(
    "change",
    [
        PositionsSet((7,), (Position(),), (Position("x"),), ""),
        RowsInserted((7,), (Position("x"),), ""),
        RowsInserted((-1,), (Position("x"),), ""),
        RowsRemoved((7,), (Position("x"),), ""),
        RowsRemoved((-1,), (Position("x"),), ""),
    ],
)
def test_a_change_at_a_row_that_the_book_does_not_have_raises(change: Change) -> None:
    with pytest.raises(IndexError):
        change.apply(book_of("a", "b"))


def test_a_change_of_a_field_that_there_is_not_cannot_be_made() -> None:
    book = book_of("a")
    with pytest.raises(TypeError):
        set_fields(book, {0: {"colour": "red"}}, "")
    with pytest.raises(AttributeError):
        set_book(book, "colour", "red", "")
    with pytest.raises(IndexError):
        set_fields(book, {1: {"strike": 1.0}}, "")
    with pytest.raises(IndexError):
        remove_rows(book, [1], "")


def test_a_paste_of_ten_thousand_rows_is_one_change_that_comes_back() -> None:
    book = book_of("a", "b")
    change = insert_rows(book, 1, [Position(str(row)) for row in range(10_000)], "paste 10000 rows")
    after = change.apply(book)
    assert len(after.positions) == 10_002
    assert after.positions[-1].name == "b"
    assert change.inverse().apply(after) == book


def test_words_count_the_rows_where_there_are_more_than_one() -> None:
    assert counted("set strike", 1) == "set strike"
    assert counted("set strike", 3) == "set strike of 3 rows"
