"""The simulation of an option on two weighted sums: right where a formula is exact, honest about its error."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from spreadgui.pricing import bachelier, margrabe, shifted, yardstick
from spreadgui.pricing.simulation import Simulated, spread_value

QUICK = {"power": 11, "replicates": 12}


def within(found: Simulated, exact: float) -> bool:
    """Within four and a half standard errors of the replicates' mean."""
    return abs(found.value - exact) <= 4.5 * found.standard_error + 1e-12


@pytest.mark.parametrize("kind", ["call", "put"])
@pytest.mark.parametrize("strike", [-20.0, 0.0, 7.0, 30.0])
@pytest.mark.parametrize("correlation", [-0.6, 0.8, 1.0])
def test_one_market_a_side_is_the_yardsticks(kind: str, strike: float, correlation: float) -> None:
    tied = [[1.0, correlation], [correlation, 1.0]]
    found = spread_value([1.0, -1.1], [112.0, 95.0], [0, 0], [0.3, 0.45], tied, strike, 1.5, 0.95, kind=kind, **QUICK)
    exact = float(yardstick.value(112.0, 1.1 * 95.0, strike, 0.3, 0.45, correlation, 1.5, 0.95, kind=kind))
    assert within(found, exact)
    assert found.standard_error < 0.02


def test_parts_that_move_as_one_are_margrabes_exchange() -> None:
    ones = np.ones((3, 3))
    ones[2, :2] = ones[:2, 2] = 0.5
    found = spread_value([0.5, 1.0, -1.0], [80.0, 60.0, 105.0], [0, 0, 0], [0.3, 0.3, 0.4], ones, 0.0, 1.0, **QUICK)
    assert within(found, float(margrabe.value(100.0, 105.0, 0.0, 0.3, 0.4, 0.5, 1.0)))


def test_normal_and_shifted_parts_agree_with_their_own_formulas() -> None:
    tied = [[1.0, 0.6], [0.6, 1.0]]
    normal = spread_value([1.0, -2.0], [-3.0, 4.0], [0, 0], [18.0, 12.0], tied, -5.0, 0.5, normal=True, **QUICK)
    assert within(normal, float(bachelier.value(-3.0, 8.0, -5.0, 18.0, 24.0, 0.6, 0.5)))
    lifted = spread_value([1.0, -1.0], [-4.0, 30.0], [20.0, 5.0], [0.7, 0.5], tied, -30.0, 0.5, **QUICK)
    exact = shifted.value(yardstick.value, -4.0, 30.0, -30.0, 0.7, 0.5, 0.6, 0.5, shift_long=20.0, shift_short=5.0)
    assert within(lifted, float(exact))


def test_three_parts_agree_with_a_grid_over_their_normals() -> None:
    """A Gauss-Hermite grid of 60 nodes a normal: no random number, another road altogether."""
    tied = np.array([[1.0, 0.8, 0.6], [0.8, 1.0, 0.5], [0.6, 0.5, 1.0]])
    weights, forwards, vols = np.array([0.6, 0.4, -1.0]), np.array([90.0, 100.0, 80.0]), np.array([0.35, 0.4, 0.3])
    nodes, chances = np.polynomial.hermite_e.hermegauss(60)
    grid = np.array(list(itertools.product(nodes, repeat=3))) @ np.linalg.cholesky(tied).T
    share = np.array([np.prod(one) for one in itertools.product(chances, repeat=3)])
    ends = forwards * np.exp(vols * grid - 0.5 * vols**2)
    exact = float(share @ np.maximum(ends @ weights - 5.0, 0.0) / share.sum())
    found = spread_value(weights, forwards, np.zeros(3), vols, tied, 5.0, 1.0)
    assert found.value == pytest.approx(exact, abs=5e-3)
    assert found.standard_error < 2e-3


def test_the_standard_error_is_what_other_seeds_scatter_by() -> None:
    """Twenty seeds: the scatter of their values lies within a factor of two of the errors they claim."""
    tied = [[1.0, 0.5], [0.5, 1.0]]
    runs = [
        spread_value([1.0, -1.0], [100.0, 95.0], [0, 0], [0.4, 0.3], tied, 3.0, 1.0, power=8, replicates=8, seed=seed)
        for seed in range(20)
    ]
    scatter = float(np.std([run.value for run in runs], ddof=1))
    claimed = float(np.mean([run.standard_error for run in runs]))
    assert 0.5 < scatter / claimed < 2.0


def test_the_same_seed_gives_the_same_digits_and_progress_is_told() -> None:
    told: list[tuple[int, int]] = []
    arguments = ([1.0, -1.0], [100.0, 95.0], [0, 0], [0.4, 0.3], [[1.0, 0.5], [0.5, 1.0]], 3.0, 1.0)
    one = spread_value(*arguments, progress=lambda done, of: told.append((done, of)), **QUICK)
    assert one == spread_value(*arguments, **QUICK)
    assert told == [(done, 12) for done in range(1, 13)]
    assert one.complete


def test_a_cancelled_run_says_so_and_keeps_what_it_has() -> None:
    done: list[int] = []
    arguments = ([1.0, -1.0], [100.0, 95.0], [0, 0], [0.4, 0.3], [[1.0, 0.5], [0.5, 1.0]], 3.0, 1.0)
    found = spread_value(
        *arguments, progress=lambda count, _of: done.append(count), cancelled=lambda: len(done) == 3, **QUICK
    )
    assert (found.replicates, found.complete) == (3, False)
    none = spread_value(*arguments, cancelled=lambda: True, **QUICK)
    assert np.isnan(none.value)
    assert np.isinf(none.standard_error)


@pytest.mark.parametrize(
    ("name", "changed"),
    [
        ("forwards", {1: [100.0]}), ("vols", {3: [0.4, np.nan]}), ("correlation", {4: [[1.0]]}),
        ("correlation", {4: [[1.0, 2.0], [2.0, 1.0]]}),
    ],
)  # fmt: skip
def test_what_does_not_fit_is_refused_by_name(name: str, changed: dict[int, list[float]]) -> None:
    arguments = [[1.0, -1.0], [100.0, 95.0], [0, 0], [0.4, 0.3], [[1.0, 0.5], [0.5, 1.0]], 3.0, 1.0]
    for place, value in changed.items():
        arguments[place] = value
    with pytest.raises(ValueError, match=name):
        spread_value(*arguments)
    with pytest.raises(ValueError, match="replicates"):
        spread_value([1.0, -1.0], [100.0, 95.0], [0, 0], [0.4, 0.3], [[1.0, 0.5], [0.5, 1.0]], 3.0, 1.0, replicates=1)
