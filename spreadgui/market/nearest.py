"""The correlation matrix nearest to one that cannot be: N. J. Higham, "Computing the nearest correlation matrix - a
problem from finance", IMA Journal of Numerical Analysis 22 (2002) 329-343.

A matrix of correlations that were each estimated or judged on their own need not be one that any set of prices could
show: some weighted sum of the prices would then have a variance below zero. Among all that can be, the one with the
least sum of squared moves is unique, because both sets that it has to lie in are convex: the matrices with no
eigenvalue below a floor, and those with ones on the diagonal. Projecting on either in turn, with Dykstra's correction
of the first, leads to it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

TINY_EIGENVALUE = 1e-10
_ASYMMETRY = 1e-12
# What the eigenvalues of a matrix of n rows with entries up to one are uncertain by is a small multiple of n * n of it.
_EPSILON = float(np.finfo(np.float64).eps)


@dataclass(frozen=True)
class Nearest:
    """A correlation matrix (n by n, read-only), how it was found, and how far it is from what was given.

    `distance` is the Frobenius norm of the difference: the root of the sum over all entries, each pair twice, of the
    squared moves. `converged` is false where the limit of rounds came first: the matrix is then a correlation matrix
    with the floor kept, and near, but not the nearest.
    """

    matrix: FloatArray
    rounds: int
    distance: float
    converged: bool


def nearest_correlation(
    matrix: ArrayLike,
    *,
    smallest_eigenvalue: float = TINY_EIGENVALUE,
    tolerance: float = 1e-11,
    limit: int = 10_000,
) -> Nearest:
    """The nearest matrix to `matrix` with ones on the diagonal and no eigenvalue below `smallest_eigenvalue`.

    `matrix` is n by n, symmetric (to 1e-12, the mean of the two being taken), with entries from −1 to 1. Its diagonal
    need not be of ones. A correlation matrix that has the floor already comes back as it is, after 0 rounds.
    Rounds end once no entry moves by more than `tolerance` in one and the two projections differ by no more than that.
    What is left below the floor by then, of the order of `tolerance`, is taken away by moving towards the unit matrix.

    Measured against an independent minimisation: tests/market/test_nearest.py. Error of an entry some hundred times
    `tolerance` at most, since convergence is linear.

    Raises ValueError, naming the argument, for a `matrix` that is empty, not square, not symmetric, not of numbers or
    with entries beyond 1; for a `smallest_eigenvalue` outside 0 to below 1, a `tolerance` not above zero and a `limit`
    below 1.

    >>> found = nearest_correlation([[1, 1, 0], [1, 1, 1], [0, 1, 1]])
    >>> found.matrix.round(4).tolist()
    [[1.0, 0.7607, 0.1573], [0.7607, 1.0, 0.7607], [0.1573, 0.7607, 1.0]]
    >>> round(found.distance, 4)
    0.5278
    """
    given = _symmetric(matrix)
    _check_options(smallest_eigenvalue, tolerance, limit)
    if _has_floor(given, smallest_eigenvalue) and bool(np.all(np.diagonal(given) == 1.0)):
        return Nearest(_read_only(given), 0, 0.0, True)
    found, rounds, converged = _alternate(given, smallest_eigenvalue, tolerance, limit)
    found = lifted(found, smallest_eigenvalue)
    return Nearest(_read_only(found), rounds, float(np.linalg.norm(found - given)), converged)


def lifted(matrix: FloatArray, smallest_eigenvalue: float) -> FloatArray:
    """`matrix`, with ones on its diagonal, moved towards the unit matrix as far as the floor of its eigenvalues needs.

    Every eigenvalue e becomes (1 − s) e + s, so s is known in closed form; the floor has to be below 1.

    >>> lifted(np.array([[1.0, 1.0], [1.0, 1.0]]), 0.1).tolist()
    [[1.0, 0.9], [0.9, 1.0]]
    """
    lowest = float(np.linalg.eigvalsh(matrix)[0])
    if lowest >= smallest_eigenvalue:
        return matrix
    kept = (1.0 - smallest_eigenvalue) / (1.0 - lowest)
    result = kept * matrix
    np.fill_diagonal(result, 1.0)
    return result


def _alternate(given: FloatArray, floor: float, tolerance: float, limit: int) -> tuple[FloatArray, int, bool]:
    """The projections in turn; in the paper's symbols R = Y − ΔS, X = P_S(R), ΔS = X − R, Y = P_U(X)."""
    ones, correction = given, np.zeros_like(given)
    for rounds in range(1, limit + 1):
        corrected = ones - correction
        above = _with_floor(corrected, floor)
        correction = above - corrected
        before, ones = ones, above.copy()
        np.fill_diagonal(ones, 1.0)
        if max(np.max(np.abs(ones - before)), np.max(np.abs(ones - above))) <= tolerance:
            return ones, rounds, True
    return ones, limit, False


def _with_floor(matrix: FloatArray, floor: float) -> FloatArray:
    values, vectors = np.linalg.eigh(matrix)
    result = (vectors * np.maximum(values, floor)) @ vectors.T
    return np.asarray(0.5 * (result + result.T))


def _has_floor(matrix: FloatArray, floor: float) -> bool:
    return float(np.linalg.eigvalsh(matrix)[0]) >= floor - _EPSILON * matrix.size


def _symmetric(matrix: ArrayLike) -> FloatArray:
    try:
        given: NDArray[Any] = np.array(matrix, dtype=np.float64)
    except (TypeError, ValueError):
        raise ValueError("matrix: expected a square array of numbers") from None
    if given.ndim != 2 or given.shape[0] != given.shape[1] or not given.size:
        raise ValueError(f"matrix: expected a square array of at least one row, found the shape {given.shape}")
    if not np.all(np.isfinite(given)):
        raise ValueError("matrix: expected finite numbers only")
    if np.max(np.abs(given)) > 1.0:
        raise ValueError(f"matrix: expected entries from −1 to 1, found {given.flat[np.argmax(np.abs(given))]:g}")
    if np.max(np.abs(given - given.T)) > _ASYMMETRY:
        raise ValueError("matrix: expected a symmetric array")
    return np.asarray(0.5 * (given + given.T))


def _check_options(smallest_eigenvalue: float, tolerance: float, limit: int) -> None:
    if not 0.0 <= smallest_eigenvalue < 1.0:
        raise ValueError(f"smallest_eigenvalue: expected zero or more and below 1, found {smallest_eigenvalue:g}")
    if not 0.0 < tolerance < math.inf:
        raise ValueError(f"tolerance: expected a number above zero, found {tolerance:g}")
    if limit < 1:
        raise ValueError(f"limit: expected at least 1, found {limit}")


def _read_only(matrix: FloatArray) -> FloatArray:
    matrix.setflags(write=False)
    return matrix
