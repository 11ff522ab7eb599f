"""What a guessed correlation costs: the values at either end, the band, the book's total."""

from __future__ import annotations

from typing import Any

import msgspec
import numpy as np
import pytest

from spreadgui.book.records import Book, Correlation
from spreadgui.valuation.guesses import guess_total
from spreadgui.valuation.table import json_text, summary_text, value_book
from tests.books import GAS, POWER, book_of, cap, season, spark
from tests.valuation.test_laws import book as other_laws
from tests.valuation.test_laws import position as other_position
from tests.valuation.test_strips import book as strip_book
from tests.valuation.test_strips import strip


def estimated(some: Book, error: float) -> Book:
    """The book with all its correlations estimated, each with this standard error."""
    pairs = tuple(msgspec.structs.replace(pair, standard_error=error) for pair in some.correlations)
    return msgspec.structs.replace(some, correlations=pairs)


def with_correlation(some: Book, moved: float) -> float:
    pairs = tuple(msgspec.structs.replace(pair, correlation=pair.correlation + moved) for pair in some.correlations)
    return float(value_book(msgspec.structs.replace(some, correlations=pairs)).results.values("value")[0])


@pytest.mark.parametrize(
    "some",
    [
        book_of(spark()),
        book_of(spark(kind="put", side="short"), method="kirk"),
        other_laws(other_position("North", "South", strike=-35.0)),
        other_laws(other_position("Night", "Dawn", strike=-8.0)),
        strip_book(strip()),
    ],
    ids=["call", "sold put by Kirk", "shifted", "normal", "strip"],
)
def test_the_two_ends_are_the_values_with_the_correlation_there(some: Book) -> None:
    found = value_book(estimated(some, 0.07)).results
    assert found.values("guess_low")[0] == pytest.approx(with_correlation(some, -0.07), rel=1e-12)
    assert found.values("guess_high")[0] == pytest.approx(with_correlation(some, 0.07), rel=1e-12)
    assert found.values("guess_low")[0] > found.values("guess_high")[0]  # a spread falls as its legs go together


def test_only_rows_on_an_estimated_correlation_have_a_band() -> None:
    rows: list[Any] = [spark(), spark(own_correlation=0.5), cap(), season(), spark(kind="forward")]
    found = value_book(estimated(book_of(*rows), 0.05)).results
    assert np.isfinite(found.values("guess_low")).tolist() == [True, False, False, False, False]
    assert np.isnan(value_book(book_of(spark())).results.values("guess_low")).all()


def test_an_end_beyond_one_is_one() -> None:
    tied = (Correlation(POWER.name, GAS.name, 0.98, 0.1),)
    found = value_book(book_of(spark(), correlations=tied)).results
    full = value_book(book_of(spark(own_correlation=1.0))).results.values("value")[0]
    assert found.values("guess_high")[0] == pytest.approx(full, rel=1e-12)


def test_deliveries_apart_have_a_smaller_error_as_they_have_a_smaller_correlation() -> None:
    apart = spark(short_delivery="2027-07")
    slate = value_book(estimated(book_of(spark(), apart), 0.1)).slate
    decay = float(np.exp(-0.5 * 0.5 * (POWER.tie_strength + GAS.tie_strength)))
    assert slate.values("correlation_error").tolist() == pytest.approx([0.1, 0.1 * decay])


def test_the_books_total_adds_the_bands_without_signs() -> None:
    valued = value_book(estimated(book_of(spark(), spark(side="short", strike=9.0), cap()), 0.05))
    rows, cost, share = guess_total(valued.slate, valued.results)
    low, high = (valued.results.values(key)[:2] for key in ("guess_low", "guess_high"))
    assert rows == 2
    assert cost == pytest.approx(float(1000.0 * np.abs(high - low).sum()))
    worth = float(np.abs(valued.slate.values("quantity") * valued.results.values("value")).sum())
    assert share == pytest.approx(cost / worth)
    assert "Estimated correlations are behind 2 positions" in summary_text(valued)
    assert '"cost_of_guesses"' in json_text(valued)
    assert "Estimated correlations" not in summary_text(value_book(book_of(spark())))
