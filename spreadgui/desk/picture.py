"""The real window, drawn without a screen."""

from __future__ import annotations

import math
import sys
from pathlib import Path

from PySide6.QtCore import (
    QBuffer,
    QCoreApplication,
    QIODevice,
    QMessageLogContext,
    Qt,
    QtMsgType,
    qInstallMessageHandler,
)
from PySide6.QtWidgets import QApplication

from spreadgui.book.records import Book
from spreadgui.desk.look.theme import apply, theme_for
from spreadgui.desk.window import SMALLEST, Window


def draw_window(book: Book, path: Path, width: int, height: int, *, dark: bool = False, row: int = 0) -> bytes:
    """The window on `book` as PNG, `width` by `height` pixels, once every number in it is current.

    A picture smaller than the window can be is drawn at the window's smallest size and scaled down.
    """
    qInstallMessageHandler(_pass_on)
    app = QApplication.instance() or QApplication(["spreadgui"])
    assert isinstance(app, QApplication)
    theme = theme_for(app, dark=dark)
    apply(app, theme)
    window = Window(theme)
    try:
        window.assemble(book, path)
        scale = max(1.0, SMALLEST[0] / width, SMALLEST[1] / height)
        window.resize(math.ceil(width * scale), math.ceil(height * scale))
        window.show()
        window.complete()
        window.positions.view.go_to(max(row, 0), window.positions.model.column("name"))
        _settle(window)
        return _png_of(window, width, height)
    finally:
        window.shut()
        window.hide()
        window.deleteLater()
        qInstallMessageHandler(None)


def _pass_on(_kind: QtMsgType, _context: QMessageLogContext, text: str) -> None:
    # The offscreen platform remarks at every window that it has no window manager to tell of sizes; that is the point.
    if "propagateSizeHints" not in text:
        sys.stderr.write(f"spreadgui: {text}\n")


def _settle(window: Window) -> None:
    """Serve the event loop until everything asked for has come and been painted."""
    for _ in range(3):
        QCoreApplication.processEvents()
        window.workbench.wait_until_idle()


def _png_of(window: Window, width: int, height: int) -> bytes:
    picture = window.grab()
    if (picture.width(), picture.height()) != (width, height):
        smooth = Qt.TransformationMode.SmoothTransformation
        picture = picture.scaled(width, height, Qt.AspectRatioMode.IgnoreAspectRatio, smooth)
    buffer = QBuffer()
    buffer.open(QIODevice.OpenModeFlag.WriteOnly)
    picture.save(buffer, "PNG")
    return bytes(buffer.data().data())
