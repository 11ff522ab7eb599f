"""A row of chips of which one is chosen."""

from collections.abc import Sequence

from PySide6.QtCore import QSize, Qt, Signal, Slot
from PySide6.QtGui import QFontMetrics, QKeyEvent, QStandardItemModel
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QSizePolicy, QToolButton, QWidget


class Choice(QWidget):
    """A few named choices side by side, exactly one of them chosen.

    A pane too narrow for the row turns it into a list (`set_narrow`).
    The row is one stop of the Tab key: Left and Right (or Home and End) go from choice to choice, past those that are
    switched off. `chosen(key)` is sent when the user chooses another one, never when the program does.
    """

    chosen = Signal(str)

    def __init__(self, choices: Sequence[str | tuple[str, str]], name: str, parent: QWidget | None = None) -> None:
        """`choices` are words, or pairs (key, words); `name` says what is chosen here, for a screen reader.

        ValueError if there are no choices or a key comes twice. The first choice is chosen.
        """
        super().__init__(parent)
        pairs = [(choice, choice) if isinstance(choice, str) else choice for choice in choices]
        keys = [key for key, _ in pairs]
        if not keys or len(set(keys)) != len(keys):
            raise ValueError(f"choices: expected different keys, at least one, found {keys}")
        self._chips = {key: _Chip(key, words, name, self) for key, words in pairs}
        self._row = self._make_row()
        self._list = self._make_list(pairs, name)
        self._current = keys[0]
        self.setAccessibleName(name)
        self.setSizePolicy(QSizePolicy.Policy.Fixed, QSizePolicy.Policy.Fixed)
        line = QHBoxLayout(self)
        line.setContentsMargins(0, 0, 0, 0)
        line.addWidget(self._row)
        line.addWidget(self._list)
        self._show_current()

    def current(self) -> str:
        """The key of the chosen choice."""
        return self._current

    def keys(self) -> tuple[str, ...]:
        """All keys, in order."""
        return tuple(self._chips)

    def set_current(self, key: str) -> None:
        """Choose `key` without sending `chosen`; KeyError if there is none."""
        if key not in self._chips:
            raise KeyError(f"choice: no {key!r} among {', '.join(self._chips)}")
        self._current = key
        self._show_current()

    def set_available(self, key: str, available: bool, why: str = "") -> None:
        """Switch one choice on or off; `why` is the tooltip that says the reason. KeyError if there is none."""
        self._chips[key].setEnabled(available)
        self._chips[key].setToolTip(why)
        model = self._list.model()
        if isinstance(model, QStandardItemModel):
            item = model.item(self.keys().index(key))
            item.setEnabled(available)
            item.setToolTip(why)

    def is_narrow(self) -> bool:
        """Whether the choices stand in a list, for want of room."""
        return not self._list.isHidden()

    def set_narrow(self, narrow: bool) -> None:
        """Show the choices as a list (True) or as the row; the keyboard stays where it is."""
        if narrow == self.is_narrow():
            return
        had_focus = self._list.hasFocus() or any(chip.hasFocus() for chip in self._chips.values())
        self._list.setVisible(narrow)
        self._row.setVisible(not narrow)
        if had_focus:
            (self._list if narrow else self._chips[self._current]).setFocus()

    def row_width(self) -> int:
        """Pixels that the whole row needs."""
        return self._row.sizeHint().width()

    def list_width(self) -> int:
        """Pixels that the list needs."""
        return self._list.sizeHint().width()

    def _make_row(self) -> QWidget:
        row = QWidget(self)
        line = QHBoxLayout(row)
        line.setContentsMargins(0, 0, 0, 0)
        line.setSpacing(2)
        for chip in self._chips.values():
            line.addWidget(chip)
            chip.clicked.connect(self._chip_clicked)
            chip.stepped.connect(self._step)
        return row

    def _make_list(self, pairs: Sequence[tuple[str, str]], name: str) -> QComboBox:
        narrow = QComboBox(self)
        for key, words in pairs:
            narrow.addItem(words, key)
        narrow.setAccessibleName(name)
        narrow.activated.connect(self._list_chosen)
        narrow.hide()
        return narrow

    def _show_current(self) -> None:
        for key, chip in self._chips.items():
            chip.setChecked(key == self._current)
            # One stop of the Tab key for the whole row, as for tabs.
            chip.setFocusPolicy(Qt.FocusPolicy.TabFocus if key == self._current else Qt.FocusPolicy.NoFocus)
        self._list.setCurrentIndex(self.keys().index(self._current))

    def _choose(self, key: str) -> None:
        changed = key != self._current
        self.set_current(key)
        if changed:
            self.chosen.emit(key)

    @Slot()
    def _chip_clicked(self) -> None:
        chip = self.sender()
        if isinstance(chip, _Chip):
            self._choose(chip.key)

    @Slot(int)
    def _list_chosen(self, index: int) -> None:
        self._choose(self.keys()[index])

    @Slot(int)
    def _step(self, step: int) -> None:
        """Go `step` choices on among those that are switched on, stopping at either end."""
        usable = [key for key, chip in self._chips.items() if chip.isEnabled() or key == self._current]
        place = usable.index(self._current) + step
        key = usable[max(0, min(place, len(usable) - 1))]
        self._choose(key)
        self._chips[key].setFocus(Qt.FocusReason.TabFocusReason)


# More steps than any row has choices: to its end.
_ALL = 1000
_STEPS = {Qt.Key.Key_Left: -1, Qt.Key.Key_Right: 1, Qt.Key.Key_Home: -_ALL, Qt.Key.Key_End: _ALL}


class _Chip(QToolButton):
    """One choice; as wide as its words in bold, so that the row stands still when another one is chosen."""

    stepped = Signal(int)

    def __init__(self, key: str, words: str, group: str, parent: QWidget) -> None:
        super().__init__(parent)
        self.key = key
        self.setText(words)
        self.setCheckable(True)
        self.setAccessibleName(words)
        self.setAccessibleDescription(group)
        self.setToolButtonStyle(Qt.ToolButtonStyle.ToolButtonTextOnly)

    def sizeHint(self) -> QSize:
        """The room of the words in bold."""
        font = self.font()
        plain = QFontMetrics(font).horizontalAdvance(self.text())
        font.setBold(True)
        extra = QFontMetrics(font).horizontalAdvance(self.text()) - plain
        hint = super().sizeHint()
        return QSize(hint.width() + (0 if self.isChecked() else max(extra, 0)), hint.height())

    def minimumSizeHint(self) -> QSize:
        """Never cut."""
        return self.sizeHint()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """The arrow keys go along the row; every other key does what it does on a button."""
        step = _STEPS.get(Qt.Key(event.key()))
        if step is None:
            super().keyPressEvent(event)
            return
        mirrored = self.layoutDirection() == Qt.LayoutDirection.RightToLeft and abs(step) == 1
        self.stepped.emit(-step if mirrored else step)
