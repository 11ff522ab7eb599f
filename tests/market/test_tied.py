"""All correlations of a book in one matrix: each as the book has it, and what tie strengths leave of "can be"."""

from __future__ import annotations

import datetime
import math
from collections.abc import Iterable

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from spreadgui.book.records import Book, Correlation, Market, Position
from spreadgui.market.quotes import Quotes, UnknownMarkError
from spreadgui.market.tied import Contract, Tied, contracts_in_use, largest_share, matrix_of

PATIENT = settings(deadline=None, max_examples=60)
NAMES = ("North", "South", "Quill", "Pellan")


def months(count: int) -> list[str]:
    return [f"{2027 + month // 12}-{month % 12 + 1:02d}" for month in range(count)]


def book_of(markets: Iterable[Market], correlations: Iterable[Correlation] = (), *positions: Position) -> Book:
    day = datetime.date(2026, 12, 1)
    return Book(
        title="",
        currency="CRN",
        valuation_date=day,
        markets=tuple(markets),
        correlations=tuple(correlations),
        positions=positions,
    )


def two(correlation: float, *ties: float, positions: Iterable[Position] = ()) -> Book:
    """North and South with these tie strengths."""
    markets = [Market(name, "CRN/MWh", tie) for name, tie in zip(NAMES, ties, strict=False)]
    return book_of(markets, [Correlation("South", "North", correlation)], *positions)


def most_between(ties: tuple[float, float], contracts: list[Contract]) -> float:
    """The largest correlation of North and South that their contracts bear."""
    tied = Tied.of(two(1.0, *ties), contracts)
    return largest_share(lambda share: tied.shrunk((0, 1), share).holds((0, 1)))


@st.composite
def books(draw: st.DrawFn) -> Book:
    """Up to four markets, one perhaps twice, with some of their correlations, one perhaps twice, any tie strength."""
    names = draw(st.lists(st.sampled_from(NAMES), min_size=1, max_size=4, unique_by=lambda name: name))
    names += draw(st.lists(st.sampled_from(names), max_size=1))
    ties = st.one_of(st.floats(0.0, 3.0), st.sampled_from([0.0, -1.0, math.nan]))
    markets = [Market(name, "CRN/MWh", draw(ties)) for name in names]
    pair = st.tuples(st.sampled_from(NAMES), st.sampled_from(NAMES), st.floats(-1.0, 1.0))
    return book_of(markets, [Correlation(*one) for one in draw(st.lists(pair, max_size=8))])


def by_quotes(quotes: Quotes, first: Contract, second: Contract) -> float:
    try:
        return quotes.correlation(*first, *second)
    except UnknownMarkError:
        return math.nan


def test_contracts_come_in_the_order_of_markets_and_months_each_once() -> None:
    positions = (
        Position(long_leg="South", long_delivery="2027-07", short_leg="North", short_delivery="2027-03"),
        Position(long_leg="North", long_delivery="2027-02", short_leg="South", short_delivery="2027-07"),
        Position(long_leg="South", long_delivery="2027-01", own_correlation=0.3),
    )
    assert contracts_in_use(two(0.5, 0.1, 0.2, positions=positions)) == (
        ("North", "2027-02"), ("North", "2027-03"), ("South", "2027-01"), ("South", "2027-07"),
    )  # fmt: skip


def test_a_leg_that_names_no_contract_is_passed_over() -> None:
    legs = [("", ""), ("", "2027-01"), ("North", ""), ("North", "2027-13"), ("West", "2027-01"), ("South", "2027-01")]
    positions = tuple(Position(long_leg=leg, long_delivery=month) for leg, month in legs)
    assert contracts_in_use(two(0.5, 0.1, -0.2, positions=positions)) == ()
    twice = book_of([Market("South", "CRN/MWh")] * 2, [], *positions)
    assert contracts_in_use(twice) == ()


@PATIENT
@given(books())
def test_every_entry_is_the_correlation_of_the_quotes_and_nan_where_there_is_none(book: Book) -> None:
    contracts = [(name, month) for name in NAMES for month in ("2027-01", "2027-02", "2029-07")]
    quotes = Quotes.of(book)
    expected = np.array([[by_quotes(quotes, one, other) for other in contracts] for one in contracts])
    found = matrix_of(book, contracts)
    assert np.array_equal(np.isnan(found), np.isnan(expected))
    np.testing.assert_allclose(found, expected, rtol=4e-16, atol=0.0)
    assert np.array_equal(found, matrix_of(quotes, contracts), equal_nan=True)
    assert np.array_equal(found, found.T, equal_nan=True)


def test_a_delivery_that_is_no_month_has_no_correlations() -> None:
    found = matrix_of(two(0.5, 0.1, 0.2), [("North", "2027-01"), ("South", "soon")])
    assert np.isnan(found).tolist() == [[False, True], [True, True]]


def test_a_tie_strength_without_end_gives_no_correlation() -> None:
    assert np.isnan(matrix_of(two(0.5, math.inf, 0.2), [("North", "2027-01")])).all()


def test_no_contracts_have_an_empty_matrix() -> None:
    assert matrix_of(two(0.5, 0.1, 0.2), []).shape == (0, 0)


@PATIENT
@given(st.integers(0, 10**6), st.floats(0.0, 5.0), st.integers(2, 4))
def test_markets_that_can_be_stay_so_for_all_deliveries_where_tie_strengths_are_the_same(
    seed: int, tie: float, count: int
) -> None:
    factors = np.random.default_rng(seed).normal(size=(count, count))
    factors /= np.linalg.norm(factors, axis=1, keepdims=True)
    between = factors @ factors.T
    np.fill_diagonal(between, 1.0)
    book = book_of(Market(name, "CRN/MWh", tie) for name in NAMES[:count])
    contracts = [(name, month) for name in NAMES[:count] for month in months(9)[:: count + 1]]
    tied = Tied.of(book, contracts).with_between(between)
    assert tied.holds(tuple(range(count)))


@pytest.mark.parametrize(("tie", "other"), [(0.1, 2.0), (0.5, 0.3), (0.0, 1.0), (1.0, 0.0)])
def test_two_contracts_against_one_bear_what_the_determinant_says(tie: float, other: float) -> None:
    # North in two months a year apart and South in the first of them, with p = exp(−a) and q = exp(−(a + b) / 2):
    # 1 + 2 r² p q − r² − r² q² − p² >= 0, so r² <= (1 − p²) / (1 + q² − 2 p q). Own algebra.
    p, q = math.exp(-tie), math.exp(-0.5 * (tie + other))
    most = math.sqrt((1.0 - p * p) / (1.0 + q * q - 2.0 * p * q))
    contracts = [("North", "2027-01"), ("North", "2028-01"), ("South", "2027-01")]
    assert min(most, 1.0) - 1.01e-4 <= most_between((tie, other), contracts) <= most


@pytest.mark.parametrize(("tie", "other"), [(0.2, 2.0), (0.5, 1.0), (1.0, 4.0)])
def test_many_deliveries_bear_little_more_than_the_spectral_densities_say(tie: float, other: float) -> None:
    # exp(−c |k|) for whole k has the spectral density sinh c / (cosh c − cos w), a textbook Fourier series (from
    # memory). Endless months bear r where r² f_m² <= f_a f_b at each frequency w, m being the mean; so do fewer months.
    step, frequency = 1.0 / 12.0, np.linspace(1e-3, np.pi, 20_001)

    def density(strength: float) -> NDArray[np.float64]:
        return np.asarray(np.sinh(strength * step) / (np.cosh(strength * step) - np.cos(frequency)))

    mean = density(0.5 * (tie + other))
    endless = math.sqrt(float(np.min(density(tie) * density(other) / mean**2)))
    found = most_between((tie, other), [(name, month) for name in NAMES[:2] for month in months(60)])
    assert endless - 1.01e-4 <= found <= endless + 0.02
    anywhere = math.sqrt(tie * other * (3 * tie + other) * (tie + 3 * other)) / (tie + other) ** 2
    assert anywhere - 1.01e-4 <= found <= anywhere + 0.02  # the formula of the module's docstring


@PATIENT
@given(st.floats(0.01, 3.0), st.floats(0.01, 3.0), st.sets(st.sampled_from(months(48)), min_size=1, max_size=9))
def test_no_choice_of_deliveries_bears_less_than_the_formula_says(tie: float, other: float, chosen: set[str]) -> None:
    anywhere = math.sqrt(tie * other * (3 * tie + other) * (tie + 3 * other)) / (tie + other) ** 2
    tied = Tied.of(two(anywhere, tie, other), [(name, month) for name in NAMES[:2] for month in sorted(chosen)])
    assert tied.holds((0, 1))


def test_no_tie_beside_one_leaves_no_correlation() -> None:
    assert most_between((0.0, 0.5), [(name, month) for name in NAMES[:2] for month in months(3)]) == 0.0
    assert most_between((0.0, 0.0), [(name, month) for name in NAMES[:2] for month in months(3)]) == 1.0


def test_members_are_a_part_of_the_whole_matrix() -> None:
    contracts = [("South", "2027-01"), ("North", "2027-01"), ("South", "2027-03")]
    tied = Tied.of(two(0.5, 0.1, 0.2), contracts)
    assert tied.markets == ("South", "North")
    assert np.array_equal(tied.matrix((0,)), tied.matrix()[np.ix_([0, 2], [0, 2])])
    assert np.array_equal(tied.shrunk((0, 1), 0.5).matrix((0, 1))[0, 1:2], 0.5 * tied.matrix()[0, 1:2])
    assert np.array_equal(tied.shrunk((0, 1), 0.5).matrix((0,)), tied.matrix((0,)))


@given(st.integers(0, 10_000))
def test_the_largest_share_is_found_to_its_step(steps: int) -> None:
    assert largest_share(lambda share: share <= steps / 10_000) == steps / 10_000
