"""Gauss-Legendre panels along the exercise boundary: the safety net under the trapezoid rule.

The same integral, cut where the boundary needs it. A stretch of boundary is bisected in tau until its arc is short
against the unit width of the weight, stretches that cannot meet the weight are dropped, those the whole weight lies
beyond are done in closed form, and each that is left takes twelve nodes. Nothing is assumed about the boundary's
shape, so hairpins, second arms and bends sharper than the weight is wide come out as well as a straight line does, at
some ten times the cost.

Two bounds make the bisection safe. The speed of the boundary in tau, the norm of an affine function of the share L,
is convex in L, hence at most (1 - L) speed_low + L speed_high; since L is the slope of lg, its integral, the arc from
one end to the other, is at most speed_low (d tau - d lg) + speed_high d lg. And no point of a stretch is farther from
the nearer end than half its arc.

Distances are measured from the frame with ln(1 + L0 (e^d - 1)) taken by log1p and expm1, so that nothing is lost
where a correlation within 1e-15 of one makes the whole crossing of the weight as short as 1e-8 in tau.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from scipy.special import ndtr

from spreadgui.pricing.boundary import Boundary, Rows, window
from spreadgui.pricing.inputs import Array

# Normal tail beyond the window: 1.5e-14 on either side.
REACH = 7.6
NODES, WEIGHTS = np.polynomial.legendre.leggauss(12)
LONGEST_ARC = 2.2
LONGEST_STEP = 2.5
BISECTIONS = 100
# A step this small beside its place cannot be halved any more.
RESOLUTION = 1e-15
LAST_DIGIT = 2.0**-53
PANELS_AT_ONCE = 4096


def _travel(line: Boundary, distance: Array) -> tuple[Array, Array]:
    """lg - lg0 and the short leg's share of S1 at a distance in tau."""
    far = np.exp(-np.abs(distance))
    ahead = distance > 0.0
    grown, kept = np.where(ahead, line.share, line.share * far), np.where(ahead, line.remainder * far, line.remainder)
    total = grown + kept
    near = np.log1p(line.share * np.expm1(np.clip(distance, -1.0, 1.0)))
    rise = np.where(np.abs(distance) < 1.0, near, np.maximum(distance, 0.0) + np.log(total))
    return rise, grown / total


def _place(line: Boundary, distance: Array, rise: Array) -> tuple[Array, Array]:
    x = line.x + (line.x_first * rise + line.x_second * distance)
    y = line.y + (line.y_first * rise + line.y_second * distance)
    return x, y


class _Cut(NamedTuple):
    """Stretches of boundary: `rows`, `start` and `stop` in tau of those to be integrated; `sunk_rows`, `low` and
    `high` in y of those on whose exercised side the whole weight lies."""

    rows: Rows
    start: Array
    stop: Array
    sunk_rows: Rows
    low: Array
    high: Array


def _cut(line: Boundary, span: Array) -> _Cut:
    """The stretches that can meet the weight, from -span to span in tau."""
    bounds = window(line, REACH)
    shallow = np.minimum(0.0, np.minimum(line.across_first, line.across_second)) - REACH
    rows, start, stop = np.arange(line.tau.size), -span - line.tau, span - line.tau
    found: list[_Cut] = []
    for _ in range(BISECTIONS):
        part = line.only(rows)
        rise_start, rise_stop = _travel(part, start)[0], _travel(part, stop)[0]
        rise, step = rise_stop - rise_start, stop - start
        half = 0.5 * (part.speed_low * (step - rise) + part.speed_high * rise)
        x_start, y_start = _place(part, start, rise_start)
        x_stop, y_stop = _place(part, stop, rise_stop)
        meets = (
            (np.minimum(y_start, y_stop) - half < bounds.high[rows])
            & (np.maximum(y_start, y_stop) + half > bounds.low[rows])
            & (np.minimum(x_start, x_stop) - half < bounds.deep[rows])
        )
        sunk = meets & (np.maximum(x_start, x_stop) + half < shallow[rows])
        finest = step <= RESOLUTION * np.maximum(np.abs(start), np.abs(stop))
        small = (half <= 0.5 * LONGEST_ARC) & (step <= LONGEST_STEP) | finest
        done, split = meets & small & ~sunk, meets & ~small & ~sunk
        found.append(_Cut(rows[done], start[done], stop[done], rows[sunk], y_start[sunk], y_stop[sunk]))
        if not split.any():
            break
        middle = 0.5 * (start + stop)[split]
        start, stop = np.concatenate((start[split], middle)), np.concatenate((middle, stop[split]))
        rows = np.concatenate((rows[split], rows[split]))
    return _Cut(*(np.concatenate(parts) for parts in zip(*found, strict=True)))


def _span(line: Boundary, deviation_short: Array) -> Array:
    """A distance either way beyond which the boundary cannot meet the weight."""
    slowest = np.minimum(line.speed_low, line.speed_high)
    return np.maximum(20.0 * deviation_short + 10.0, np.abs(line.tau) + 40.0 / slowest + 40.0)


def integrate(line: Boundary, deviation_short: Array) -> tuple[Array, Array]:
    """Layers (6, n) as the trapezoid rule gives them: masses about the origin and the two legs' weights, then the
    integrals in tau of S1 phi2, S2 phi2 and S2^2/S1 phi2 over the first forward. And what the masses, added up, may
    have lost to rounding: a node on a second arm is placed by its distance in tau from the frame on the first, whose
    last digit the boundary's speed turns into standard deviations."""
    rows, start, stop, sunk_rows, low, high = _cut(line, _span(line, deviation_short))
    total = np.zeros((6, line.tau.size))
    for layer, shift in enumerate((np.zeros_like(line.tau), line.along_first, line.along_second)):
        mass = ndtr(high - shift[sunk_rows]) - ndtr(low - shift[sunk_rows])
        total[layer] = np.bincount(sunk_rows, mass, minlength=line.tau.size)
    sums = np.empty((7, rows.size))
    for first in range(0, rows.size, PANELS_AT_ONCE):
        some = slice(first, first + PANELS_AT_ONCE)
        _panel_sums(line, rows[some], start[some], stop[some], sums[:, some])
    # Added up in the order of each row's own panels, whatever rows stand beside it.
    added = np.stack([np.bincount(rows, layer, minlength=line.tau.size) for layer in sums])
    return total + added[:6], added[6]


def _panel_sums(line: Boundary, rows: Rows, start: Array, stop: Array, sums: Array) -> None:
    half = 0.5 * (stop - start)
    distance = ((start + half)[:, None] + half[:, None] * NODES).ravel()
    weight = (half[:, None] * WEIGHTS).ravel()
    rows = np.repeat(rows, NODES.size)
    part = line.only(rows)
    rise, share = _travel(part, distance)
    x, y = _place(part, distance, rise)
    along = weight * (part.y_first * share + part.y_second)
    edge = weight * np.exp(part.log_first + rise - 0.5 * (x * x + y * y)) / (2.0 * np.pi)
    masses = (
        _mass(x, y, along),
        _mass(x - part.across_first, y - part.along_first, along),
        _mass(x - part.across_second, y - part.along_second, along),
    )
    speed = np.hypot(part.x_first * share + part.x_second, part.y_first * share + part.y_second)
    loose = LAST_DIGIT * np.abs(distance) * speed * np.abs(np.stack(masses)).sum(axis=0)
    layers = (*masses, edge, edge * share, edge * share * share, loose)
    for target, layer in zip(sums, layers, strict=True):
        layer.reshape(-1, NODES.size).sum(axis=1, out=target)


def _mass(x: Array, y: Array, along: Array) -> Array:
    return np.asarray(along * np.exp(-0.5 * y * y) * ndtr(-x) / np.sqrt(2.0 * np.pi))
