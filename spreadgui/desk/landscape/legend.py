"""The legend under the plot: a small drawing of each mark beside its meaning, on as many lines as it takes."""

from __future__ import annotations

from collections.abc import Iterator

from PySide6.QtCore import QPointF, QSize, Qt
from PySide6.QtGui import QFont, QFontMetrics, QPainter, QPaintEvent, QPen, QPolygonF
from PySide6.QtWidgets import QSizePolicy, QWidget

from spreadgui.desk.landscape.drawing import BOUNDARY_DASHES, BOUNDARY_WIDTH
from spreadgui.desk.landscape.items import DOT, RING_DOT, RING_DOTS_APART
from spreadgui.desk.landscape.words import Entry
from spreadgui.desk.look.theme import Theme

_SWATCH = 18
_SWATCH_GAP = 5
_ENTRY_GAP = 14


class Legend(QWidget):
    """Entries side by side, broken between entries where the width ends."""

    def __init__(self, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._theme = theme
        self._entries: tuple[Entry, ...] = ()
        policy = QSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Minimum)
        policy.setHeightForWidth(True)
        self.setSizePolicy(policy)
        self.set_theme(theme)

    def set_entries(self, entries: tuple[Entry, ...]) -> None:
        """Explain these marks."""
        self._entries = entries
        self.setAccessibleName("Legend: " + "; ".join(entry.spoken() for entry in entries))
        self.updateGeometry()
        self.update()

    def set_theme(self, theme: Theme) -> None:
        """Paint in other colours and sizes."""
        self._theme = theme
        self._font = QFont(self.font())
        self._font.setPointSizeF(theme.small)
        self._metrics = QFontMetrics(self._font)
        self.updateGeometry()
        self.update()

    def hasHeightForWidth(self) -> bool:  # noqa: N802 - Qt calls it by this name
        """A narrow legend is a tall one."""
        return True

    def heightForWidth(self, width: int) -> int:  # noqa: N802 - Qt calls it by this name
        """The lines that the entries take in this width."""
        lines = max((line for line, _, _ in self._places(width)), default=0) + 1
        return lines * self._line_height()

    def sizeHint(self) -> QSize:
        """One line with everything on it."""
        return QSize(sum(self._width(entry) + _ENTRY_GAP for entry in self._entries), self._line_height())

    def minimumSizeHint(self) -> QSize:
        """The widest entry."""
        return QSize(max((self._width(entry) for entry in self._entries), default=0), self._line_height())

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Swatch and words of every entry."""
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
        painter.setFont(self._font)
        tall = self._line_height()
        for line, x, entry in self._places(self.width()):
            if entry.mark:
                self._swatch(painter, entry.mark, QPointF(x, (line + 0.5) * tall))
                x += _SWATCH + _SWATCH_GAP
            painter.setPen(self._theme.colour("muted"))
            room = self.width() - x
            words = self._metrics.elidedText(entry.words, Qt.TextElideMode.ElideRight, room)
            painter.drawText(x, line * tall, room, tall, int(Qt.AlignmentFlag.AlignVCenter), words)
        painter.end()

    def _places(self, width: int) -> Iterator[tuple[int, int, Entry]]:
        """Line and left edge of every entry."""
        line, x = 0, 0
        for entry in self._entries:
            if x and x + self._width(entry) > width:
                line, x = line + 1, 0
            yield line, x, entry
            x += self._width(entry) + _ENTRY_GAP

    def _width(self, entry: Entry) -> int:
        swatch = _SWATCH + _SWATCH_GAP if entry.mark else 0
        return swatch + self._metrics.horizontalAdvance(entry.words) + 1

    def _line_height(self) -> int:
        return self._metrics.height() + 2

    def _swatch(self, painter: QPainter, mark: str, start: QPointF) -> None:
        end = QPointF(start.x() + _SWATCH, start.y())
        if mark == "point":
            painter.setPen(Qt.PenStyle.NoPen)
            painter.setBrush(self._theme.colour("kelp"))
            painter.drawEllipse(QPointF(0.5 * (start.x() + end.x()), start.y()), DOT, DOT)
            return
        if mark == "dotted":
            painter.setPen(QPen(self._theme.colour("ink"), RING_DOT, c=Qt.PenCapStyle.RoundCap))
            count = int(_SWATCH / RING_DOTS_APART) + 1
            painter.drawPoints(
                QPolygonF([start + QPointF(RING_DOTS_APART * (dot + 0.25), 0.0) for dot in range(count)])
            )
            return
        pen = QPen(self._theme.colour("amber"), BOUNDARY_WIDTH, c=Qt.PenCapStyle.FlatCap)
        pen.setDashPattern(BOUNDARY_DASHES)
        painter.setPen(pen)
        painter.drawLine(start, end)
