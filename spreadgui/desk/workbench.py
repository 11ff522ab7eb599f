"""The workbench: joins the book's session, the slate, the live results and the pricing thread, for the panes to see.

Every change of the book goes in through `apply`, `undo` and `redo`; everything the panes show comes out of `slate`,
`results` and the signals. Panes never price and never touch the session.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, cast

import numpy as np
from PySide6.QtCore import QObject, QTimer, Signal, Slot

from spreadgui.book.changes import Change
from spreadgui.book.records import Book
from spreadgui.book.session import BookSession
from spreadgui.desk.jobs import Failure, Finished, Job, PricingThread
from spreadgui.valuation.results import LiveResults, Part
from spreadgui.valuation.slate import RowArray, Slate, Succession, follow
from spreadgui.valuation.surface import Surface, SurfaceRequest

if TYPE_CHECKING:  # it brings the formulas along, which the window does without until it has been painted
    from spreadgui.valuation.reading import Reading

_NO_ROWS: RowArray = np.empty(0, dtype=np.intp)


class Workbench(QObject):
    """The book at work.

    `followed` tells that a new slate stands (with its Succession), `priced` which rows have become current,
    `read` and `drawn` bring the Reading and the surface of the focus, `finished` the end of a run, `failed` a
    sentence, `saved_changed` that the modified mark may have turned.
    """

    followed = Signal(object)
    priced = Signal(object)
    read = Signal(object)
    drawn = Signal(object)
    finished = Signal(object)
    failed = Signal(str)
    saved_changed = Signal()

    def __init__(self, book: Book, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._session = BookSession(book)
        self._thread = PricingThread(self)
        self._thread.arrived.connect(self._take)
        self._sight: range = range(0)
        self._focus: int | None = None
        self._request: SurfaceRequest | None = None
        self._focus_due = False
        self._last_failure: Failure | None = None
        # One job an event-loop turn: a burst of signals (an edit moves the focus and scrolls) asks only once.
        self._ask = QTimer(self)
        self._ask.setSingleShot(True)
        self._ask.timeout.connect(self._submit)
        first = follow(None, book, self._session.revision)
        self.slate: Slate = first.slate
        self.results = LiveResults()
        self.results.follow(first)
        self._session.subscribe(self._on_session)
        self._begun = False

    def begin(self) -> None:
        """Price from now on; until then the window is still coming up and must not share its processor."""
        self._begun = True
        self._ask.start()

    # --- the book

    @property
    def book(self) -> Book:
        return self._session.book

    @property
    def modified(self) -> bool:
        return self._session.modified

    @property
    def undo_words(self) -> str | None:
        return self._session.undo_words

    @property
    def redo_words(self) -> str | None:
        return self._session.redo_words

    def apply(self, change: Change) -> None:
        self._session.apply(change)

    def undo(self) -> None:
        self._session.undo()

    def redo(self) -> None:
        self._session.redo()

    def open(self, book: Book) -> None:
        """Work on another book; the focus stays on its row where the book has one."""
        self._session.open(book)

    def mark_saved(self) -> None:
        self._session.mark_saved()

    # --- what the panes look at

    def set_sight(self, rows: range) -> None:
        """These rows are on the screen: price them before all others."""
        self._sight = rows

    def set_focus(self, row: int | None, request: SurfaceRequest | None) -> None:
        """Read this row and draw this surface of it, now and after every change; None for neither."""
        if (row, request) == (self._focus, self._request):
            return
        self._focus, self._request = row, request
        self._focus_due = True
        self._ask.start()

    @property
    def focus(self) -> int | None:
        return self._focus

    @property
    def last_failure(self) -> Failure | None:
        """The newest failure of the pricing thread, for whoever wants its details."""
        return self._last_failure

    @property
    def idle(self) -> bool:
        """Whether every row is settled and every result asked for has come."""
        return not self._ask.isActive() and self._thread.idle

    def wait_until_idle(self, seconds: float = 30.0) -> bool:
        """Serve the event loop until `idle`; False if that takes longer than `seconds`."""
        if self._ask.isActive():
            self._ask.stop()
            self._submit()
        return self._thread.wait_until_idle(seconds)

    def close(self) -> None:
        """End the pricing thread; call it before the widgets die."""
        self._ask.stop()
        self._thread.close()

    # --- the road

    def _on_session(self) -> None:
        if self._session.revision != self.slate.revision:
            self._follow(follow(self.slate, self._session.book, self._session.revision))
        self.saved_changed.emit()

    def _follow(self, succession: Succession) -> None:
        self.slate = succession.slate
        self.results.follow(succession)
        if self._focus is not None and self._focus >= len(self.slate):
            self._focus = self._request = None
        self._focus_due = True
        self.followed.emit(succession)
        self._ask.start()

    @Slot()
    def _submit(self) -> None:
        if not self._begun:
            return
        pending = self.results.pending()
        in_sight = (pending >= self._sight.start) & (pending < self._sight.stop)
        focus = self._focus if self._focus_due else None
        request = self._request if self._focus_due else None
        if pending.size or focus is not None:
            self._thread.submit(Job(self.slate, pending[in_sight], pending[~in_sight], focus, request))

    @Slot(object)
    def _take(self, result: object) -> None:
        if isinstance(result, Part):
            rows = self.results.accept(result)
            if rows.size:
                self.priced.emit(rows)
        elif isinstance(result, Finished):
            self.finished.emit(result)
        elif isinstance(result, Failure):
            self._fail(result)
        elif isinstance(result, Surface):
            self._take_surface(result)
        else:
            self._take_reading(cast("Reading", result))

    def _take_surface(self, surface: Surface) -> None:
        if surface.revision == self.slate.revision and surface.request == self._request:
            self._focus_due = False
            self.drawn.emit(surface)

    def _take_reading(self, reading: Reading) -> None:
        if reading.revision == self.slate.revision and reading.row == self._focus:
            self._focus_due = self._request is not None  # the surface of the row is still to come
            self.read.emit(reading)

    def _fail(self, failure: Failure) -> None:
        self._last_failure = failure
        rows = self.results.fail(failure.sentence) if failure.revision == self.slate.revision else _NO_ROWS
        self._focus_due = False
        self.failed.emit(failure.sentence)
        if rows.size:
            self.priced.emit(rows)
