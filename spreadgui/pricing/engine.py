"""Exercise masses by whichever of the Yardstick's integrals fits a row, a block at a time."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from spreadgui.pricing import boundary, hermite, one_factor, panels, trapezoid
from spreadgui.pricing.boundary import Rows
from spreadgui.pricing.inputs import Array
from spreadgui.pricing.legs import STILL, Legs, combined

# A smaller deviation of one leg, or a smaller part of it that the correlation leaves free, moves no value by more
# than some 1e-14 of the larger forward: the row has one factor.
NO_DEVIATION = 1e-14
# Nor does a strike below this, in units of the smaller forward.
NO_STRIKE = 1e-18
# A deviation above this has run the normal distribution out: alone it may as well be this wide, and where the other
# is above half of it both legs end next to nothing but under their own numeraires, so that the strike decides no
# exercise.
WIDE = 40.0
# ln(S1/(S2 + K)) lies between affine functions of the two normals: it deviates by no more than a + b and drifts by no
# more than 1.5 (a + b)^2 under any of the three weights. Ten deviations away the outcome is settled to 1e-23.
SURE = 10.0
PANEL_ROWS = 1024
PANEL_ERROR = 5e-13
ROUNDING = 2e-15


class Masses(NamedTuple):
    """What the integrals give for one block, each field of shape (n,).

    With side +1 the masses are the exercise probabilities of a call under the unit weight and under either leg as
    numeraire, with side -1 the probabilities that it is not exercised. `edge_first`, `edge_both` and `edge_second` are
    F1^2, -F1 F2 and F2^2 times the undiscounted gammas, all over F1. `error` is in units of the larger forward.
    """

    side: Array
    plain: Array
    in_first: Array
    in_second: Array
    edge_first: Array
    edge_both: Array
    edge_second: Array
    error: Array


def _exchange(
    first: Array, second: Array, strike: Array, a: Array, b: Array, rho: Array, out: Masses, rows: Rows
) -> None:
    """Margrabe's case: the strike decides no exercise."""
    v = combined(a, b, rho, np.empty_like(a), np.empty_like(a))
    upper = np.log(first / second) / v + 0.5 * v
    lower = upper - v
    side = np.where(first > second, -1.0, 1.0)
    density = np.where(v > STILL, np.exp(-0.5 * upper * upper) / np.sqrt(2.0 * np.pi) / v, 0.0)
    out.side[rows], out.error[rows] = side, 0.0
    out.in_first[rows], out.in_second[rows] = ndtr(side * upper), ndtr(side * lower)
    out.plain[rows] = 0.5 - 0.5 * side
    for edge in (out.edge_first, out.edge_both, out.edge_second):
        edge[rows] = density


def _store(layers: Array, out: Masses, rows: Rows) -> None:
    fields = (out.plain, out.in_first, out.in_second, out.edge_first, out.edge_both, out.edge_second)
    for field, layer in zip(fields, layers, strict=False):
        field[rows] = layer


def _line(first: Array, second: Array, strike: Array, a: Array, b: Array, rho: Array, out: Masses, rows: Rows) -> None:
    """One normal factor: no volatility in one leg or in both, or a correlation of one or minus one."""
    a, b = np.where(a <= NO_DEVIATION, 0.0, a), np.where(b <= NO_DEVIATION, 0.0, b)
    side = np.where(first - second > strike, -1.0, 1.0)
    out.side[rows], out.error[rows] = side, 0.0
    _store(one_factor.integrate(first, second, strike, a, np.where((a > 0.0) & (rho < 0.0), -b, b), side), out, rows)


def _plane(
    first: Array, second: Array, strike: Array, a: Array, b: Array, rho: Array, out: Masses, rows: Rows, edge: bool
) -> None:
    """The case of two factors: few nodes where they are enough, else the trapezoid rule, else panels."""
    line = boundary.lay(boundary.Plane(second / first, strike / first, a, b, rho))
    larger = np.maximum(first, second)
    side = np.where(first - second > strike, -1.0, 1.0)
    layers, error = np.zeros((6 if edge else 3, rows.size)), np.full(rows.size, np.inf)
    for rule, some in zip(hermite.RULES, hermite.sort(line), strict=True):
        found, good = hermite.integrate(line, some, side, rule, edge)
        layers[:, some[good]], error[some[good]] = found[:, good], hermite.ERROR
    left = np.flatnonzero(~np.isfinite(error))
    if left.size:
        rest = line.only(left)
        walk = trapezoid.plan(rest, side[left] < 0.0)
        weights = np.stack((-strike[left], first[left], -second[left])) / larger[left]
        layers[:, left], found_error = trapezoid.integrate(rest, walk, weights, edge)
        side[left], error[left] = walk.side, found_error + trapezoid.TAIL * np.abs(weights).sum(axis=0)
        left = left[~np.isfinite(found_error)]
    for start in range(0, left.size, PANEL_ROWS):
        some = left[start : start + PANEL_ROWS]
        found, loose = panels.integrate(line.only(some), b[some])
        layers[:, some] = found[: len(layers)]
        side[some], error[some] = 1.0, PANEL_ERROR + loose
    if edge:
        layers[3:] /= a * b * np.sqrt((1.0 - rho) * (1.0 + rho))
    out.side[rows], out.error[rows] = side, error
    _store(layers, out, rows)


def masses(legs: Legs, size: int, edge: bool) -> Masses:
    """The masses of one oriented block of `size` rows; without `edge` the edge fields are left unset."""
    columns = (legs.first, legs.second, legs.strike, legs.deviation_first, legs.deviation_second, legs.correlation)
    first, second, strike, a, b, rho = (np.broadcast_to(column, (size,)) for column in columns)
    out = Masses(*np.empty((len(Masses._fields), size)))
    wide = np.maximum(a, b) > WIDE
    exchange = (strike <= NO_STRIKE * np.minimum(first, second)) | wide & (np.minimum(a, b) > 0.5 * WIDE)
    if wide.any():
        a, b = np.where(exchange, a, np.minimum(a, WIDE)), np.where(exchange, b, np.minimum(b, WIDE))
    spread = a + b
    settled = ~exchange & (np.abs(np.log(first / (second + strike))) > SURE * spread + 1.5 * spread * spread)
    line = ~(exchange | settled) & (np.minimum(a, b) * np.sqrt(1.0 - np.abs(rho)) <= NO_DEVIATION)
    plane = ~(exchange | line | settled)

    def rows_of(chosen: NDArray[np.bool_]) -> tuple[tuple[Array, Array, Array, Array, Array, Array], Rows]:
        rows = np.flatnonzero(chosen)
        return (first[rows], second[rows], strike[rows], a[rows], b[rows], rho[rows]), rows

    if settled.any():
        out.side[settled] = np.where(first > second + strike, -1.0, 1.0)[settled]
        for field in out[1:]:
            field[settled] = 0.0
    if exchange.any():
        few, rows = rows_of(exchange)
        _exchange(*few, out, rows)
    if line.any():
        few, rows = rows_of(line)
        _line(*few, out, rows)
    if plane.any():
        few, rows = rows_of(plane)
        _plane(*few, out, rows, edge)
    return out
