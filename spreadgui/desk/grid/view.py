"""The two views of the grid: the scrolling one, and over its left edge the pinned columns that never leave.

Both share the model and the selection. The scrolling view has the keyboard; the pinned one shows and edits its own
columns but hands the focus back.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from PySide6.QtCore import QItemSelectionModel, QModelIndex, QPersistentModelIndex, QRect, Qt, Signal, Slot
from PySide6.QtGui import QKeyEvent, QResizeEvent
from PySide6.QtWidgets import QAbstractItemDelegate, QAbstractItemView, QFrame, QHeaderView, QTableView, QWidget

from spreadgui.desk.grid.delegate import GridDelegate
from spreadgui.desk.grid.model import GridModel
from spreadgui.desk.look.theme import Theme

Index = QModelIndex | QPersistentModelIndex
_EXTRA_HEIGHT = 9
_EDIT_TRIGGERS = (
    QAbstractItemView.EditTrigger.DoubleClicked
    | QAbstractItemView.EditTrigger.EditKeyPressed
    | QAbstractItemView.EditTrigger.AnyKeyPressed
)


class PlainGridView(QTableView):
    """A table view fit for many rows: fixed row height, own handling of changes, headers that do not count cells."""

    def __init__(self, model: Any, theme: Theme, parent: QWidget | None = None) -> None:
        """`model` is a table model that is an `EditedModel` as well."""
        super().__init__(parent)
        self.setModel(model)
        self.cells = GridDelegate(model, theme, self)
        self.setItemDelegate(self.cells)
        self.setEditTriggers(_EDIT_TRIGGERS)
        self.setShowGrid(False)
        self.setFrameShape(QFrame.Shape.NoFrame)
        self.setHorizontalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setVerticalScrollMode(QAbstractItemView.ScrollMode.ScrollPerItem)
        self.setWordWrap(False)
        self.setTabKeyNavigation(True)
        # The header would ask every row whether it is selected whenever all are: seconds at 100,000 rows.
        self._header_selection = QItemSelectionModel(model, self)
        self.horizontalHeader().setSelectionModel(self._header_selection)
        self.horizontalHeader().setHighlightSections(False)
        self.verticalHeader().setSectionResizeMode(QHeaderView.ResizeMode.Fixed)
        self.verticalHeader().setDefaultAlignment(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
        self.cells.committed.connect(self._move_on)
        self.set_theme(theme)

    def set_theme(self, theme: Theme) -> None:
        """Take the colours and sizes of another theme."""
        self.cells.set_theme(theme)
        self.verticalHeader().setDefaultSectionSize(self.fontMetrics().height() + _EXTRA_HEIGHT)
        self.viewport().update()

    def dataChanged(self, first: Index, last: Index, roles: Sequence[int] = ()) -> None:
        """Repaint what of the changed cells is in sight; Qt's own way repaints everything, off-screen changes too."""
        area = self.changed_area(first, last)
        if not area.isEmpty():
            self.viewport().update(area)

    def closeEditor(self, editor: QWidget, hint: QAbstractItemDelegate.EndEditHint) -> None:
        """Qt closes an editor when the current cell changes; a wrong entry stays until Escape or mending ends it."""
        if hint == QAbstractItemDelegate.EndEditHint.RevertModelCache or not self.cells.is_wrong(editor):
            super().closeEditor(editor, hint)
        else:
            self.setState(self.State.NoState)  # else no other cell could be edited meanwhile

    def changed_area(self, first: Index, last: Index) -> QRect:
        """The visible rectangle between two cells, empty where none of it is in sight."""
        rows = self.rows_in_sight()
        top, bottom = max(first.row(), rows.start), min(last.row(), rows.stop - 1)
        if top > bottom:
            return QRect()
        y = self.rowViewportPosition(top)
        height = self.rowViewportPosition(bottom) + self.rowHeight(bottom) - y
        return QRect(0, y, self.viewport().width(), height)

    def rows_in_sight(self) -> range:
        """The rows that the viewport shows, whole or in part."""
        count = self.model().rowCount()
        if not count:
            return range(0)
        first = max(self.rowAt(0), 0)
        last = self.rowAt(self.viewport().height() - 1)
        return range(first, count if last < 0 else last + 1)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Enter goes on to the next row, as after an entry."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter) and self.state() != self.State.EditingState:
            self.step(0, 1 if not event.modifiers() & Qt.KeyboardModifier.ShiftModifier else -1)
            return
        super().keyPressEvent(event)

    @Slot(object, int)
    def _move_on(self, _index: QPersistentModelIndex, key: int) -> None:
        self.setFocus()
        steps = {Qt.Key.Key_Tab: (1, 0), Qt.Key.Key_Backtab: (-1, 0)}
        self.step(*steps.get(Qt.Key(key), (0, 1)))

    def step(self, columns: int, rows: int) -> None:
        """Make the cell so far off current, where there is one."""
        here = self.currentIndex()
        there = self.model().index(here.row() + rows, here.column() + columns)
        if there.isValid():
            self.setCurrentIndex(there)

    def selected_rows(self) -> list[int]:
        """The rows that hold any selected cell, ascending."""
        rows: set[int] = set()
        for block in self.selectionModel().selection().toList():
            rows.update(range(block.top(), block.bottom() + 1))
        return sorted(rows)


class PinnedView(PlainGridView):
    """The columns that stay; lies over the left edge of the scrolling view and scrolls with its rows."""

    def __init__(self, model: GridModel, theme: Theme, parent: QWidget) -> None:
        super().__init__(model, theme, parent)
        self.setObjectName("pinnedColumns")
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.verticalHeader().hide()
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setVerticalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        for place, column in enumerate(model.columns):
            self.setColumnHidden(place, not column.pinned)


class GridView(PlainGridView):
    """The scrolling view, with the pinned one upon it.

    `sight_changed(rows)` tells which rows are on the screen, `row_changed(row)` which one is current (−1 for none).
    """

    sight_changed = Signal(object)
    row_changed = Signal(int)

    def __init__(self, model: GridModel, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(model, theme, parent)
        self.setObjectName("positionsGrid")
        self.setAccessibleName("Positions")
        self._sight = range(0)
        self._row = -1
        self._place = (0, 0)
        self.pinned = PinnedView(model, theme, self)
        self.pinned.setSelectionModel(self.selectionModel())
        self._join()
        model.modelAboutToBeReset.connect(self._remember_place)
        model.modelReset.connect(self._return_to_place)

    def _join(self) -> None:
        """Tie the two views' scrolling, column widths, current cell and committed entries together."""
        self.verticalScrollBar().valueChanged.connect(self.pinned.verticalScrollBar().setValue)
        self.pinned.verticalScrollBar().valueChanged.connect(self.verticalScrollBar().setValue)
        self.horizontalHeader().sectionResized.connect(self._follow_width)
        self.pinned.horizontalHeader().sectionResized.connect(self._follow_pinned_width)
        self.verticalScrollBar().valueChanged.connect(self._tell_sight)
        self.selectionModel().currentChanged.connect(self._on_current)
        self.pinned.cells.committed.disconnect()
        self.pinned.cells.committed.connect(self._move_on)

    # --- geometry

    def pinned_width(self) -> int:
        """The width that the pinned columns take."""
        model = self.model()
        assert isinstance(model, GridModel)
        return sum(self.columnWidth(place) for place, column in enumerate(model.columns) if column.pinned)

    def updateGeometries(self) -> None:
        super().updateGeometries()
        if hasattr(self, "pinned"):  # Qt calls this from the base class's constructor too
            self._lay_pinned()
            self._tell_sight()

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self._lay_pinned()
        self._tell_sight()

    def set_theme(self, theme: Theme) -> None:
        super().set_theme(theme)
        if hasattr(self, "pinned"):
            self.pinned.set_theme(theme)

    def _lay_pinned(self) -> None:
        frame = self.viewport().geometry()
        top = self.horizontalHeader().geometry().top()
        self.pinned.horizontalHeader().setFixedHeight(self.horizontalHeader().height())
        self.pinned.setGeometry(frame.left(), top, self.pinned_width(), frame.bottom() - top + 1)

    @Slot(int, int, int)
    def _follow_width(self, place: int, _old: int, new: int) -> None:
        self.pinned.setColumnWidth(place, new)
        self._lay_pinned()

    @Slot(int, int, int)
    def _follow_pinned_width(self, place: int, _old: int, new: int) -> None:
        if self.columnWidth(place) != new:
            self.setColumnWidth(place, new)

    def scrollTo(
        self, index: Index, hint: QAbstractItemView.ScrollHint = QAbstractItemView.ScrollHint.EnsureVisible
    ) -> None:
        """Bring a cell into sight, out from under the pinned columns."""
        if self._is_pinned(index):
            self.pinned.scrollTo(index, hint)
            bar = self.horizontalScrollBar()
            kept = bar.value()
            super().scrollTo(index, hint)
            bar.setValue(kept)
            return
        super().scrollTo(index, hint)
        hidden = self.pinned_width() - self.columnViewportPosition(index.column())
        if hidden > 0:
            self.horizontalScrollBar().setValue(self.horizontalScrollBar().value() - hidden)

    # --- keyboard and editing

    def edit(self, index: Index, *trigger_and_event: Any) -> Any:
        """Edit in the view that shows the cell. Qt calls this in two forms, a program's and a user's."""
        if self._is_pinned(index):
            return QTableView.edit(self.pinned, index, *trigger_and_event)
        return super().edit(index, *trigger_and_event)

    def _is_pinned(self, index: Index) -> bool:
        model = self.model()
        return isinstance(model, GridModel) and index.isValid() and model.columns[index.column()].pinned

    # --- where we are

    def current_row(self) -> int:
        """The row of the current cell, −1 where there is none."""
        return self.currentIndex().row()

    def go_to(self, row: int, column: int) -> None:
        """Make a cell current and bring it into sight; beyond the last row, the last."""
        row = min(row, self.model().rowCount() - 1)
        if row >= 0:
            self.setCurrentIndex(self.model().index(row, column))

    @Slot()
    def _remember_place(self) -> None:
        index = self.currentIndex()
        self._place = (max(index.row(), 0), max(index.column(), 0))

    @Slot()
    def _return_to_place(self) -> None:
        self._row = -1
        self._tell_sight()
        self.go_to(*self._place)
        if not self.model().rowCount():
            self.row_changed.emit(-1)

    @Slot(QModelIndex, QModelIndex)
    def _on_current(self, current: QModelIndex, previous: QModelIndex) -> None:
        self.pinned.viewport().update()
        if current.row() != self._row:
            self._row = current.row()
            self.row_changed.emit(self._row)

    @Slot()
    def _tell_sight(self) -> None:
        rows = self.rows_in_sight()
        if rows != self._sight:
            self._sight = rows
            self.sight_changed.emit(rows)
