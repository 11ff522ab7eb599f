"""The zero curve of a book, written down: one point a line."""

from __future__ import annotations

import re

from PySide6.QtWidgets import QDialog, QDialogButtonBox, QLabel, QPlainTextEdit, QVBoxLayout, QWidget

from spreadgui.book.entries import EntryError, date
from spreadgui.book.records import Book, ZeroPoint
from spreadgui.desk.look.theme import set_refused, set_tone
from spreadgui.market.zero_curve import curve_faults
from spreadgui.valuation.typed import number_in_percent, percent_text

HOW = (
    "One point a line: a day and the zero rate to it, in per cent a year, continuous. Between two points the rate "
    "times time runs straight; before the first and after the last the rate is theirs. Without any point the flat "
    "zero rate of the book discounts."
)


class ZeroCurveDialog(QDialog):
    """Edits the points as text; `points` is what was read when it is accepted."""

    def __init__(self, book: Book, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._book = book
        self.points: tuple[ZeroPoint, ...] = book.zero_curve
        self.setWindowTitle("Zero curve")
        how = QLabel(HOW)
        how.setWordWrap(True)
        set_tone(how, "muted")
        self.text = QPlainTextEdit(curve_text(book.zero_curve))
        self.text.setAccessibleName("Points of the zero curve")
        self.text.setTabChangesFocus(True)
        self.fault = QLabel()
        self.fault.setWordWrap(True)
        set_tone(self.fault, "brick")
        self.buttons = QDialogButtonBox()
        self.buttons.addButton("Take over", QDialogButtonBox.ButtonRole.AcceptRole)
        self.buttons.addButton("Leave as it is", QDialogButtonBox.ButtonRole.RejectRole)
        self.buttons.accepted.connect(self.accept)
        self.buttons.rejected.connect(self.reject)
        column = QVBoxLayout(self)
        for part in (how, self.text, self.fault, self.buttons):
            column.addWidget(part)
        self.resize(420, 360)

    def accept(self) -> None:
        """Close if every line is a point; else say what is wrong and stay."""
        try:
            self.points = read_curve(self.text.toPlainText(), self._book)
        except EntryError as error:
            self.fault.setText(str(error))
            set_refused(self.text, True)
            return
        super().accept()


def curve_text(points: tuple[ZeroPoint, ...]) -> str:
    """The points as the dialog writes them."""
    return "\n".join(f"{point.date}  {percent_text(point.rate)}" for point in points)


def read_curve(text: str, book: Book) -> tuple[ZeroPoint, ...]:
    """The points of a text; EntryError with the line and what is wrong with it."""
    points: list[ZeroPoint] = []
    for line, written in enumerate(text.splitlines(), 1):
        parts = re.split(r"[\s;]+", written.strip().removesuffix("%").strip(), maxsplit=1)
        if parts == [""]:
            continue
        if len(parts) != 2:
            raise EntryError(f"line {line}: expected a day and a rate, as 2027-06-01 3.05")
        try:
            points.append(ZeroPoint(date(parts[0]), number_in_percent(parts[1])))
        except EntryError as error:
            raise EntryError(f"line {line}: {error}") from None
    points.sort(key=lambda point: point.date)
    faults = curve_faults(book.valuation_date, [(point.date, point.rate) for point in points]) if points else ()
    if faults:
        raise EntryError(faults[0].partition(": ")[2])
    return tuple(points)
