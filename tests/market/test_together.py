"""The check of a book's correlations: what can be passes, and what cannot is told of the markets that are at odds."""

from __future__ import annotations

import datetime
import itertools
import math
import re
from collections.abc import Iterable

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from spreadgui.book.reading import read_book
from spreadgui.book.records import Book, Correlation, Market, Position
from spreadgui.market.tied import Tied, contracts_in_use, matrix_of
from spreadgui.market.together import check, complete_sets, offending
from spreadgui.shipped import sample_book

Matrix = NDArray[np.float64]
PATIENT = settings(deadline=None, max_examples=60)
NAMES = ("Ash", "Birch", "Cedar", "Elm", "Fir", "Hazel", "Larch", "Oak")
MONTHS = ("2027-01", "2027-02", "2027-07")


def book_of(
    between: Matrix, ties: Iterable[float] = (), months: Iterable[str] = MONTHS[:1], gaps: Iterable[str] = ()
) -> Book:
    """Markets with these correlations and a position on each delivery of each; `gaps` ("Ash Elm") are left out."""
    count, strengths = len(between), [*ties, *[0.0] * len(between)]
    pairs = [pair for pair in itertools.combinations(range(count), 2) if np.isfinite(between[pair])]
    return Book(
        title="",
        currency="CRN",
        valuation_date=datetime.date(2026, 12, 1),
        markets=tuple(Market(NAMES[place], "CRN/MWh", strengths[place]) for place in range(count)),
        correlations=tuple(
            Correlation(NAMES[first], NAMES[second], float(between[first, second]))
            for first, second in pairs
            if f"{NAMES[first]} {NAMES[second]}" not in gaps
        ),
        positions=tuple(
            Position(long_leg=NAMES[place], long_delivery=month) for place in range(count) for month in months
        ),
    )


def matrix(*upper: float) -> Matrix:
    """The symmetric matrix with ones on its diagonal and these above it, row by row."""
    rows = round(0.5 + math.sqrt(0.25 + 2 * len(upper)))
    result = np.eye(rows)
    result[np.triu_indices(rows, 1)] = upper
    return np.asarray(np.triu(result) + np.triu(result, 1).T)


def possible(count: int, seed: int) -> Matrix:
    factors = np.random.default_rng(seed).normal(size=(count, count + 2))
    factors /= np.linalg.norm(factors, axis=1, keepdims=True)
    return np.asarray(matrix(*(factors @ factors.T)[np.triu_indices(count, 1)]))


anything = st.integers(2, 6).flatmap(
    lambda rows: st.lists(st.floats(-1.0, 1.0), min_size=rows * (rows - 1) // 2, max_size=rows * (rows - 1) // 2).map(
        lambda upper: matrix(*upper)
    )
)
strengths = st.lists(st.sampled_from([0.0, 0.1, 0.5, 2.0]), min_size=6, max_size=6)


@pytest.mark.parametrize("name", ["ardenmoor_winter", "one_spark"])
def test_the_books_that_come_with_the_program_pass(name: str) -> None:
    found = check(read_book(sample_book(name)))
    assert found.possible
    assert (found.offenders, found.sentence) == ((), "")


@PATIENT
@given(st.integers(1, 6), st.integers(0, 10**6))
def test_what_prices_could_show_passes(count: int, seed: int) -> None:
    between = possible(count, seed)
    found = check(book_of(between, [0.3] * count, MONTHS))
    assert (found.possible, found.offenders, found.sentence, found.missing) == (True, (), "", ())
    assert found.checked == (NAMES[:count],)
    assert check(book_of(between)).smallest_eigenvalue == float(np.linalg.eigvalsh(between)[0])


@PATIENT
@given(anything, strengths)
def test_offenders_cannot_be_and_none_of_them_can_be_spared(between: Matrix, ties: list[float]) -> None:
    book = book_of(between, ties, MONTHS)
    found = check(book)
    contracts = contracts_in_use(book)
    assert found.smallest_eigenvalue == float(np.linalg.eigvalsh(matrix_of(book, contracts))[0])
    assert found.possible == (found.smallest_eigenvalue >= -found.tolerance) == (not found.offenders)

    def lowest(names: tuple[str, ...]) -> float:
        return float(np.linalg.eigvalsh(matrix_of(book, [one for one in contracts if one[0] in names]))[0])

    if found.offenders:
        assert lowest(found.offenders) < -found.tolerance
        for size in range(1, min(len(found.offenders), 4)):
            assert all(lowest(some) >= -found.tolerance for some in itertools.combinations(NAMES[: len(between)], size))
        assert found.sentence.count("\n") == 0
        assert all(name in found.sentence for name in found.offenders)


@PATIENT
@given(st.tuples(*[st.floats(-0.99, 0.99)] * 3))
def test_the_range_that_is_told_of_three_is_the_range_there_is(upper: tuple[float, float, float]) -> None:
    between = np.round(matrix(*upper), 2)
    found = check(book_of(between))
    if found.possible:
        return
    assert found.offenders == NAMES[:3]
    told = re.search(
        r"that of (\w+) and (\w+) has to be from (\S+) to (\S+), and the book has (\S+)$",
        found.sentence.replace("−", "-"),
    )
    assert told
    first, second = NAMES.index(told[1]), NAMES.index(told[2])
    low, high, held = (float(told[place]) for place in (3, 4, 5))
    assert held == between[first, second]

    def passes(correlation: float) -> bool:
        moved = between.copy()
        moved[first, second] = moved[second, first] = correlation
        return check(book_of(moved)).possible

    if low <= high:  # a range narrower than the three decimals that are told has none of them in it
        assert passes(low)
        assert passes(high)
    assert not passes(low - 0.0015)
    assert not passes(high + 0.0015)


def test_three_at_odds_are_told_with_the_pair_that_would_move_least() -> None:
    assert check(book_of(matrix(0.9, -0.5, 0.9))).sentence == (
        "the correlations of Ash, Birch and Cedar cannot exist together: with 0.9 between Ash and Birch and −0.5 "
        "between Ash and Cedar, that of Birch and Cedar has to be from −0.827 to −0.073, and the book has 0.9"
    )


def test_two_at_odds_through_their_ties_are_told_what_these_leave() -> None:
    sound = book_of(matrix(0.9), [0.1, 2.0])
    assert check(sound).possible  # for one delivery nothing is amiss
    assert check(book_of(matrix(0.9), [0.1, 2.0], MONTHS)).sentence == (
        "the correlation of Ash and Birch cannot hold across the deliveries in use: with tie strengths of 0.1 and 2 it "
        f"cannot be beyond {_most_of_two()} or −{_most_of_two()}, and the book has 0.9"
    )
    assert check(book_of(matrix(-0.4), [0.0, 2.0], MONTHS)).sentence == (
        "the correlation of Ash and Birch cannot hold across the deliveries in use: with tie strengths of 0 and 2 it "
        "has to be 0, and the book has −0.4"
    )


def _most_of_two() -> str:
    """By trying each figure of three decimals in turn."""
    bears = [
        figure
        for figure in range(1000)
        if np.linalg.eigvalsh(matrix_of(book := book_of(matrix(figure / 1000), [0.1, 2.0], MONTHS),
                                        contracts_in_use(book)))[0] >= -1e-12
    ]  # fmt: skip
    return f"{max(bears) / 1000:g}"


def test_three_at_odds_through_their_ties_only_are_told_so() -> None:
    between, ties = matrix(0.75, 0.1, 0.7), [0.3, 1.0, 0.4]
    found = check(book_of(between, ties, MONTHS))
    assert np.linalg.eigvalsh(between)[0] > 0.0
    assert found.offenders == NAMES[:3]
    assert "for one delivery they could, but not with tie strengths of 0.3, 1 and 0.4 across" in found.sentence
    told = re.search(r"came down to (\S+) % of", found.sentence)
    assert told
    for share, passes in ((float(told[1]) / 100.0, True), (float(told[1]) / 100.0 + 2e-4, False)):
        shrunk = share * between + (1.0 - share) * np.eye(3)
        assert check(book_of(shrunk, ties, MONTHS)).possible is passes


def test_more_than_are_searched_for_are_found_by_leaving_out_the_others() -> None:
    # Equal correlations r of n markets can be from −1 / (n − 1) on: at −0.24 five can, six cannot.
    between = np.eye(8)
    between[:6, :6] = -0.24 + 1.24 * np.eye(6)
    found = check(book_of(between))
    assert found.offenders == NAMES[:6]
    assert found.sentence == (
        "the correlations of Ash, Birch, Cedar, Elm, Fir and Hazel cannot exist together: a mix of the 6 would have a "
        "variance below zero, so at least one of them has to move"
    )


def test_the_fewest_are_found_even_where_leaving_out_ends_with_more() -> None:
    between = np.eye(8)
    between[:6, :6] = -0.3 + 1.3 * np.eye(6)  # any five of the six
    between[6, 7] = between[7, 6] = 1.0
    between[5, 6] = between[6, 5] = 0.3  # and three, with a lesser eigenvalue below zero
    tied = Tied.of(book_of(between), contracts_in_use(book_of(between)))
    assert offending(tied, tuple(range(8))) == (5, 6, 7)


def test_a_correlation_beyond_one_is_told_as_such() -> None:
    assert check(book_of(matrix(0.2, -1.2, 0.3))).sentence == "the correlation of Ash and Cedar is −1.2, beyond 1 or −1"


def test_a_long_list_of_names_is_cut() -> None:
    found = check(book_of(-0.16 + 1.16 * np.eye(8)))
    assert found.offenders == NAMES
    assert "of Ash, Birch, Cedar, Elm, Fir and 3 others cannot" in found.sentence


def test_missing_pairs_are_named_and_the_complete_sets_checked() -> None:
    between = matrix(0.9, -0.5, 0.9, 0.1, 0.2, 0.3)
    book = book_of(between, gaps=["Ash Elm", "Birch Elm"])
    found = check(book)
    assert found.checked == (("Ash", "Birch", "Cedar"), ("Cedar", "Elm"))
    assert found.missing == (("Ash", "Elm"), ("Birch", "Elm"))
    assert found.remark == "not checked, for want of a correlation: Ash with Elm and Birch with Elm"
    without_a_pair = check(book_of(matrix(0.9, -0.5, 0.9), gaps=["Ash Cedar"]))
    assert without_a_pair.possible
    assert without_a_pair.checked == (("Ash", "Birch"), ("Birch", "Cedar"))


def test_a_conflict_among_the_smaller_sets_is_found() -> None:
    # Ash, Birch, Cedar and Elm have all their correlations and can be; Elm, Fir and Hazel have theirs and cannot.
    between = np.full((6, 6), np.nan)
    between[:4, :4], between[3:, 3:] = 0.2 + 0.8 * np.eye(4), matrix(0.9, 0.9, -0.9)
    found = check(book_of(between))
    assert found.checked == (NAMES[:4], NAMES[3:6])
    assert found.offenders == NAMES[3:6]
    assert found.smallest_eigenvalue == float(np.linalg.eigvalsh(between[3:, 3:])[0])
    assert len(found.missing) == 6
    assert found.remark.endswith("Birch with Fir, Birch with Hazel, Cedar with Fir and Cedar with Hazel")


@PATIENT
@given(st.integers(1, 7), st.sets(st.tuples(st.integers(0, 6), st.integers(0, 6)), max_size=12))
def test_complete_sets_are_all_the_largest_ones(count: int, gaps: set[tuple[int, int]]) -> None:
    between = np.eye(count)
    for first, second in gaps:
        if first != second and max(first, second) < count:
            between[first, second] = between[second, first] = np.nan
    book = book_of(between)
    places = range(count)

    def complete(some: tuple[int, ...]) -> bool:
        return bool(np.all(np.isfinite(between[np.ix_(some, some)])))

    every = [some for size in range(1, count + 1) for some in itertools.combinations(places, size) if complete(some)]
    largest = {some for some in every if not any(set(some) < set(other) for other in every)}
    found = complete_sets(Tied.of(book, contracts_in_use(book)))
    assert set(found) == largest
    assert len(found) == len(largest)


def test_a_book_that_uses_no_contract_passes() -> None:
    found = check(book_of(matrix(0.9, -0.5, 0.9), months=()))
    assert (found.possible, found.smallest_eigenvalue, found.checked, found.remark) == (True, 1.0, (), "")


def test_only_what_positions_use_is_looked_at() -> None:
    book = book_of(matrix(0.9, -0.5, 0.9))
    less = Book(
        title="",
        currency="CRN",
        valuation_date=book.valuation_date,
        markets=book.markets,
        correlations=book.correlations,
        positions=book.positions[:2],
    )
    assert check(less).possible
    assert not check(book).possible
