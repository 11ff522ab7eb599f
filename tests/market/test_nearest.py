"""The nearest correlation matrix: a published example, an independent minimisation, and what makes it the nearest."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from numpy.typing import NDArray
from scipy.optimize import minimize

from spreadgui.market.nearest import TINY_EIGENVALUE, lifted, nearest_correlation

Matrix = NDArray[np.float64]
PATIENT = settings(deadline=None, max_examples=60)

# N. J. Higham, IMA J. Numer. Anal. 22 (2002) 329-343: the matrix of its introduction and its nearest. The figures are
# from memory; the independent minimisation below confirms them.
HIGHAM = np.array([[1.0, 1.0, 0.0], [1.0, 1.0, 1.0], [0.0, 1.0, 1.0]])
HIGHAM_NEAREST = np.array([[1.0, 0.7607, 0.1573], [0.7607, 1.0, 0.7607], [0.1573, 0.7607, 1.0]])


def symmetric(entries: Matrix) -> Matrix:
    upper = np.triu(entries, 1)
    return np.asarray(upper + upper.T + np.eye(len(entries)))


def correlation_of(factors: Matrix) -> Matrix:
    """The correlations of sums with these factors, one row each."""
    rows = factors / np.linalg.norm(factors, axis=1, keepdims=True)
    result = rows @ rows.T
    np.fill_diagonal(result, 1.0)
    return np.asarray(0.5 * (result + result.T))


def minimised(target: Matrix, seed: int = 1) -> Matrix:
    """The least squared distance over all L L' with rows of length one, from several starts: no projection in it."""
    rows, random = len(target), np.random.default_rng(seed)

    def squared(flat: NDArray[np.float64]) -> float:
        return float(np.sum((correlation_of(flat.reshape(rows, rows)) - target) ** 2))

    starts = [random.normal(size=rows * rows) for _ in range(4)]
    ends = [minimize(squared, start, method="BFGS", options={"gtol": 1e-7}) for start in starts]
    return correlation_of(min(ends, key=lambda end: float(end.fun)).x.reshape(rows, rows))


anything = st.integers(2, 6).flatmap(
    lambda rows: arrays(np.float64, (rows, rows), elements=st.floats(-1.0, 1.0)).map(symmetric)
)
valid = st.tuples(st.integers(2, 6), st.integers(0, 10**6)).map(
    lambda drawn: correlation_of(np.random.default_rng(drawn[1]).normal(size=(drawn[0], drawn[0] + 3)))
)


def test_the_example_of_the_paper_comes_out_to_its_four_digits() -> None:
    found = nearest_correlation(HIGHAM)
    assert np.array_equal(found.matrix.round(4), HIGHAM_NEAREST)
    assert found.distance == pytest.approx(0.5278, abs=5e-5)  # the paper's figure, from memory


def test_the_example_agrees_with_an_independent_minimisation() -> None:
    assert np.max(np.abs(minimised(HIGHAM) - nearest_correlation(HIGHAM).matrix)) < 1e-5


@pytest.mark.parametrize("seed", [0, 1, 2, 4])
def test_small_cases_agree_with_an_independent_minimisation(seed: int) -> None:
    target = symmetric(np.random.default_rng(seed).uniform(-1.0, 1.0, (4, 4)))
    assert np.linalg.eigvalsh(target)[0] < -0.05  # else there would be nothing to find
    found = nearest_correlation(target)
    other = minimised(target)
    assert np.max(np.abs(other - found.matrix)) < 2e-4
    assert found.distance == pytest.approx(float(np.linalg.norm(other - target)), abs=1e-8)


@PATIENT
@given(anything, st.sampled_from([TINY_EIGENVALUE, 1e-4, 0.05]))
def test_what_comes_back_is_a_correlation_matrix_above_the_floor(matrix: Matrix, floor: float) -> None:
    found = nearest_correlation(matrix, smallest_eigenvalue=floor)
    assert found.converged
    assert np.array_equal(found.matrix, found.matrix.T)
    assert np.all(np.diagonal(found.matrix) == 1.0)
    assert np.max(np.abs(found.matrix)) <= 1.0
    assert np.linalg.eigvalsh(found.matrix)[0] >= floor - 1e-13
    assert found.distance == float(np.linalg.norm(found.matrix - matrix))


@PATIENT
@given(valid)
def test_a_correlation_matrix_comes_back_as_it_is(matrix: Matrix) -> None:
    found = nearest_correlation(matrix)
    assert np.array_equal(found.matrix, matrix)
    assert (found.rounds, found.distance, found.converged) == (0, 0.0, True)


@PATIENT
@given(anything, st.integers(0, 10**6))
def test_no_other_correlation_matrix_is_nearer(matrix: Matrix, seed: int) -> None:
    found = nearest_correlation(matrix)
    random = np.random.default_rng(seed)
    for other in (correlation_of(random.normal(size=(len(matrix), 3))) for _ in range(40)):
        for share in (1.0, 1e-2, 1e-4):  # all of the way to the other, and steps that start towards it
            between = found.matrix + share * (other - found.matrix)
            # A floor above zero costs at most its size for each row.
            assert np.linalg.norm(between - matrix) >= found.distance - len(matrix) * TINY_EIGENVALUE - 1e-9


@PATIENT
@given(anything)
def test_the_nearest_to_the_nearest_is_itself(matrix: Matrix) -> None:
    once = nearest_correlation(matrix).matrix
    assert np.max(np.abs(nearest_correlation(once).matrix - once)) < 1e-9


def test_a_diagonal_that_is_not_of_ones_becomes_one() -> None:
    found = nearest_correlation([[0.5, 0.3], [0.3, 0.5]])
    assert found.matrix.tolist() == [[1.0, 0.3], [0.3, 1.0]]


def test_correlations_of_one_give_way_only_by_the_floor() -> None:
    found = nearest_correlation(np.ones((4, 4)), smallest_eigenvalue=1e-6)
    assert np.linalg.eigvalsh(found.matrix)[0] >= 1e-6 - 1e-14
    assert np.max(1.0 - found.matrix) < 1.1e-6


def test_a_limit_that_comes_first_is_told_and_still_gives_a_correlation_matrix() -> None:
    found = nearest_correlation(HIGHAM, limit=2, smallest_eigenvalue=0.01)
    assert (found.rounds, found.converged) == (2, False)
    assert np.linalg.eigvalsh(found.matrix)[0] >= 0.01 - 1e-14
    assert found.distance > nearest_correlation(HIGHAM, smallest_eigenvalue=0.01).distance


def test_the_given_matrix_is_left_alone_and_the_found_one_is_read_only() -> None:
    given_matrix = HIGHAM.copy()
    found = nearest_correlation(given_matrix)
    assert np.array_equal(given_matrix, HIGHAM)
    assert given_matrix.flags.writeable
    with pytest.raises(ValueError, match="read-only"):
        found.matrix[0, 1] = 0.0


def test_lifting_leaves_what_is_above_the_floor_and_keeps_every_direction() -> None:
    assert np.array_equal(lifted(HIGHAM_NEAREST, -1.0), HIGHAM_NEAREST)
    raised = lifted(HIGHAM, 0.2)
    assert np.linalg.eigvalsh(raised)[0] == pytest.approx(0.2, abs=1e-14)
    assert raised[0, 1] / HIGHAM[0, 1] == pytest.approx(raised[1, 2] / HIGHAM[1, 2], rel=1e-15)


@pytest.mark.parametrize(
    ("matrix", "sentence"),
    [
        ([[1.0, 0.5]], "matrix: expected a square array of at least one row"),
        ([1.0], "matrix: expected a square array of at least one row"),
        (np.empty((0, 0)), "matrix: expected a square array of at least one row"),
        ([[1.0, 0.5], [0.4, 1.0]], "matrix: expected a symmetric array"),
        ([[1.0, np.nan], [np.nan, 1.0]], "matrix: expected finite numbers only"),
        ([[1.0, np.inf], [np.inf, 1.0]], "matrix: expected finite numbers only"),
        ([[1.0, -1.2], [-1.2, 1.0]], "matrix: expected entries from −1 to 1, found -1.2"),
        ([["a", "b"], ["b", "a"]], "matrix: expected a square array of numbers"),
        ([[1.0], [1.0, 2.0]], "matrix: expected a square array of numbers"),
    ],
)
def test_what_is_no_matrix_of_correlations_is_refused(matrix: object, sentence: str) -> None:
    with pytest.raises(ValueError, match=sentence):
        nearest_correlation(matrix)  # type: ignore[arg-type]  # what is refused is of no declared type


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("smallest_eigenvalue", -1e-9), ("smallest_eigenvalue", 1.0), ("smallest_eigenvalue", np.nan),
        ("tolerance", 0.0), ("tolerance", np.nan), ("limit", 0),
    ],
)  # fmt: skip
def test_an_option_out_of_range_is_refused_by_name(name: str, value: float) -> None:
    with pytest.raises(ValueError, match=f"^{name}: expected"):
        nearest_correlation(HIGHAM, **{name: value})  # type: ignore[arg-type]  # one of them is a whole number
