"""Starts the Qt program on a book."""

from __future__ import annotations

import datetime
import os
import sys
import traceback
from pathlib import Path

from PySide6.QtCore import QMessageLogContext, QtMsgType, qInstallMessageHandler
from PySide6.QtWidgets import QApplication

from spreadgui.book.loading import is_positions_list, load
from spreadgui.desk.look.theme import apply, theme_for
from spreadgui.desk.window import Window


def run_window(path: Path, *, demo: bool) -> int:
    """Open the window on the book at `path` and stay until it is closed; gives the exit status.

    The demo book has no file of its own to be saved to. Raises BookError where the book cannot be read.
    """
    book = load(path, datetime.date.today())
    app = start_application()
    theme = theme_for(app)
    apply(app, theme)
    window = Window(theme)
    sys.excepthook = lambda _kind, error, _trace: _stumble(window, error)
    window.show()
    window.open_after_paint(book, None if demo or is_positions_list(path) else path)
    return app.exec()


def start_application() -> QApplication:
    """The application object; where the screen cannot be reached, one line instead of Qt's abort."""
    qInstallMessageHandler(_handle_message)
    app = QApplication(["spreadgui"])
    qInstallMessageHandler(None)
    app.setApplicationName("spreadgui")
    app.setDesktopFileName("spreadgui")
    return app


def _stumble(window: Window, error: BaseException) -> None:
    """A fault of the program in the middle of an act: say so where the user looks; the book is as it was before it."""
    details = "".join(traceback.format_exception(error))
    if not hasattr(window, "message"):  # it is still coming up: there is nothing to keep
        sys.stderr.write(f"spreadgui: the window could not be opened: {type(error).__name__}: {error}\n")
        os._exit(3)
    window.message.say(
        f"A fault of this program, not of your input: {type(error).__name__}: {error}. The book is as it was.", details
    )


def _handle_message(kind: QtMsgType, _context: QMessageLogContext, text: str) -> None:
    if kind == QtMsgType.QtFatalMsg:
        first = text.strip().splitlines()[0] if text.strip() else "Qt cannot start"
        sys.stderr.write(
            f"spreadgui: no window can be opened ({first}); without one, try "
            "`spreadgui value BOOK --csv -` or `spreadgui picture BOOK --png FILE`\n"
        )
        sys.stderr.flush()
        os._exit(2)
    sys.stderr.write(f"spreadgui: {text}\n")
