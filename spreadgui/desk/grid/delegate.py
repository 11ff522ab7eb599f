"""Painting and editing of grid cells.

A wrong entry stays in its editor: the text is kept, the edge turns brick, and a note beside the cell says why. The
book changes only when the text is right.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Protocol

from PySide6.QtCore import (
    QAbstractItemModel,
    QEvent,
    QModelIndex,
    QObject,
    QPersistentModelIndex,
    QPoint,
    QRect,
    Qt,
    Signal,
    SignalInstance,
)
from PySide6.QtGui import QColor, QFontMetrics, QKeyEvent, QPainter, QPen
from PySide6.QtWidgets import (
    QAbstractItemDelegate,
    QComboBox,
    QLabel,
    QLineEdit,
    QStyle,
    QStyledItemDelegate,
    QStyleOptionViewItem,
    QTableView,
    QWidget,
)

from spreadgui.book.fields import Field
from spreadgui.desk.grid.cells import Cell, Look
from spreadgui.desk.look.theme import Theme, set_refused, tabular

Index = QModelIndex | QPersistentModelIndex
_PADDING = 6
_COMMIT_KEYS = {
    Qt.Key.Key_Return: QAbstractItemDelegate.EndEditHint.NoHint,
    Qt.Key.Key_Enter: QAbstractItemDelegate.EndEditHint.NoHint,
    Qt.Key.Key_Tab: QAbstractItemDelegate.EndEditHint.EditNextItem,
    Qt.Key.Key_Backtab: QAbstractItemDelegate.EndEditHint.EditPreviousItem,
}


class EditedColumn(Protocol):
    """What painting and editing ask of a column."""

    @property
    def heading(self) -> str: ...

    @property
    def numeric(self) -> bool: ...

    @property
    def field(self) -> Field | None: ...


class EditedModel(Protocol):
    """What painting and editing ask of a model: cells with their look, and whether a text may go into one."""

    @property
    def columns(self) -> Sequence[EditedColumn]: ...

    def cell(self, index: Index) -> Cell: ...

    def choices(self, index: Index) -> tuple[str, ...]: ...

    def typed(self, index: Index) -> str: ...

    def refusal(self, index: Index, text: str) -> str: ...

    def index(self, row: int, column: int) -> QModelIndex: ...


class GridDelegate(QStyledItemDelegate):
    """Paints from the model's cell cache and edits with checks at once.

    `committed(index, key)` tells that an entry was taken with a key, `refused(index, sentence)` that one was not.
    """

    committed = Signal(object, int)
    refused = Signal(object, str)

    def __init__(self, model: EditedModel, theme: Theme, view: QTableView) -> None:
        super().__init__(view)
        self._model = model
        self._note = EntryNote(view.viewport())
        self._wrong: QWidget | None = None  # the editor that the note speaks of
        self.set_theme(theme)

    def set_theme(self, theme: Theme) -> None:
        """Take the colours of another theme."""
        palette = theme.palette
        self._ink, self._muted = QColor(palette.ink), QColor(palette.muted)
        self._accent, self._amber, self._brick = QColor(palette.kelp), QColor(palette.amber), QColor(palette.brick)
        self._line, self._entry, self._panel = QColor(palette.line), QColor(palette.entry), QColor(palette.panel)
        self._selected = QColor(palette.kelp_soft)
        self._inks = {
            Look.OWN: self._accent,
            Look.PRICING: self._muted,
            Look.INCOMPLETE: self._amber,
            Look.REFUSED: self._brick,
            Look.BEYOND: self._amber,
        }

    # --- painting

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: Index) -> None:
        cell = self._model.cell(index)
        rect: QRect = option.rect
        state = option.state
        entry = cell.look in (Look.ENTRY, Look.MARKED, Look.OWN)
        selected = bool(state & QStyle.StateFlag.State_Selected)
        painter.fillRect(rect, self._selected if selected else self._entry if entry else self._panel)
        painter.setPen(self._line)
        painter.drawLine(rect.bottomLeft(), rect.bottomRight())
        painter.drawLine(rect.topRight(), rect.bottomRight())
        self._paint_text(painter, rect, cell.text, cell.look, index)
        if state & QStyle.StateFlag.State_HasFocus or index == self._view().currentIndex():
            painter.setPen(QPen(self._accent, 2))
            painter.drawRect(rect.adjusted(1, 1, -2, -2))

    def _paint_text(self, painter: QPainter, rect: QRect, text: str, look: Look, index: Index) -> None:
        if not text:
            return
        inner = rect.adjusted(_PADDING, 0, -_PADDING, 0)
        metrics = painter.fontMetrics()
        wide = metrics.horizontalAdvance(text) > inner.width()
        shown = metrics.elidedText(text, Qt.TextElideMode.ElideRight, inner.width()) if wide else text
        numeric = self._model.columns[index.column()].numeric
        side = Qt.AlignmentFlag.AlignRight if numeric else Qt.AlignmentFlag.AlignLeft
        painter.setPen(self._inks.get(look, self._ink))
        painter.drawText(inner, side | Qt.AlignmentFlag.AlignVCenter, shown)
        if look is Look.OWN:
            self._underline(painter, inner, metrics, shown)

    def _underline(self, painter: QPainter, inner: QRect, metrics: QFontMetrics, text: str) -> None:
        base = inner.center().y() + metrics.ascent() // 2 + 2
        painter.drawLine(inner.right() - metrics.horizontalAdvance(text) + 1, base, inner.right() + 1, base)

    # --- editing

    def createEditor(self, parent: QWidget, option: QStyleOptionViewItem, index: Index) -> QWidget:
        choices = self._model.choices(index)
        column = self._model.columns[index.column()]
        if choices:
            fixed = column.field is not None and bool(column.field.entry.choices)
            editor: QWidget = _choice_editor(parent, choices, editable=not fixed)
        else:
            editor = QLineEdit(parent)
            editor.setFont(tabular(editor.font()))
            editor.setAlignment(Qt.AlignmentFlag.AlignRight if column.numeric else Qt.AlignmentFlag.AlignLeft)
        editor.setObjectName("cellEditor")
        editor.setAccessibleName(f"{column.heading}, row {index.row() + 1}")
        cell = QPersistentModelIndex(index)
        editor.setProperty("cell", cell)
        _signal_of(editor).connect(lambda _text: self._check(editor, cell, quiet=True))
        return editor

    def updateEditorGeometry(self, editor: QWidget, option: QStyleOptionViewItem, index: Index) -> None:
        """Over the cell; a list of choices is made as wide as its words, as far as the grid reaches."""
        rect: QRect = option.rect
        if isinstance(editor, QComboBox):
            area = editor.parentWidget()
            wide = max(rect.width(), editor.sizeHint().width())
            rect.setWidth(min(wide, area.width() if area is not None else wide))
            if area is not None and rect.right() > area.width():
                rect.moveRight(area.width())
        editor.setGeometry(rect)
        if editor is self._wrong:  # the grid has scrolled: its note goes along
            self._note.stand_beside(rect)

    def setEditorData(self, editor: QWidget, index: Index) -> None:
        if not editor.property("filled"):
            _set_text(editor, self._model.typed(index))
            editor.setProperty("filled", True)

    def setModelData(self, editor: QWidget, model: QAbstractItemModel, index: Index) -> None:
        if not self._check(editor, index):
            return
        model.setData(index, _text_of(editor))

    def is_wrong(self, editor: QWidget) -> bool:
        """Whether the text in an editor cannot go into its cell; says why beside it."""
        return not self._check(editor, self._index_of(editor))

    def destroyEditor(self, editor: QWidget, index: Index) -> None:
        if editor is self._wrong:
            self._settle()
        super().destroyEditor(editor, index)

    def eventFilter(self, editor: QObject, event: QEvent) -> bool:
        """Keys that take an entry do so only if it is right; leaving a wrong one keeps it open with its note."""
        if not isinstance(editor, QWidget):
            return super().eventFilter(editor, event)
        if event.type() == QEvent.Type.KeyPress:
            assert isinstance(event, QKeyEvent)
            key = Qt.Key(event.key())
            if key in _COMMIT_KEYS:
                self._commit(editor, key)
                return True
        if event.type() == QEvent.Type.FocusOut and not self._check(editor, self._index_of(editor)):
            return False
        return super().eventFilter(editor, event)

    def _commit(self, editor: QWidget, key: Qt.Key) -> None:
        index = QPersistentModelIndex(self._index_of(editor))
        if not self._check(editor, index):
            return
        self.commitData.emit(editor)
        self.closeEditor.emit(editor, QAbstractItemDelegate.EndEditHint.NoHint)
        self.committed.emit(index, int(key))

    def _check(self, editor: QWidget, index: Index, *, quiet: bool = False) -> bool:
        """Whether the editor's text may go into the cell; shows or takes away the note. `quiet`: while typing."""
        if not index.isValid():
            return True
        reason = self._model.refusal(index, _text_of(editor))
        if not reason:
            set_refused(editor, False)
            if editor is self._wrong:
                self._settle()
        elif not quiet:
            set_refused(editor, True)
            self._wrong = editor
            self._note.say(reason, editor.geometry())
            self.refused.emit(index, reason)
        return not reason

    def _settle(self) -> None:
        self._wrong = None
        self._note.hide()

    def _view(self) -> QTableView:
        view = self.parent()
        assert isinstance(view, QTableView)
        return view

    def _index_of(self, editor: QWidget) -> QModelIndex:
        place = editor.property("cell")
        return self._model.index(place.row(), place.column()) if place is not None else QModelIndex()


class EntryNote(QLabel):
    """The sentence beside a cell that says why its entry was not taken."""

    def __init__(self, area: QWidget) -> None:
        super().__init__(area)
        self._area = area
        self.setObjectName("entryNote")
        self.setTextFormat(Qt.TextFormat.PlainText)
        self.setWordWrap(False)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.hide()

    def say(self, sentence: str, cell: QRect) -> None:
        """Show `sentence` beside `cell`."""
        self.setText(sentence)
        self.setAccessibleName(sentence)
        self.adjustSize()
        self.stand_beside(cell)
        self.show()
        self.raise_()

    def stand_beside(self, cell: QRect) -> None:
        """Stand under the cell, or above it where there is no room, never cut by the edge of the grid."""
        area = self._area.rect()
        below = cell.bottom() + 3
        y = below if below + self.height() <= area.bottom() else cell.top() - self.height() - 3
        x = max(2, min(cell.left(), area.right() - self.width() - 2))
        self.move(QPoint(x, y))


def _choice_editor(parent: QWidget, choices: tuple[str, ...], *, editable: bool) -> QComboBox:
    editor = QComboBox(parent)
    editor.addItems(list(choices))
    editor.setEditable(editable)
    if editable:
        editor.setInsertPolicy(QComboBox.InsertPolicy.NoInsert)
    return editor


def _signal_of(editor: QWidget) -> SignalInstance:
    if isinstance(editor, QComboBox):
        return editor.currentTextChanged
    assert isinstance(editor, QLineEdit)
    return editor.textChanged


def _text_of(editor: QWidget) -> str:
    if isinstance(editor, QComboBox):
        return editor.currentText()
    assert isinstance(editor, QLineEdit)
    return editor.text()


def _set_text(editor: QWidget, text: str) -> None:
    if isinstance(editor, QComboBox):
        place = editor.findText(text)
        if place >= 0:
            editor.setCurrentIndex(place)
        elif editor.isEditable():
            editor.setEditText(text)
        return
    assert isinstance(editor, QLineEdit)
    editor.setText(text)
    editor.selectAll()
