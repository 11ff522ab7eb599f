"""The Reading pane: one position by every method, side by side."""

from __future__ import annotations

from typing import TYPE_CHECKING

from PySide6.QtCore import QEvent, QRect, QSize, Qt, Signal, Slot
from PySide6.QtGui import QAction, QGuiApplication, QResizeEvent
from PySide6.QtWidgets import QFrame, QHBoxLayout, QScrollArea, QSizePolicy, QToolButton, QVBoxLayout, QWidget

from spreadgui.desk.look.pane import ElidedLabel, Figure, Pane
from spreadgui.desk.look.theme import Theme, set_rank, set_tone
from spreadgui.desk.panels.days_sheet import RANKS, days_sheet
from spreadgui.desk.panels.parts_sheet import parts_sheet
from spreadgui.desk.panels.reading_sheets import (
    CAUTION,
    Headline,
    closing_line,
    copied_reading,
    headlines,
    methods_sheet,
    quote_line,
    reason_text,
    sensitivities_sheet,
)
from spreadgui.desk.panels.sheet_view import PADDING, SheetView
from spreadgui.desk.panels.sheets import Sheet
from spreadgui.desk.panels.simulation_line import SimulationLine

if TYPE_CHECKING:  # its module loads the formulas, which must not hold up the first paint of the window
    from spreadgui.valuation.reading import Reading
    from spreadgui.valuation.simulated import SimulatedReading

WAITING = "Pricing: these numbers are out of date."
NO_POSITION = "Choose a position in the grid: its value by every method and its sensitivities stand here."
_GAP = 4
_MOST_ROW_SPARE = 7
_LEAST_SIZE = QSize(240, 60)


class ReadingPane(Pane):
    """The headline figures of a position, the table of methods, the table of sensitivities, and a caution.

    The figures and the caution stay in sight; the tables scroll where they do not fit. Where there is width for it, the
    sensitivities to the two legs stand side by side. A strip can be unfolded into a table of its days. Tab goes from
    table to table, the arrow keys from cell to cell and on from one table into the next; Ctrl+C copies the table that
    has the keyboard, its context menu the whole reading.
    """

    _reading: Reading | None = None  # here already, since Qt may tell of a new font while the frame is being made

    def __init__(self, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__("Reading", parent=parent)
        self._waiting = False
        self._headline = _HeadlineRow()
        self._methods, self._sensitivities, self._parts, self._days = (SheetView(theme) for _ in range(4))
        for view, name in ((self._parts, "Parts"), (self._days, "Days")):
            view.setAccessibleName(name)
        self.simulation = SimulationLine()
        self._quote = ElidedLabel()
        self._unfold = QToolButton()
        self._unfold.setCheckable(True)
        set_rank(self._quote, "small")
        for part in (self._parts, self.simulation, self._days, self._unfold, self._quote):
            part.hide()
        self._roll = _Roll()
        self._caution = ElidedLabel(CAUTION)
        set_rank(self._caution, "small")
        set_tone(self._caution, "muted")
        self._join()
        self._lay_out_body()
        self.show_nothing(NO_POSITION)

    def show_reading(self, reading: Reading) -> None:
        """Show a position; one that could not be priced says why."""
        if self._reading is None or (self._reading.row, self._reading.revision) != (reading.row, reading.revision):
            self.simulation.rest()  # what was simulated was another position, or other marks
        self._reading, self._waiting = reading, False
        self.set_subtitle(reading.subject)
        if reading.reason:
            self.show_empty(reason_text(reading))
            return
        self._headline.set_figures(headlines(reading))
        self._quote.set_text(quote_line(reading))
        self._quote.setVisible(reading.quote is not None)
        self._name_unfolding()
        self._fade(False)
        self.show_body()  # before the tables are fitted: only then is its size known
        self._fit()

    def show_simulation(self, found: SimulatedReading) -> None:
        """Show what a simulation came to, if it is still of this position under these marks."""
        reading = self._reading
        if reading is not None and (reading.row, reading.revision) == (found.row, found.revision):
            self.simulation.show_result(found, reading.unit)

    def show_waiting(self) -> None:
        """What is shown is out of date: its ink is muted, and the line at the bottom says so."""
        if self._reading is None:
            return
        self._waiting = True
        self._fade(True)

    def show_nothing(self, text: str) -> None:
        """Show no position but `text`, which says what would be here and how to get it."""
        self._reading, self._waiting = None, False
        self.set_subtitle("")
        self.show_empty(text)

    def set_theme(self, theme: Theme) -> None:
        """Take the colours and sizes of another theme, which is put on the program already."""
        for view in self._views():
            view.set_theme(theme)
        self._fit()

    def is_waiting(self) -> bool:
        """Whether what is shown is marked as out of date."""
        return self._waiting

    def copied(self) -> str:
        """The whole reading as tab-separated text, numbers plain; empty where there is none."""
        return "" if self._reading is None else copied_reading(self._reading)

    def copy_reading(self) -> None:
        """Put the whole reading on the clipboard."""
        QGuiApplication.clipboard().setText(self.copied())

    def changeEvent(self, event: QEvent) -> None:
        """Lay out anew for another font."""
        super().changeEvent(event)
        if event.type() == QEvent.Type.FontChange:
            self._fit()

    def unfolded(self) -> bool:
        """Whether the days of a strip are shown."""
        return self._unfold.isChecked() and not self._unfold.isHidden()

    def _views(self) -> tuple[SheetView, ...]:
        """The tables: two always, the third for blends, the last while a strip is unfolded."""
        return self._methods, self._sensitivities, self._parts, self._days

    def _view_of(self, sheet: Sheet) -> SheetView:
        views = {"Methods": self._methods, "Sensitivities": self._sensitivities, "Parts": self._parts}
        return views.get(sheet.name, self._days)

    @Slot()
    def _on_unfold(self) -> None:
        self._name_unfolding()
        self._fit()

    def _name_unfolding(self) -> None:
        days = 0 if self._reading is None else len(self._reading.days)
        self._unfold.setVisible(days > 0)
        self._unfold.setText(f"{'Fold' if self._unfold.isChecked() else 'Unfold'} {days} days")

    def _join(self) -> None:
        self._roll.resized.connect(self._fit)
        self._unfold.toggled.connect(self._on_unfold)
        self._unfold.setToolTip("The options of the strip, one row for each of its days.")
        for view in self._views():
            view.stepped_out.connect(self._step)
            view.walked.connect(self._keep_in_sight)
            view.setContextMenuPolicy(Qt.ContextMenuPolicy.ActionsContextMenu)
            for words, act in (("Copy table", view.copy), ("Copy whole reading", self.copy_reading)):
                action = QAction(words, view)
                action.triggered.connect(act)
                view.addAction(action)

    def _lay_out_body(self) -> None:
        tables = QWidget()
        tables.setObjectName("paneBody")
        column = QVBoxLayout(tables)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(_GAP)
        column.addWidget(self._methods)
        column.addWidget(self._sensitivities)
        column.addWidget(self._parts)
        column.addWidget(self.simulation)
        column.addWidget(self._unfold, 0, Qt.AlignmentFlag.AlignLeft)
        column.addWidget(self._days)
        column.addStretch(1)
        self._roll.setWidget(tables)
        body = QWidget()
        body.setObjectName("paneBody")
        whole = QVBoxLayout(body)
        whole.setContentsMargins(0, 0, 0, 0)
        whole.setSpacing(_GAP)
        whole.addWidget(self._headline)
        whole.addWidget(self._quote)
        whole.addWidget(self._roll, 1)
        whole.addWidget(self._caution)
        self.set_body(body)

    def _fade(self, faded: bool) -> None:
        self._headline.set_faded(faded)
        for view in self._views():
            view.set_faded(faded)
        told = CAUTION if self._reading is None else closing_line(self._reading)
        self._caution.set_text(WAITING if faded else told)

    @Slot()
    def _fit(self) -> None:
        """Lay the tables out for the room there is: legs side by side if they fit, rows apart if there is height."""
        reading = self._reading
        if reading is None or reading.reason:
            return
        methods = methods_sheet(reading, remarks=True)
        pairs = sensitivities_sheet(reading, paired=True)
        if self._sensitivities.needed_width(pairs) > self._room((methods, pairs)):
            pairs = sensitivities_sheet(reading, paired=False)
        if self._methods.needed_width(methods) > self._room((methods, pairs)):
            methods = methods_sheet(reading, remarks=False)
        parts = (parts_sheet(reading),) if reading.parts else ()
        self._show_sheets((methods, pairs, *parts, *self._day_sheets(reading, (methods, pairs, *parts))))

    def _day_sheets(self, reading: Reading, others: tuple[Sheet, ...]) -> tuple[Sheet, ...]:
        """The days of an unfolded strip, with as many of its columns as fit."""
        if not self.unfolded():
            return ()
        sheets = [days_sheet(reading, rank) for rank in RANKS]
        fitting = (days for days in sheets if self._days.needed_width(days) <= self._room((*others, days)))
        return (next(fitting, sheets[-1]),)

    def _show_sheets(self, sheets: tuple[Sheet, ...]) -> None:
        rows = sum(len(sheet.rows) for sheet in sheets)
        spare = max(self._roll.height() - self._height_of(sheets), 0) // rows
        shown = {sheet.name for sheet in sheets}
        self._parts.setVisible("Parts" in shown)
        self.simulation.setVisible("Parts" in shown)
        self._days.setVisible("Days" in shown)
        for sheet in sheets:
            self._view_of(sheet).show_sheet(sheet, self._room(sheets), min(spare, _MOST_ROW_SPARE))

    def _room(self, sheets: tuple[Sheet, ...]) -> int:
        """The width for the tables, less the scroll bar if these sheets need one."""
        bar = self._roll.verticalScrollBar().sizeHint().width()
        return self._roll.width() - (bar if self._height_of(sheets) > self._roll.height() else 0)

    def _height_of(self, sheets: tuple[Sheet, ...]) -> int:
        heights = [self._view_of(sheet).needed_height(sheet) for sheet in sheets]
        unfolding = 0 if self._unfold.isHidden() else self._unfold.sizeHint().height() + _GAP
        if any(sheet.name == "Parts" for sheet in sheets):
            unfolding += self.simulation.sizeHint().height() + _GAP
        return sum(heights) + _GAP * (len(sheets) - 1) + unfolding

    @Slot(int)
    def _step(self, step: int) -> None:
        """An arrow key went past the end of a table: on into the next one, or to the end of what there is to see."""
        source = self.sender()
        views = [view for view in self._views() if not view.isHidden()]
        place = next(number for number, view in enumerate(views) if view is source) + step
        if not 0 <= place < len(views):
            bar = self._roll.verticalScrollBar()
            bar.setValue(bar.maximum() if step > 0 else bar.minimum())
            return
        column, target = views[place - step].currentIndex().column(), views[place]
        sheet = target.sheet()
        target.setFocus(Qt.FocusReason.TabFocusReason)
        target.go_to(0 if step > 0 else len(sheet.rows) - 1, min(max(column, 0), len(sheet.headings) - 1))

    @Slot(QRect)
    def _keep_in_sight(self, cell: QRect) -> None:
        view, tables = self.sender(), self._roll.widget()
        if not isinstance(view, SheetView) or tables is None or not view.hasFocus():
            return
        if view.currentIndex().row() == 0:  # the headings with the first row
            cell = cell.adjusted(0, -view.horizontalHeader().height(), 0, 0)
        for corner in (cell.bottomRight(), cell.topLeft()):
            place = view.mapTo(tables, corner)
            self._roll.ensureVisible(place.x(), place.y(), 2, 2)


class _Roll(QScrollArea):
    """A scroll area without a frame that tells when its size changes."""

    resized = Signal()

    def __init__(self) -> None:
        super().__init__()
        self.setFrameShape(QFrame.Shape.NoFrame)
        self.setWidgetResizable(True)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setAccessibleName("Methods and sensitivities")
        self._size = QSize()

    def minimumSizeHint(self) -> QSize:
        """A few rows; the rest scrolls."""
        return _LEAST_SIZE

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        # Qt sends this for its inner viewport too, whenever a scroll bar comes or goes.
        if self.size() != self._size:
            self._size = self.size()
            self.resized.emit()


# Pixels between the figures.
_LOOSE, _TIGHT = 20, 8
# How the figures may be set, the first that fits: the first one large; all small; close together, in their short forms.
_MANNERS = ((True, False), (False, False), (False, True))


class _HeadlineRow(QWidget):
    """The headline figures side by side, the first one largest; smaller, and at last shortened, where room is short."""

    def __init__(self) -> None:
        super().__init__()
        self._lines: tuple[Headline, ...] = ()
        self._tone = ""
        self._large, self._first = Figure(""), Figure("", small=True)
        self._others = [Figure("", small=True) for _ in range(3)]
        self._row = row = QHBoxLayout(self)
        row.setContentsMargins(PADDING, 0, 0, 0)
        row.setSpacing(_LOOSE)
        for figure in self._figures():
            row.addWidget(figure, 0, Qt.AlignmentFlag.AlignBottom)
        row.addStretch(1)
        self.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Fixed)

    def set_figures(self, lines: tuple[Headline, ...]) -> None:
        """Show these four, current."""
        self._lines, self._tone = lines, ""
        self._write()

    def set_faded(self, faded: bool) -> None:
        """Write the figures in the muted ink, or in the plain one."""
        tone = "muted" if faded else ""
        if tone != self._tone:
            self._tone = tone
            self._write()

    def sizeHint(self) -> QSize:
        """As high as the large figure whether it shows or not, so that what is below stands still."""
        return QSize(super().sizeHint().width(), self._large.sizeHint().height())

    def minimumSizeHint(self) -> QSize:
        """No width of its own: it makes do."""
        return QSize(0, self.sizeHint().height())

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        if event.size().width() != event.oldSize().width():
            self._write()

    def _figures(self) -> list[Figure]:
        return [self._large, self._first, *self._others]

    def _write(self) -> None:
        """Set the figures in the first manner that fits the width, or else in the tightest."""
        if not self._lines:
            return
        for large, tight in _MANNERS:
            self._set(tight)
            if self._needed_width(large) <= self.width():
                break
        self._large.setVisible(large)
        self._first.setVisible(not large)
        self._settle()

    def _set(self, tight: bool) -> None:
        first, *others = self._lines
        self._row.setSpacing(_TIGHT if tight else _LOOSE)
        for figure, line in zip(self._figures(), (first, first, *others), strict=True):
            figure.set_caption(line.short_caption if tight else line.caption)
            figure.set_value(line.short if tight else line.text, tone=self._tone, tip=line.tip)

    def _settle(self) -> None:
        """Give every figure its new width now: left to the event loop, one picture would show them cut."""
        for figure in self._figures():
            inner = figure.layout()
            if inner is not None:
                inner.activate()
        self._row.activate()

    def _needed_width(self, large: bool) -> int:
        widths = [figure.sizeHint().width() for figure in (self._large if large else self._first, *self._others)]
        return sum(widths) + len(self._others) * self._row.spacing() + self._row.contentsMargins().left()
