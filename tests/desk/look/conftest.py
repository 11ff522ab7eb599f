"""Each test here starts from an application without a theme and leaves it so."""

import os

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

from collections.abc import Iterator

import pytest
from PySide6.QtGui import QPalette
from PySide6.QtWidgets import QApplication

from spreadgui.desk.look import theme as look


def _forget(app: QApplication) -> None:
    """As if the program had just been started."""
    app.setStyleSheet("")
    app.setPalette(QPalette())
    app.setProperty("systemPrefersDark", None)
    app.setProperty("systemTextPoints", None)


@pytest.fixture
def bare(qapp: QApplication) -> Iterator[QApplication]:
    """The application before any theme; its font and palette are put back afterwards."""
    font = qapp.font()
    _forget(qapp)
    yield qapp
    qapp.setFont(font)
    _forget(qapp)


@pytest.fixture
def light(bare: QApplication) -> look.Theme:
    """The light theme, put on."""
    theme = look.theme_for(bare, dark=False)
    look.apply(bare, theme)
    return theme
