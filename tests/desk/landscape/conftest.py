"""A pane on a screen of its own, and surfaces to show in it."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from PySide6.QtWidgets import QApplication
from pytestqt.qtbot import QtBot

from spreadgui.book.records import Position
from spreadgui.desk.landscape.pane import LandscapePane
from spreadgui.desk.look.theme import Theme, apply, theme_for
from spreadgui.valuation.slate import build_slate
from spreadgui.valuation.surface import Surface, SurfaceRequest, draw_surface
from tests.books import book_of, spark

Draw = Callable[..., Surface]


@pytest.fixture
def light(qapp: QApplication) -> Theme:
    theme = theme_for(qapp, dark=False)
    apply(qapp, theme)
    return theme


@pytest.fixture
def pane(qtbot: QtBot, light: Theme) -> LandscapePane:
    """Shown, 700 by 560, empty."""
    made = LandscapePane(light)
    qtbot.addWidget(made)
    made.resize(700, 560)
    with qtbot.waitExposed(made):
        made.show()
    return made


@pytest.fixture
def draw() -> Draw:
    """The surface of a position: `draw(quantity, method, position)`."""

    def drawn(quantity: str = "value", method: str = "kirk", position: Position | None = None, **book: Any) -> Surface:
        slate = build_slate(book_of(position or spark(), **book), 1)
        return draw_surface(slate, SurfaceRequest(0, quantity, method))

    return drawn
