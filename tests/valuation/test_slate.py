"""The slate: what it takes from a book, and what it takes over from the slate before it."""

from __future__ import annotations

import msgspec
import numpy as np
import pytest

from spreadgui.book.changes import insert_rows, remove_rows, set_book, set_fields
from spreadgui.book.records import Book, Position
from spreadgui.market.contracts import Readiness, Shape
from spreadgui.valuation.slate import Slate, build_slate, follow
from tests.books import POWER, book_of, cap, season, spark


def same(first: Slate, second: Slate) -> bool:
    return (
        np.array_equal(first.inputs, second.inputs, equal_nan=True)
        and all(np.array_equal(getattr(first, key), getattr(second, key)) for key in ("kind", "shape", "readiness"))
        and first.units == second.units
        and dict(first.troubles) == dict(second.troubles)
    )


def test_a_slate_holds_what_the_marks_and_the_row_say() -> None:
    slate = build_slate(book_of(spark(), season(), cap()), 7)
    assert slate.revision == 7
    assert slate.values("forward_long").tolist() == [108.0, 108.0, 108.0]
    assert slate.values("forward_short")[:2].tolist() == [13.0, 80.0]
    assert slate.values("quantity").tolist() == [1000.0, -500.0, 10.0]
    assert slate.values("years")[0] == pytest.approx(28 / 365)
    assert slate.values("discount")[0] == pytest.approx(np.exp(-0.03 * 28 / 365))
    assert slate.values("correlation")[0] == 0.65
    assert slate.values("correlation")[1] == pytest.approx(np.exp(-0.4 * 0.5))  # tie strength 0.4, half a year apart
    assert slate.shape.tolist() == [Shape.SPREAD, Shape.SPREAD, Shape.LONG_LEG_ONLY]
    assert slate.units == ("CRN/MWh",) * 3


def test_own_marks_win_over_the_book() -> None:
    own = {"own_forward_long": 99.0, "own_vol_short": 0.33, "own_correlation": -0.2}
    slate = build_slate(book_of(spark(**own)), 1)
    assert slate.values("forward_long")[0] == 99.0
    assert slate.values("forward_short")[0] == 13.0
    assert (slate.values("vol_long")[0], slate.values("vol_short")[0]) == (0.6, 0.33)
    assert slate.values("correlation")[0] == -0.2


def test_a_slate_cannot_be_written_to() -> None:
    slate = build_slate(book_of(spark()), 1)
    with pytest.raises(ValueError, match="read-only"):
        slate.inputs[0, 0] = 1.0


def test_a_row_that_lacks_something_is_incomplete_and_a_wrong_one_refused() -> None:
    slate = build_slate(book_of(spark(), spark(expiry=None), spark(long_leg="Nowhere")), 1)
    assert slate.readiness.tolist() == [Readiness.READY, Readiness.INCOMPLETE, Readiness.REFUSED]
    assert [trouble.field for trouble in slate.troubles[1]] == ["expiry"]
    assert "Nowhere" in slate.troubles[2][0].sentence


@pytest.mark.parametrize(
    "change",
    [
        lambda book: set_fields(book, {1: {"strike": 4.0}}, "set strike"),
        lambda book: insert_rows(book, 1, (Position(), cap()), "insert"),
        lambda book: remove_rows(book, (0, 2), "delete"),
        lambda book: set_book(book, "zero_rate", 0.05, "set rate"),
        lambda book: set_fields(book, {0: {"long_leg": "Nowhere"}}, "set leg"),
    ],
    ids=["a cell", "rows in", "rows out", "the rate", "a bad leg"],
)
def test_following_gives_the_same_slate_as_building_anew(change) -> None:
    book = book_of(spark(), season(expiry=None), cap(), spark(strike=1.0))
    before = build_slate(book, 1)
    after = change(book).apply(book)
    assert same(follow(before, after, 2).slate, build_slate(after, 2))


def test_following_an_edit_resolves_only_the_edited_row() -> None:
    book = book_of(spark(), season(), cap())
    before = build_slate(book, 1)
    after = set_fields(book, {1: {"strike": 4.0}}, "").apply(book)
    assert follow(before, after, 2).old_rows.tolist() == [0, -1, 2]


def test_following_rows_in_and_out_knows_where_each_came_from() -> None:
    book = book_of(spark(), season(), cap())
    shorter = remove_rows(book, (0,), "").apply(book)
    longer = insert_rows(shorter, 1, (Position(),), "").apply(shorter)
    assert follow(build_slate(book, 1), longer, 2).old_rows.tolist() == [1, -1, 2]


def test_new_marks_are_followed_everywhere() -> None:
    book = book_of(spark(), cap())
    dearer = msgspec.structs.replace(POWER, marks=(msgspec.structs.replace(POWER.marks[0], forward=120.0),))
    marked: Book = msgspec.structs.replace(book, markets=(dearer, book.markets[1]))
    succession = follow(build_slate(book, 1), marked, 2)
    assert succession.old_rows.tolist() == [-1, -1]
    assert succession.slate.values("forward_long").tolist() == [120.0, 120.0]


def test_an_empty_book_makes_an_empty_slate() -> None:
    assert len(build_slate(book_of(), 1)) == 0
