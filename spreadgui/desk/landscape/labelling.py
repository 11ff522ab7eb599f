"""The texts of the labels and their boxes: what the place finder of labels.py needs, from a drawn surface."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pyqtgraph as pg
from numpy.typing import NDArray
from PySide6.QtCore import QPointF
from PySide6.QtGui import QFont, QFontMetricsF, QPolygonF

from spreadgui.desk.landscape.frame import Frame
from spreadgui.desk.landscape.isolines import Isoline
from spreadgui.desk.landscape.items import DOT, RIM, RING_DOTS_APART, Label
from spreadgui.desk.landscape.labels import Box, Line, Plot, place_labels, samples
from spreadgui.desk.landscape.levels import Levels
from spreadgui.desk.landscape.notation import notation_for
from spreadgui.valuation.surface import Surface

_PADDING = 8.0
_GAP = 4.0
_RIM = 2.0
# The straight boundary counts as so many points that labels had better not cover.
_BOUNDARY_POINTS = 80


def labels_of_lines(
    surface: Surface, levels: Levels, lines: Sequence[Isoline], obstacles: tuple[Box, ...], frame: Frame, font: QFont
) -> tuple[Label, ...]:
    """The values of the isolines, as many as there is room for beside the `obstacles`."""
    metrics = QFontMetricsF(font)
    texts = [text_of_line(line.level, levels) for line in lines]
    wanting = [
        Line(frame.pixels(line.points), metrics.horizontalAdvance(text) + _PADDING, metrics.height() + 1.0)
        for line, text in zip(lines, texts, strict=True)
    ]
    avoided = [frame.pixels(frame.unit(points).T) for points in (_dense(surface.boundary), *surface.rings)]
    plot = Plot(frame.plot.width(), frame.plot.height(), obstacles, np.concatenate(avoided))
    return tuple(Label(box, texts[index]) for index, box in place_labels(wanting, plot))


def text_of_line(level: float, levels: Levels) -> str:
    """An even line with the decimals of the step; one of the lines below the first step with those that it needs."""
    if abs(level) < 1e-6 * levels.step:
        return "0"
    if abs(level) < 0.99 * levels.step:
        return notation_for(levels.largest, levels.finest).trimmed(level)
    return notation_for(levels.largest, levels.step).text(level)


def label_of_point(text: str, place: QPointF, frame: Frame, font: QFont) -> Label:
    """The value beside the current point, where there is room: right, left, above, below."""
    bold = QFont(font)
    bold.setBold(True)
    metrics = QFontMetricsF(bold)
    point, plot = place - frame.plot.topLeft(), frame.plot
    width, height = metrics.horizontalAdvance(text) + _PADDING, metrics.height() + 1.0
    across, up = 0.5 * width + _RIM, 0.5 * height + _RIM
    aside, above = DOT + RIM + _GAP + 0.5 * width, DOT + RIM + _GAP + 0.5 * height
    boxes = [
        Box(point.x() + right, point.y() + down, width, height)
        for right, down in ((aside, 0.0), (-aside, 0.0), (0.0, -above), (0.0, above))
    ]
    inside = (box for box in boxes if across <= box.x <= plot.width() - across and up <= box.y <= plot.height() - up)
    return Label(next(inside, boxes[0]), text)


def dots_of_rings(surface: Surface, frame: Frame) -> QPolygonF:
    """Dots along the rings, in pixels of the view, as far as they lie in the plot."""
    if not surface.rings:
        return QPolygonF()
    dots = np.concatenate([samples(frame.pixels(frame.unit(ring).T), RING_DOTS_APART) for ring in surface.rings])
    inside = ((dots > 1.0) & (dots < (frame.plot.width() - 1.0, frame.plot.height() - 1.0))).all(axis=1)
    x, y = dots[inside].T
    polygon: QPolygonF = pg.functions.arrayToQPolygonF(x + frame.plot.left(), y + frame.plot.top())
    return polygon


def _dense(line: NDArray[np.float64]) -> NDArray[np.float64]:
    """A straight line from two ends as many points; none from none."""
    return np.linspace(line[:, 0], line[:, 1], _BOUNDARY_POINTS).T if line.shape[1] else line
