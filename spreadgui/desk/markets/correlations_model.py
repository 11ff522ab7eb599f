"""The Qt model of Correlations: the symmetric matrix of a book's markets, with each market's tie strength before it."""

from __future__ import annotations

from dataclasses import dataclass

import msgspec
from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, QPersistentModelIndex, Qt, Slot

from spreadgui.book import entries
from spreadgui.book.changes import set_book, set_market
from spreadgui.book.entries import EntryError, quoted
from spreadgui.book.fields import Field
from spreadgui.book.records import Book, Correlation, Market
from spreadgui.desk.grid.cells import Cell, Look
from spreadgui.desk.workbench import Workbench
from spreadgui.valuation.shown import trimmed_text
from spreadgui.valuation.typed import number_in_percent, percent_text

Index = QModelIndex | QPersistentModelIndex
_NOWHERE = QModelIndex()
_DISPLAY, _EDIT, _TOOLTIP, _ALIGNMENT, _ACCESSIBLE = (
    int(role)
    for role in (
        Qt.ItemDataRole.DisplayRole,
        Qt.ItemDataRole.EditRole,
        Qt.ItemDataRole.ToolTipRole,
        Qt.ItemDataRole.TextAlignmentRole,
        Qt.ItemDataRole.AccessibleTextRole,
    )
)
_RIGHT = int(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
_READABLE = Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable
_TIE = 0  # the place of the tie strengths; the markets follow
_TIE_FIELD = Field("tie_strength", entries.NUMBER, "Tie strength", "")
_PAIR_FIELD = Field("correlation", entries.WORDS, "Correlation", "")


@dataclass(frozen=True)
class MatrixColumn:
    """One column: the tie strengths, or the correlations with one market."""

    heading: str
    field: Field | None
    numeric: bool = True


class CorrelationsModel(QAbstractTableModel):
    """Markets as rows, and as columns once more."""

    def __init__(self, workbench: Workbench, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._workbench = workbench
        self._names: tuple[str, ...] = ()
        self._pairs: dict[frozenset[str], Correlation] = {}
        self.columns: tuple[MatrixColumn, ...] = ()
        self._look_up()
        workbench.followed.connect(self._on_followed)

    # --- what the view asks

    def rowCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else len(self._names)

    def columnCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else len(self.columns)

    def data(self, index: Index, role: int = _DISPLAY) -> object:
        if role == _DISPLAY:
            return self.cell(index).text
        if role == _ALIGNMENT:
            return _RIGHT
        if role == _EDIT:
            return self.typed(index)
        if role == _TOOLTIP:
            return self.tip(index) or None
        if role == _ACCESSIBLE:
            return f"{self._words(index)}: {self.cell(index).text or 'none'}"
        return None

    def flags(self, index: Index) -> Qt.ItemFlag:
        return _READABLE if self._is_diagonal(index) else _READABLE | Qt.ItemFlag.ItemIsEditable

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = _DISPLAY) -> object:
        if role == _DISPLAY:
            if orientation == Qt.Orientation.Vertical:
                return self._names[section]
            return _broken(self.columns[section].heading)
        if role == _ALIGNMENT and orientation == Qt.Orientation.Horizontal:
            return _RIGHT
        return None

    def setData(self, index: Index, value: object, role: int = _EDIT) -> bool:
        """Take a text that was typed into a cell; False where it is refused (`refusal` then says why)."""
        text = str(value)
        if role != _EDIT or self._is_diagonal(index) or self.refusal(index, text):
            return False
        if text.strip() != self.typed(index):
            self._set_tie(index.row(), text) if index.column() == _TIE else self._set_pair(index, text)
        return True

    # --- what painting and editing ask

    def cell(self, index: Index) -> Cell:
        """A cell's text and look: correlations in per cent, empty where the book has none."""
        if self._is_diagonal(index):
            return Cell("100", Look.COMPUTED)
        if index.column() == _TIE:
            return Cell(trimmed_text(self._market(index.row()).tie_strength, 4, 2), Look.ENTRY)
        pair = self.pair(index)
        if pair is None:
            return Cell("", Look.ENTRY)
        look = Look.ENTRY if pair.standard_error is None else Look.OWN
        error = "" if pair.standard_error is None else f" ±{trimmed_text(100.0 * pair.standard_error, 2)}"
        return Cell(trimmed_text(100.0 * pair.correlation, 4, 1) + error, look)

    def text_of(self, row: int, column: int) -> str:
        """What a cell shows."""
        return self.cell(self.index(row, column)).text

    def pair(self, index: Index) -> Correlation | None:
        """The book's entry behind a cell."""
        return self._pairs.get(frozenset((self._names[index.row()], self.columns[index.column()].heading)))

    def choices(self, index: Index) -> tuple[str, ...]:
        """Correlations are typed, never chosen from a list."""
        return ()

    def typed(self, index: Index) -> str:
        """What an editor starts with, to the last digit."""
        if self._is_diagonal(index):
            return "100"
        if index.column() == _TIE:
            return _TIE_FIELD.entry.text(self._market(index.row()).tie_strength)
        pair = self.pair(index)
        if pair is None:
            return ""
        error = "" if pair.standard_error is None else f" ± {percent_text(pair.standard_error)}"
        return percent_text(pair.correlation) + error

    def tip(self, index: Index) -> str:
        """What a pointer resting on a cell tells: the pair, and where its correlation came from."""
        if self._is_diagonal(index):
            return "A market with itself. Two deliveries of it: exp(−tie strength × years apart)."
        if index.column() == _TIE:
            return f"How fast the correlation of two deliveries of {self._names[index.row()]} decays, per year apart."
        pair = self.pair(index)
        if pair is None:
            return f"{self._words(index)}: not in the book."
        error = "" if pair.standard_error is None else f" ± {100.0 * pair.standard_error:.2f} (one standard error)"
        return f"{self._words(index)}: {100.0 * pair.correlation:g} %{error}. {pair.note}".strip()

    def refusal(self, index: Index, text: str) -> str:
        """Why `text` cannot go into a cell, as one sentence; empty where it can."""
        try:
            if index.column() == _TIE:
                if entries.number(text) < 0.0:
                    return f"expected a tie strength of zero or more, got {quoted(text)}"
            elif text.strip():
                value, error = read_pair(text)
                if abs(value) > 1.0:
                    return f"expected a correlation from −100 to 100 %, got {quoted(text)}"
                if error is not None and error < 0.0:
                    return f"expected a standard error of 0 or more, got {quoted(text)}"
        except EntryError as error:
            return str(error)
        return ""

    # --- inside

    def _words(self, index: Index) -> str:
        return f"{self._names[index.row()]} and {self.columns[index.column()].heading}"

    def _is_diagonal(self, index: Index) -> bool:
        return index.column() == index.row() + 1

    def _market(self, row: int) -> Market:
        return self._workbench.book.markets[row]

    def _set_tie(self, row: int, text: str) -> None:
        market = msgspec.structs.replace(self._market(row), tie_strength=entries.number(text))
        self._workbench.apply(set_market(self._workbench.book, row, market, f"set the tie strength of {market.name}"))

    def _set_pair(self, index: Index, text: str) -> None:
        first, second = self._names[index.row()], self.columns[index.column()].heading
        value, error = read_pair(text) if text.strip() else (None, None)
        book = self._workbench.book
        pairs = with_correlation(book, first, second, value, error)
        self._workbench.apply(set_book(book, "correlations", pairs, f"set the correlation of {first} and {second}"))

    def _look_up(self) -> None:
        book = self._workbench.book
        self._names = tuple(market.name for market in book.markets)
        self._pairs = {frozenset((pair.first, pair.second)): pair for pair in book.correlations}
        self.columns = (
            MatrixColumn("Tie strength", _TIE_FIELD),
            *(MatrixColumn(name, _PAIR_FIELD) for name in self._names),
        )

    @Slot()
    def _on_followed(self) -> None:
        names = self._names
        self._look_up()
        if names != self._names:
            self.beginResetModel()
            self.endResetModel()
        elif names:
            self.dataChanged.emit(self.index(0, 0), self.index(len(names) - 1, len(names)))


def read_pair(text: str) -> tuple[float, float | None]:
    """A correlation as it is typed, in per cent, with its standard error where one is given: "80" or "80 ± 4"; raises
    EntryError."""
    value, given, error = text.replace("+-", "±").replace("+/-", "±").partition("±")
    return number_in_percent(value), number_in_percent(error) if given else None


def with_correlation(
    book: Book, first: str, second: str, value: float | None, error: float | None = None
) -> tuple[Correlation, ...]:
    """The book's correlations with one pair typed: put in its place, added at the end, or (None) taken out. Where it
    came from before is forgotten."""
    wanted = frozenset((first, second))
    kept = [pair for pair in book.correlations if frozenset((pair.first, pair.second)) != wanted]
    if value is None:
        return tuple(kept)
    if len(kept) == len(book.correlations):
        return (*kept, Correlation(first, second, value, error))
    return tuple(
        msgspec.structs.replace(pair, correlation=value, standard_error=error, note="")
        if frozenset((pair.first, pair.second)) == wanted
        else pair
        for pair in book.correlations
    )


def _broken(name: str) -> str:
    """A market's name over two lines, for a narrow heading."""
    words = name.split(" ")
    middle = (len(words) + 1) // 2
    return " ".join(words[:middle]) + ("\n" + " ".join(words[middle:]) if len(words) > 1 else "")
