"""The chart beside Marks: the forward curve above, the term structure of volatility below, one step a month."""

from __future__ import annotations

import numpy as np
import pyqtgraph as pg
from PySide6.QtGui import QPen
from PySide6.QtWidgets import QWidget

from spreadgui.book.records import Mark, Market
from spreadgui.desk.look.theme import Theme

_TICKS = 4
_LEAST_HEIGHT = 120


class CurveChart(pg.GraphicsLayoutWidget):  # type: ignore[misc]  # pyqtgraph has no stubs
    """Shows one market; `set_month` marks one delivery with an upright line."""

    def __init__(self, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setMinimumSize(200, _LEAST_HEIGHT)
        self.setAccessibleName("Forward curve and volatilities")
        self._market: Market | None = None
        self._month = ""
        self._plots = (self.addPlot(row=0, col=0), self.addPlot(row=1, col=0))
        self._lines = [pg.InfiniteLine(angle=90) for _ in self._plots]
        for plot, line in zip(self._plots, self._lines, strict=True):
            plot.setMenuEnabled(False)
            plot.setMouseEnabled(False, False)
            plot.hideButtons()
            plot.addItem(line)
            line.hide()
        self._plots[1].setXLink(self._plots[0])
        self.set_theme(theme)

    def set_theme(self, theme: Theme) -> None:
        """Take the colours and sizes of another theme."""
        self._theme = theme
        self.setBackground(theme.colour("panel"))
        for plot in self._plots:
            for side in ("left", "bottom"):
                axis = plot.getAxis(side)
                axis.setPen(theme.colour("edge"))
                axis.setTextPen(theme.colour("muted"))
                font = self.font()
                font.setPointSizeF(theme.small)
                axis.setTickFont(font)
        for line in self._lines:
            line.setPen(pg.mkPen(theme.colour("edge"), width=1))
        self._draw()

    def show_market(self, market: Market | None) -> None:
        """Draw the marks of `market`; None empties the chart."""
        self._market = market
        self._draw()

    def set_month(self, month: str) -> None:
        """The delivery to point at; one that is not marked, or none, points at nothing."""
        self._month = month
        self._point()

    def _draw(self) -> None:
        for plot, line in zip(self._plots, self._lines, strict=True):
            plot.clear()
            plot.addItem(line)
        market = self._market
        if market is None or not market.marks:
            self.setAccessibleDescription("No marks.")
            return
        marks = market.marks
        percent = 1.0 if market.dynamics == "normal" else 100.0
        self._step(self._plots[0], [mark.forward for mark in marks], "kelp")
        daily = [np.nan if mark.daily_volatility is None else percent * mark.daily_volatility for mark in marks]
        self._step(self._plots[1], [percent * mark.volatility for mark in marks], "kelp")
        if np.isfinite(daily).any():
            self._step(self._plots[1], daily, "amber", dashed=True)
        self._name(market, percent)
        self._point()

    def _step(self, plot: pg.PlotItem, values: list[float], token: str, *, dashed: bool = False) -> None:
        pen = QPen(self._theme.colour(token), 1.6)
        pen.setCosmetic(True)
        if dashed:
            pen.setDashPattern([4.0, 3.0])
        edges = np.arange(len(values) + 1, dtype=np.float64)
        plot.plot(edges, np.asarray(values), stepMode="center", pen=pen, connect="finite")

    def _name(self, market: Market, percent: float) -> None:
        marks = market.marks
        step = max(1, -(-len(marks) // _TICKS))
        ticks = [(place + 0.5, mark.delivery) for place, mark in enumerate(marks) if place % step == 0]
        for plot, title in zip(self._plots, self._titles(market, percent), strict=True):
            plot.getAxis("bottom").setTicks([ticks])
            plot.setTitle(title, color=self._theme.colour("muted").name(), size=f"{self._theme.small:.0f}pt")
            plot.setXRange(0.0, len(marks), padding=0.01)
        self.setAccessibleDescription(_spoken(marks, market))

    def _titles(self, market: Market, percent: float) -> tuple[str, str]:
        unit = "% a year" if percent == 100.0 else market.unit
        daily = any(mark.daily_volatility is not None for mark in market.marks)
        return f"Forward, {market.unit}", f"Volatility, {unit}{' (dashed: daily)' if daily else ''}"

    def _point(self) -> None:
        months = [mark.delivery for mark in self._market.marks] if self._market is not None else []
        for line in self._lines:
            line.setVisible(self._month in months)
            if self._month in months:
                line.setValue(months.index(self._month) + 0.5)


def _spoken(marks: tuple[Mark, ...], market: Market) -> str:
    low, high = min(marks, key=lambda mark: mark.forward), max(marks, key=lambda mark: mark.forward)
    return (
        f"{market.name}: forwards from {low.forward:g} ({low.delivery}) to {high.forward:g} ({high.delivery}) "
        f"{market.unit} over {len(marks)} months."
    )
