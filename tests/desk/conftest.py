"""Real windows, real threads, real files; the user's own settings are out of reach."""

from __future__ import annotations

import threading
from collections.abc import Iterator
from pathlib import Path

import pytest
from PySide6.QtCore import QSettings, QStandardPaths
from PySide6.QtWidgets import QApplication
from pytestqt.qtbot import QtBot

from spreadgui import shipped
from spreadgui.book.reading import read_book
from spreadgui.book.records import Book
from spreadgui.desk.look.theme import apply, theme_for
from spreadgui.desk.window import Window
from tests.books import book_of, cap, season, spark


@pytest.fixture(autouse=True)
def own_settings(tmp_path: Path) -> None:
    """Settings of the test, in a folder of the test."""
    QStandardPaths.setTestModeEnabled(True)
    QSettings.setPath(QSettings.Format.IniFormat, QSettings.Scope.UserScope, str(tmp_path / "settings"))


@pytest.fixture(autouse=True)
def no_thread_is_left() -> Iterator[None]:
    """Every test ends the threads it began."""
    before = set(threading.enumerate())
    yield
    left = [thread.name for thread in threading.enumerate() if thread not in before and thread.is_alive()]
    assert not left, f"threads left behind: {left}"


@pytest.fixture
def two_market_book() -> Book:
    """A spark call, a sold season put with a strike below zero, an outright."""
    return book_of(spark(), season(), cap())


@pytest.fixture
def demo_book() -> Book:
    """The book that comes with the program."""
    return read_book(shipped.sample_book("ardenmoor_winter"))


class Desk:
    """Opens windows for a test and closes them after it."""

    def __init__(self, qtbot: QtBot, app: QApplication) -> None:
        self._qtbot = qtbot
        self._theme = theme_for(app, dark=False)
        apply(app, self._theme)
        self._windows: list[Window] = []

    def open(self, book: Book, path: Path | None = None) -> Window:
        """A complete window on `book`, shown, active, every number in it current."""
        window = Window(self._theme)
        window.assemble(book, path)
        self._windows.append(window)
        window.resize(1600, 1000)
        window.show()
        window.complete()
        self._qtbot.waitUntil(lambda: window.workbench.idle, timeout=20_000)
        return window

    def close(self) -> None:
        """End all windows without asking about changes."""
        for window in self._windows:
            window.shut()
            window.hide()
            window.deleteLater()
        QApplication.processEvents()


@pytest.fixture
def desk(qtbot: QtBot, qapp: QApplication) -> Iterator[Desk]:
    opened = Desk(qtbot, qapp)
    yield opened
    opened.close()
