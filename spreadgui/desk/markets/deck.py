"""What stands under Positions: the panes of the markets, one at a time."""

from __future__ import annotations

from PySide6.QtCore import Signal, Slot
from PySide6.QtWidgets import QStackedWidget, QVBoxLayout, QWidget

from spreadgui.desk.look.choice import Choice
from spreadgui.desk.look.theme import Theme
from spreadgui.desk.markets.blends_pane import BlendsPane
from spreadgui.desk.markets.correlations_pane import CorrelationsPane
from spreadgui.desk.markets.marks_pane import MarksPane
from spreadgui.desk.workbench import Workbench


class MarketDeck(QWidget):
    """Marks, Correlations and Blends, with chips to choose between them.

    `told(sentence)` says what a person should know.
    """

    told = Signal(str)

    def __init__(self, workbench: Workbench, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.marks = MarksPane(workbench, theme)
        self.correlations = CorrelationsPane(workbench, theme)
        self.blends = BlendsPane(workbench, theme)
        self._panes: dict[str, MarksPane | CorrelationsPane | BlendsPane] = {
            "marks": self.marks,
            "correlations": self.correlations,
            "blends": self.blends,
        }
        self.choice = Choice([("marks", "Marks"), ("correlations", "Correlations"), ("blends", "Blends")], "Markets")
        self._stack = QStackedWidget()
        for pane in self._panes.values():
            self._stack.addWidget(pane)
            pane.told.connect(self.told)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(2)
        column.addWidget(self.choice)
        column.addWidget(self._stack, 1)
        self.choice.chosen.connect(self.show_pane)

    @Slot(str)
    def show_pane(self, key: str) -> None:
        """Bring a pane to the front: "marks", "correlations" or "blends"; KeyError for none of them."""
        self._stack.setCurrentWidget(self._panes[key])
        self.choice.set_current(key)

    def go_to(self, key: str) -> None:
        """The same, and put the keyboard into its table."""
        self.show_pane(key)
        self._panes[key].view.setFocus()

    def set_theme(self, theme: Theme) -> None:
        """Take the colours and sizes of another theme."""
        for pane in self._panes.values():
            pane.set_theme(theme)
