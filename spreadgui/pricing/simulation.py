"""The true value of an option on two weighted sums of forwards, by quasi-random simulation.

The payoff max(sum w_i F_i - sum v_j G_j - K, 0) of jointly (shifted) lognormal or normal forwards has no formula that
is exact. Scrambled Sobol points (A. B. Owen, "Scrambling Sobol' and Niederreiter-Xing points", Journal of Complexity
14, 1998, 466-489; scipy.stats.qmc) are drawn in independent replicates, whose spread gives the standard error. It is
there to say how far a moment-matched value is off, not to be quick: some tenths of a second for a value.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import ndtri

from spreadgui.pricing.inputs import Array, as_floats, check_kind

REPLICATES = 16
POWER = 14
SEED = 20_261_201

Progress = Callable[[int, int], None]
Cancelled = Callable[[], bool]


@dataclass(frozen=True)
class Simulated:
    """A discounted value with its standard error, from so many `replicates` of so many `points`.

    `complete` is false where the run was cancelled: then fewer replicates count than were asked for, and with fewer
    than two the error is infinite.
    """

    value: float
    standard_error: float
    points: int
    replicates: int
    complete: bool


def spread_value(
    weights: ArrayLike,
    forwards: ArrayLike,
    shifts: ArrayLike,
    vols: ArrayLike,
    correlation: ArrayLike,
    strike: float,
    expiry: float,
    discount: float = 1.0,
    *,
    kind: str = "call",
    normal: bool = False,
    power: int = POWER,
    replicates: int = REPLICATES,
    seed: int = SEED,
    progress: Progress = lambda _done, _of: None,
    cancelled: Cancelled = lambda: False,
) -> Simulated:
    """The option on sum(weights * forwards at expiry) - strike, weights below zero for what is paid.

    `weights`, `forwards`, `shifts` and `vols` are (n,), `correlation` (n, n); volatilities are annualised decimals of
    forward + shift, or absolute where `normal`. `power` makes 2**power points a replicate. `progress(done, of)` is told
    after each replicate, `cancelled()` asked before it. The same seed gives the same digits. ValueError naming the
    argument for shapes that do not fit, a correlation that is none, or fewer than two replicates.

    >>> found = spread_value([1.0, -1.0], [105.12711, 100.92203], [0, 0], [0.2, 0.1], [[1, 0.5], [0.5, 1]], 4.0, 1.0,
    ...     0.904837)
    >>> bool(abs(found.value - 6.6531) < 4 * found.standard_error + 1e-4)
    True
    """
    check_kind(kind)
    columns = [as_floats(name, one) for name, one in
               (("weights", weights), ("forwards", forwards), ("shifts", shifts), ("vols", vols))]  # fmt: skip
    tied = as_floats("correlation", correlation)
    _check(columns, tied, replicates)
    one, two, three, four = columns
    payoffs = _Payoffs(one, two, three, four, _factor(tied), strike, expiry, kind, normal)
    return _run(payoffs, discount, power, replicates, seed, progress, cancelled)


@dataclass(frozen=True)
class _Payoffs:
    weights: Array
    forwards: Array
    shifts: Array
    vols: Array
    factor: Array
    strike: float
    expiry: float
    kind: str
    normal: bool

    def mean(self, uniform: Array) -> float:
        """The mean undiscounted payoff over points of the unit cube, (points, n)."""
        # A point on the cube's edge would be infinitely far out.
        shocks = ndtri(np.clip(uniform, 2.0**-53, 1.0 - 2.0**-53)) @ self.factor.T
        deviations = self.vols * np.sqrt(self.expiry)
        if self.normal:
            ends = self.forwards + deviations * shocks
        else:
            ends = (self.forwards + self.shifts) * np.exp(deviations * shocks - 0.5 * deviations**2) - self.shifts
        spread = ends @ self.weights - self.strike
        if self.kind == "forward":
            return float(np.mean(spread))
        return float(np.mean(np.maximum(spread if self.kind == "call" else -spread, 0.0)))


def _run(
    payoffs: _Payoffs, discount: float, power: int, replicates: int, seed: int, progress: Progress, cancelled: Cancelled
) -> Simulated:
    from scipy.stats import qmc  # takes half a second to load, which only who simulates should wait for

    means: list[float] = []
    for stream in np.random.SeedSequence(seed).spawn(replicates):
        if cancelled():
            break
        points = qmc.Sobol(len(payoffs.weights), scramble=True, seed=np.random.default_rng(stream))
        means.append(payoffs.mean(points.random_base2(power)))
        progress(len(means), replicates)
    count = len(means)
    error = float(np.std(means, ddof=1) / np.sqrt(count)) if count > 1 else np.inf
    value = float(np.mean(means)) if means else np.nan
    return Simulated(discount * value, discount * error, 2**power, count, count == replicates)


def _factor(correlation: Array) -> Array:
    """A matrix whose square is the correlation: Cholesky's, or by eigenvalues where it is only semi-definite."""
    try:
        return np.asarray(np.linalg.cholesky(correlation))
    except np.linalg.LinAlgError:
        values, vectors = np.linalg.eigh(correlation)
        if values[0] < -1e-10 * len(values):
            raise ValueError(f"correlation: has an eigenvalue of {values[0]:g}, below zero") from None
        return np.asarray(vectors * np.sqrt(np.maximum(values, 0.0)))


def _check(columns: list[Array], correlation: Array, replicates: int) -> None:
    count = columns[0].size
    for name, column in zip(("weights", "forwards", "shifts", "vols"), columns, strict=True):
        if column.shape != (count,) or not np.isfinite(column).all():
            raise ValueError(f"{name}: expected {count} finite numbers, found shape {column.shape}")
    if correlation.shape != (count, count) or not np.isfinite(correlation).all():
        raise ValueError(f"correlation: expected {count} by {count} finite numbers, found shape {correlation.shape}")
    if replicates < 2:
        raise ValueError(f"replicates: expected two or more, found {replicates}")
