"""The Marks pane: one market's forwards and volatilities by delivery, editable, with their chart."""

from __future__ import annotations

from PySide6.QtCore import QModelIndex, Qt, Signal, Slot
from PySide6.QtGui import QAction, QGuiApplication, QKeyEvent, QKeySequence
from PySide6.QtWidgets import QHBoxLayout, QLineEdit, QSplitter, QToolButton, QVBoxLayout, QWidget

from spreadgui.book.entries import EntryError
from spreadgui.desk.grid.view import PlainGridView
from spreadgui.desk.look.pane import Pane
from spreadgui.desk.look.theme import Theme, set_refused
from spreadgui.desk.markets.curve import CurveChart
from spreadgui.desk.markets.market_bar import MarketBar
from spreadgui.desk.markets.marks_block import block_text, texts_of_block
from spreadgui.desk.markets.marks_model import MarksModel
from spreadgui.desk.workbench import Workbench

EMPTY = "The book has no market yet: its marks stand here."
_WIDTHS = {"period": 118, "forward": 78, "volatility": 72, "daily_volatility": 104, "positions": 66, "note": 190}


class MarksPane(Pane):
    """Marks in their frame. `told(sentence)` says what a person should know."""

    told = Signal(str)

    def __init__(self, workbench: Workbench, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__("Marks", parent=parent)
        self._workbench = workbench
        self.bar = MarketBar(workbench)
        self.model = MarksModel(workbench, self)
        self.view = MarksView(self.model, theme)
        self.chart = CurveChart(theme)
        self.month = QLineEdit()
        self._lay_out_body()
        self._join_parts()
        self._show_market()

    def set_theme(self, theme: Theme) -> None:
        """Take the colours and sizes of another theme."""
        self.view.set_theme(theme)
        self.chart.set_theme(theme)

    def choose(self, name: str) -> None:
        """Show the market of that name; nothing happens where there is none."""
        place = self.bar.markets.findText(name)
        if place >= 0:
            self.bar.markets.setCurrentIndex(place)
            self._on_chosen(place)

    # --- acts

    def add_delivery(self) -> None:
        """Mark the month that is written in the field, as a copy of its neighbour."""
        try:
            row = self.model.add_delivery(self.month.text())
        except EntryError as error:
            set_refused(self.month, True)
            self.told.emit(f"Not added: {error}")
            return
        set_refused(self.month, False)
        self.month.clear()
        self.view.setCurrentIndex(self.model.index(row, 1))
        self.view.setFocus()

    def remove_rows(self) -> None:
        """Take the selected deliveries' marks out; the positions that read them become incomplete."""
        self.model.remove_rows(self.view.selected_rows())

    def copy(self) -> None:
        """Put the selected block on the clipboard, tab-separated, as it would be typed."""
        QGuiApplication.clipboard().setText(block_text(self.model, self.view.selectionModel().selection().toList()))

    def paste(self) -> None:
        """Type the clipboard's block from the current cell on, as one change; all of it or nothing."""
        start = self.view.currentIndex()
        if not start.isValid():
            return
        try:
            self.model.set_cells(texts_of_block(self.model, start, QGuiApplication.clipboard().text()))
        except EntryError as error:
            self.told.emit(f"Not pasted: {error}")

    # --- inside

    def _lay_out_body(self) -> None:
        self.month.setPlaceholderText("2029-01")
        self.month.setAccessibleName("Delivery month to add")
        self.month.setToolTip("A delivery month to mark, written as 2029-01")
        self.month.setFixedWidth(76)
        self._add, self._remove = QToolButton(), QToolButton()
        self._add.setText("Add delivery")
        self._remove.setText("Remove deliveries")
        tools = QHBoxLayout()
        tools.setSpacing(4)
        for part in (self.month, self._add, self._remove):
            tools.addWidget(part)
        tools.addStretch(1)
        left = QWidget()
        column = QVBoxLayout(left)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(3)
        column.addWidget(self.view, 1)
        column.addLayout(tools)
        split = QSplitter(Qt.Orientation.Horizontal)
        split.setChildrenCollapsible(False)
        split.addWidget(left)
        split.addWidget(self.chart)
        split.setSizes([440, 260])
        split.setStretchFactor(1, 1)
        body = QWidget()
        body.setObjectName("paneBody")
        whole = QVBoxLayout(body)
        whole.setContentsMargins(0, 0, 0, 0)
        whole.setSpacing(2)
        whole.addWidget(self.bar)
        whole.addWidget(split, 1)
        self.set_body(body)
        for place, marks_column in enumerate(self.model.columns):
            self.view.setColumnWidth(place, _WIDTHS[marks_column.key])

    def _join_parts(self) -> None:
        self.bar.chosen.connect(self._on_chosen)
        self.bar.told.connect(self.told)
        self._add.clicked.connect(self.add_delivery)
        self.month.returnPressed.connect(self.add_delivery)
        self._remove.clicked.connect(self.remove_rows)
        self.view.cells.refused.connect(lambda _index, sentence: self.told.emit(f"Not entered: {sentence}"))
        self.view.selectionModel().currentChanged.connect(self._on_current)
        self.view.copied.connect(self.copy)
        self.view.pasted.connect(self.paste)
        for words, act in (("Copy", self.copy), ("Paste", self.paste), ("Remove deliveries", self.remove_rows)):
            action = QAction(words, self.view)
            action.triggered.connect(act)
            self.view.addAction(action)
        self.view.setContextMenuPolicy(Qt.ContextMenuPolicy.ActionsContextMenu)
        self._workbench.followed.connect(self._show_market)

    @Slot(int)
    def _on_chosen(self, place: int) -> None:
        self.model.choose(place)
        self._show_market()

    @Slot()
    def _show_market(self) -> None:
        market = self.bar.market
        if self.model.place != self.bar.place:
            self.model.choose(self.bar.place)
        if market is None:
            self.set_subtitle("")
            self.show_empty(EMPTY)
            return
        legs = self.model.legs
        used = sum(bool({one.long_leg, one.short_leg} & legs) for one in self._workbench.book.positions)
        self.set_subtitle(f"{market.name} · {len(market.marks)} months · read by {used} positions", market.note)
        self.chart.show_market(market)
        self.show_body()

    @Slot(QModelIndex)
    def _on_current(self, current: QModelIndex) -> None:
        period = self.model.period(current.row()) if current.isValid() else None
        self.chart.set_month(period.deliveries[0] if period is not None and period.span == "month" else "")


class MarksView(PlainGridView):
    """The table of Marks; the platform's keys for copy and paste are told to the pane."""

    copied = Signal()
    pasted = Signal()

    def __init__(self, model: MarksModel, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(model, theme, parent)
        self.setAccessibleName("Marks")
        self.verticalHeader().hide()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Copy and paste; all else as in every grid."""
        if event.matches(QKeySequence.StandardKey.Copy):
            self.copied.emit()
        elif event.matches(QKeySequence.StandardKey.Paste):
            self.pasted.emit()
        else:
            super().keyPressEvent(event)
