"""What the pinned libraries must not do."""

from __future__ import annotations

import sys

from PySide6.QtCore import QObject, Signal


class Sender(QObject):
    sent = Signal(object)


def test_emitting_does_not_use_up_true_and_none() -> None:
    """PySide6 6.12.0 on Python 3.11 loses a reference to True at every emit and in the end aborts the process."""
    sender, got = Sender(), []
    sender.sent.connect(got.append)
    before = sys.getrefcount(True), sys.getrefcount(None)
    for number in range(2000):
        sender.sent.emit(number)
    after = sys.getrefcount(True), sys.getrefcount(None)
    assert len(got) == 2000
    # On Pythons whose constants never die the counts stand still; a loss would be one for each emit.
    assert before[0] - after[0] < 100
    assert before[1] - after[1] < 100
