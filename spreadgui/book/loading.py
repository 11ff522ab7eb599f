"""A book from either kind of file: our own JSON, or a CSV list of positions that carry their own marks."""

from __future__ import annotations

import datetime
from pathlib import Path

from spreadgui.book.positions_csv import read_positions
from spreadgui.book.reading import read_book
from spreadgui.book.records import Book


def load(path: Path, today: datetime.date) -> Book:
    """The book at `path`; a CSV list becomes a book valued on `today`. Raises BookError with every fault."""
    if is_positions_list(path):
        return Book(title=path.stem, currency="", valuation_date=today, positions=read_positions(path))
    return read_book(path)


def is_positions_list(path: Path) -> bool:
    """Whether the name says that the file is a CSV list of positions."""
    return path.suffix.lower() == ".csv"
