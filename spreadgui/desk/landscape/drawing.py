"""The surface itself as pyqtgraph draws it: the coloured image, the isolines and the boundary.

Everything is drawn in the unit square, which the view box shows once and for all: a new surface sets data and moves
nothing, and numbers of any size stay within the reach of Qt's transforms.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache

import numpy as np
import pyqtgraph as pg
from numpy.typing import NDArray
from PySide6.QtCore import QRectF, Qt
from PySide6.QtGui import QColor, QPainter, QPen

from spreadgui.desk.landscape.frame import Frame
from spreadgui.desk.landscape.isolines import Isoline, isolines, joined
from spreadgui.desk.landscape.levels import Levels
from spreadgui.desk.look.ramps import Bytes, diverging, sequential
from spreadgui.desk.look.theme import Theme
from spreadgui.desk.look.tokens import Palette, contrast
from spreadgui.valuation.surface import Surface

FloatArray = NDArray[np.float64]

FADED = 0.35
BOUNDARY_WIDTH = 2.0
BOUNDARY_DASHES = (4.0, 2.5)
_NONE = np.empty(0)


class SmoothImage(pg.ImageItem):  # type: ignore[misc]  # pyqtgraph has no stubs
    """An image whose colours run into each other between the nodes."""

    def paint(self, painter: QPainter, *args: object) -> None:
        """As the library paints it, interpolated."""
        painter.setRenderHint(QPainter.RenderHint.SmoothPixmapTransform, True)
        super().paint(painter, *args)


class SurfaceDrawing:
    """The items in the view box, filled again and again."""

    def __init__(self, theme: Theme) -> None:
        self.box = pg.ViewBox(enableMenu=False, enableMouse=False, defaultPadding=0.0)
        self.box.setRange(xRange=(0.0, 1.0), yRange=(0.0, 1.0), padding=0.0, disableAutoRange=True)
        self.box.setAcceptedMouseButtons(Qt.MouseButton.NoButton)
        self.image = SmoothImage(axisOrder="row-major", autoDownsample=False)
        self.dark_lines, self.light_lines, self.zero_line = (_curve("finite") for _ in range(3))
        self.boundary_ground, self.boundary = _curve("all"), _curve("all")
        self._theme = theme
        self._levels: Levels | None = None
        self._lines: list[Isoline] = []
        for item in self._items():
            self.box.addItem(item, ignoreBounds=True)
        self.set_theme(theme)

    @property
    def lines(self) -> Sequence[Isoline]:
        """The isolines, in the unit square."""
        return self._lines

    def set_surface(self, surface: Surface, levels: Levels, frame: Frame) -> None:
        """Draw another surface."""
        self._levels = levels
        rows, columns = surface.values.shape
        unit = np.linspace(0.0, 1.0, columns), np.linspace(0.0, 1.0, rows)
        self._lines = isolines(*unit, surface.values, levels.lines)
        self._set_image(surface.values, levels)
        self._set_lines()
        boundary = frame.unit(surface.boundary)
        for curve in (self.boundary_ground, self.boundary):
            curve.setData(*boundary)

    def set_theme(self, theme: Theme) -> None:
        """Recolour everything."""
        self._theme = theme
        palette = theme.palette
        self.dark_lines.setPen(_pen(palette.ink, 1.0, alpha=150))
        self.light_lines.setPen(_pen(palette.panel, 1.0, alpha=190))
        self.zero_line.setPen(_pen(palette.ink, 1.8))
        self.boundary_ground.setPen(_pen(palette.panel, 4.0, alpha=170))
        self.boundary.setPen(_pen(palette.amber, BOUNDARY_WIDTH, dashes=BOUNDARY_DASHES))
        if self._levels is not None:
            self.image.setLookupTable(ramp_of(palette, self._levels.signed))
            self._set_lines()

    def set_faded(self, faded: bool) -> None:
        """Fade the ink of a surface that no longer speaks of the book, or bring it back."""
        for item in self._items():
            item.setOpacity(FADED if faded else 1.0)

    def _items(self) -> tuple[pg.GraphicsObject, ...]:
        return (
            self.image, self.dark_lines, self.light_lines, self.zero_line,
            self.boundary_ground, self.boundary,
        )  # fmt: skip

    def _set_image(self, values: FloatArray, levels: Levels) -> None:
        low, high = levels.ramp
        rows, columns = values.shape
        self.image.setLookupTable(ramp_of(self._theme.palette, levels.signed), update=False)
        self.image.setImage((values - low) / (high - low), autoLevels=False, levels=(0.0, 1.0))
        # A node's colour belongs in the middle of its patch, so the image reaches half a step beyond the rectangle.
        step = 1.0 / (columns - 1), 1.0 / (rows - 1)
        self.image.setRect(QRectF(-0.5 * step[0], -0.5 * step[1], 1.0 + step[0], 1.0 + step[1]))

    def _set_lines(self) -> None:
        """Ink where the ramp is near the ground, ground where it is deep: each line in what is seen better."""
        assert self._levels is not None
        groups: dict[str, list[Isoline]] = {"dark": [], "light": [], "zero": []}
        for line in self._lines:
            groups[line_ink(self._theme.palette, self._levels, line.level)].append(line)
        for curve, group in ((self.dark_lines, "dark"), (self.light_lines, "light"), (self.zero_line, "zero")):
            curve.setData(*joined(groups[group]))


@cache
def ramp_of(palette: Palette, signed: bool) -> Bytes:
    """The colours from the low to the high end of the ramp; read-only, made once for each palette."""
    colours = diverging(palette) if signed else sequential(palette)
    colours.setflags(write=False)
    return colours


def line_ink(palette: Palette, levels: Levels, level: float) -> str:
    """How the isoline of `level` is drawn: "dark" (in ink), "light" (in the ground's colour), or as the "zero" line."""
    if levels.signed and abs(level) < 0.5 * levels.step:
        return "zero"
    dark = _ink_is_seen_better(palette, levels.signed)
    share = (level - levels.ramp[0]) / (levels.ramp[1] - levels.ramp[0])
    return "dark" if dark[round(share * (len(dark) - 1))] else "light"


@cache
def _ink_is_seen_better(palette: Palette, signed: bool) -> tuple[bool, ...]:
    """For every colour of the ramp whether ink stands out from it more than the ground's colour does."""
    grounds = ("#" + "".join(f"{part:02X}" for part in colour) for colour in ramp_of(palette, signed))
    return tuple(contrast(palette.ink, ground) >= contrast(palette.panel, ground) for ground in grounds)


def _curve(connect: str) -> pg.PlotCurveItem:
    curve = pg.PlotCurveItem(_NONE, _NONE, connect=connect, antialias=True)
    curve.setSegmentedLineMode("off")
    return curve


def _pen(colour: str, width: float, *, alpha: int = 255, dashes: tuple[float, ...] = ()) -> QPen:
    ink = QColor(colour)
    ink.setAlpha(alpha)
    pen = QPen(ink, width)
    pen.setCosmetic(True)
    pen.setJoinStyle(Qt.PenJoinStyle.RoundJoin)
    if dashes:
        pen.setDashPattern(dashes)
        pen.setCapStyle(Qt.PenCapStyle.FlatCap)
    return pen
