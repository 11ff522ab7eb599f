"""Isolines of a surface, by contourpy. No Qt here."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import reduce

import numpy as np
from contourpy import LineType, contour_generator
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

# Where the surface varies by less than this share of its range from node to node, an isoline would trace rounding.
_LEVEL_GROUND = 1e-5


@dataclass(frozen=True)
class Isoline:
    """One connected line (n, 2) of points (long, short) on which the surface has the value `level`."""

    level: float
    points: FloatArray


def isolines(long: FloatArray, short: FloatArray, values: FloatArray, levels: FloatArray) -> list[Isoline]:
    """The lines of every level, in order; `values[i, j]` stands at (`long[j]`, `short[i]`)."""
    if not levels.size:
        return []
    found = contour_generator(long, short, values, name="serial", line_type=LineType.Separate)
    slope = _relief(values) > _LEVEL_GROUND * float(values.max() - values.min())
    return [
        Isoline(float(level), piece)
        for level in levels
        for points in found.lines(float(level))
        for piece in _on_slopes(np.asarray(points), long, short, slope)
    ]


def joined(lines: Sequence[Isoline]) -> tuple[FloatArray, FloatArray]:
    """All lines as one pair of columns, a NaN after each: what one curve item draws in one go."""
    if not lines:
        return np.empty(0), np.empty(0)
    gap = np.full((1, 2), np.nan)
    points = np.concatenate([part for line in lines for part in (line.points, gap)])
    return points[:, 0].copy(), points[:, 1].copy()


def _relief(values: FloatArray) -> FloatArray:
    """How far the values differ within one node of each node."""
    return _spread(values, np.maximum) - _spread(values, np.minimum)


def _spread(values: FloatArray, pick: np.ufunc) -> FloatArray:
    """The picked one of each node and its eight neighbours, first along the rows, then along the columns."""
    for axis in (0, 1):
        padded = np.pad(values, [(1, 1) if axis == side else (0, 0) for side in (0, 1)], mode="edge")
        views = (padded.take(np.arange(start, start + values.shape[axis]), axis=axis) for start in range(3))
        values = reduce(pick, views)
    return values


def _on_slopes(points: FloatArray, long: FloatArray, short: FloatArray, slope: NDArray[np.bool_]) -> list[FloatArray]:
    """The pieces of a line that do not cross level ground."""
    column = np.rint((points[:, 0] - long[0]) / (long[-1] - long[0]) * (len(long) - 1)).astype(np.intp)
    row = np.rint((points[:, 1] - short[0]) / (short[-1] - short[0]) * (len(short) - 1)).astype(np.intp)
    kept = slope[row, column]
    if kept.all():
        return [points]
    cuts = np.flatnonzero(np.diff(kept)) + 1
    runs = zip(np.split(points, cuts), np.split(kept, cuts), strict=True)
    return [run for run, is_kept in runs if is_kept[0] and len(run) > 1]
