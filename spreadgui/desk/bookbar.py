"""The strip above the panes: what holds for the whole book, open to change at once."""

from __future__ import annotations

from collections.abc import Callable
from typing import get_args

from PySide6.QtCore import QSignalBlocker, Qt, Signal, Slot
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QLabel, QLineEdit, QToolButton, QWidget

from spreadgui.book.changes import set_book
from spreadgui.book.entries import EntryError, Value, date, quoted, words
from spreadgui.book.records import ValuationMethod
from spreadgui.desk.look.theme import set_refused, set_tone
from spreadgui.desk.workbench import Workbench
from spreadgui.desk.zero_curve_dialog import ZeroCurveDialog
from spreadgui.pricing.methods import METHODS
from spreadgui.valuation.typed import number_in_percent, percent_text


class BookBar(QWidget):
    """Title, valuation date, zero rate or curve, method and gap tolerance of the book.

    `told(sentence)` says what a person should know.
    """

    told = Signal(str)

    def __init__(self, workbench: Workbench, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._workbench = workbench
        self.title = _line("Book title", 170)
        self.date = _line("Valuation date, written as 2027-01-15", 96)
        self.rate = _line("Zero rate in per cent a year, continuous", 64)
        self.rate.setAlignment(Qt.AlignmentFlag.AlignRight)
        self.curve = QToolButton()
        self.tolerance = _line("Formula gap tolerance in per cent of the premium", 52)
        self.tolerance.setAlignment(Qt.AlignmentFlag.AlignRight)
        self.method = QComboBox()
        self.method.setAccessibleName("Method of the values")
        self.method.setToolTip("The method that values and sensitivities of the book come from.")
        for method in METHODS:
            if method.key in get_args(ValuationMethod):
                self.method.addItem(method.name, method.key)
        self._lay_out()
        self.title.editingFinished.connect(self._take_title)
        self.date.editingFinished.connect(self._take_date)
        self.rate.editingFinished.connect(self._take_rate)
        self.curve.setToolTip("Zero rates by day, in place of one flat rate.")
        self.curve.clicked.connect(self._edit_curve)
        self.tolerance.editingFinished.connect(self._take_tolerance)
        self.method.activated.connect(self._take_method)
        workbench.followed.connect(self.show_book)
        self.show_book()

    @Slot()
    def show_book(self) -> None:
        """Show the book as it is; an entry that is being typed and is wrong goes."""
        book = self._workbench.book
        shown = {
            self.title: book.title,
            self.date: str(book.valuation_date),
            self.rate: percent_text(book.zero_rate),
            self.tolerance: percent_text(book.gap_tolerance),
        }
        for line, text in shown.items():
            if line.text() != text:
                line.setText(text)
            set_refused(line, False)
        points = len(book.zero_curve)
        self.rate.setEnabled(not points)
        self.curve.setText(f"Curve ({points})…" if points else "Curve…")
        with QSignalBlocker(self.method):
            self.method.setCurrentIndex(self.method.findData(book.method))

    def _lay_out(self) -> None:
        row = QHBoxLayout(self)
        row.setContentsMargins(12, 2, 12, 6)
        row.setSpacing(6)
        for words_, widget, unit in (
            ("Book", self.title, ""),
            ("Valuation date", self.date, ""),
            ("Zero rate", self.rate, "%"),
            ("", self.curve, ""),
            ("Value by", self.method, ""),
            ("Gap tolerance", self.tolerance, "%"),
        ):
            if words_:
                label = QLabel(words_)
                set_tone(label, "muted")
                label.setBuddy(widget)
                row.addWidget(label)
            row.addWidget(widget)
            if unit:
                row.addWidget(QLabel(unit))
            row.addSpacing(10)
        row.addStretch(1)

    @Slot()
    def _take_title(self) -> None:
        self._take(self.title, "title", words, "set the book's title")

    @Slot()
    def _take_date(self) -> None:
        self._take(self.date, "valuation_date", date, "set the valuation date")

    @Slot()
    def _take_rate(self) -> None:
        self._take(self.rate, "zero_rate", number_in_percent, "set the zero rate")

    @Slot()
    def _edit_curve(self) -> None:
        dialog = ZeroCurveDialog(self._workbench.book, self)
        if dialog.exec() == ZeroCurveDialog.DialogCode.Accepted:
            self._set("zero_curve", dialog.points, "set the zero curve")

    @Slot()
    def _take_tolerance(self) -> None:
        self._take(self.tolerance, "gap_tolerance", _tolerance, "set the gap tolerance")

    @Slot()
    def _take_method(self) -> None:
        self._set("method", self.method.currentData(), "set the method")

    def _take(self, line: QLineEdit, field: str, read: Callable[[str], Value], change: str) -> None:
        try:
            value = read(line.text())
        except EntryError as error:
            set_refused(line, True)
            line.setToolTip(str(error))
            self.told.emit(f"Not entered: {error}")
            return
        set_refused(line, False)
        line.setToolTip(line.accessibleName())
        self._set(field, value, change)

    def _set(self, field: str, value: object, change: str) -> None:
        if value is not None and value != getattr(self._workbench.book, field):
            self._workbench.apply(set_book(self._workbench.book, field, value, change))


def _tolerance(text: str) -> float:
    value = number_in_percent(text)
    if value < 0.0:
        raise EntryError(f"expected a tolerance of 0 % or more, got {quoted(text)}")
    return value


def _line(name: str, width: int) -> QLineEdit:
    line = QLineEdit()
    line.setAccessibleName(name)
    line.setToolTip(name)
    line.setFixedWidth(width)
    return line
