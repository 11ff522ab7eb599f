"""The book being worked on: the one door through which it changes, and the way back.

Needs no Qt: the desk listens, and so can a test.
"""

from __future__ import annotations

from collections.abc import Callable

from spreadgui.book.changes import Change
from spreadgui.book.records import Book


class BookSession:
    """Holds the current book, its revision, and what undo and redo need.

    The revision goes up by one at every change, undo and redo included, and never comes back, so that a result can
    tell whether it still speaks of this book.
    """

    def __init__(self, book: Book) -> None:
        self._book = book
        self._revision = 1
        self._done: list[Change] = []
        self._undone: list[Change] = []
        self._saved_at: int | None = 0
        self._listeners: list[Callable[[], None]] = []

    @property
    def book(self) -> Book:
        return self._book

    @property
    def revision(self) -> int:
        return self._revision

    @property
    def modified(self) -> bool:
        """Whether the book differs from the one last saved or opened."""
        return self._saved_at != len(self._done)

    @property
    def undo_words(self) -> str | None:
        """What the next undo takes back, or None."""
        return self._done[-1].words if self._done else None

    @property
    def redo_words(self) -> str | None:
        """What the next redo does again, or None."""
        return self._undone[-1].words if self._undone else None

    def subscribe(self, listener: Callable[[], None]) -> None:
        """Call `listener` after every change of the book or of its saved state."""
        self._listeners.append(listener)

    def apply(self, change: Change) -> None:
        """The door: make `change`, and remember how to take it back. A change that raises leaves all as it was."""
        book = change.apply(self._book)
        if self._saved_at is not None and self._saved_at > len(self._done):
            self._saved_at = None  # the saved state lies among the undone changes, which end here
        self._undone.clear()
        self._done.append(change)
        self._become(book)

    def undo(self) -> None:
        """Take the last change back; nothing happens where there is none."""
        if self._done:
            book = self._done[-1].inverse().apply(self._book)
            self._undone.append(self._done.pop())
            self._become(book)

    def redo(self) -> None:
        """Make the last undone change again; nothing happens where there is none."""
        if self._undone:
            book = self._undone[-1].apply(self._book)
            self._done.append(self._undone.pop())
            self._become(book)

    def open(self, book: Book) -> None:
        """Work on another book from here; nothing of the old one can be undone any more."""
        self._done.clear()
        self._undone.clear()
        self._saved_at = 0
        self._become(book)

    def mark_saved(self) -> None:
        """The book as it is now has been written."""
        self._saved_at = len(self._done)
        self._tell()

    def _become(self, book: Book) -> None:
        self._book = book
        self._revision += 1
        self._tell()

    def _tell(self) -> None:
        for listener in self._listeners:
            listener()
