"""The Blends pane: what mixes of markets legs can name."""

from __future__ import annotations

from PySide6.QtCore import Qt, Signal, Slot
from PySide6.QtGui import QAction
from PySide6.QtWidgets import QHBoxLayout, QToolButton, QVBoxLayout, QWidget

from spreadgui.desk.grid.view import PlainGridView
from spreadgui.desk.look.pane import ElidedLabel, Pane
from spreadgui.desk.look.theme import Theme, set_rank, set_tone
from spreadgui.desk.markets.blends_model import BlendsModel
from spreadgui.desk.workbench import Workbench

_WIDTHS = (150, 84, 190, 84)
_HOW = (
    "A blend stands as one leg at the weighted sum of its markets; volatility and correlation match its first two "
    "moments and its covariance with the other leg. Type into the last row for one more part."
)


class BlendsPane(Pane):
    """The table of blends in its frame. `told(sentence)` says what a person should know."""

    told = Signal(str)

    def __init__(self, workbench: Workbench, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__("Blends", parent=parent)
        self._workbench = workbench
        self.model = BlendsModel(workbench, self)
        self.view = PlainGridView(self.model, theme)
        self._remove = QToolButton()
        self._lay_out_body()
        self.view.cells.refused.connect(lambda _index, sentence: self.told.emit(f"Not entered: {sentence}"))
        self._remove.clicked.connect(self.remove_rows)
        workbench.followed.connect(self._show_count)
        self._show_count()

    def set_theme(self, theme: Theme) -> None:
        """Take the colours and sizes of another theme."""
        self.view.set_theme(theme)

    def remove_rows(self) -> None:
        """Take the selected parts out."""
        self.model.remove_rows(self.view.selected_rows())

    def _lay_out_body(self) -> None:
        self.view.setAccessibleName("Blends")
        self.view.verticalHeader().hide()
        for place, width in enumerate(_WIDTHS):
            self.view.setColumnWidth(place, width)
        self._remove.setText("Remove parts")
        action = QAction("Remove parts", self.view)
        action.triggered.connect(self.remove_rows)
        self.view.addAction(action)
        self.view.setContextMenuPolicy(Qt.ContextMenuPolicy.ActionsContextMenu)
        how = ElidedLabel(_HOW)
        set_rank(how, "small")
        set_tone(how, "muted")
        line = QHBoxLayout()
        line.addWidget(self._remove)
        line.addWidget(how, 1)
        body = QWidget()
        body.setObjectName("paneBody")
        column = QVBoxLayout(body)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(4)
        column.addWidget(self.view, 1)
        column.addLayout(line)
        self.set_body(body)

    @Slot()
    def _show_count(self) -> None:
        book = self._workbench.book
        names = {blend.name for blend in book.blends}
        used = sum(bool({one.long_leg, one.short_leg} & names) for one in book.positions)
        self.set_subtitle(f"{len(names)} blend{'' if len(names) == 1 else 's'} · legs of {used} positions")
