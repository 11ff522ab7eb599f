"""Live results: what is kept, what awaits pricing, what of a late answer is still true."""

from __future__ import annotations

import numpy as np

from spreadgui.book.changes import insert_rows, remove_rows, set_fields
from spreadgui.book.records import Book
from spreadgui.valuation.price import price_rows
from spreadgui.valuation.results import LiveResults, State
from spreadgui.valuation.slate import Slate, follow
from tests.books import book_of, cap, season, spark


def priced(book: Book) -> tuple[LiveResults, Slate]:
    results, succession = LiveResults(), follow(None, book, 1)
    results.follow(succession)
    results.accept(price_rows(succession.slate, results.pending()))
    return results, succession.slate


def states(results: LiveResults) -> list[State]:
    return [State(int(code)) for code in results.state]


def test_a_new_book_awaits_pricing_but_for_rows_that_cannot_be() -> None:
    results = LiveResults()
    results.follow(follow(None, book_of(spark(), spark(expiry=None), spark(own_correlation=1.5)), 1))
    assert states(results) == [State.PRICING, State.INCOMPLETE, State.REFUSED]
    assert results.reason(1) == "the expiry is missing"
    assert "1.5" in results.reason(2)
    assert results.pending().tolist() == [0]


def test_an_edit_leaves_all_other_rows_current() -> None:
    book = book_of(spark(), season(), cap())
    results, slate = priced(book)
    kept = results.values("yardstick").copy()
    edited = set_fields(book, {1: {"strike": 4.0}}, "").apply(book)
    results.follow(follow(slate, edited, 2))
    assert states(results) == [State.CURRENT, State.PRICING, State.CURRENT]
    assert np.isnan(results.values("yardstick")[1])
    assert results.values("yardstick")[[0, 2]].tolist() == kept[[0, 2]].tolist()


def test_a_late_part_is_dropped_for_the_rows_touched_since_and_taken_for_the_others() -> None:
    book = book_of(spark(), season(), cap())
    results, first = LiveResults(), follow(None, book, 1)
    results.follow(first)
    late = price_rows(first.slate, np.arange(3))
    edited = set_fields(book, {1: {"strike": 40.0}}, "").apply(book)
    results.follow(follow(first.slate, edited, 2))
    assert results.accept(late).tolist() == [0, 2]
    assert states(results) == [State.CURRENT, State.PRICING, State.CURRENT]


def test_a_late_part_is_dropped_whole_when_rows_have_moved_since() -> None:
    book = book_of(spark(), season(), cap())
    results, first = LiveResults(), follow(None, book, 1)
    results.follow(first)
    late = price_rows(first.slate, np.arange(3))
    shorter = remove_rows(book, (0,), "").apply(book)
    results.follow(follow(first.slate, shorter, 2))
    assert results.accept(late).size == 0
    assert states(results) == [State.PRICING] * 2


def test_a_part_does_not_overwrite_a_row_that_is_current_already() -> None:
    book = book_of(spark())
    results, slate = priced(book)
    assert results.accept(price_rows(slate, np.arange(1))).size == 0


def test_rows_that_move_keep_their_results_and_reasons() -> None:
    book = book_of(spark(expiry=None), season(), cap())
    results, slate = priced(book)
    kept = results.values("value").copy()
    longer = insert_rows(book, 0, (spark(),), "").apply(book)
    results.follow(follow(slate, longer, 2))
    assert states(results) == [State.PRICING, State.INCOMPLETE, State.CURRENT, State.CURRENT]
    assert results.reason(1) == "the expiry is missing"
    assert results.reason(0) == ""
    assert results.values("value")[2:].tolist() == kept[1:].tolist()


def test_rows_whose_pricing_broke_say_so_and_are_tried_again_with_the_next_edit() -> None:
    book = book_of(spark(), season())
    results, first = LiveResults(), follow(None, book, 1)
    results.follow(first)
    assert results.fail("Pricing stopped.").tolist() == [0, 1]
    assert states(results) == [State.REFUSED] * 2
    assert results.reason(0) == "Pricing stopped."
    results.follow(follow(first.slate, set_fields(book, {1: {"strike": 1.0}}, "").apply(book), 2))
    assert states(results) == [State.PRICING] * 2
    assert results.reason(0) == ""


def test_a_failure_leaves_rows_that_are_current_alone() -> None:
    results, _slate = priced(book_of(spark()))
    assert results.fail("Pricing stopped.").size == 0
    assert states(results) == [State.CURRENT]
