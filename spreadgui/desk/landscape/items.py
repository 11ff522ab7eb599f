"""What is painted over the surface in pixels: the axes and the colour bar, the labels, the crosshair."""

from __future__ import annotations

from dataclasses import dataclass

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QFont, QFontMetricsF, QImage, QPainter, QPen, QPolygonF
from PySide6.QtWidgets import QGraphicsItem, QStyleOptionGraphicsItem, QWidget

from spreadgui.desk.landscape.frame import TICK, TICK_GAP, Axis, Frame
from spreadgui.desk.landscape.labels import Box
from spreadgui.desk.look.theme import Theme

DOT = 4.5
RIM = 2.0
RING_DOT = 1.7
RING_DOTS_APART = 4.2
_CORNER = 3.0


class Painted(QGraphicsItem):
    """An item as large as its view, in the view's pixels."""

    def __init__(self, theme: Theme) -> None:
        super().__init__()
        self.theme = theme
        self.frame: Frame | None = None
        self._bounds = QRectF()
        self.setAcceptedMouseButtons(Qt.MouseButton.NoButton)

    def boundingRect(self) -> QRectF:  # noqa: N802 - Qt calls it by this name
        """The whole view."""
        return self._bounds

    def set_frame(self, frame: Frame | None, bounds: QRectF) -> None:
        """Stand in this frame, in a view with these bounds."""
        self.prepareGeometryChange()
        self.frame, self._bounds = frame, bounds
        self.update()

    def set_theme(self, theme: Theme) -> None:
        """Paint in other colours from now on."""
        self.theme = theme
        self.update()


class AxesItem(Painted):
    """The plot's edge, the numbers along it, and the colour bar with its own."""

    def __init__(self, theme: Theme) -> None:
        super().__init__(theme)
        self.font = QFont()
        self.bar = QImage()
        self.focused = False

    def paint(self, painter: QPainter, _option: QStyleOptionGraphicsItem, _widget: QWidget | None = None) -> None:
        """Edge, ticks, numbers, bar."""
        if self.frame is None:
            return
        painter.setFont(self.font)
        self._edge(painter, self.frame.plot, accent=self.focused)
        self._along_bottom(painter, self.frame)
        self._along_side(painter, self.frame.plot, self.frame.short, left=True)
        if not self.frame.bar.isEmpty():
            painter.setRenderHint(QPainter.RenderHint.SmoothPixmapTransform, True)
            painter.drawImage(self.frame.bar, self.bar)
            self._edge(painter, self.frame.bar)
            self._along_side(painter, self.frame.bar, self.frame.values, left=False)

    def _edge(self, painter: QPainter, rect: QRectF, *, accent: bool = False) -> None:
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
        painter.setPen(QPen(self.theme.colour("kelp" if accent else "edge"), 2 if accent else 1))
        painter.drawRect(rect)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)

    def _along_bottom(self, painter: QPainter, frame: Frame) -> None:
        line, plot = painter.fontMetrics().height(), frame.plot
        widest = frame.long.widest(_metrics(painter)) + 8.0
        for tick in frame.long.ticks:
            x = plot.left() + tick.share * plot.width()
            self._tick(painter, QPointF(x, plot.bottom()), QPointF(x, plot.bottom() + TICK))
            room = QRectF(x - 0.5 * widest, plot.bottom() + TICK + TICK_GAP - 1.0, widest, line)
            self._number(painter, room, tick.text, Qt.AlignmentFlag.AlignHCenter)

    def _along_side(self, painter: QPainter, rect: QRectF, axis: Axis, *, left: bool) -> None:
        line = painter.fontMetrics().height()
        widest = axis.widest(_metrics(painter)) + 1.0
        for tick in axis.ticks:
            y = rect.bottom() - tick.share * rect.height()
            near = rect.left() if left else rect.right()
            far = near - TICK if left else near + TICK
            self._tick(painter, QPointF(near, y), QPointF(far, y))
            start = far - TICK_GAP - widest if left else far + TICK_GAP
            # Numbers end at one edge on either side, so that the units stand below each other.
            self._number(painter, QRectF(start, y - 0.5 * line, widest, line), tick.text, Qt.AlignmentFlag.AlignRight)

    def _tick(self, painter: QPainter, start: QPointF, end: QPointF) -> None:
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
        painter.setPen(QPen(self.theme.colour("edge"), 1))
        painter.drawLine(start, end)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)

    def _number(self, painter: QPainter, room: QRectF, text: str, side: Qt.AlignmentFlag) -> None:
        painter.setPen(self.theme.colour("muted"))
        painter.drawText(room, int(side | Qt.AlignmentFlag.AlignVCenter | Qt.TextFlag.TextDontClip), text)


class RingsItem(Painted):
    """The rings as dots, each in a halo of the ground's colour so that it is seen on every part of the ramp.

    Dots in pixels are an order of magnitude cheaper than a dotted pen along a curve.
    """

    def __init__(self, theme: Theme) -> None:
        super().__init__(theme)
        self.dots = QPolygonF()

    def paint(self, painter: QPainter, _option: QStyleOptionGraphicsItem, _widget: QWidget | None = None) -> None:
        """Halos first, so that no halo covers a dot."""
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
        ground = self.theme.colour("panel")
        ground.setAlpha(130)
        for colour, size in ((ground, 3.3), (self.theme.colour("ink"), RING_DOT)):
            # At this size a square is as good a dot as a round one, and four times as quick.
            painter.setPen(QPen(colour, size, c=Qt.PenCapStyle.SquareCap))
            painter.drawPoints(self.dots)


@dataclass(frozen=True)
class Label:
    """A text and the box, in pixels of the plot, that it stands in."""

    box: Box
    text: str


class LabelsItem(Painted):
    """The values of the isolines, the current point and its value."""

    def __init__(self, theme: Theme) -> None:
        super().__init__(theme)
        self.font = QFont()
        self.labels: tuple[Label, ...] = ()
        self.point = QPointF()
        self.point_label: Label | None = None

    def dot_box(self) -> Box:
        """The dot with its rim, in pixels of the plot."""
        corner = self.frame.plot.topLeft() if self.frame is not None else QPointF()
        size = 2.0 * (DOT + RIM)
        return Box(self.point.x() - corner.x(), self.point.y() - corner.y(), size, size)

    def paint(self, painter: QPainter, _option: QStyleOptionGraphicsItem, _widget: QWidget | None = None) -> None:
        """Labels first, the point on top."""
        if self.frame is None or self.point_label is None:
            return
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
        painter.setFont(self.font)
        for label in self.labels:
            self._label(painter, self.frame.plot, label, "ink", QPen(Qt.PenStyle.NoPen))
        bold = QFont(self.font)
        bold.setBold(True)
        painter.setFont(bold)
        self._label(painter, self.frame.plot, self.point_label, "kelp", QPen(self.theme.colour("kelp"), 1))
        painter.setPen(QPen(self.theme.colour("panel"), RIM))
        painter.setBrush(self.theme.colour("kelp"))
        painter.drawEllipse(self.point, DOT + 0.5 * RIM, DOT + 0.5 * RIM)

    def _label(self, painter: QPainter, plot: QRectF, label: Label, ink: str, edge: QPen) -> None:
        room = rect_of(label.box).translated(plot.topLeft())
        painter.setPen(edge)
        painter.setBrush(self.theme.colour("panel"))
        painter.drawRoundedRect(room, _CORNER, _CORNER)
        painter.setPen(self.theme.colour(ink))
        painter.drawText(room, int(Qt.AlignmentFlag.AlignCenter | Qt.TextFlag.TextDontClip), label.text)


@dataclass(frozen=True)
class Crosshair:
    """Two hairs through a place of the view, and a pointer at a share of the colour bar."""

    place: QPointF
    share: float

    def paint(self, painter: QPainter, frame: Frame, theme: Theme) -> None:
        """Ink between two ground-coloured lines, so that the hairs are seen on every part of the ramp."""
        plot = frame.plot
        x, y = round(self.place.x()) + 0.5, round(self.place.y()) + 0.5
        ground, ink = theme.colour("panel"), theme.colour("ink")
        ground.setAlpha(150)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
        for colour, width in ((ground, 3.0), (ink, 1.0)):
            painter.setPen(QPen(colour, width))
            painter.drawLine(QPointF(plot.left() + 1, y), QPointF(plot.right(), y))
            painter.drawLine(QPointF(x, plot.top() + 1), QPointF(x, plot.bottom()))
        if not frame.bar.isEmpty():
            self._point(painter, frame.bar, ink)

    def _point(self, painter: QPainter, bar: QRectF, ink: QColor) -> None:
        y = bar.bottom() - self.share * bar.height()
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(ink)
        tip = bar.left() - 1.0
        painter.drawPolygon(QPolygonF([QPointF(tip, y), QPointF(tip - 7.0, y - 4.0), QPointF(tip - 7.0, y + 4.0)]))


def rect_of(box: Box) -> QRectF:
    """The box as Qt's rectangle."""
    return QRectF(box.x - 0.5 * box.width, box.y - 0.5 * box.height, box.width, box.height)


def _metrics(painter: QPainter) -> QFontMetricsF:
    return QFontMetricsF(painter.font())
