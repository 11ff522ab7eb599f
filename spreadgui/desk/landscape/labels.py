"""Where the values of the isolines are written: spread out, inside the plot, clear of each other. No Qt here.

All lengths are pixels of the plot, from its upper left corner.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

_RIM = 3.0
_APART = 5.0
# A line is worth a label once it is this long, and a place every so many pixels is tried.
_LEAST_LENGTH = 26.0
_STRIDE = 11.0
# Where another line passes nearer, nobody could tell which of the two the label is for.
_TELL_APART = 5.0
# Shares of the plot's diagonal: how long a line is that gets a second label, and how far from the first that stands.
_THERE_AND_BACK = 1.15
_SECOND = 0.22


@dataclass(frozen=True)
class Box:
    """A rectangle around its centre."""

    x: float
    y: float
    width: float
    height: float

    def overlaps(self, other: Box, apart: float = 0.0) -> bool:
        """Whether the two come nearer than `apart` to each other."""
        return (
            abs(self.x - other.x) < 0.5 * (self.width + other.width) + apart
            and abs(self.y - other.y) < 0.5 * (self.height + other.height) + apart
        )


@dataclass(frozen=True)
class Line:
    """A line (n, 2) that wants a label of this size."""

    points: FloatArray
    width: float
    height: float


@dataclass(frozen=True)
class Plot:
    """The plot that the labels go into, what they must not cover, and the points (n, 2) they had better not."""

    width: float
    height: float
    obstacles: tuple[Box, ...]
    avoided: FloatArray


def place_labels(lines: Sequence[Line], plot: Plot) -> list[tuple[int, Box]]:
    """Boxes for as many lines as there is room for, each with the index of its line.

    The longest line chooses first. A place is good near the plot's falling diagonal, moved a little to the upper right
    of the middle so that the labels make a ladder across the lines, and bad on top of other lines. Once all have
    chosen, a line that goes there and back again is labelled a second time, far from the first.
    """
    if not lines:
        return []
    field = _Field(lines, plot)
    order = sorted(range(len(lines)), key=lambda index: -field.lengths[index])
    placed: list[tuple[int, Box]] = []
    for index in order:
        if field.lengths[index] >= _LEAST_LENGTH:
            placed += field.best(index, [box for _, box in placed])
    diagonal = float(np.hypot(plot.width, plot.height))
    for index, first in list(placed):
        if field.lengths[index] > _THERE_AND_BACK * diagonal:
            placed += field.best(index, [box for _, box in placed], first, _SECOND * diagonal)
    return placed


class _Field:
    """The lines as points every few pixels, and the search for places on them."""

    def __init__(self, lines: Sequence[Line], plot: Plot) -> None:
        self._lines, self._plot = lines, plot
        self.lengths = [_length(line.points) for line in lines]
        self._samples = [samples(line.points, _STRIDE) for line in lines]
        self._all = np.concatenate(self._samples)
        self._owner = np.repeat(np.arange(len(lines)), [len(places) for places in self._samples])
        self._crowd = np.concatenate([self._all, plot.avoided])

    def best(
        self, index: int, taken: Sequence[Box], first: Box | None = None, apart: float = 0.0
    ) -> list[tuple[int, Box]]:
        """The best place on a line, if there is any; with a `first` label there, one that is so far `apart` from it."""
        line, plot = self._lines[index], self._plot
        places = _free(self._samples[index], line, plot, (*plot.obstacles, *taken))
        places = _told_apart(places, self._all[self._owner != index])
        if first is not None:
            places = places[np.hypot(places[:, 0] - first.x, places[:, 1] - first.y) >= apart]
        if not places.size:
            return []
        x, y = places[np.argmin(_badness(places, line, plot, self._crowd))]
        return [(index, Box(float(x), float(y), line.width, line.height))]


def _length(points: FloatArray) -> float:
    return float(np.hypot(*np.diff(points, axis=0).T).sum())


def samples(points: FloatArray, stride: float) -> FloatArray:
    """Points about every `stride` along a line (n, 2), at least two of them."""
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
    count = max(2, int(along[-1] / stride))
    wanted = (np.arange(count) + 0.5) * along[-1] / count
    return np.column_stack([np.interp(wanted, along, points[:, axis]) for axis in (0, 1)])


def _free(places: FloatArray, line: Line, plot: Plot, taken: Sequence[Box]) -> FloatArray:
    """The places where the label lies inside the plot and clear of what is there."""
    x, y = places.T
    across, up = 0.5 * line.width, 0.5 * line.height
    free = (x >= across + _RIM) & (x <= plot.width - across - _RIM)
    free &= (y >= up + _RIM) & (y <= plot.height - up - _RIM)
    places = places[free]
    sizes = [(box.x, box.y, 0.5 * box.width + across + _APART, 0.5 * box.height + up + _APART) for box in taken]
    boxes = np.array(sizes).reshape(-1, 4)
    away = np.abs(places[:, np.newaxis, :] - boxes[:, :2]) >= boxes[:, 2:]
    kept: FloatArray = places[away.any(axis=2).all(axis=1)]
    return kept


def _told_apart(places: FloatArray, others: FloatArray) -> FloatArray:
    """The places that no other line comes too near to."""
    near = (np.abs(places[:, 0, np.newaxis] - others[:, 0]) < _TELL_APART) & (
        np.abs(places[:, 1, np.newaxis] - others[:, 1]) < _TELL_APART
    )
    kept: FloatArray = places[~near.any(axis=1)]
    return kept


def _badness(places: FloatArray, line: Line, plot: Plot, every: FloatArray) -> FloatArray:
    """Distance from the ladder as a share of the plot, plus a share for every point that the label would cover."""
    x, y = places.T
    off_ladder = np.abs(x / plot.width - y / plot.height - 0.24)
    covered = (np.abs(x[:, np.newaxis] - every[:, 0]) < 0.5 * line.width + 2.0) & (
        np.abs(y[:, np.newaxis] - every[:, 1]) < 0.5 * line.height + 2.0
    )
    # A label always covers a stretch of its own line, so the fewest covered points anywhere are not counted.
    crowd = covered.sum(axis=1)
    return np.asarray(off_ladder + 0.06 * (crowd - crowd.min()))
