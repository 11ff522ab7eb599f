"""Blends in the window: a weight typed moves the positions on the blend; a new blend can be a leg at once."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QApplication, QComboBox, QLineEdit
from pytestqt.qtbot import QtBot

from spreadgui.book.records import Blend, Book, Part
from spreadgui.desk.markets.blends_model import blends_of, rows_of
from spreadgui.desk.markets.blends_pane import BlendsPane
from spreadgui.desk.window import Window
from spreadgui.valuation.results import State
from tests.desk.conftest import Desk
from tests.desk.test_window import agrees_with_its_book, settle, shown
from tests.market.test_blends import book, position


def pane_of(window: Window) -> BlendsPane:
    assert window.markets is not None
    window.handlers["go_blends"]()
    return window.markets.blends


def type_at(qtbot: QtBot, pane: BlendsPane, row: int, column: int, text: str) -> QLineEdit | QComboBox:
    pane.view.setCurrentIndex(pane.model.index(row, column))
    pane.view.edit(pane.view.currentIndex())
    editor = QApplication.focusWidget()
    assert isinstance(editor, QLineEdit | QComboBox)
    if isinstance(editor, QComboBox):
        editor.setEditText(text)
    else:
        editor.setText(text)
    qtbot.keyClick(editor, Qt.Key.Key_Return)
    return editor


def test_a_weight_typed_moves_the_rows_on_its_blend_and_the_reading_shows_its_markets(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book(position(), position(short_leg="Gas", short_ratio=7.1)))
    before = [shown(window, row, "position_value") for row in range(2)]
    assert "Gas 2028-01\tshort\t7.1" in window.reading.copied()
    pane = pane_of(window)
    type_at(qtbot, pane, 0, 3, "7.4")
    settle(qtbot, window)
    assert window.workbench.book.blends[0].parts[0] == Part("Gas", 7.4)
    after = [shown(window, row, "position_value") for row in range(2)]
    assert (after[0] != before[0], after[1] != before[1]) == (True, False)
    assert "Gas 2028-01\tshort\t7.4" in window.reading.copied()
    assert window.reading._parts.isVisible()
    assert agrees_with_its_book(window)
    window.acts.actions["undo"].trigger()
    settle(qtbot, window)
    assert [shown(window, row, "position_value") for row in range(2)] == before


def test_a_new_blend_is_typed_part_by_part_and_can_be_a_leg(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book(position()))
    pane = pane_of(window)
    type_at(qtbot, pane, 2, 0, "Clean power")
    type_at(qtbot, pane, 2, 2, "Power")
    assert pane.model.rowCount() == 4
    type_at(qtbot, pane, 2, 3, "0.9")
    assert window.workbench.book.blends[1] == Blend("Clean power", "CRN/MWh", (Part("Power", 0.9),))
    grid = window.positions.model
    place = grid.column("long_leg")
    assert "Clean power" in grid.choices(grid.index(0, place))
    assert grid.setData(grid.index(0, place), "Clean power")
    settle(qtbot, window)
    assert State(int(window.workbench.results.state[0])) is State.CURRENT
    assert grid.choices(grid.index(0, grid.column("long_delivery"))) == ("2028-01", "2028-02")
    assert agrees_with_its_book(window)


def test_wrong_entries_are_told_and_not_taken(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book(position()))
    pane = pane_of(window)
    before: Book = window.workbench.book
    model = pane.model
    assert model.refusal(model.index(0, 3), "-1") == 'expected a weight above zero, got "-1"'
    assert model.refusal(model.index(0, 2), "Oil") == 'there is no market "Oil" in this book'
    assert model.refusal(model.index(0, 0), "Gas") == '"Gas" is the name of a market'
    assert model.refusal(model.index(0, 0), "") == "a blend needs a name"
    assert not model.setData(model.index(0, 3), "-1")
    editor = type_at(qtbot, pane, 0, 3, "many")
    assert editor.isVisible()
    assert window.workbench.book is before


def test_a_blend_goes_with_its_last_part_and_its_rows_say_so(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book(position()))
    pane = pane_of(window)
    pane.view.selectAll()
    pane.remove_rows()
    settle(qtbot, window)
    assert window.workbench.book.blends == ()
    assert shown(window, 0, "position_value") == "refused"
    window.acts.actions["undo"].trigger()
    settle(qtbot, window)
    assert State(int(window.workbench.results.state[0])) is State.CURRENT


def test_rows_and_blends_stand_for_each_other() -> None:
    blends = (Blend("A", "CRN/t", (Part("x", 1.0), Part("y", 2.0)), "a note"), Blend("B", "CRN/t"))
    assert blends_of(rows_of(blends), blends) == blends
