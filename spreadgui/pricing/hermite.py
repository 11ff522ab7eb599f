"""Few Gauss-Hermite nodes along the boundary's tangent, for boundaries that hardly bend.

The direction is that of J. Choi ("Sum of all Black-Scholes-Merton models: an efficient pricing method for spread,
basket, and Asian options", Journal of Futures Markets 38, 2018, 627-644): integrate across the boundary in closed
form and along it numerically. In the frame of `boundary` the masses are

    P = sum over nodes of W_j exp(B t_j - B^2/2) Phi(A - x_j),

with the nodes t_j and the shifts B along the boundary counted from the middle of the legs' weights, and x_j the
boundary's x where its y is at the node. That takes the inverse of y(tau): a cubic guess, one Newton step, and the
tangent at the point reached, whose remaining `miss` in y is known.

How many nodes are enough depends on how steeply the boundary leaves its tangent within five deviations (`slope`) and
on how far the weights lie apart (`spread`). The table was found by comparison with the trapezoid rule on 400,000
options, half of them from corners: worst difference 4.3e-13 of the larger forward, which is the trapezoid's own tail
(tests/benchmarks/pricing_accuracy.py checks what came of it against an integration that shares nothing with it).
Boundaries that turn back never come here, and a row that misses a node by more than 0.001 is sent on.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from spreadgui.pricing.boundary import Boundary, Rows
from spreadgui.pricing.inputs import Array

ERROR = 6e-13
LARGEST_MISS = 1e-3
FARTHEST_FOOT = 0.5
SLOPE_AT = 5.0
BLOCK_NODES = 16384


class Rule(NamedTuple):
    """Nodes and weights for a unit normal, and the pairs (slope, spread) up to either of which they are enough."""

    nodes: Array
    weights: Array
    enough: tuple[tuple[float, float], ...]


def _rule(count: int, *enough: tuple[float, float]) -> Rule:
    nodes, weights = np.polynomial.hermite_e.hermegauss(count)
    return Rule(nodes, weights[:, None] / weights.sum(), enough)


RULES = (
    _rule(8, (0.03, 0.6), (0.06, 0.3)),
    _rule(10, (0.10, 0.6), (0.15, 0.3)),
    _rule(16, (0.45, 0.6)),
)


def _slope(line: Boundary, distance: Array) -> Array:
    """How steeply the boundary leaves its tangent at a distance in tau."""
    grown = line.share * np.exp(distance)
    share = grown / (grown + line.remainder)
    return np.asarray(np.abs(line.x_first * share + line.x_second) / (line.y_first * share + line.y_second))


def sort(line: Boundary) -> list[Rows]:
    """For each rule the rows it is enough for and no rule before it."""
    reach = SLOPE_AT / (line.y_first * line.share + line.y_second)
    slope = np.maximum(_slope(line, reach), _slope(line, -reach))
    one, other = np.abs(line.along_first), np.abs(line.along_second)
    spread = np.maximum(np.maximum(one, other), np.abs(line.along_first - line.along_second))
    across = np.maximum(np.abs(line.across_first), np.abs(line.across_second))
    spread = np.maximum(spread, 0.2 * across)
    # The boundary turns in y where its slope there, affine in the share, changes sign between share zero and one.
    straight = (line.y_second > 0.0) & (line.y_first + line.y_second > 0.0)
    free = straight & (np.abs(line.y - 0.5 * (line.along_first + line.along_second)) < FARTHEST_FOOT)
    sorted_rows = []
    for rule in RULES:
        fits = np.zeros(free.shape, dtype=np.bool_)
        for steepest, widest in rule.enough:
            fits |= (slope < steepest) & (spread < widest)
        fits &= free
        free &= ~fits
        sorted_rows.append(np.flatnonzero(fits))
    return sorted_rows


class _Nodes(NamedTuple):
    """The boundary at the nodes, each of shape (nodes, n)."""

    x: Array
    share: Array
    pace: Array  # d y / d tau
    miss: Array


def _nodes(line: Boundary, targets: Array) -> _Nodes:
    """The boundary where its y less y0 meets the targets of shape (nodes, n)."""
    speed = line.y_first * line.share + line.y_second
    mixing = line.y_first * line.share * line.remainder / speed
    bend = 0.5 * mixing
    twist = 2.0 * bend * bend - mixing * (line.remainder - line.share) / 6.0
    distance = targets / speed
    distance *= 1.0 - distance * (bend - distance * twist)
    share = line.share * np.exp(distance)
    total = share + line.remainder
    share /= total
    pace = line.y_first * share + line.y_second
    distance += (targets - line.y_first * np.log(total, out=total) - line.y_second * distance) / pace
    np.exp(distance, out=share)
    share *= line.share
    np.add(share, line.remainder, out=total)
    share /= total
    rise = np.log(total, out=total)
    np.multiply(line.y_first, share, out=pace)
    pace += line.y_second
    miss = targets - line.y_first * rise
    miss -= line.y_second * distance
    x = line.x_first * share
    x += line.x_second
    x *= miss
    x /= pace
    rise *= line.x_first
    x += rise
    distance *= line.x_second
    x += distance
    x += line.x
    return _Nodes(x, share, pace, miss)


def _tilts(nodes: Array, shift: Array) -> Array:
    """exp(node shift) for symmetric nodes: the lower half is the upper half's reciprocal."""
    half = nodes.size // 2
    tilts = np.empty((nodes.size, shift.size))
    upper = np.exp(nodes[half:, None] * shift, out=tilts[half:])
    np.divide(1.0, upper[::-1], out=tilts[:half])
    return tilts


def _sums(line: Boundary, side: Array, rule: Rule, edge: bool) -> tuple[Array, Array]:
    """Layers (3 or 6, n) as the trapezoid rule gives them, and the largest miss."""
    nodes, weights, _ = rule
    centre = 0.5 * (line.along_first + line.along_second)
    apart = 0.5 * (line.along_first - line.along_second)
    found = _nodes(line, nodes[:, None] + (centre - line.y))
    plain = _tilts(nodes, -centre)
    tilted = _tilts(nodes, apart)
    damped = np.exp(-0.5 * apart * apart)
    layers = np.empty((6 if edge else 3, side.size))
    cases = (
        (np.zeros(1), plain, np.exp(-0.5 * centre * centre)),
        (line.across_first, tilted, damped),
        (line.across_second, tilted[::-1], damped),
    )
    for layer, (across, tilt, damping) in enumerate(cases):
        mass = across - found.x
        mass *= side
        ndtr(mass, out=mass)
        mass *= tilt
        mass *= weights
        layers[layer] = damping * _fold(mass)
    if edge:
        gap = found.x - line.across_first
        share = found.share + found.share * (1.0 - found.share) * found.miss / found.pace
        density = np.exp(-0.5 * gap * gap) * (weights * tilted)
        density /= line.y_first * share + line.y_second
        for layer in (3, 4, 5):
            layers[layer] = damped / np.sqrt(2.0 * np.pi) * _fold(density.copy())
            density *= share
    return layers, np.abs(found.miss).max(axis=0)


def _fold(layers: Array) -> Array:
    """Sum over the first axis in place, in an order that does not depend on the number of rows."""
    count = len(layers)
    while count > 1:
        half = count // 2
        layers[:half] += layers[count - half : count]
        count -= half
    return np.asarray(layers[0])


def integrate(line: Boundary, rows: Rows, side: Array, rule: Rule, edge: bool) -> tuple[Array, NDArray[np.bool_]]:
    """Layers (3 or 6, rows) by one rule, and which rows met their nodes closely enough to be accepted."""
    layers = np.empty((6 if edge else 3, rows.size))
    good = np.empty(rows.size, dtype=np.bool_)
    size = BLOCK_NODES // rule.nodes.size
    for start in range(0, rows.size, size):
        some = slice(start, start + size)
        chosen = rows[some]
        layers[:, some], miss = _sums(line.only(chosen), side[chosen], rule, edge)
        good[some] = miss < LARGEST_MISS
    return layers, good
