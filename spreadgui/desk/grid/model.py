"""The Qt model of the grid: a thin adapter over the workbench and the column register."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, QPersistentModelIndex, Qt, Slot

from spreadgui.book.changes import counted, set_fields
from spreadgui.book.entries import EntryError, Value
from spreadgui.desk.grid.cells import Cell, CellCache, Look
from spreadgui.desk.workbench import Workbench
from spreadgui.market.blends import deliveries_of, names_of_legs
from spreadgui.valuation.column import Column
from spreadgui.valuation.columns import SCREEN_COLUMNS
from spreadgui.valuation.results import State
from spreadgui.valuation.slate import RowArray, Succession
from spreadgui.valuation.trust import tolerance_words
from spreadgui.valuation.typed import read_typed, typed_text

Index = QModelIndex | QPersistentModelIndex
_NOWHERE = QModelIndex()

# Plain ints, because a role arrives as one and comparing enums would cost more than all else that data() does.
_DISPLAY = int(Qt.ItemDataRole.DisplayRole)
_EDIT = int(Qt.ItemDataRole.EditRole)
_TOOLTIP = int(Qt.ItemDataRole.ToolTipRole)
_ALIGNMENT = int(Qt.ItemDataRole.TextAlignmentRole)
_ACCESSIBLE = int(Qt.ItemDataRole.AccessibleTextRole)
_RIGHT = int(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
_LEFT = int(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter)
_EDITABLE = Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable | Qt.ItemFlag.ItemIsEditable
_READABLE = Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable
_LOOK_WORDS = {Look.OWN: "own mark", Look.MARKED: "from Marks", Look.BEYOND: "beyond the gap tolerance"}


class GridModel(QAbstractTableModel):
    """Positions as rows, SCREEN_COLUMNS as columns."""

    def __init__(self, workbench: Workbench, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._workbench = workbench
        self.columns: tuple[Column, ...] = SCREEN_COLUMNS
        self._place = {column.key: place for place, column in enumerate(self.columns)}
        told = [place for place, column in enumerate(self.columns) if column.computed or column.key in _TOLD]
        self._told = range(told[0], told[-1] + 1)
        self._cells = CellCache(self.columns, workbench.slate, workbench.results)
        self._count = len(workbench.slate)
        self._tolerance = workbench.book.gap_tolerance
        workbench.followed.connect(self._on_followed)
        workbench.priced.connect(self._on_priced)

    # --- what the views ask

    def rowCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else self._count

    def columnCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else len(self.columns)

    def data(self, index: Index, role: int = _DISPLAY) -> object:
        if role == _DISPLAY:
            return self._cells.cell(index.row(), index.column()).text
        if role == _ALIGNMENT:
            return _RIGHT if self.columns[index.column()].numeric else _LEFT
        if role == _EDIT:
            return self.typed(index)
        if role == _TOOLTIP:
            return self.tip(index)
        if role == _ACCESSIBLE:
            return self.spoken(index)
        return None

    def flags(self, index: Index) -> Qt.ItemFlag:
        return _EDITABLE if self.columns[index.column()].field is not None else _READABLE

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = _DISPLAY) -> object:
        if orientation == Qt.Orientation.Vertical:
            return str(section + 1) if role == _DISPLAY else None
        column = self.columns[section]
        if role == _DISPLAY:
            return f"{column.heading}\n{self.unit(column)}" if column.unit else column.heading.replace(" ", "\n", 1)
        if role == _TOOLTIP:
            return column.help
        if role == _ALIGNMENT:
            return _RIGHT if column.numeric else _LEFT
        return None

    def setData(self, index: Index, value: object, role: int = _EDIT) -> bool:
        """Take a text that was typed into a cell; False where it is refused (`refusal` then says why)."""
        if role != _EDIT or self.columns[index.column()].field is None:
            return False
        try:
            self.set_cells({index.row(): {index.column(): str(value)}})
        except EntryError:
            return False
        return True

    # --- what the pane and the editors ask

    def cell(self, index: Index) -> Cell:
        """The cell's text and look, in one call."""
        return self._cells.cell(index.row(), index.column())

    def text(self, row: int, place: int) -> str:
        """What a cell shows."""
        return self._cells.cell(row, place).text

    def column(self, key: str) -> int:
        """Where the column of that key stands; KeyError where it is not on the screen."""
        return self._place[key]

    def unit(self, column: Column) -> str:
        """The unit in a heading, the book's currency filled in."""
        return column.unit.replace("{currency}", self._workbench.book.currency)

    def typed(self, index: Index) -> str:
        """What an editor starts with: the row's own entry, or for an own mark not yet typed the number in use."""
        column = self.columns[index.column()]
        if column.field is None:
            return self.cell(index).text
        value: Value = getattr(self._workbench.book.positions[index.row()], column.field.key)
        if value is None and column.own and column.numbers is not None:
            used = float(
                column.numbers(self._workbench.slate, self._workbench.results, slice(index.row(), index.row() + 1))[0]
            )
            value = used if np.isfinite(used) else None
        return typed_text(column, value, self._scale(column, index.row()))

    def _scale(self, column: Column, row: int) -> float:
        return column.scale_at(self._workbench.slate, row)

    def choices(self, index: Index) -> tuple[str, ...]:
        """The few values that a cell may take, or that fit best where it may take others; empty for none."""
        column = self.columns[index.column()]
        book = self._workbench.book
        if column.key in ("long_leg", "short_leg"):
            return ("", *names_of_legs(book))
        if column.key in ("long_delivery", "short_delivery"):
            leg = getattr(book.positions[index.row()], f"{column.key.removesuffix('_delivery')}_leg")
            return deliveries_of(book, leg)
        return column.field.entry.choices if column.field is not None else ()

    def refusal(self, index: Index, text: str) -> str:
        """Why `text` cannot go into a cell, as one sentence; empty where it can."""
        column = self.columns[index.column()]
        try:
            value = read_typed(column, text, self._scale(column, index.row()))
        except EntryError as error:
            return str(error)
        markets = names_of_legs(self._workbench.book)
        if column.key in ("long_leg", "short_leg") and value and value not in markets:
            return f'there is no market "{value}" in this book'
        return ""

    def set_cells(self, texts: Mapping[int, Mapping[int, str]], words: str = "") -> None:
        """Set cells from typed texts, row -> column -> text, as one change; EntryError where any is refused.

        Cells whose value stays the same are left alone, so that looking at an editor is not an edit.
        """
        book = self._workbench.book
        cells: dict[int, dict[str, Value]] = {}
        headings: list[str] = []
        for row, by_column in texts.items():
            for place, text in by_column.items():
                column = self.columns[place]
                assert column.field is not None
                if reason := self.refusal(self.index(row, place), text):
                    raise EntryError(reason)
                if text.strip() == self.typed(self.index(row, place)):
                    continue
                cells.setdefault(row, {})[column.field.key] = read_typed(column, text, self._scale(column, row))
                headings.append(column.heading.lower())
        if cells:
            named = words or counted(f"set {', '.join(dict.fromkeys(headings))}", len(cells))
            self._workbench.apply(set_fields(book, cells, named))

    def tip(self, index: Index) -> str | None:
        """What a pointer resting on a cell tells: the whole text, where a mark comes from, why there is no number."""
        cell, column = self.cell(index), self.columns[index.column()]
        if cell.look in (Look.INCOMPLETE, Look.REFUSED):
            return f"{cell.look.name.lower()}: {self._workbench.results.reason(index.row())}"
        if cell.look is Look.BEYOND:
            allowed = tolerance_words(self._workbench.slate)
            return f"{cell.text}: beyond the book’s gap tolerance of {allowed} of the premium."
        if column.own:
            origin = (
                "Own mark: typed into this row; clear it to return to Marks."
                if cell.look is Look.OWN
                else ("From Marks; type here to give this row its own.")
            )
            return f"{cell.text or 'No value'}. {origin}"
        return cell.text or None

    def spoken(self, index: Index) -> str:
        """A cell for a screen reader: heading, text, unit, state."""
        cell, column = self.cell(index), self.columns[index.column()]
        look = _LOOK_WORDS.get(cell.look) or (cell.look.name.lower() if cell.look >= Look.PRICING else "")
        said = [column.heading, cell.text or "empty", look if look != cell.text else ""]
        return ", ".join(filter(None, said))

    # --- what the workbench tells

    @Slot(object)
    def _on_followed(self, succession: Succession) -> None:
        old_rows, tolerance = succession.old_rows, succession.slate.book.gap_tolerance
        self._cells.stand_on(succession.slate)
        if tolerance != self._tolerance:  # no number is another, but what is said of it may be
            self._tolerance = tolerance
            self._cells.forget()
            self._changed(np.arange(self._count), self._told)
        if len(old_rows) == self._count and _in_place(old_rows):
            self._changed(np.flatnonzero(old_rows < 0), range(len(self.columns)))
            return
        self.beginResetModel()
        self._cells.forget()
        self._count = len(old_rows)
        self.endResetModel()

    @Slot(object)
    def _on_priced(self, rows: RowArray) -> None:
        self._changed(rows, self._told)

    def _changed(self, rows: RowArray, places: range) -> None:
        """One signal for all of `rows`: the views repaint what of it is in sight."""
        if rows.size:
            self._cells.renew(rows, places)
            self.dataChanged.emit(
                self.index(int(rows.min()), places.start), self.index(int(rows.max()), places.stop - 1)
            )

    def state(self, row: int) -> State:
        """The state of a row."""
        return State(int(self._workbench.results.state[row]))


# Not computed from the formulas' results, but telling of them.
_TOLD = ("state", "reason")


def _in_place(old_rows: RowArray) -> bool:
    kept = old_rows >= 0
    return bool((old_rows[kept] == np.flatnonzero(kept)).all())
