"""The plot's place in its view, its ticks, and the mapping between forwards, the unit square and pixels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF, QRectF
from PySide6.QtGui import QFontMetricsF

from spreadgui.desk.landscape.levels import Levels, multiples, round_step
from spreadgui.desk.landscape.notation import Notation, notation_for
from spreadgui.valuation.surface import Surface

FloatArray = NDArray[np.float64]

TICK = 4.0
TICK_GAP = 4.0
BAR_WIDTH = 12.0
_BAR_GAP = 14.0
_BAR_TICKS_APART = 30.0
_LEAST_TICKS = 2


@dataclass(frozen=True)
class Tick:
    """A number at a place of its axis, as a share of the axis' length from its low end."""

    share: float
    text: str


@dataclass(frozen=True)
class Axis:
    """The ticks of an axis and the notation that their numbers are written in."""

    ticks: tuple[Tick, ...]
    notation: Notation

    def widest(self, metrics: QFontMetricsF) -> float:
        """Pixels of the widest number."""
        return max((metrics.horizontalAdvance(tick.text) for tick in self.ticks), default=0.0)


@dataclass(frozen=True)
class Frame:
    """Where everything stands, in pixels of the view: the plot, its axes and the colour bar (empty if flat)."""

    plot: QRectF
    bar: QRectF
    long: Axis
    short: Axis
    values: Axis
    extent: tuple[float, float, float, float]

    def unit(self, points: FloatArray) -> FloatArray:
        """Points (2, n) of forwards in the unit square that the plot shows; far outside they come to lie nearer by."""
        low_long, high_long, low_short, high_short = self.extent
        with np.errstate(over="ignore"):
            long = (points[0] - low_long) / (high_long - low_long)
            short = (points[1] - low_short) / (high_short - low_short)
        return np.asarray(np.clip(np.array([long, short]), -1.0, 2.0))

    def pixels(self, unit: FloatArray) -> FloatArray:
        """Points (n, 2) of the unit square in pixels from the plot's upper left corner."""
        return np.asarray(unit * (self.plot.width(), -self.plot.height()) + (0.0, self.plot.height()))

    def place(self, long: float, short: float) -> QPointF:
        """Where a point of forwards stands in the view."""
        across, up = self.unit(np.array([[long], [short]]))[:, 0]
        return QPointF(
            self.plot.left() + across * self.plot.width(),
            self.plot.bottom() - up * self.plot.height(),
        )

    def forwards(self, place: QPointF) -> tuple[float, float]:
        """The forwards at a place of the plot, kept inside the rectangle."""
        low_long, high_long, low_short, high_short = self.extent
        across = min(max((place.x() - self.plot.left()) / self.plot.width(), 0.0), 1.0)
        up = min(max((self.plot.bottom() - place.y()) / self.plot.height(), 0.0), 1.0)
        return low_long + across * (high_long - low_long), low_short + up * (high_short - low_short)


def make_frame(surface: Surface, levels: Levels, width: float, height: float, metrics: QFontMetricsF) -> Frame:
    """The frame of a drawn surface in a view of that size, its numbers set in a font of these metrics."""
    line = metrics.height()
    top, bottom = 0.5 * line + 1.0, TICK + TICK_GAP + line
    tall = max(height - top - bottom, 1.0)
    short = _axis(float(surface.short[0]), float(surface.short[-1]), tall / (3.2 * line))
    values = _value_axis(levels, tall / max(_BAR_TICKS_APART, 2.2 * line))
    left = short.widest(metrics) + TICK + TICK_GAP
    right = 0.0 if levels.flat else _BAR_GAP + BAR_WIDTH + TICK + TICK_GAP + values.widest(metrics)
    wide = max(width - left - max(right, 12.0), 1.0)
    long = _long_axis(surface, wide, metrics)
    plot = QRectF(round(left), round(top), round(wide), round(tall))
    bar = QRectF() if levels.flat else QRectF(plot.right() + _BAR_GAP, plot.top(), BAR_WIDTH, plot.height())
    extent = tuple(float(end) for axis in (surface.long, surface.short) for end in (axis[0], axis[-1]))
    return Frame(plot, bar, long, short, values, (extent[0], extent[1], extent[2], extent[3]))


def _long_axis(surface: Surface, wide: float, metrics: QFontMetricsF) -> Axis:
    """As many numbers side by side as stand apart, each at its own width."""
    low, high = float(surface.long[0]), float(surface.long[-1])
    axis = _axis(low, high, wide / (6.0 * metrics.averageCharWidth()))
    while len(axis.ticks) > _LEAST_TICKS:
        apart = (axis.ticks[1].share - axis.ticks[0].share) * wide
        if apart > axis.widest(metrics) + 2.5 * metrics.averageCharWidth():
            break
        axis = _axis(low, high, len(axis.ticks) - 2.0)
    return axis


def _axis(low: float, high: float, most: float) -> Axis:
    return _axis_of(low, high, round_step(high - low, max(int(most), _LEAST_TICKS)))


def _value_axis(levels: Levels, most: float) -> Axis:
    if levels.flat:
        return Axis((), notation_for(levels.largest, levels.largest / 100.0))
    low, high = levels.used
    return _axis_of(low, high, max(levels.step, round_step(high - low, max(int(most), _LEAST_TICKS))))


def _axis_of(low: float, high: float, step: float) -> Axis:
    notation = notation_for(max(abs(low), abs(high)), step)
    places = (float(value) for value in multiples(low, high, step))
    return Axis(tuple(Tick((place - low) / (high - low), notation.text(place)) for place in places), notation)
