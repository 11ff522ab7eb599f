"""The boundary integral by the trapezoid rule, which checks itself.

By Green's theorem the exercise probability under a unit normal weight about (A, B) is an integral along the boundary,

    P = integral of phi(y - B) Phi(A - x) dy,

in any frame and for a boundary that turns back as well. With tau as parameter the integrand is analytic and dies out
at both ends like a normal density, so equally spaced nodes converge exponentially (Poisson's summation formula). Sums
over every other node are two trapezoid rules of twice the step; how far they differ tells how far their mean can be
off. What their difference g is worth depends on the step h in tau. The integrand is singular at a distance pi from
the real axis, where S1 = 0. For small h it is the normal density that limits convergence and the error is near g^4;
for h near one it is the singularity, and the error is near g^2 with chance cancellations in g to guard against.
`EXPONENTS` holds what a study against the panels supports (24,000 options, half of them from corners): the error
stays below g^exponent.

Far in the money the rule sums what is not exercised, so that the smaller side always comes without cancellation; that
needs a boundary which leaves the weight by its sides on both ends.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from spreadgui.pricing.boundary import Boundary, Rows, Window, point, window
from spreadgui.pricing.inputs import Array

Mask = NDArray[np.bool_]

# Beyond the window 7e-14 of a weight is left on either side, and cutting the node sum there costs up to 1.3e-13 more.
REACH = 7.4
TAIL = 3e-13
FIRST_NODES = 32
DOUBLINGS = 2
BLOCK_NODES = 16384
ACCEPTED_ERROR = 1e-12
STEPS = np.array([0.1, 0.15, 0.25, 0.4, 0.5, 0.8])
EXPONENTS = np.array([3.0, 2.0, 1.7, 1.45, 1.3, 1.1])
# Steeper boundaries (a correlation or a deviation next to its limit) lose digits in the node positions used here.
STEEPEST = 2e4
LONGEST_STRIDE = 1.0
TURN_CARE = 2.0


class Walk(NamedTuple):
    """Where the nodes go, each field of shape (n,): first and last distance in tau, whether the rule may be used at
    all, side +1 to sum the exercised mass and -1 the other, and the boundary's greatest speed on the way, doubled
    where it turns back."""

    start: Array
    stop: Array
    fit: Mask
    side: Array
    pace: Array

    def only(self, rows: Rows) -> Walk:
        """The walks of some rows."""
        return Walk(self.start[rows], self.stop[rows], self.fit[rows], self.side[rows], self.pace[rows])


def _limit(line: Boundary, toward: float, edge: Array, deep: Array) -> tuple[Array, Mask]:
    """How far the boundary runs one way before it leaves the weight, within a sixteenth; infinite where it does not.
    Also whether it left by the side rather than by running deep into exercise."""
    speed = line.y_first * line.share + line.y_second
    far = np.maximum(np.abs(edge - line.y), 0.5) / speed
    near = np.zeros_like(far)
    for _ in range(7):
        x, y = point(line, toward * far)
        out = (toward * (y - edge) >= 0.0) | (x >= deep)
        if out.all():
            break
        near, far = np.where(out, near, far), np.where(out, far, 2.0 * far)
    for _ in range(4):
        middle = 0.5 * (near + far)
        x, y = point(line, toward * middle)
        inner = (toward * (y - edge) >= 0.0) | (x >= deep)
        near, far = np.where(inner, near, middle), np.where(inner, middle, far)
    _, y = point(line, toward * far)
    return np.where(out, far, np.inf), toward * (y - edge) >= 0.0


def plan(line: Boundary, in_the_money: Mask) -> Walk:
    """The walk along every boundary."""
    bounds = window(line, REACH)
    before, side_before = _limit(line, -1.0, bounds.low, bounds.deep)
    after, side_after = _limit(line, 1.0, bounds.high, bounds.deep)
    rows, toward, distance = _second_arms(line, bounds)
    before[rows] = np.where(toward < 0.0, distance, before[rows])
    after[rows] = np.where(toward > 0.0, distance, after[rows])
    inner = in_the_money & side_before & side_after
    inner[rows] = False
    fit = (before < 600.0) & (after < 600.0) & (np.maximum(line.speed_low, line.speed_high) < STEEPEST)
    pace = np.maximum(_speed(line, -before), _speed(line, after))
    pace[rows] *= TURN_CARE
    return Walk(-before, after, fit, np.where(inner, -1.0, 1.0), pace)


def _speed(line: Boundary, distance: Array) -> Array:
    """Speed of the boundary in tau, which between two points is largest at one of them."""
    grown = line.share * np.exp(distance)
    share = grown / (grown + line.remainder)
    return np.hypot(line.x_first * share + line.x_second, line.y_first * share + line.y_second)


def _second_arms(line: Boundary, bounds: Window) -> tuple[Rows, Array, Array]:
    """Rows whose boundary turns back in y and meets the weight again, the way they do, and the distance at which they
    have run deep. Infinite where the turn is so far out that panels are the better means."""
    with np.errstate(all="ignore"):
        turn_share = -line.y_second / line.y_first
        rows = np.flatnonzero((turn_share > 0.0) & (turn_share < 1.0))
        few = line.only(rows)
        share = turn_share[rows]
        turn = np.log(share / (1.0 - share) * (few.remainder / few.share))
    toward = np.where(turn > 0.0, 1.0, -1.0)
    edge = np.where(turn > 0.0, bounds.high[rows], bounds.low[rows])
    deep = bounds.deep[rows] + 0.1
    near, far = np.abs(turn), np.abs(turn)
    x, y_turn = point(few, turn)
    before_deep = x < deep
    for _ in range(12):
        far = np.where(x < deep, 1.5 * far + 1.0, far)
        x, _ = point(few, toward * far)
    for _ in range(12):
        middle = 0.5 * (near + far)
        out = point(few, toward * middle)[0] >= deep
        near, far = np.where(out, near, middle), np.where(out, middle, far)
    _, y = point(few, toward * far)
    back = before_deep & (toward * (y - edge) < 0.0)
    distance = np.where(toward * (y_turn - edge) < 10.0, far, np.inf)
    return rows[back], toward[back], distance[back]


def _fold(layers: Array) -> Array:
    """Sum over the first axis, pairwise and in an order that does not depend on the number of rows."""
    count = len(layers)
    while count > 1:
        half = count // 2
        layers[:half] += layers[half:count]
        count = half
    return np.asarray(layers[0])


def _sums(line: Boundary, walk: Walk, step: Array, index: Array, edge: bool) -> Array:
    """Sums (layers, n) over the nodes start + index step, index of shape (m,) with m a power of two.

    Layers 0-2 are the masses about the origin and the two legs' weights; with `edge` layers 3-5 are the integrals in
    tau of S1 phi2, S2 phi2 and S2^2/S1 phi2 over the first forward, phi2 the density about the origin.
    """
    sums = np.empty((6 if edge else 3, step.size))
    spare = index[:, None] * step
    spare += walk.start
    share = np.exp(spare)
    share *= line.share
    total = share + line.remainder
    share /= total
    rise = np.log(total, out=total)
    y = line.y_first * rise
    x = line.x_first * rise
    along = line.y_second * spare
    y += along
    y += line.y
    spare *= line.x_second
    x += spare
    x += line.x
    x *= walk.side
    np.multiply(line.y_first, share, out=along)
    along += line.y_second
    along *= step / np.sqrt(2.0 * np.pi)
    origin = np.zeros(1)
    legs = ((origin, origin), (line.across_first, line.along_first), (line.across_second, line.along_second))
    mass = np.empty_like(y)
    for layer, (across, shift) in enumerate(legs):
        np.subtract(y, shift, out=mass)
        mass *= mass
        mass *= -0.5
        np.exp(mass, out=mass)
        mass *= along
        np.subtract(walk.side * across, x, out=spare)
        mass *= ndtr(spare, out=spare)
        sums[layer] = _fold(mass)
    if edge:
        _edge_sums(line, step, rise, share, x, y, sums)
    return sums


def _edge_sums(line: Boundary, step: Array, rise: Array, share: Array, x: Array, y: Array, sums: Array) -> None:
    x *= x
    y *= y
    x += y
    x *= -0.5
    x += rise
    x += line.log_first
    np.exp(x, out=x)
    x *= step / (2.0 * np.pi)
    for layer in (3, 4, 5):
        sums[layer] = _fold(x.copy())
        x *= share


def integrate(line: Boundary, walk: Walk, weights: Array, edge: bool) -> tuple[Array, Array]:
    """Layers (6 or 3, n) as in `_sums`, and the error of the value they give, in units of the larger forward;
    infinite where the rule is unfit or did not converge.

    weights (3, n): strike and forwards with the sign they enter the value with, over the larger forward.
    """
    count = walk.start.size
    layers, error = np.zeros((6 if edge else 3, count)), np.full(count, np.inf)
    rows, nodes = np.flatnonzero(walk.fit), FIRST_NODES
    halves = np.arange(0.0, nodes, 2.0), np.arange(1.0, nodes, 2.0)
    known = _blocked(line, walk, rows, nodes, halves[0], edge)
    for _ in range(DOUBLINGS + 1):
        step = (walk.stop[rows] - walk.start[rows]) / nodes
        other = _blocked(line, walk, rows, nodes, halves[1], edge)
        gap = weights[:, rows] * (2.0 * (known[:3] - other[:3]))
        spread = np.maximum(np.abs(gap.sum(axis=0)), 0.5 * np.abs(gap).max(axis=0))
        found = np.minimum(spread, 1.0) ** np.interp(step, STEPS, EXPONENTS)
        done = (found <= ACCEPTED_ERROR) & (step * walk.pace[rows] <= LONGEST_STRIDE)
        known += other
        layers[:, rows[done]] = known[:, done]
        error[rows[done]] = found[done]
        rows, known, nodes = rows[~done], 0.5 * known[:, ~done], 2 * nodes
        halves = halves[0], np.arange(1.0, nodes, 2.0)
        if not rows.size:
            break
    return layers, error


def _blocked(line: Boundary, walk: Walk, rows: Rows, nodes: int, index: Array, edge: bool) -> Array:
    """`_sums` in blocks that stay in the cache, for nodes that divide the walk into `nodes` steps."""
    sums = np.empty((6 if edge else 3, rows.size))
    size = max(1, BLOCK_NODES // index.size)
    for start in range(0, rows.size, size):
        chosen = rows[start : start + size]
        part = walk.only(chosen)
        step = (part.stop - part.start) / nodes
        sums[:, start : start + size] = _sums(line.only(chosen), part, step, index, edge)
    return sums
