"""Blocks of marks as tab-separated text, out to the clipboard and back."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import QItemSelectionRange, QModelIndex

from spreadgui.book.entries import EntryError
from spreadgui.desk.markets.marks_model import MarksModel


def block_text(model: MarksModel, blocks: Sequence[QItemSelectionRange]) -> str:
    """The smallest rectangle that holds the selected cells, each as it would be typed; tab and line break between."""
    if not blocks:
        return ""
    rows = range(min(one.top() for one in blocks), max(one.bottom() for one in blocks) + 1)
    places = range(min(one.left() for one in blocks), max(one.right() for one in blocks) + 1)
    return "".join("\t".join(model.typed(model.index(row, place)).strip() for place in places) + "\n" for row in rows)


def texts_of_block(model: MarksModel, start: QModelIndex, text: str) -> dict[int, dict[int, str]]:
    """The cells that a pasted block goes into, from `start` on; EntryError where it does not fit or one is refused."""
    lines = text.rstrip("\n").split("\n")
    cells: dict[int, dict[int, str]] = {}
    for down, line in enumerate(lines):
        for across, typed in enumerate(line.rstrip("\r").split("\t")):
            row, place = start.row() + down, start.column() + across
            if row >= model.rowCount() or place >= model.columnCount():
                raise EntryError(f"the block of {len(lines)} lines reaches beyond the table")
            column = model.columns[place]
            if column.field is None:
                if typed.strip() != model.typed(model.index(row, place)).strip():
                    raise EntryError(f"{column.heading.lower()} of {model.period(row).name} cannot be typed over")
                continue
            if reason := model.refusal(model.index(row, place), typed):
                raise EntryError(f"{column.heading.lower()} of {model.period(row).name}: {reason}")
            cells.setdefault(row, {})[place] = typed
    return cells
