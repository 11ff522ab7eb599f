"""The Qt model of Blends: one row a part, and an empty one at the end for the next; a thin adapter."""

from __future__ import annotations

from dataclasses import dataclass

import msgspec
from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, QPersistentModelIndex, Qt, Slot

from spreadgui.book import entries
from spreadgui.book.changes import set_book
from spreadgui.book.entries import EntryError, quoted
from spreadgui.book.fields import Field
from spreadgui.book.records import Blend, Part
from spreadgui.desk.grid.cells import Cell, Look
from spreadgui.desk.workbench import Workbench
from spreadgui.valuation.shown import trimmed_text

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
_LEFT = int(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter)
_EDITABLE = Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable | Qt.ItemFlag.ItemIsEditable


@dataclass(frozen=True)
class BlendColumn:
    """One column of Blends."""

    key: str
    heading: str
    help: str
    field: Field | None
    numeric: bool = False


COLUMNS = (
    BlendColumn("name", "Blend", "What legs call it. The same name on several rows is one blend.",
                Field("name", entries.WORDS, "Blend", "")),
    BlendColumn("unit", "Unit", "Money over what is delivered, as CRN/MWh.", Field("unit", entries.WORDS, "Unit", "")),
    BlendColumn("market", "Market", "A market that it is made of.", Field("market", entries.WORDS, "Market", "")),
    BlendColumn("weight", "Weight", "Units of the market for one unit of the blend.",
                Field("weight", entries.NUMBER, "Weight", ""), numeric=True),
)  # fmt: skip


@dataclass(frozen=True)
class Row:
    """A part of a blend. A blend without parts has one row, without a market."""

    name: str
    unit: str
    market: str = ""
    weight: float | None = None


class BlendsModel(QAbstractTableModel):
    """Parts as rows, COLUMNS as columns; typing into the last row begins a new part."""

    def __init__(self, workbench: Workbench, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._workbench = workbench
        self.columns = COLUMNS
        self._rows = rows_of(workbench.book.blends)
        workbench.followed.connect(self._on_followed)

    # --- what the view asks

    def rowCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else len(self._rows) + 1

    def columnCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else len(COLUMNS)

    def data(self, index: Index, role: int = _DISPLAY) -> object:
        if role == _DISPLAY:
            return self.cell(index).text
        if role == _EDIT:
            return self.typed(index)
        if role == _ALIGNMENT:
            return _RIGHT if COLUMNS[index.column()].numeric else _LEFT
        if role == _TOOLTIP:
            return self.typed(index) or None
        if role == _ACCESSIBLE:
            return f"{COLUMNS[index.column()].heading}: {self.typed(index) or 'empty'}"
        return None

    def flags(self, _index: Index) -> Qt.ItemFlag:
        return _EDITABLE

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = _DISPLAY) -> object:
        if orientation == Qt.Orientation.Vertical:
            return None
        column = COLUMNS[section]
        return {_DISPLAY: column.heading, _TOOLTIP: column.help, _ALIGNMENT: _RIGHT if column.numeric else _LEFT}.get(
            role
        )

    def setData(self, index: Index, value: object, role: int = _EDIT) -> bool:
        """Take a text that was typed into a cell; False where it is refused (`refusal` then says why)."""
        text = str(value)
        if role != _EDIT or self.refusal(index, text):
            return False
        if text.strip() != self.typed(index):
            self._set(index.row(), COLUMNS[index.column()].key, text.strip())
        return True

    # --- what painting and editing ask

    def cell(self, index: Index) -> Cell:
        """A cell's text and look."""
        if COLUMNS[index.column()].key == "weight" and index.row() < len(self._rows):
            weight = self._rows[index.row()].weight
            return Cell("" if weight is None else trimmed_text(weight, 6, 0), Look.ENTRY)
        return Cell(self.typed(index), Look.ENTRY)

    def choices(self, index: Index) -> tuple[str, ...]:
        """The book's markets for a part; all else is typed."""
        if COLUMNS[index.column()].key != "market":
            return ()
        return tuple(market.name for market in self._workbench.book.markets)

    def typed(self, index: Index) -> str:
        """What stands in a cell; the last row is empty but for the blend above, which a part goes into."""
        key = COLUMNS[index.column()].key
        if index.row() >= len(self._rows):
            return ""
        value = getattr(self._rows[index.row()], key)
        return entries.NUMBER.text(value) if key == "weight" else str(value)

    def refusal(self, index: Index, text: str) -> str:
        """Why `text` cannot go into a cell, as one sentence; empty where it can."""
        key, bare = COLUMNS[index.column()].key, text.strip()
        if key == "weight":
            try:
                return (
                    ""
                    if not bare or entries.number(bare) > 0.0
                    else f"expected a weight above zero, got {quoted(bare)}"
                )
            except EntryError as error:
                return str(error)
        markets = {market.name for market in self._workbench.book.markets}
        if key == "market" and bare and bare not in markets:
            return f"there is no market {quoted(bare)} in this book"
        if key == "name" and bare in markets:
            return f"{quoted(bare)} is the name of a market"
        if key == "name" and not bare and index.row() < len(self._rows):
            return "a blend needs a name"
        return ""

    def remove_rows(self, rows: list[int]) -> None:
        """Take parts out; a blend goes with its last part."""
        kept = [row for place, row in enumerate(self._rows) if place not in set(rows)]
        if len(kept) < len(self._rows):
            self._apply(kept, "remove parts of blends")

    # --- inside

    def _set(self, place: int, key: str, text: str) -> None:
        rows = list(self._rows)
        if place >= len(rows):
            above = rows[-1] if rows else Row("", "")
            name = text if key == "name" else above.name or "New blend"
            unit = above.unit if name == above.name else f"{self._workbench.book.currency}/MWh"
            rows.append(Row(name, unit))
            place = len(rows) - 1
        old = rows[place]
        value = (entries.number(text) if text else None) if key == "weight" else text
        rows[place] = Row(**{**{one: getattr(old, one) for one in ("name", "unit", "market", "weight")}, key: value})
        if key in ("name", "unit") and old.name:  # what is said of a blend holds for all its rows
            rows = [
                Row(rows[place].name, rows[place].unit, row.market, row.weight) if row.name == old.name else row
                for row in rows
            ]
        self._apply(rows, f"set the {key} of the blend {rows[place].name}")

    def _apply(self, rows: list[Row], words: str) -> None:
        book = self._workbench.book
        self._workbench.apply(set_book(book, "blends", blends_of(rows, book.blends), words))

    @Slot()
    def _on_followed(self) -> None:
        """An editor may be open on a row that stays: only rows that go away reset the model."""
        rows = rows_of(self._workbench.book.blends)
        more = len(rows) - len(self._rows)
        if rows == self._rows:
            return
        if more < 0:
            self.beginResetModel()
            self._rows = rows
            self.endResetModel()
            return
        if more:
            self.beginInsertRows(_NOWHERE, len(self._rows) + 1, len(rows))
        self._rows = rows
        if more:
            self.endInsertRows()
        self.dataChanged.emit(self.index(0, 0), self.index(len(rows), len(COLUMNS) - 1))


def rows_of(blends: tuple[Blend, ...]) -> list[Row]:
    """The rows that stand for these blends."""
    rows: list[Row] = []
    for blend in blends:
        rows += [Row(blend.name, blend.unit, part.market, part.weight) for part in blend.parts]
        if not blend.parts:
            rows.append(Row(blend.name, blend.unit))
    return rows


def blends_of(rows: list[Row], before: tuple[Blend, ...]) -> tuple[Blend, ...]:
    """The blends that rows stand for, in their order, each keeping its note. A weight left empty is one."""
    notes = {blend.name: blend.note for blend in before}
    blends: dict[str, Blend] = {}
    for row in rows:
        blend = blends.setdefault(row.name, Blend(row.name, row.unit, note=notes.get(row.name, "")))
        if row.market:
            part = Part(row.market, 1.0 if row.weight is None else row.weight)
            blends[row.name] = msgspec.structs.replace(blend, parts=(*blend.parts, part))
    return tuple(blends.values())
