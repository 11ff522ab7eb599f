"""The Qt model of Marks: the periods of one market, a thin adapter over the workbench and `market.periods`."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, QPersistentModelIndex, Qt, Slot

from spreadgui.book.changes import set_market
from spreadgui.book.entries import EntryError, Value, delivery, quoted
from spreadgui.book.records import Market
from spreadgui.desk.grid.cells import Cell, Look
from spreadgui.desk.markets.marks_columns import COLUMNS, MarkColumn
from spreadgui.desk.workbench import Workbench
from spreadgui.market.periods import (
    Period,
    periods_of,
    spread_to_months,
    value_of,
    with_delivery,
    without_deliveries,
)
from spreadgui.valuation.shown import trimmed_text
from spreadgui.valuation.typed import number_in_percent, percent_text

Index = QModelIndex | QPersistentModelIndex
_NOWHERE = QModelIndex()
_DISPLAY, _EDIT, _TOOLTIP, _ALIGNMENT, _ACCESSIBLE = (
    int(role)
    for role in (
        Qt.ItemDataRole.DisplayRole,
        Qt.ItemDataRole.EditRole,
        Qt.ItemDataRole.ToolTipRole,
        Qt.ItemDataRole.TextAlignmentRole,
        Qt.ItemDataRole.AccessibleTextRole,
    )
)
_RIGHT = int(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
_LEFT = int(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter)
_READABLE = Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable
_INDENT = {"year": "", "season": "  ", "quarter": "    ", "month": "      "}


class MarksModel(QAbstractTableModel):
    """Periods as rows, COLUMNS as columns, of the market chosen."""

    def __init__(self, workbench: Workbench, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._workbench = workbench
        self.columns: tuple[MarkColumn, ...] = COLUMNS
        self._place = 0
        self._periods: tuple[Period, ...] = ()
        self._readers: Counter[str] = Counter()
        self._look_up()
        workbench.followed.connect(self._on_followed)

    # --- which market

    @property
    def place(self) -> int:
        """Where the market stands in the book; 0 where the book has none."""
        return self._place

    @property
    def market(self) -> Market | None:
        """The market that is shown, or None where the book has none."""
        markets = self._workbench.book.markets
        return markets[self._place] if self._place < len(markets) else None

    def choose(self, place: int) -> None:
        """Show another market of the book."""
        self.beginResetModel()
        self._place = max(place, 0)
        self._look_up()
        self.endResetModel()

    @property
    def legs(self) -> set[str]:
        """What a leg that reads the market is called: its name, or that of a blend that holds it."""
        if self.market is None:
            return set()
        name, blends = self.market.name, self._workbench.book.blends
        return {name, *(blend.name for blend in blends if any(part.market == name for part in blend.parts))}

    @property
    def is_absolute(self) -> bool:
        """Whether the market's volatilities are amounts in its unit."""
        return self.market is not None and self.market.dynamics == "normal"

    # --- what the view asks

    def rowCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else len(self._periods)

    def columnCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else len(self.columns)

    def data(self, index: Index, role: int = _DISPLAY) -> object:
        if role == _DISPLAY:
            return self.cell(index).text
        if role == _ALIGNMENT:
            return _RIGHT if self.columns[index.column()].numeric else _LEFT
        if role == _EDIT:
            return self.typed(index)
        if role == _TOOLTIP:
            return self.cell(index).text.strip() or None
        if role == _ACCESSIBLE:
            column = self.columns[index.column()]
            return f"{self.period(index.row()).name}, {column.heading}, {self.cell(index).text.strip() or 'empty'}"
        return None

    def flags(self, index: Index) -> Qt.ItemFlag:
        if self.columns[index.column()].field is None:
            return _READABLE
        return _READABLE | Qt.ItemFlag.ItemIsEditable

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = _DISPLAY) -> object:
        if orientation == Qt.Orientation.Vertical:
            return None
        column = self.columns[section]
        if role == _DISPLAY:
            return f"{column.heading}\n{self.unit(column)}"
        if role == _TOOLTIP:
            return column.help
        if role == _ALIGNMENT:
            return _RIGHT if column.numeric else _LEFT
        return None

    def setData(self, index: Index, value: object, role: int = _EDIT) -> bool:
        """Take a text that was typed into a cell; False where it is refused (`refusal` then says why)."""
        if role != _EDIT or self.columns[index.column()].field is None or self.refusal(index, str(value)):
            return False
        self.set_cells({index.row(): {index.column(): str(value)}})
        return True

    # --- what painting and editing ask

    def cell(self, index: Index) -> Cell:
        """A cell's text and look; a period's numbers are means of its months'."""
        return Cell(self.text(index.row(), index.column()), self._look(index.row(), index.column()))

    def text(self, row: int, place: int) -> str:
        """What a cell shows."""
        period, column = self._periods[row], self.columns[place]
        if column.key == "period":
            return _INDENT[period.span] + period.name
        if column.key == "positions":
            count = sum(self._readers[one] for one in period.deliveries)
            return str(count) if count else ""
        if column.key == "note":
            return self._note(period)
        value = self._value(period, column)
        return "" if value is None else self._shown(period, column, value)

    def period(self, row: int) -> Period:
        """The period of a row."""
        return self._periods[row]

    def unit(self, column: MarkColumn) -> str:
        """The second line of a heading."""
        unit = "" if self.market is None else self.market.unit
        if column.key == "forward" or (column.in_percent and self.is_absolute):
            return unit
        return "% a year" if column.in_percent else ""

    def choices(self, index: Index) -> tuple[str, ...]:
        """Marks are typed, never chosen from a list."""
        return ()

    def typed(self, index: Index) -> str:
        """What an editor starts with: the number to the last digit for a month, as shown for a mean."""
        period, column = self._periods[index.row()], self.columns[index.column()]
        if column.field is None:
            return self.text(index.row(), index.column())
        value = self._value(period, column)
        if value is None or period.span != "month":
            return "" if value is None else self._shown(period, column, value).replace("\N{MINUS SIGN}", "-")
        return percent_text(value) if self._is_percent(column) else column.field.entry.text(value)

    def refusal(self, index: Index, text: str) -> str:
        """Why `text` cannot go into a cell, as one sentence; empty where it can."""
        column = self.columns[index.column()]
        try:
            value = self._read(column, text)
        except EntryError as error:
            return str(error)
        if value is None and column.key != "daily_volatility":
            return f"a mark needs a {column.heading.lower()}"
        return ""

    # --- acts

    def set_cells(self, texts: Mapping[int, Mapping[int, str]]) -> None:
        """Set cells from typed texts, row -> column -> text, as one change; EntryError where any is refused.

        Longer periods first, so that a month typed beside its quarter has the last word.
        """
        market = self.market
        if market is None:
            return
        headings: list[str] = []
        for row in sorted(texts, key=lambda row: len(self._periods[row].deliveries), reverse=True):
            for place, text in texts[row].items():
                index = self.index(row, place)
                if reason := self.refusal(index, text):
                    raise EntryError(reason)
                if text.strip() == self.typed(index).strip():
                    continue
                column = self.columns[place]
                value = self._read(column, text)
                assert value is None or isinstance(value, float)
                market = spread_to_months(market, self._periods[row], column.mark_field, value)
                headings.append(f"{column.heading.lower()} of {market.name} {self._periods[row].name}")
        if headings:
            more = f" and {len(headings) - 1} more" if len(headings) > 1 else ""
            self._apply(market, f"mark the {headings[0]}{more}")

    def add_delivery(self, text: str) -> int:
        """Mark one more month, written 2027-01; gives its row. EntryError where the text is none or it is marked."""
        month = delivery(text)
        if self.market is None:
            raise EntryError("the book has no market to mark")
        if any(mark.delivery == month for mark in self.market.marks):
            raise EntryError(f"{self.market.name} has a mark for {quoted(month)} already")
        self._apply(with_delivery(self.market, month), f"add a mark of {self.market.name} for {month}")
        return next(row for row, period in enumerate(self._periods) if period.deliveries == (month,))

    def remove_rows(self, rows: list[int]) -> None:
        """Take the marks of these periods out of the book."""
        if self.market is None or not rows:
            return
        months = sorted({one for row in rows for one in self._periods[row].deliveries})
        what = months[0] if len(months) == 1 else f"{len(months)} months"
        self._apply(without_deliveries(self.market, months), f"remove the marks of {self.market.name} for {what}")

    # --- inside

    def _apply(self, market: Market, words: str) -> None:
        self._workbench.apply(set_market(self._workbench.book, self._place, market, words))

    def _value(self, period: Period, column: MarkColumn) -> float | None:
        assert self.market is not None
        return value_of(self.market, period, column.mark_field)

    def _is_percent(self, column: MarkColumn) -> bool:
        return column.in_percent and not self.is_absolute

    def _shown(self, period: Period, column: MarkColumn, value: float) -> str:
        """A mark to its last digit, a mean to the second decimal."""
        decimals = column.decimals if period.span == "month" else 2
        return trimmed_text(value * (100.0 if self._is_percent(column) else 1.0), decimals, 2)

    def _read(self, column: MarkColumn, text: str) -> Value:
        assert column.field is not None
        if not text.strip():
            return None
        if not self._is_percent(column):
            return column.field.entry.read(text)
        value = number_in_percent(text)
        if value < 0.0:
            raise EntryError(f"expected {column.field.in_percent}, got {quoted(text)}")
        return value

    def _note(self, period: Period) -> str:
        assert self.market is not None
        notes = {mark.note for mark in self.market.marks if mark.delivery in period.deliveries}
        return notes.pop() if len(notes) == 1 else ""

    def _look(self, row: int, place: int) -> Look:
        column = self.columns[place]
        if column.field is None:
            return Look.COMPUTED
        return Look.ENTRY if self._periods[row].span == "month" else Look.MARKED

    def _look_up(self) -> None:
        self._periods = periods_of(self.market) if self.market is not None else ()
        names = self.legs
        self._readers = Counter(
            month
            for position in self._workbench.book.positions
            for month in {
                month
                for leg, month in (
                    (position.long_leg, position.long_delivery), (position.short_leg, position.short_delivery),
                )
                if leg in names
            }
        )  # fmt: skip

    @Slot()
    def _on_followed(self) -> None:
        before = self._periods
        market = self.market
        if market is None or periods_of(market) != before:
            self.choose(min(self._place, max(len(self._workbench.book.markets) - 1, 0)))
            return
        self._look_up()
        if self._periods:
            self.dataChanged.emit(self.index(0, 0), self.index(len(self._periods) - 1, len(self.columns) - 1))
            self.headerDataChanged.emit(Qt.Orientation.Horizontal, 0, len(self.columns) - 1)
