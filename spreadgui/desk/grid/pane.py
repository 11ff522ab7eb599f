"""The Positions pane: the grid, and the acts on its rows."""

from __future__ import annotations

import msgspec
from PySide6.QtCore import Qt, Signal, Slot
from PySide6.QtGui import QFontMetrics
from PySide6.QtWidgets import QWidget

from spreadgui.book.changes import insert_rows, remove_rows
from spreadgui.book.records import Position
from spreadgui.desk.grid.model import GridModel
from spreadgui.desk.grid.view import GridView
from spreadgui.desk.look.pane import Pane
from spreadgui.desk.look.theme import Theme
from spreadgui.desk.workbench import Workbench

_NARROWEST, _WIDEST = 48, 210
_SAMPLED_ROWS = 64
_HORIZONTAL = Qt.Orientation.Horizontal
# Computed columns are empty when the widths are set; this is room for the numbers to come.
_LEAST = {"position_value": 96, "formula_check": 210, "implied_status": 96}
_LEAST_COMPUTED = 84
_PADDING = 16
EMPTY = "No positions yet. Insert a row to enter the first one, or open a book."


class PositionsPane(Pane):
    """The grid in its frame. `row_changed(row)` tells the current row, `told(sentence)` what a person should know."""

    row_changed = Signal(int)
    told = Signal(str)

    def __init__(self, workbench: Workbench, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__("Positions", parent)
        self._workbench = workbench
        self.model = GridModel(workbench, self)
        self.view = GridView(self.model, theme, self)
        self.set_body(self.view)
        self._fit_columns()
        self.view.sight_changed.connect(workbench.set_sight)
        self.view.row_changed.connect(self.row_changed)
        for view in (self.view, self.view.pinned):
            view.cells.refused.connect(self._tell_refusal)
        workbench.followed.connect(self._show_count)
        self._show_count()

    def set_theme(self, theme: Theme) -> None:
        """Take the colours and sizes of another theme."""
        self.view.set_theme(theme)
        self._fit_columns()

    @Slot()
    def show_from_the_top(self) -> None:
        """As for a book that has just been opened: its first position, columns as wide as it needs."""
        self._fit_columns()
        self.view.go_to(0, self.model.column("name"))

    # --- acts

    def insert_row(self) -> None:
        """A new, empty position under the current one."""
        self._insert(self.view.current_row() + 1, (Position(),), "insert a row")

    def duplicate_rows(self) -> None:
        """The selected positions once more, under the last of them."""
        rows = self.view.selected_rows()
        if rows:
            copies = tuple(_copy(self._workbench.book.positions[row]) for row in rows)
            self._insert(rows[-1] + 1, copies, "duplicate a row" if len(rows) == 1 else f"duplicate {len(rows)} rows")

    def delete_rows(self) -> None:
        """Take the selected positions out of the book."""
        rows = self.view.selected_rows()
        if rows:
            words = "delete a row" if len(rows) == 1 else f"delete {len(rows)} rows"
            self._workbench.apply(remove_rows(self._workbench.book, rows, words))

    def clear_cells(self) -> None:
        """Empty the selected entry cells: own marks return to Marks, words and days go, ratios return to 1."""
        texts: dict[int, dict[int, str]] = {}
        for block in self.view.selectionModel().selection().toList():
            for place in range(block.left(), block.right() + 1):
                column = self.model.columns[place]
                if column.field is not None and not column.field.entry.choices:
                    for row in range(block.top(), block.bottom() + 1):
                        texts.setdefault(row, {})[place] = ""
        self.model.set_cells(texts)

    def edit_current(self) -> None:
        """Open the editor of the current cell."""
        if self.view.currentIndex().isValid():
            self.view.edit(self.view.currentIndex())

    def _insert(self, at: int, positions: tuple[Position, ...], words: str) -> None:
        self._workbench.apply(insert_rows(self._workbench.book, at, positions, words))
        self.view.go_to(at, self.model.column("name"))
        self.view.setFocus()

    # --- what is shown

    @Slot()
    def _show_count(self) -> None:
        count = len(self._workbench.slate)
        title = self._workbench.book.title or "Untitled book"
        self.set_subtitle(f"{title} · {count} position{'' if count == 1 else 's'}")
        if count:
            self.show_body()
        else:
            self.show_empty(EMPTY)

    @Slot(object, str)
    def _tell_refusal(self, _index: object, sentence: str) -> None:
        self.told.emit(f"Not entered: {sentence}")

    def _fit_columns(self) -> None:
        """Widths from the headings and from what the first rows hold; a person may drag them afterwards."""
        metrics = QFontMetrics(self.view.font())
        rows = min(self.model.rowCount(), _SAMPLED_ROWS)
        for place in range(self.model.columnCount()):
            heading = str(self.model.headerData(place, _HORIZONTAL))
            longest = max((self.model.text(row, place) for row in range(rows)), key=len, default="")
            width = max(metrics.horizontalAdvance(text) for text in (*heading.split("\n"), longest)) + _PADDING
            column = self.model.columns[place]
            least = _LEAST.get(column.key, _LEAST_COMPUTED if column.computed else _NARROWEST)
            self.view.setColumnWidth(place, max(least, min(width, _WIDEST)))


def _copy(position: Position) -> Position:
    """The same position as a record of its own, so that the two rows are told apart."""
    return msgspec.structs.replace(position)
