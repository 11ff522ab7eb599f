"""The Contours: the view that draws a surface flat, with its axes, labels, colour bar and crosshair."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import QEvent, QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import (
    QFocusEvent,
    QFont,
    QFontMetricsF,
    QImage,
    QKeyEvent,
    QMouseEvent,
    QPainter,
    QPaintEvent,
    QPixmap,
    QResizeEvent,
    QWheelEvent,
)
from PySide6.QtWidgets import QFrame, QWidget

from spreadgui.desk.landscape.drawing import FADED, SurfaceDrawing, ramp_of
from spreadgui.desk.landscape.frame import Frame, make_frame
from spreadgui.desk.landscape.items import AxesItem, Crosshair, Label, LabelsItem, RingsItem
from spreadgui.desk.landscape.labelling import dots_of_rings, label_of_point, labels_of_lines
from spreadgui.desk.landscape.levels import Levels, levels_of
from spreadgui.desk.landscape.words import Words
from spreadgui.desk.look.theme import Theme, tabular
from spreadgui.desk.look.tokens import Palette
from spreadgui.valuation.surface import Surface, quantity_of

_STEPS = {
    Qt.Key.Key_Left: (-1, 0),
    Qt.Key.Key_Right: (1, 0),
    Qt.Key.Key_Up: (0, 1),
    Qt.Key.Key_Down: (0, -1),
}
_BIG_STEP = 10
_NOTHING = 1e-10


@dataclass(frozen=True)
class Drawn:
    """What is drawn, and what follows from it in every size and colour."""

    surface: Surface
    levels: Levels
    words: Words


class Contours(pg.GraphicsView):  # type: ignore[misc]  # pyqtgraph has no stubs
    """One surface at a time; `crosshair_moved` is sent when the crosshair moves, comes or goes."""

    crosshair_moved = Signal()

    def __init__(self, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent, useOpenGL=False, background=None)
        self.setFrameShape(QFrame.Shape.NoFrame)
        # The pane's own menus and scrolling go on working over the plot.
        self.setContextMenuPolicy(Qt.ContextMenuPolicy.NoContextMenu)
        self.setRenderHint(QPainter.RenderHint.Antialiasing, True)
        self.setMinimumSize(200, 120)
        self.viewport().setMouseTracking(True)
        self.drawn: Drawn | None = None
        self.frame: Frame | None = None
        self.crosshair: tuple[float, float] | None = None
        self._by_mouse = False
        self._theme = theme
        self.drawing = SurfaceDrawing(theme)
        self._axes, self._rings, self._labels = AxesItem(theme), RingsItem(theme), LabelsItem(theme)
        self._cross: Crosshair | None = None
        # The scene as it was painted last: the crosshair moves over it without any of it being painted again.
        self._picture: QPixmap | None = None
        for item in (self.drawing.box, self._axes, self._rings, self._labels):
            self.scene().addItem(item)
        self.set_theme(theme)

    @property
    def words(self) -> Words | None:
        """The words for what is drawn."""
        return self.drawn.words if self.drawn is not None else None

    @property
    def labels(self) -> tuple[Label, ...]:
        """The isolines' labels, in pixels of the plot."""
        return self._labels.labels

    @property
    def point_label(self) -> Label | None:
        """The label at the current point."""
        return self._labels.point_label

    def draw(self, surface: Surface) -> Words:
        """Draw `surface`, which must have nodes, in place of the one before, and give the words for it.

        The crosshair stays where it is if that is still a place of the rectangle.
        """
        levels = levels_of(surface.values, quantity_of(surface.request.quantity).signed, _negligible(surface))
        drawn = self.drawn = Drawn(surface, levels, Words(surface, levels))
        frame = self._fit(drawn)
        self.drawing.set_surface(surface, levels, frame)
        self._place_labels(drawn, frame)
        self.set_faded(False)
        if self.crosshair is not None and not surface.covers(*self.crosshair):
            self.crosshair = None
        self._move_crosshair(self.crosshair)
        return drawn.words

    def set_theme(self, theme: Theme) -> None:
        """Recolour, and set the numbers in the theme's size."""
        self._theme = theme
        self.setBackground(theme.colour("panel"))
        self.drawing.set_theme(theme)
        font = tabular(QFont(self.font()))
        font.setPointSizeF(theme.small)
        self._axes.font = self._labels.font = font
        for item in (self._axes, self._rings, self._labels):
            item.set_theme(theme)
        self._refit()
        self._repaint()

    def set_faded(self, faded: bool) -> None:
        """Fade the ink of what is drawn, or bring it back."""
        self.drawing.set_faded(faded)
        for item in (self._rings, self._labels):
            item.setOpacity(FADED if faded else 1.0)
        self._repaint()

    def set_crosshair(self, long: float, short: float) -> None:
        """Put the crosshair there; a point outside the rectangle puts it away."""
        inside = self.drawn is not None and self.drawn.surface.covers(long, short)
        self._move_crosshair((long, short) if inside else None)

    def put_crosshair_away(self) -> None:
        """No crosshair."""
        self._move_crosshair(None)

    def sizeHint(self) -> QSize:
        """A comfortable plot."""
        return QSize(480, 360)

    def paintEvent(self, event: QPaintEvent) -> None:
        """The picture of the scene, made anew if anything but the crosshair has changed, and the crosshair over it."""
        ratio = self.devicePixelRatioF()
        if self._picture is None or self._picture.size() != self.viewport().size() * ratio:
            self._picture = self._paint_scene()
        painter = QPainter(self.viewport())
        painter.drawPixmap(0, 0, self._picture)
        if self._cross is not None and self.frame is not None:
            painter.setOpacity(self._labels.opacity())
            self._cross.paint(painter, self.frame, self._theme)
        painter.end()

    def resizeEvent(self, event: QResizeEvent | None) -> None:
        """Another frame for another size; the library also calls this with None while it is being made."""
        super().resizeEvent(event)
        if event is not None:
            self._refit()

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """The crosshair follows the mouse inside the plot."""
        event.accept()
        if self.frame is None:
            return
        if self.frame.plot.contains(event.position()):
            self._by_mouse = True
            self.set_crosshair(*self.frame.forwards(event.position()))
        elif self._by_mouse:
            self.put_crosshair_away()

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """A press gives the plot the keyboard, by its focus policy, and does nothing else: no dragging, no zooming."""
        event.accept()

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Nothing was pressed."""
        event.accept()

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        """Nothing is opened."""
        event.accept()

    def wheelEvent(self, event: QWheelEvent) -> None:  # noqa: N802 - Qt calls it by this name
        """The view never zooms; whatever the pane stands in may scroll."""
        event.ignore()

    def leaveEvent(self, event: QEvent) -> None:
        """The mouse takes its crosshair with it; one set by keyboard stays."""
        if self._by_mouse:
            self.put_crosshair_away()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Arrow keys step the crosshair from node to node, from the current point at first; Escape puts it away."""
        key = Qt.Key(event.key())
        if self.drawn is not None and key in _STEPS:
            count = _BIG_STEP if event.modifiers() & Qt.KeyboardModifier.ShiftModifier else 1
            self._step(self.drawn.surface, _STEPS[key], count)
        elif key == Qt.Key.Key_Escape and self.crosshair is not None:
            self.put_crosshair_away()
        else:
            event.ignore()

    def focusInEvent(self, event: QFocusEvent) -> None:
        """Mark the plot's edge."""
        super().focusInEvent(event)
        self._mark_focus(True)

    def focusOutEvent(self, event: QFocusEvent) -> None:
        """Unmark it."""
        super().focusOutEvent(event)
        self._mark_focus(False)

    def _mark_focus(self, focused: bool) -> None:
        self._axes.focused = focused
        self._repaint()

    def _step(self, surface: Surface, direction: tuple[int, int], count: int) -> None:
        self._by_mouse = False
        start = self.crosshair or surface.current[:2]
        place = (
            float(np.clip(at + way * count * (nodes[1] - nodes[0]), nodes[0], nodes[-1]))
            for at, way, nodes in zip(start, direction, (surface.long, surface.short), strict=True)
        )
        self.set_crosshair(*place)

    def _move_crosshair(self, place: tuple[float, float] | None) -> None:
        self.crosshair, self._cross = place, None
        if place is not None and self.frame is not None and self.drawn is not None:
            low, high = self.drawn.levels.used
            value = self.drawn.surface.value_at(*place)
            share = (value - low) / (high - low) if high > low else 0.0
            self._cross = Crosshair(self.frame.place(*place), share)
        self.viewport().update()
        self.crosshair_moved.emit()

    def _refit(self) -> None:
        if self.drawn is not None:
            self._place_labels(self.drawn, self._fit(self.drawn))
            self._move_crosshair(self.crosshair)
            self._repaint()

    def _repaint(self) -> None:
        self._picture = None
        self.viewport().update()

    def _paint_scene(self) -> QPixmap:
        size, ratio = self.viewport().size(), self.devicePixelRatioF()
        picture = QPixmap(size * ratio)
        picture.setDevicePixelRatio(ratio)
        picture.fill(self._theme.colour("panel"))
        painter = QPainter(picture)
        self.render(painter, QRectF(QPointF(), size.toSizeF()), self.viewport().rect())
        painter.end()
        return picture

    def _fit(self, drawn: Drawn) -> Frame:
        """The frame for this surface in this size, with the colour bar in it."""
        size, metrics = self.viewport().size(), QFontMetricsF(self._axes.font)
        frame = self.frame = make_frame(drawn.surface, drawn.levels, size.width(), size.height(), metrics)
        self.drawing.box.setGeometry(frame.plot)
        self._axes.bar = bar_image(self._theme.palette, drawn.levels)
        for item in (self._axes, self._rings, self._labels):
            item.set_frame(frame, QRectF(self.viewport().rect()))
        return frame

    def _place_labels(self, drawn: Drawn, frame: Frame) -> None:
        surface, font = drawn.surface, self._labels.font
        self._rings.dots = dots_of_rings(surface, frame)
        self._labels.point = frame.place(*surface.current[:2])
        label = label_of_point(drawn.words.current_value(), self._labels.point, frame, font)
        self._labels.point_label = label
        obstacles = (self._labels.dot_box(), label.box)
        self._labels.labels = labels_of_lines(surface, drawn.levels, self.drawing.lines, obstacles, frame, font)
        self._labels.update()


def _negligible(surface: Surface) -> float:
    """What is nothing to a desk: so small a share of the forward in money, of one unit in a delta."""
    scale = 1.0 if surface.request.quantity.startswith("delta") else float(np.abs(surface.long).max())
    return _NOTHING * scale


def bar_image(palette: Palette, levels: Levels) -> QImage:
    """The used part of the ramp, one pixel wide, its high end on top."""
    colours = ramp_of(palette, levels.signed)
    low, high = ((end - levels.ramp[0]) / (levels.ramp[1] - levels.ramp[0]) for end in levels.used)
    rows = np.rint(np.linspace(high, low, len(colours)) * (len(colours) - 1)).astype(np.intp)
    # Rows of four bytes: an image of three would have to be padded to a multiple of four.
    pixels = np.column_stack([colours[rows], np.full(len(rows), 255, dtype=np.uint8)])
    return QImage(pixels.tobytes(), 1, len(rows), 4, QImage.Format.Format_RGBX8888).copy()
