"""The status line: what the book is worth, what of it is current, how long pricing took."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from PySide6.QtCore import Slot
from PySide6.QtWidgets import QLabel, QStatusBar, QWidget

from spreadgui.desk.jobs import Finished
from spreadgui.desk.workbench import Workbench
from spreadgui.valuation.results import LiveResults, State
from spreadgui.valuation.shown import number_text
from spreadgui.valuation.trust import book_words

_SHOWN_MILLISECONDS = 6000
_DOT = "   ·   "


class StatusLine(QStatusBar):
    """Follows the workbench by itself; `tell` shows a passing sentence."""

    def __init__(self, workbench: Workbench, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._workbench = workbench
        self._seconds = 0.0
        self._trust = ""
        self._label = QLabel()
        self.setSizeGripEnabled(False)
        self.addPermanentWidget(self._label)
        for signal in (workbench.priced, workbench.saved_changed):
            signal.connect(self._refresh)
        workbench.followed.connect(self._on_followed)
        workbench.finished.connect(self._on_finished)
        self._refresh()

    def tell(self, sentence: str) -> None:
        """Show a sentence for a while."""
        self.showMessage(sentence, _SHOWN_MILLISECONDS)

    def text(self) -> str:
        """The lasting words."""
        return self._label.text()

    @Slot()
    def _refresh(self) -> None:
        words = _DOT.join(self._words())
        self._label.setText(words)
        self._label.setAccessibleName(words)

    @Slot()
    def _on_followed(self) -> None:
        """What was said of the formulas was said of another book; it is worked out anew once all is priced."""
        self._trust = ""
        self._refresh()

    @Slot(object)
    def _on_finished(self, finished: Finished) -> None:
        if finished.rows:
            self._seconds = finished.seconds
        if not finished.left:
            self._trust = book_words(self._workbench.slate, self._workbench.results)
        self._refresh()

    def _words(self) -> Iterator[str]:
        results, book = self._workbench.results, self._workbench.book
        yield f"Book value {number_text(results.total_value(), 0)} {book.currency}".rstrip()
        yield state_words(results)
        if self._trust:
            yield self._trust
        if self._seconds:
            yield f"priced in {number_text(1000 * self._seconds, 0)} ms"
        yield f"marks of {book.valuation_date}"
        yield "not saved" if self._workbench.modified else "saved"


def state_words(results: LiveResults) -> str:
    """How many rows are in each state, in words.

    >>> state_words(LiveResults())
    'no rows'
    """
    counts = np.bincount(results.state, minlength=len(State))
    said = [f"{counts[state]} {state.word}" for state in State if counts[state]]
    if len(said) == 1 and counts[State.CURRENT]:
        return "all current"
    return ", ".join(said) or "no rows"
