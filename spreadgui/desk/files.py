"""Opening, saving and remembering books. The book that is open stays untouched until another has been read whole."""

from __future__ import annotations

import datetime
from pathlib import Path

import msgspec
from PySide6.QtCore import QObject, QSettings, Signal
from PySide6.QtWidgets import QFileDialog, QMessageBox, QWidget

from spreadgui.book.faults import BookError
from spreadgui.book.loading import is_positions_list, load
from spreadgui.book.records import Book
from spreadgui.book.writing import write_book
from spreadgui.desk.workbench import Workbench

_FILTER = "Books (*.json);;Lists of positions (*.csv);;All files (*)"
_MOST_RECENT = 8
_MOST_TOLD = 3
_RECENT = "books/recent"


def settings() -> QSettings:
    """What the program remembers for this user."""
    return QSettings(QSettings.Format.IniFormat, QSettings.Scope.UserScope, "spreadgui", "spreadgui")


class BookFiles(QObject):
    """The file of the book on the workbench.

    `opened` tells that another book has come, `moved` that the path changed, `failed(sentence, details)` that a file
    could not be read or written, `done(sentence)` that one was.
    """

    opened = Signal()
    moved = Signal()
    failed = Signal(str, str)
    done = Signal(str)

    def __init__(self, workbench: Workbench, window: QWidget) -> None:
        super().__init__(window)
        self._workbench = workbench
        self._window = window
        self.path: Path | None = None

    # --- acts

    def new(self) -> None:
        """An empty book with the markets and marks of the one that is open."""
        if self.may_leave():
            book = msgspec.structs.replace(self._workbench.book, title="New book", positions=())
            self._take(book, None)

    def choose(self) -> None:
        """Ask for a file and open it."""
        if not self.may_leave():
            return
        name, _ = QFileDialog.getOpenFileName(self._window, "Open a book", self._folder(), _FILTER)
        if name:
            self.open(Path(name))

    def open_asking(self, path: Path) -> None:
        """Open `path`, asking first about unsaved changes."""
        if self.may_leave():
            self.open(path)

    def open(self, path: Path) -> bool:
        """Open the book at `path`; where it cannot be read, say why and keep the open one."""
        try:
            book = load(path, datetime.date.today())
        except BookError as error:
            self.failed.emit(refusal_words(path, error), str(error))
            return False
        self._take(book, None if is_positions_list(path) else path)
        self.done.emit(f"Opened {path.name}")
        return True

    def save(self) -> bool:
        """Write the book to its file, asking for one where it has none."""
        return self.save_as() if self.path is None else self.write(self.path)

    def save_as(self) -> bool:
        """Ask for a file and write the book there."""
        suggestion = str(self.path or Path(self._folder()) / f"{_file_stem(self._workbench.book)}.json")
        name, _ = QFileDialog.getSaveFileName(self._window, "Save the book as", suggestion, _FILTER)
        return bool(name) and self.write(_as_json(Path(name)))

    def write(self, path: Path) -> bool:
        """Write the book to `path`; where that fails, say why. The old file then is as it was."""
        try:
            write_book(self._workbench.book, path)
        except OSError as error:
            reason = error.strerror or str(error)
            self.failed.emit(f"{path.name} was not saved: {reason}. The book is still open and unsaved.", str(path))
            return False
        self.path = path
        self._workbench.mark_saved()
        self._remember(path)
        self.moved.emit()
        self.done.emit(f"Saved {path.name}")
        return True

    def may_leave(self) -> bool:
        """Whether the open book may go: it has no unsaved changes, or the user has decided about them."""
        if not self._workbench.modified:
            return True
        answer = self._ask_to_save()
        if answer == QMessageBox.StandardButton.Save:
            return self.save()
        return answer == QMessageBox.StandardButton.Discard

    # --- what is remembered

    def recent(self) -> list[Path]:
        """The books opened or saved last that still exist, newest first."""
        kept = settings().value(_RECENT, [])
        names = [kept] if isinstance(kept, str) else kept  # Qt gives a list of one back as the one
        if not isinstance(names, list):
            return []
        return [Path(name) for name in names if Path(name).is_file()]

    def _remember(self, path: Path) -> None:
        newest = path.resolve()
        kept = [newest, *(other for other in self.recent() if other != newest)]
        settings().setValue(_RECENT, [str(one) for one in kept[:_MOST_RECENT]])

    def _take(self, book: Book, path: Path | None) -> None:
        self.path = path
        self._workbench.open(book)
        if path is not None:
            self._remember(path)
        self.opened.emit()
        self.moved.emit()

    def _ask_to_save(self) -> int:
        box = QMessageBox(self._window)
        box.setIcon(QMessageBox.Icon.Warning)
        box.setWindowTitle("Unsaved changes")
        box.setText(f"{self._workbench.book.title or 'This book'} has changes that are not saved.")
        buttons = QMessageBox.StandardButton
        box.setStandardButtons(buttons.Save | buttons.Discard | buttons.Cancel)
        box.setDefaultButton(buttons.Save)
        return box.exec()

    def _folder(self) -> str:
        return str(self.path.parent if self.path is not None else Path.home())


def refusal_words(path: Path, error: BookError) -> str:
    """Why a file was not opened, in one sentence: the first faults and how many more there are."""
    told = "; ".join(str(fault) for fault in error.faults[:_MOST_TOLD])
    more = len(error.faults) - _MOST_TOLD
    rest = f"; and {more} more (`spreadgui check` lists all)" if more > 0 else ""
    return f"{path.name} was not opened: {told}{rest}."


def _file_stem(book: Book) -> str:
    kept = "".join(character if character.isalnum() else "_" for character in book.title.lower()).strip("_")
    return kept or "book"


def _as_json(path: Path) -> Path:
    return path if path.suffix else path.with_suffix(".json")
