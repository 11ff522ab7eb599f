"""The gap tolerance: which rows it marks, in words, and what it comes to for the book."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from spreadgui.pricing.methods import method
from spreadgui.valuation.results import State
from spreadgui.valuation.table import ValuedBook, value_book
from spreadgui.valuation.trust import CLOSED_FORMS, LEAST_PREMIUM, beyond, book_words, row_words, trust_of
from tests.books import book_of, cap, season, spark
from tests.valuation.test_laws import NIGHT, SOUTH
from tests.valuation.test_laws import book as other_laws
from tests.valuation.test_laws import position as other_position

# Kirk is some 3 % off where the strike is half the short leg; the spark spread's strike is small.
WIDE = spark(name="wide", strike=60.0, own_vol_short=0.9, own_vol_long=0.9, quantity=2000.0, side="short")


def valued(*positions: Any, **changed: Any) -> ValuedBook:
    return value_book(book_of(*positions, **changed))


def test_a_row_is_beyond_when_its_gap_is_a_larger_part_of_the_premium_than_the_book_allows() -> None:
    some = valued(spark(), WIDE)
    gap = some.results.values("kirk") / some.results.values("yardstick") - 1.0
    assert abs(gap[0]) < abs(gap[1])
    for tolerance, said in ((abs(gap[1]) * 1.01, [False, False]), (abs(gap[1]) * 0.99, [False, True])):
        again = valued(spark(), WIDE, gap_tolerance=float(tolerance))
        assert beyond("kirk", again.slate, again.results, slice(None)).tolist() == said


def test_the_row_says_in_words_which_formulas_are_beyond_and_whether_its_value_rests_on_one() -> None:
    tight = {"gap_tolerance": 1e-6}
    on_kirk = valued(WIDE, method="kirk", **tight)
    assert row_words(on_kirk.slate, on_kirk.results, 0).startswith("value beyond: Kirk ")
    on_yardstick = valued(WIDE, **tight)
    words = row_words(on_yardstick.slate, on_yardstick.results, 0)
    assert words.startswith("beyond: Kirk ")
    loose = valued(WIDE, gap_tolerance=0.5)
    assert row_words(loose.slate, loose.results, 0) == "within 50 %"


def test_what_no_closed_form_has_to_approximate_is_exact() -> None:
    some = valued(cap(), spark(kind="forward"), spark(strike=0.0), gap_tolerance=1e-9)
    assert [row_words(some.slate, some.results, row) for row in range(2)] == ["exact", "exact"]
    assert not any(beyond("margrabe", some.slate, some.results, slice(None)))
    normal = value_book(other_laws(other_position(NIGHT.name, "Dawn"), other_position("North", SOUTH.name)))
    assert row_words(normal.slate, normal.results, 0) == "exact"
    assert row_words(normal.slate, normal.results, 1) != "exact"


def test_the_book_total_counts_values_without_signs_and_only_of_priced_rows() -> None:
    some = valued(spark(), WIDE, season(), spark(quantity=None), gap_tolerance=0.005, method="kirk")
    trust = trust_of(method("kirk"), some.slate, some.results)
    values = np.abs(some.slate.values("quantity") * some.results.values("value"))[:3]
    off = beyond("kirk", some.slate, some.results, slice(0, 3))
    assert some.results.state[3] == State.INCOMPLETE
    assert 0 < trust.rows == int(off.sum()) < 3
    assert trust.value == pytest.approx(float(values[off].sum()))
    assert trust.of_all == pytest.approx(float(values.sum()))
    assert trust.share == trust.value / trust.of_all
    assert book_words(some.slate, some.results) == (
        f"{100 * trust.share:.0f} % of the book’s value on Kirk beyond 0.5 %"
    )


def test_a_book_on_the_yardstick_names_the_closed_form_that_is_beyond_for_most_of_it() -> None:
    some = valued(spark(), WIDE, gap_tolerance=1e-4)
    worst = max((trust_of(one, some.slate, some.results) for one in CLOSED_FORMS), key=lambda trust: trust.share)
    assert book_words(some.slate, some.results).startswith(f"{worst.method.name} beyond 0.01 % for ")
    calm = valued(spark(), gap_tolerance=0.5)
    assert book_words(calm.slate, calm.results) == "every formula within 50 %"


def test_a_premium_the_yardstick_cannot_tell_from_nothing_is_judged_for_no_formula() -> None:
    hopeless = spark(strike=5000.0)
    some = valued(hopeless, gap_tolerance=1e-12)
    assert some.results.values("yardstick")[0] < LEAST_PREMIUM * 108.0
    assert not any(beyond(one.key, some.slate, some.results, slice(None))[0] for one in CLOSED_FORMS)


def test_an_empty_book_rests_on_nothing() -> None:
    some = valued()
    assert trust_of(method("kirk"), some.slate, some.results).share == 0.0
    assert book_words(some.slate, some.results) == "every formula within 1 %"
