"""A view of a small read-only table that is exactly as large as its content, painted with decimals aligned.

It never scrolls by itself: the pane around it does. The current cell walks by the arrow keys, past the last row into
whatever follows (`stepped_out`); Ctrl+C copies the table as tab-separated text, or the cells that are marked where
several are.
"""

from __future__ import annotations

from PySide6.QtCore import (
    QAbstractTableModel,
    QEvent,
    QItemSelectionModel,
    QModelIndex,
    QPersistentModelIndex,
    QRect,
    QSize,
    Qt,
    Signal,
)
from PySide6.QtGui import QColor, QFont, QFontMetrics, QGuiApplication, QKeyEvent, QKeySequence, QPainter, QPen
from PySide6.QtWidgets import (
    QApplication,
    QFrame,
    QHeaderView,
    QSizePolicy,
    QStyle,
    QStyledItemDelegate,
    QStyleOptionViewItem,
    QTableView,
    QWidget,
)

from spreadgui.desk.look.theme import Theme, tabular
from spreadgui.desk.panels.sheets import NOTHING, Cell, Heading, Sheet, tabbed

Index = QModelIndex | QPersistentModelIndex
PADDING = 4
_APART = 10
_AFTER_GAP = 4
_HEADING_EXTRA = 3
_ROW_EXTRA = 1
# Spare width goes between the columns up to this much for each, then after the last.
_MOST_SPARE = 14
_DISPLAY, _ALIGN, _TIP, _SPOKEN = (
    int(role)
    for role in (
        Qt.ItemDataRole.DisplayRole,
        Qt.ItemDataRole.TextAlignmentRole,
        Qt.ItemDataRole.ToolTipRole,
        Qt.ItemDataRole.AccessibleTextRole,
    )
)
_RIGHT = int(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignBottom)
_LEFT = int(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignBottom)
_NO_PARENT = QModelIndex()


class SheetModel(QAbstractTableModel):
    """A sheet for Qt."""

    def __init__(self, parent: QWidget) -> None:
        super().__init__(parent)
        self.sheet = NOTHING

    def set_sheet(self, sheet: Sheet) -> None:
        """Show another sheet."""
        self.beginResetModel()
        self.sheet = sheet
        self.endResetModel()

    def rowCount(self, parent: Index = _NO_PARENT) -> int:
        return 0 if parent.isValid() else len(self.sheet.rows)

    def columnCount(self, parent: Index = _NO_PARENT) -> int:
        return 0 if parent.isValid() else len(self.sheet.headings)

    def cell(self, index: Index) -> Cell:
        """The cell at `index`."""
        return self.sheet.rows[index.row()][index.column()]

    def data(self, index: Index, role: int = _DISPLAY) -> object:
        if role == _DISPLAY:
            return self.cell(index).words
        if role == _TIP:
            return self.cell(index).tip or None
        if role == _SPOKEN:
            return self.cell(index).spoken or None
        return None

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = _DISPLAY) -> object:
        if orientation != Qt.Orientation.Horizontal or section >= len(self.sheet.headings):
            return None
        heading = self.sheet.headings[section]
        if role == _DISPLAY:
            return heading.text
        if role == _ALIGN:
            return _RIGHT if heading.number else _LEFT
        return heading.tip or None if role == _TIP else None


class Setting:
    """The fonts of a theme - "plain", "strong" and "small" - and how much room texts need in them."""

    def __init__(self, theme: Theme) -> None:
        plain = tabular(QApplication.font())
        plain.setPointSizeF(theme.points)
        strong, small = QFont(plain), QFont(plain)
        strong.setWeight(QFont.Weight.DemiBold)
        small.setPointSizeF(theme.small)
        self.fonts = {"plain": plain, "strong": strong, "small": small}
        self.metrics = {name: QFontMetrics(font) for name, font in self.fonts.items()}

    @staticmethod
    def font_name(cell: Cell) -> str:
        """Which font the cell's text is set in."""
        return "small" if cell.small else "strong" if cell.strong else "plain"

    def width(self, font_name: str, text: str) -> int:
        """Pixels that `text` takes in one of the fonts."""
        return self.metrics[font_name].horizontalAdvance(text) if text else 0

    def after_width(self, cell: Cell) -> int:
        """Pixels of the small letters after the text, with the gap before them."""
        return self.width("small", cell.after) + _AFTER_GAP if cell.after else 0

    def heading_width(self, heading: Heading) -> int:
        """Pixels that a heading needs, margins included."""
        widest = max(self.width("small", line) for line in heading.text.split("\n"))
        return widest + 2 * PADDING + 2 + (_APART if heading.apart else 0)

    def heading_height(self, sheet: Sheet) -> int:
        """Pixels of the row of headings."""
        lines = max((heading.text.count("\n") + 1 for heading in sheet.headings), default=0)
        return lines * self.metrics["small"].height() + _HEADING_EXTRA

    def after_widths(self, sheet: Sheet) -> list[int]:
        """For each column the room that its `after` texts take, so that they stand below each other."""
        return [
            max((self.after_width(row[column]) for row in sheet.rows if row[column].number), default=0)
            for column in range(len(sheet.headings))
        ]

    def column_widths(self, sheet: Sheet) -> list[int]:
        """Pixels that each column needs for every text to show whole."""
        widths = [self.heading_width(heading) for heading in sheet.headings]
        afters = self.after_widths(sheet)
        # Cells of one column first, so that a spanned remark widens the table only by what is still lacking.
        cells = [(cell, column) for row in sheet.rows for column, cell in enumerate(row)]
        for cell, column in sorted(cells, key=lambda pair: pair[0].span):
            last = column + cell.span
            needed = self.cell_width(cell, afters[column]) + (_APART if sheet.headings[column].apart else 0)
            widths[last - 1] += max(needed - sum(widths[column:last]), 0)
        return widths

    def cell_width(self, cell: Cell, after: int) -> int:
        """Pixels that a cell needs, margins included, in a column whose `after` texts take `after` pixels."""
        extra = after if cell.number and cell.span == 1 else self.after_width(cell)
        return self.width(self.font_name(cell), cell.text) + extra + 2 * PADDING


class SheetDelegate(QStyledItemDelegate):
    """Paints the cells: numbers to the right, what comes after them in small letters below each other."""

    def __init__(self, view: SheetView) -> None:
        super().__init__(view)
        self._view = view

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: Index) -> None:
        view, rect = self._view, QRect(option.rect)
        sheet, cell = view.sheet(), view.model().cell(index)
        selected = bool(option.state & QStyle.StateFlag.State_Selected) and view.hasFocus()
        if selected:
            painter.fillRect(rect, view.colour("kelp_soft"))
        elif index.row() in sheet.marked:
            painter.fillRect(rect, view.colour("paper"))
        self._write(painter, rect.adjusted(PADDING, 0, -PADDING, 0), cell, view.after_width(index))
        if view.hasFocus() and index == view.currentIndex():
            painter.setPen(QPen(view.colour("kelp"), 1))
            painter.drawRect(option.rect.adjusted(0, 0, -1, -1))

    def _write(self, painter: QPainter, rect: QRect, cell: Cell, after: int) -> None:
        name = self._view.setting.font_name(cell)
        tail, room = QRect(rect), QRect(rect)
        if cell.number:
            room.setRight(rect.right() - after)
            tail.setLeft(room.right() + 1 + _AFTER_GAP)
        else:
            tail.setLeft(rect.left() + self._view.setting.width(name, cell.text) + _AFTER_GAP)
        self._put(painter, room, cell.text, name, cell.tone, right=cell.number)
        if cell.after:
            self._put(painter, tail, cell.after, "small", "muted")

    def _put(
        self, painter: QPainter, room: QRect, text: str, font: str, tone: str, *, right: bool = False
    ) -> None:  # fmt: skip
        view = self._view
        metrics = view.setting.metrics[font]
        if metrics.horizontalAdvance(text) > room.width():
            text = metrics.elidedText(text, Qt.TextElideMode.ElideRight, room.width())
        side = Qt.AlignmentFlag.AlignRight if right else Qt.AlignmentFlag.AlignLeft
        painter.setFont(view.setting.fonts[font])
        painter.setPen(view.ink(tone))
        painter.drawText(room, side | Qt.AlignmentFlag.AlignVCenter, text)

    def sizeHint(self, option: QStyleOptionViewItem, index: Index) -> QSize:
        """What the cell needs for its text to show whole."""
        view = self._view
        width = view.setting.cell_width(view.model().cell(index), view.after_width(index))
        return QSize(width + (_APART if view.sheet().headings[index.column()].apart else 0), view.row_height())


class SheetView(QTableView):
    """Shows one sheet at its full size. `stepped_out(1)` and `(-1)` tell that an arrow key went past an end."""

    stepped_out = Signal(int)
    walked = Signal(QRect)

    def __init__(self, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._theme, self._faded, self._spare_height = theme, False, 0
        self.setting = Setting(theme)
        self._afters: list[int] = []
        self._model = SheetModel(self)
        self.setModel(self._model)
        self.setItemDelegate(SheetDelegate(self))
        self._set_up()

    def _set_up(self) -> None:
        self.setFrameShape(QFrame.Shape.NoFrame)
        self.setShowGrid(False)
        self.setWordWrap(False)
        self.setTabKeyNavigation(False)
        self.setCornerButtonEnabled(False)
        self.setEditTriggers(QTableView.EditTrigger.NoEditTriggers)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setVerticalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        self.verticalHeader().hide()
        self.verticalHeader().setMinimumSectionSize(1)
        header = self.horizontalHeader()
        header.setMinimumSectionSize(1)
        header.setSectionResizeMode(QHeaderView.ResizeMode.Fixed)
        header.setSectionsClickable(False)
        header.setHighlightSections(False)
        header.setStyleSheet(f"QHeaderView::section {{ border-right: none; padding: 0 {PADDING}px 2px {PADDING}px; }}")

    def model(self) -> SheetModel:
        """The model that holds the sheet."""
        return self._model

    def sheet(self) -> Sheet:
        """What is shown."""
        return self._model.sheet

    def set_theme(self, theme: Theme) -> None:
        """Take the colours and sizes of another theme; the pane lays the view out anew after it."""
        self._theme, self.setting = theme, Setting(theme)
        self.viewport().update()

    def set_faded(self, faded: bool) -> None:
        """Write all in the muted ink, for numbers that are out of date."""
        self._faded = faded
        self.viewport().update()

    def is_faded(self) -> bool:
        """Whether the numbers are marked as out of date."""
        return self._faded

    def ink(self, tone: str) -> QColor:
        """The colour of a text of that tone as things stand."""
        if self._faded or tone == "muted":
            return self.colour("muted")
        return self.colour("kelp" if tone == "accent" else "ink")

    def colour(self, token: str) -> QColor:
        """A colour of the theme."""
        return self._theme.colour(token)

    def after_width(self, index: Index) -> int:
        """The room kept for the small letters after the text of a cell."""
        cell = self._model.cell(index)
        return self._afters[index.column()] if cell.number and cell.span == 1 else self.setting.after_width(cell)

    def needed_width(self, sheet: Sheet) -> int:
        """Pixels that `sheet` would need for every text to show whole."""
        return sum(self.setting.column_widths(sheet))

    def needed_height(self, sheet: Sheet) -> int:
        """Pixels that `sheet` would take with its rows as close as they may stand."""
        return self.setting.heading_height(sheet) + len(sheet.rows) * self._least_row()

    def row_height(self) -> int:
        """Pixels of a row as it is now."""
        return self._least_row() + self._spare_height

    def show_sheet(self, sheet: Sheet, width: int, spare_height: int) -> None:
        """Show `sheet` across `width` pixels, every row `spare_height` pixels higher than it must be."""
        self._spare_height = spare_height
        self._afters = self.setting.after_widths(sheet)
        if sheet != self.sheet():
            self._take(sheet)
        self.setAccessibleName(sheet.name)
        widths = self.setting.column_widths(sheet)
        spare = max(width - sum(widths), 0)
        step = min(_MOST_SPARE, spare // max(len(widths), 1))
        for column, needed in enumerate(widths):
            last = column == len(widths) - 1
            self.setColumnWidth(column, needed + (spare - step * column if last and not _numbers_last(sheet) else step))
        self.verticalHeader().setDefaultSectionSize(self.row_height())
        heading = self.setting.heading_height(sheet)
        self.horizontalHeader().setFixedHeight(heading)
        self.setFixedHeight(heading + len(sheet.rows) * self.row_height())
        self.setMinimumWidth(sum(widths))

    def _take(self, sheet: Sheet) -> None:
        place = self.currentIndex()
        row, column = place.row(), place.column()
        self.clearSpans()
        self._model.set_sheet(sheet)
        for number, cells in enumerate(sheet.rows):
            for start, cell in enumerate(cells):
                if cell.span > 1:
                    self.setSpan(number, start, 1, cell.span)
        if self.hasFocus() and 0 <= row < len(sheet.rows):
            self.go_to(row, min(column, len(sheet.headings) - 1))

    def go_to(self, row: int, column: int) -> None:
        """Make a cell the current one, nothing else being marked."""
        index = self._model.index(row, column)
        self.selectionModel().setCurrentIndex(index, QItemSelectionModel.SelectionFlag.ClearAndSelect)

    def copy(self) -> None:
        """Put the table on the clipboard, or the marked cells where several are."""
        QGuiApplication.clipboard().setText(self.copied())

    def copied(self) -> str:
        """What `copy` takes: the whole table with its headings, numbers plain; or several marked cells as shown."""
        marked = self.selectionModel().selectedIndexes()
        if len(marked) < 2:
            return tabbed(self.sheet().copied)
        lines: dict[int, dict[int, str]] = {}
        for index in marked:
            lines.setdefault(index.row(), {})[index.column()] = self._model.cell(index).words
        return tabbed([[line[column] for column in sorted(line)] for _, line in sorted(lines.items())])

    def currentChanged(self, current: Index, previous: Index) -> None:  # noqa: N802  # Qt calls it by this name
        """Tell the pane where the current cell lies, so that it is scrolled into sight."""
        super().currentChanged(current, previous)
        if current.isValid():
            self.walked.emit(self.visualRect(current).translated(0, self.horizontalHeader().height()))

    def event(self, event: QEvent) -> bool:
        """Claim Ctrl+C for this table, whatever the window does with it elsewhere."""
        if (
            event.type() == QEvent.Type.ShortcutOverride
            and isinstance(event, QKeyEvent)
            and event.matches(QKeySequence.StandardKey.Copy)
        ):
            event.accept()
            return True
        return super().event(event)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Copy; go past the first and the last row; leave the paging keys to the pane."""
        steps = {Qt.Key.Key_Up: -1, Qt.Key.Key_Down: 1}
        step = steps.get(Qt.Key(event.key()))
        end = 0 if step == -1 else len(self.sheet().rows) - 1
        if event.matches(QKeySequence.StandardKey.Copy):
            self.copy()
        elif step is not None and self.currentIndex().row() == end:
            self.stepped_out.emit(step)
        elif event.key() in (Qt.Key.Key_PageUp, Qt.Key.Key_PageDown):
            event.ignore()
        else:
            super().keyPressEvent(event)

    def _least_row(self) -> int:
        return self.setting.metrics["plain"].height() + _ROW_EXTRA


def _numbers_last(sheet: Sheet) -> bool:
    return bool(sheet.headings) and sheet.headings[-1].number
