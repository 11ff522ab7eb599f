"""The change that is offered for correlations that cannot exist together: it passes, is told in full, and is near."""

from __future__ import annotations

import datetime
import itertools
from collections.abc import Iterable, Sequence

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from msgspec import structs
from numpy.typing import NDArray

from spreadgui.book.reading import read_book
from spreadgui.book.records import Book, Correlation, Market, Position
from spreadgui.market.mending import DECIMALS, Move, mended
from spreadgui.market.nearest import nearest_correlation
from spreadgui.market.tied import contracts_in_use, matrix_of
from spreadgui.market.together import check
from spreadgui.shipped import sample_book

Matrix = NDArray[np.float64]
PATIENT = settings(deadline=None, max_examples=40)
NAMES = ("Ash", "Birch", "Cedar", "Elm", "Fir", "Hazel")
MONTHS = ("2027-01", "2027-02", "2027-07")
HALF_UNIT = 0.5 * 10.0**-DECIMALS


def book_of(upper: Sequence[float | None], ties: Iterable[float] = (), months: Sequence[str] = MONTHS[:1]) -> Book:
    """Markets with these correlations, row by row above the diagonal, and a position on each delivery of each."""
    count = next(rows for rows in range(2, 7) if rows * (rows - 1) // 2 == len(upper))
    strengths, pairs = [*ties, *[0.0] * count], itertools.combinations(NAMES[:count], 2)
    return Book(
        title="",
        currency="CRN",
        valuation_date=datetime.date(2026, 12, 1),
        markets=tuple(Market(name, "CRN/MWh", tie) for name, tie in zip(NAMES[:count], strengths, strict=False)),
        correlations=tuple(Correlation(*pair, one) for pair, one in zip(pairs, upper, strict=True) if one is not None),
        positions=tuple(Position(long_leg=name, long_delivery=month) for name in NAMES[:count] for month in months),
    )


def with_entries(book: Book, correlations: tuple[Correlation, ...]) -> Book:
    return structs.replace(book, correlations=correlations)


def market_matrix(book: Book) -> Matrix:
    return matrix_of(book, [(market.name, MONTHS[0]) for market in book.markets])


uppers = st.integers(2, 6).flatmap(
    lambda rows: st.lists(
        st.floats(-1.0, 1.0).map(lambda one: round(one, 3)),
        min_size=rows * (rows - 1) // 2,
        max_size=rows * (rows - 1) // 2,
    )
)
strengths = st.lists(st.sampled_from([0.0, 0.1, 0.5, 2.0]), min_size=6, max_size=6)


@PATIENT
@given(uppers, strengths, st.sampled_from([50, 1, 0]), st.data())
def test_the_mended_book_passes_and_every_entry_that_moves_is_told(
    upper: list[float], ties: list[float], rounds: int, data: st.DataObject
) -> None:
    gaps = data.draw(st.sets(st.integers(0, len(upper) - 1), max_size=2))
    book = book_of([None if place in gaps else one for place, one in enumerate(upper)], ties, MONTHS)
    found = mended(book, rounds=rounds)
    after = with_entries(book, found.correlations)
    assert check(after).possible
    assert found.after == check(after)
    assert found.before == check(book)
    for names in found.after.checked:  # the same said with no help from the check
        contracts = [one for one in contracts_in_use(after) if one[0] in names]
        assert np.linalg.eigvalsh(matrix_of(after, contracts))[0] >= -1e-12 * len(contracts_in_use(after))
    pairs = list(zip(book.correlations, found.correlations, strict=True))
    assert all((old.first, old.second) == (new.first, new.second) for old, new in pairs)
    assert found.moves == tuple(
        Move(old.first, old.second, old.correlation, new.correlation) for old, new in pairs if new is not old
    )
    for move in found.moves:
        assert move.new != move.old
        assert move.new == round(move.new, DECIMALS)
        assert abs(move.new) <= 1.0


@PATIENT
@given(uppers)
def test_a_book_that_passes_keeps_its_entries(upper: list[float]) -> None:
    book = book_of(upper)
    found = mended(book)
    if check(book).possible:
        assert found.correlations == book.correlations
        assert all(new is old for new, old in zip(found.correlations, book.correlations, strict=True))
        assert (found.moves, found.before, found.sentence) == ((), found.after, "no correlation has to move")
    else:
        assert found.moves
        assert not found.before.possible


@PATIENT
@given(uppers, st.sampled_from([0.0, 0.01, 0.2]))
def test_for_one_delivery_the_mend_is_highams_matrix_to_rounding(upper: list[float], floor: float) -> None:
    book = book_of(upper)
    if check(book).possible:
        return
    count = len(book.markets)
    found = market_matrix(with_entries(book, mended(book, smallest_eigenvalue=floor).correlations))
    nearest = nearest_correlation(market_matrix(book), smallest_eigenvalue=floor + count * HALF_UNIT).matrix
    assert np.max(np.abs(found - nearest)) <= HALF_UNIT * (1.0 + 1e-9)
    assert np.linalg.eigvalsh(found)[0] >= floor


def test_correlations_at_odds_for_one_delivery_become_those_of_the_paper() -> None:
    # Higham (2002), from memory: 0.7607 and 0.1573 (tests/market/test_nearest.py), here with a floor for the rounding.
    found = mended(book_of([1.0, 0.0, 1.0]))
    assert [move.new for move in found.moves] == pytest.approx([0.7607, 0.1573, 0.7607], abs=1.5e-4)
    assert found.sentence == ("3 of 3 correlations would move, the furthest that of Ash and Birch, from 1 to 0.7606")


def test_ties_at_odds_bring_only_their_markets_down() -> None:
    book = book_of([0.9, 0.0, 0.0], [0.1, 2.0, 0.1], MONTHS)
    found = mended(book)
    assert [(move.first, move.second) for move in found.moves] == [("Ash", "Birch")]
    assert found.sentence == (f"1 correlation would move, that of Ash and Birch, from 0.9 to {found.moves[0].new:g}")
    more = structs.replace(found.correlations[0], correlation=found.moves[0].new + 3e-4)
    assert not check(with_entries(book, (more, *found.correlations[1:]))).possible


def test_ties_at_odds_move_the_correlations_with_others_but_little() -> None:
    # Two markets brought down to what they just bear leave a third no slack, so its correlations follow a little.
    found = mended(book_of([0.9, 0.1, 0.2], [0.1, 2.0, 0.1], MONTHS))
    assert (found.moves[0].first, found.moves[0].second) == ("Ash", "Birch")
    assert all(0.9 * move.old < move.new < move.old for move in found.moves[1:])


def test_no_tie_beside_one_leaves_no_correlation_and_leaves_the_others_alone() -> None:
    found = mended(book_of([0.7, 0.3, 0.4], [0.0, 0.5, 0.5], MONTHS))
    assert [(move.first, move.second, move.new) for move in found.moves] == [
        ("Ash", "Birch", 0.0),
        ("Ash", "Cedar", 0.0),
    ]


def test_sets_that_share_a_pair_are_both_mended() -> None:
    book = book_of([0.9, -0.5, None, 0.9, -0.5, 0.9])  # Ash with Elm is missing; either three of the others is at odds
    assert not check(book).possible
    found = mended(book)
    assert found.after.possible
    assert found.after.checked == (("Ash", "Birch", "Cedar"), ("Birch", "Cedar", "Elm"))


def test_entries_out_of_the_matter_are_left_alone() -> None:
    book = book_of([0.9, -0.5, 0.9, 0.3, 0.2, 0.1])
    others = (
        Correlation("Ash", "West", 0.4),  # no such market
        Correlation("Ash", "Ash", 0.4),  # ties a market to itself
        Correlation("Cedar", "Elm", 0.9),  # a second time
    )
    book = structs.replace(book, correlations=(*book.correlations, *others), positions=book.positions[:3])
    found = mended(book)
    assert found.after.possible
    moved = {frozenset((move.first, move.second)) for move in found.moves}
    assert moved <= {frozenset(pair) for pair in itertools.combinations(NAMES[:3], 2)}
    assert found.correlations[-3:] == others


def test_a_market_apart_keeps_its_correlations_to_the_last_decimal() -> None:
    book = book_of([1.0, 0.0, 0.0, 0.0, 1.0, 0.0, 0.0, 0.0, 0.0, 0.01234567])  # Elm and Fir by themselves
    found = mended(book)
    assert [(move.first, move.second) for move in found.moves] == [
        ("Ash", "Birch"),
        ("Ash", "Cedar"),
        ("Birch", "Cedar"),
    ]
    assert found.correlations[-1] is book.correlations[-1]


def test_a_correlation_beyond_one_comes_back_within() -> None:
    found = mended(book_of([1.2]))
    assert [move.new for move in found.moves] == [1.0]
    assert found.after.possible


def test_the_book_is_left_as_it_is() -> None:
    book = book_of([0.9, -0.5, 0.9])
    before = book_of([0.9, -0.5, 0.9])
    mended(book)
    assert book == before


def test_the_book_that_comes_with_the_program_needs_no_mend() -> None:
    assert mended(read_book(sample_book("ardenmoor_winter"))).moves == ()


@pytest.mark.parametrize("floor", [-0.1, 0.6, float("nan")])
def test_a_floor_out_of_range_is_refused_by_name(floor: float) -> None:
    with pytest.raises(ValueError, match=r"^smallest_eigenvalue: expected a number from 0 to 0\.5, found"):
        mended(book_of([0.5]), smallest_eigenvalue=floor)


def test_rounds_below_zero_are_refused_by_name() -> None:
    with pytest.raises(ValueError, match=r"^rounds: expected zero or more, found -1"):
        mended(book_of([0.5]), rounds=-1)
