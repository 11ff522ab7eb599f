"""The Correlations pane: the matrix of the book's markets, whether it can be, and the nearest that can."""

from __future__ import annotations

from PySide6.QtCore import Qt, QTimer, Signal, Slot
from PySide6.QtWidgets import QDialog, QDialogButtonBox, QHBoxLayout, QLabel, QToolButton, QVBoxLayout, QWidget

from spreadgui.book.changes import set_book
from spreadgui.book.records import Book
from spreadgui.desk.grid.view import PlainGridView
from spreadgui.desk.look.pane import ElidedLabel, Pane
from spreadgui.desk.look.theme import Theme, set_tone
from spreadgui.desk.markets.correlations_model import CorrelationsModel
from spreadgui.desk.panels.sheet_view import SheetView
from spreadgui.desk.panels.sheets import Cell, Heading, Sheet, signed_text
from spreadgui.desk.workbench import Workbench
from spreadgui.market.mending import Mend, mended
from spreadgui.market.together import Together, check
from spreadgui.valuation.shown import number_text

EMPTY = "The book has no market yet: the correlations of its markets stand here."
# The check waits for the hand to rest; it takes a few milliseconds.
_PATIENCE_MS = 120
_TIE_WIDTH, _WIDTH = 64, 76


class CorrelationsPane(Pane):
    """The matrix in its frame. `told(sentence)` says what a person should know."""

    told = Signal(str)

    def __init__(self, workbench: Workbench, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__("Correlations", parent=parent)
        self._workbench, self._theme = workbench, theme
        self._checked: Together | None = None
        self.model = CorrelationsModel(workbench, self)
        self.view = PlainGridView(self.model, theme)
        self.verdict = ElidedLabel()
        self.offer = QToolButton()
        self._rest = QTimer(self, singleShot=True, interval=_PATIENCE_MS)
        self._lay_out_body()
        self._rest.timeout.connect(self.check)
        self.offer.clicked.connect(self._offer)
        self.view.cells.refused.connect(lambda _index, sentence: self.told.emit(f"Not entered: {sentence}"))
        self.model.modelReset.connect(self._size_columns)
        workbench.followed.connect(self._on_followed)
        self._on_followed()
        self.check()

    def set_theme(self, theme: Theme) -> None:
        """Take the colours and sizes of another theme."""
        self._theme = theme
        self.view.set_theme(theme)

    @property
    def checked(self) -> Together | None:
        """What the last check found."""
        return self._checked

    @Slot()
    def check(self) -> None:
        """Say whether the correlations of all contracts in use can exist together."""
        self._rest.stop()
        found = self._checked = check(self._workbench.book)
        self.offer.setVisible(not found.possible)
        set_tone(self.verdict, "muted" if found.possible else "brick")
        self.verdict.set_text(_verdict(found))

    def mend(self) -> Mend:
        """The change that would make the correlations possible."""
        return mended(self._workbench.book)

    def accept(self, mend: Mend) -> None:
        """Take the offered correlations over, as one change."""
        words = f"move {len(mend.moves)} correlations to the nearest that can be"
        self._workbench.apply(set_book(self._workbench.book, "correlations", mend.correlations, words))

    def _lay_out_body(self) -> None:
        self.view.setAccessibleName("Correlations")
        self.offer.setText("Nearest that can be…")
        self.offer.setToolTip("Show every correlation that would have to move, and take them over or leave them.")
        line = QHBoxLayout()
        line.addWidget(self.verdict, 1)
        line.addWidget(self.offer)
        body = QWidget()
        body.setObjectName("paneBody")
        column = QVBoxLayout(body)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(4)
        column.addWidget(self.view, 1)
        column.addLayout(line)
        self.set_body(body)
        self._size_columns()

    @Slot()
    def _size_columns(self) -> None:
        for place in range(self.model.columnCount()):
            self.view.setColumnWidth(place, _WIDTH if place else _TIE_WIDTH)

    @Slot()
    def _on_followed(self) -> None:
        book: Book = self._workbench.book
        if not book.markets:
            self.set_subtitle("")
            self.show_empty(EMPTY)
            return
        self.show_body()
        pairs = len(book.markets) * (len(book.markets) - 1) // 2
        self.set_subtitle(f"{len(book.correlations)} of {pairs} pairs · in per cent, of log-returns for one delivery")
        self._rest.start()

    @Slot()
    def _offer(self) -> None:
        mend = self.mend()
        dialog = MendDialog(mend, self._theme, self)
        if dialog.exec() == QDialog.DialogCode.Accepted:
            self.accept(mend)


class MendDialog(QDialog):
    """Every correlation that would move, to be taken over together or left."""

    def __init__(self, mend: Mend, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setWindowTitle("Nearest correlations that can be")
        sentence = QLabel(f"{mend.before.sentence[:1].upper()}{mend.before.sentence[1:]}.")
        offer = QLabel(f"{mend.sentence[:1].upper()}{mend.sentence[1:]}. Undo takes it back.")
        for label in (sentence, offer):
            label.setWordWrap(True)
            label.setTextFormat(Qt.TextFormat.PlainText)
        set_tone(offer, "muted")
        self.moves = SheetView(theme)
        self.buttons = QDialogButtonBox()
        self.buttons.addButton("Take over", QDialogButtonBox.ButtonRole.AcceptRole)
        self.buttons.addButton("Leave as they are", QDialogButtonBox.ButtonRole.RejectRole)
        self.buttons.accepted.connect(self.accept)
        self.buttons.rejected.connect(self.reject)
        column = QVBoxLayout(self)
        for part in (sentence, self.moves, offer, self.buttons):
            column.addWidget(part)
        sheet = moves_sheet(mend)
        self.moves.show_sheet(sheet, self.moves.needed_width(sheet), 2)
        self.setMinimumWidth(460)


def moves_sheet(mend: Mend) -> Sheet:
    """One row for each correlation that moves, the furthest first."""
    moves = sorted(mend.moves, key=lambda move: -abs(move.new - move.old))
    headings = (
        Heading("Market"), Heading("Market"), Heading("Now, %", number=True), Heading("Nearest, %", number=True),
        Heading("Move, points", number=True),
    )  # fmt: skip
    rows = tuple(
        (
            Cell(move.first),
            Cell(move.second),
            Cell(number_text(100 * move.old, 2), number=True),
            Cell(number_text(100 * move.new, 2), number=True, strong=True),
            Cell(signed_text(100 * (move.new - move.old), 2), number=True),
        )
        for move in moves
    )
    copied = tuple((move.first, move.second, repr(move.old), repr(move.new)) for move in moves)
    return Sheet("Moves", headings, rows, (("Market", "Market", "Now", "Nearest"), *copied))


def _verdict(found: Together) -> str:
    if not found.possible:
        return f"{found.sentence[:1].upper()}{found.sentence[1:]}."
    count = len(found.contracts)
    said = f"The correlations of the {count} contracts in use can exist together"
    remark = f"; {found.remark}" if found.remark else ""
    return f"{said} (smallest eigenvalue {found.smallest_eigenvalue:.2g}){remark}."
