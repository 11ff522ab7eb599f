"""The strip above Marks: which market, and what holds for all of its deliveries."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any, get_args

import msgspec
from PySide6.QtCore import QSignalBlocker, Signal, Slot
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QLabel, QLineEdit, QToolButton, QVBoxLayout, QWidget

from spreadgui.book.changes import set_market
from spreadgui.book.entries import EntryError, date, number, quoted, words
from spreadgui.book.records import Dynamics, LotRule, Market
from spreadgui.desk.look.theme import set_refused, set_tone
from spreadgui.desk.workbench import Workbench
from spreadgui.market.strips import is_week


class MarketBar(QWidget):
    """The market chosen and its unit, law, shift, lot, tie strength and calendar.

    `chosen(place)` tells that the user chose another market, `told(sentence)` what a person should know.
    """

    chosen = Signal(int)
    told = Signal(str)

    def __init__(self, workbench: Workbench, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._workbench = workbench
        self.markets = QComboBox()
        self.markets.setAccessibleName("Market")
        self.dynamics = _choices("How its forwards move", get_args(Dynamics))
        self.lot_rule = _choices("Lot: fixed, or per hour or day of the delivery month", get_args(LotRule))
        self.unit = _line("Unit, as CRN/MWh", 84)
        self.shift = _line("What is added to a forward to make it lognormal", 60)
        self.lot_size = _line("Units in a lot", 72)
        self.tie_strength = _line("How fast the correlation of two deliveries decays, per year apart", 52)
        self.business_days = _line("A 1 for each business day from Monday to Sunday, a 0 for each other", 72)
        self.holidays = _line("Holidays, parted by blanks", 180)
        self._lay_out()
        self._join()
        workbench.followed.connect(self.show_market)
        self.show_market()

    @property
    def place(self) -> int:
        """Where the chosen market stands in the book."""
        return max(self.markets.currentIndex(), 0)

    @property
    def market(self) -> Market | None:
        """The market chosen; None where the book has none."""
        markets = self._workbench.book.markets
        return markets[self.place] if self.place < len(markets) else None

    @Slot()
    def show_market(self) -> None:
        """Show the market as it is; an entry that is being typed and is wrong goes."""
        names = [market.name for market in self._workbench.book.markets]
        with QSignalBlocker(self.markets):
            if names != [self.markets.itemText(place) for place in range(self.markets.count())]:
                place = self.place
                self.markets.clear()
                self.markets.addItems(names)
                self.markets.setCurrentIndex(min(place, len(names) - 1))
        market = self.market or Market("", "")
        for line, text in self._texts(market).items():
            if line.text() != text:
                line.setText(text)
                line.setCursorPosition(0)
            set_refused(line, False)
        for combo, value in ((self.dynamics, market.dynamics), (self.lot_rule, market.lot_rule)):
            with QSignalBlocker(combo):
                combo.setCurrentText(value)
        self.shift.setEnabled(market.dynamics == "shifted lognormal")

    def _texts(self, market: Market) -> dict[QLineEdit, str]:
        return {
            self.unit: market.unit,
            self.shift: f"{market.shift:g}",
            self.lot_size: f"{market.lot_size:g}",
            self.tie_strength: f"{market.tie_strength:g}",
            self.business_days: market.business_days,
            self.holidays: " ".join(str(day) for day in market.holidays),
        }

    def _lay_out(self) -> None:
        self.settings = QToolButton()
        self.settings.setText("Settings")
        self.settings.setCheckable(True)
        self.settings.setToolTip("Unit, law, lot, tie strength and calendar of the market")
        self._more = QWidget()
        lines = (
            (("Unit", self.unit), ("Moves", self.dynamics), ("Shift", self.shift)),
            (("Lot", self.lot_size), ("", self.lot_rule), ("Tie strength", self.tie_strength)),
            (("Business days", self.business_days), ("Holidays", self.holidays)),
        )
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 2)
        column.setSpacing(3)
        column.addLayout(_in_a_line((("Market", self.markets), ("", self.settings))))
        column.addWidget(self._more)
        more = QVBoxLayout(self._more)
        more.setContentsMargins(0, 0, 0, 0)
        more.setSpacing(3)
        for parts in lines:
            more.addLayout(_in_a_line(parts))
        self._more.hide()
        self.settings.toggled.connect(self._more.setVisible)

    def _join(self) -> None:
        self.markets.activated.connect(self._on_chosen)
        self.dynamics.activated.connect(lambda _place: self._set("dynamics", self.dynamics.currentText()))
        self.lot_rule.activated.connect(lambda _place: self._set("lot_rule", self.lot_rule.currentText()))
        readers: dict[str, tuple[QLineEdit, Callable[[str], Any]]] = {
            "unit": (self.unit, words),
            "shift": (self.shift, number),
            "lot_size": (self.lot_size, _above_zero),
            "tie_strength": (self.tie_strength, _zero_or_more),
            "business_days": (self.business_days, _week),
            "holidays": (self.holidays, _days),
        }
        for field, (line, read) in readers.items():
            line.editingFinished.connect(lambda field=field, line=line, read=read: self._take(field, line, read))

    @Slot(int)
    def _on_chosen(self, place: int) -> None:
        self.show_market()
        self.chosen.emit(place)

    def _take(self, field: str, line: QLineEdit, read: Callable[[str], Any]) -> None:
        if self.market is None or line.text() == self._texts(self.market)[line]:
            set_refused(line, False)
            return
        try:
            value = read(line.text())
        except EntryError as error:
            set_refused(line, True)
            line.setToolTip(str(error))
            self.told.emit(f"Not entered: {error}")
            return
        set_refused(line, False)
        line.setToolTip(line.accessibleName())
        self._set(field, value)

    def _set(self, field: str, value: Any) -> None:
        market = self.market
        if market is None or getattr(market, field) == value:
            return
        changes = {field: value}
        if field == "dynamics" and value != "shifted lognormal":
            changes["shift"] = 0.0  # another law has none
        changed = msgspec.structs.replace(market, **changes)
        words_ = f"set the {field.replace('_', ' ')} of {market.name}"
        self._workbench.apply(set_market(self._workbench.book, self.place, changed, words_))


def _in_a_line(parts: Sequence[tuple[str, QWidget]]) -> QHBoxLayout:
    line = QHBoxLayout()
    line.setSpacing(6)
    for text, widget in parts:
        if text:
            label = QLabel(text)
            set_tone(label, "muted")
            label.setBuddy(widget)
            line.addWidget(label)
        line.addWidget(widget)
    line.addStretch(1)
    return line


def _line(name: str, width: int) -> QLineEdit:
    line = QLineEdit()
    line.setAccessibleName(name)
    line.setToolTip(name)
    line.setFixedWidth(width)
    return line


def _choices(name: str, choices: tuple[str, ...]) -> QComboBox:
    combo = QComboBox()
    combo.setAccessibleName(name)
    combo.setToolTip(name)
    combo.addItems(list(choices))
    return combo


def _above_zero(text: str) -> float:
    value = number(text)
    if not value > 0.0:
        raise EntryError(f"expected a number above zero, got {quoted(text)}")
    return value


def _zero_or_more(text: str) -> float:
    value = number(text)
    if value < 0.0:
        raise EntryError(f"expected a number of zero or more, got {quoted(text)}")
    return value


def _week(text: str) -> str:
    if not is_week(text.strip()):
        raise EntryError(f"expected a 1 or a 0 for each day from Monday to Sunday, got {quoted(text)}")
    return text.strip()


def _days(text: str) -> tuple[Any, ...]:
    return tuple(sorted({date(part) for part in text.replace(",", " ").split()}))
