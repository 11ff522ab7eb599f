"""A quoted premium: the correlation it implies comes back, with a status and an error bar that hold."""

from __future__ import annotations

import datetime
import math

import msgspec
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.book.records import Book
from spreadgui.valuation.quoted import tolerance_of
from spreadgui.valuation.reading import read_position
from spreadgui.valuation.results import IMPLIED_WORDS
from spreadgui.valuation.table import ValuedBook, value_book
from tests.books import book_of, cap, season, spark
from tests.valuation.test_laws import book as other_laws
from tests.valuation.test_laws import position as other_position
from tests.valuation.test_strips import book as strip_book
from tests.valuation.test_strips import strip


def implied(valued: ValuedBook, row: int = 0) -> tuple[float, float, str]:
    values = [float(valued.results.values(f"implied_{key}")[row]) for key in ("correlation", "correlation_error")]
    code = float(valued.results.values("implied_status")[row])
    return values[0], values[1], IMPLIED_WORDS[int(code)] if math.isfinite(code) else ""


def quoted_at(some: Book, correlation: float) -> Book:
    """The book with its first row's premium quoted to the last digit as it is worth at another correlation."""
    position = some.positions[0]
    priced = value_book(
        msgspec.structs.replace(some, positions=(msgspec.structs.replace(position, own_correlation=correlation),))
    )
    yardstick, bachelier = (float(priced.results.values(key)[0]) for key in ("yardstick", "bachelier"))
    premium = yardstick if math.isfinite(yardstick) else bachelier
    return msgspec.structs.replace(some, positions=(msgspec.structs.replace(position, quoted_premium=premium),))


@pytest.mark.parametrize(
    "some",
    [
        book_of(spark()),
        book_of(spark(kind="put", side="short"), method="kirk"),
        book_of(season()),
        other_laws(other_position("North", "South", strike=-35.0)),
        other_laws(other_position("Night", "Dawn", strike=-8.0)),
        strip_book(strip()),
        strip_book(strip(kind="put"), dynamics="normal", vol=30.0, daily=60.0, gas_vol=4.0),
    ],
    ids=["call", "put", "below zero", "shifted", "normal", "strip", "normal strip"],
)
@given(correlation=st.floats(-0.9, 0.9))
@settings(max_examples=15, deadline=None)
def test_the_correlation_behind_a_premium_comes_back(some: Book, correlation: float) -> None:
    found, error, status = implied(value_book(quoted_at(some, correlation)))
    assert status == "solved"
    assert found == pytest.approx(correlation, abs=max(error, 1e-8))
    assert error < 0.05


def test_a_premium_no_correlation_gives_says_which_end_it_is_beyond() -> None:
    for some in (book_of(spark()), strip_book(strip())):
        for premium, said in ((0.01, "below floor"), (90.0, "above ceiling")):
            position = msgspec.structs.replace(some.positions[0], quoted_premium=premium)
            found, _, status = implied(value_book(msgspec.structs.replace(some, positions=(position,))))
            assert status == said
            assert math.isnan(found)


def test_rows_without_a_quote_or_without_two_legs_or_a_choice_imply_nothing() -> None:
    rows = (spark(), cap(quoted_premium=3.0), spark(kind="forward", quoted_premium=1.0), spark(quoted_premium=12.0))
    valued = value_book(book_of(*rows))
    assert [implied(valued, row)[2] for row in range(4)] == ["", "", "", "solved"]
    reading = read_position(valued.slate, 1)
    assert reading.quote is not None
    assert reading.quote.status == "no correlation to imply"
    assert read_position(valued.slate, 0).quote is None


def test_a_quote_does_not_change_what_the_row_is_worth() -> None:
    plain, quoted = value_book(book_of(spark())), value_book(book_of(spark(quoted_premium=12.0)))
    assert plain.results.values("value")[0] == quoted.results.values("value")[0]


def test_the_reading_sets_the_quote_against_value_and_marked_correlation() -> None:
    slate = value_book(book_of(spark(quoted_premium=12.0, side="short"))).slate
    reading = read_position(slate, 0)
    assert reading.quote is not None
    assert reading.quote.gap == pytest.approx(12.0 - reading.unit_value)
    assert reading.quote.position_gap == pytest.approx(-1000.0 * (12.0 - reading.unit_value))
    assert reading.quote.marked == 0.65
    assert abs(reading.quote.implied) < 1.0


def test_the_error_bar_holds_the_truth_when_the_premium_is_rounded_to_what_was_quoted() -> None:
    exact = quoted_at(book_of(spark()), 0.4)
    premium = exact.positions[0].quoted_premium
    assert premium is not None
    for digits in (1, 2, 3):
        position = msgspec.structs.replace(exact.positions[0], quoted_premium=round(premium, digits))
        found, error, status = implied(value_book(msgspec.structs.replace(exact, positions=(position,))))
        if digits > 1:
            assert abs(found - 0.4) <= error
        assert status == "solved"


@given(st.integers(0, 6), st.integers(1, 10**6))
def test_the_tolerance_is_half_the_last_decimal_and_never_more_than_half_a_cent(decimals: int, digits: int) -> None:
    premium = float(f"{digits}e-{decimals}")
    assert tolerance_of(premium) <= 0.005
    assert round(premium, max(2, decimals)) == premium


def test_a_premium_of_zero_has_a_tolerance_too() -> None:
    assert tolerance_of(0.0) == 0.005
    valued = value_book(book_of(spark(quoted_premium=0.0)))
    assert implied(valued)[2] == "below floor"


def test_a_quoted_strip_past_in_part_is_quoted_for_what_is_left() -> None:
    some = strip_book(strip(), day=datetime.date(2027, 1, 12))
    found, _, status = implied(value_book(quoted_at(some, 0.3)))
    assert status == "solved"
    assert found == pytest.approx(0.3, abs=1e-4)
