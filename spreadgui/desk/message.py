"""The message strip: one sentence to the user above the panes, until it is put away or another takes its place."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QSizePolicy, QToolButton, QWidget


class MessageStrip(QFrame):
    """Hidden while there is nothing to say. Never takes the keyboard away from where it is."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("messageStrip")
        self._text = QLabel()
        self._text.setTextFormat(Qt.TextFormat.PlainText)
        self._text.setWordWrap(True)
        self._text.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Preferred)
        self._text.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self._away = QToolButton()
        self._away.setText("Put away")
        self._away.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self._away.clicked.connect(self.put_away)
        row = QHBoxLayout(self)
        row.setContentsMargins(12, 4, 6, 4)
        row.addWidget(self._text, 1)
        row.addWidget(self._away)
        self.hide()

    def say(self, sentence: str, details: str = "") -> None:
        """Show `sentence`; `details` are told when the pointer rests on it."""
        self._text.setText(sentence)
        self._text.setToolTip(details)
        self.setAccessibleName(sentence)
        self.show()

    def put_away(self) -> None:
        """Hide the strip and forget what it said."""
        self._text.clear()
        self.hide()

    def sentence(self) -> str:
        """What is being said; empty where nothing is."""
        return self._text.text()
