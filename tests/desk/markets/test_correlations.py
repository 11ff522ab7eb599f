"""Correlations in the window: typed once for each pair, checked together, mended only when asked."""

from __future__ import annotations

import datetime
from collections.abc import Callable

from PySide6.QtCore import Qt, QTimer
from PySide6.QtWidgets import QApplication, QLineEdit
from pytestqt.qtbot import QtBot

from spreadgui.book.records import Book, Correlation, Mark, Market, Position
from spreadgui.desk.markets.correlations_pane import CorrelationsPane, MendDialog
from spreadgui.desk.window import Window
from spreadgui.market.together import check
from tests.books import book_of, season, spark
from tests.desk.conftest import Desk
from tests.desk.test_window import agrees_with_its_book, settle, shown

NAMES = ("North", "South", "Quill")


def three_markets() -> Book:
    """Three markets whose correlations can be, and a spread on each pair."""
    markets = tuple(Market(name, "CRN/MWh", 0.3, marks=(Mark("2027-01", 80.0, 0.5),)) for name in NAMES)
    pairs = (("North", "South"), ("South", "Quill"), ("North", "Quill"))
    positions = tuple(
        Position(
            f"{first}-{second}", quantity=10.0, long_leg=first, long_delivery="2027-01", short_leg=second,
            short_delivery="2027-01", expiry=datetime.date(2026, 12, 29),
        )
        for first, second in pairs
    )  # fmt: skip
    correlations = tuple(Correlation(first, second, 0.8) for first, second in pairs)
    return book_of(*positions, markets=markets, correlations=correlations)


def pane_of(window: Window) -> CorrelationsPane:
    assert window.markets is not None
    window.handlers["go_correlations"]()
    return window.markets.correlations


def type_at(qtbot: QtBot, pane: CorrelationsPane, row: int, column: int, text: str) -> QLineEdit:
    pane.view.setCurrentIndex(pane.model.index(row, column))
    qtbot.keyClick(pane.view, text[0])
    editor = QApplication.focusWidget()
    assert isinstance(editor, QLineEdit)
    qtbot.keyClicks(editor, text[1:])
    qtbot.keyClick(editor, Qt.Key.Key_Return)
    return editor


def in_dialog(act: Callable[[MendDialog], None]) -> None:
    """Do `act` in the dialog that is about to open."""

    def when_open() -> None:
        dialog = QApplication.activeModalWidget()
        assert isinstance(dialog, MendDialog)
        act(dialog)

    QTimer.singleShot(50, when_open)


def test_a_correlation_typed_on_either_side_moves_its_pair_alone(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(three_markets())
    pane = pane_of(window)
    before = [shown(window, row, "position_value") for row in range(3)]
    type_at(qtbot, pane, 0, 2, "70")  # North and South
    settle(qtbot, window)
    assert window.workbench.book.correlations[0] == Correlation("North", "South", 0.7)
    assert pane.model.text_of(1, 1) == pane.model.text_of(0, 2) == "70.0"
    after = [shown(window, row, "position_value") for row in range(3)]
    assert [old != new for old, new in zip(before, after, strict=True)] == [True, False, False]
    assert agrees_with_its_book(window)


def test_an_impossible_matrix_is_told_of_mended_when_asked_and_undone(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(three_markets())
    pane = pane_of(window)
    assert not pane.offer.isVisible()
    assert "can exist together" in pane.verdict.full_text()
    type_at(qtbot, pane, 0, 3, "-80")  # North and Quill
    qtbot.waitUntil(pane.offer.isVisible)
    impossible = window.workbench.book
    assert "North, South and Quill cannot exist together" in pane.verdict.full_text()
    seen: list[int] = []

    def leave(dialog: MendDialog) -> None:
        seen.append(len(dialog.moves.sheet().rows))
        dialog.buttons.buttons()[1].click()

    in_dialog(leave)
    pane.offer.click()
    assert seen == [3]
    assert window.workbench.book is impossible  # nothing is mended unless it is taken over
    in_dialog(lambda dialog: dialog.buttons.buttons()[0].click())
    pane.offer.click()
    settle(qtbot, window)
    mended = window.workbench.book
    assert check(mended).possible
    assert mended.correlations != impossible.correlations
    qtbot.waitUntil(lambda: not pane.offer.isVisible())
    assert agrees_with_its_book(window)
    window.acts.actions["undo"].trigger()
    settle(qtbot, window)
    assert window.workbench.book == impossible
    qtbot.waitUntil(pane.offer.isVisible)


def test_a_wrong_entry_is_told_and_not_taken(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(three_markets())
    pane = pane_of(window)
    before = window.workbench.book
    editor = type_at(qtbot, pane, 1, 3, "120")
    assert editor.isVisible()
    assert pane.view.cells._note.text() == 'expected a correlation from −100 to 100 %, got "120"'
    assert window.workbench.book is before
    qtbot.keyClick(editor, Qt.Key.Key_Escape)
    editor = type_at(qtbot, pane, 1, 0, "-1")
    assert pane.view.cells._note.text() == 'expected a tie strength of zero or more, got "-1"'
    qtbot.keyClick(editor, Qt.Key.Key_Escape)
    assert not pane.model.flags(pane.model.index(1, 2)) & Qt.ItemFlag.ItemIsEditable


def test_a_tie_strength_moves_the_spreads_across_deliveries(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book_of(season(), spark()))
    pane = pane_of(window)
    before = [shown(window, row, "position_value") for row in range(2)]
    type_at(qtbot, pane, 0, 0, "0.9")
    settle(qtbot, window)
    assert window.workbench.book.markets[0].tie_strength == 0.9
    after = [shown(window, row, "position_value") for row in range(2)]
    assert after[0] != before[0]
    assert after[1] == before[1]  # one delivery: nothing decays


def test_a_missing_pair_is_empty_and_typing_adds_it(desk: Desk, qtbot: QtBot) -> None:
    book = three_markets()
    window = desk.open(book_of(*book.positions, markets=book.markets, correlations=book.correlations[:2]))
    pane = pane_of(window)
    assert pane.model.text_of(0, 3) == ""
    assert "for want of a correlation: North with Quill" in pane.verdict.full_text()
    assert shown(window, 2, "position_value") == "incomplete"
    type_at(qtbot, pane, 0, 3, "55.5")
    settle(qtbot, window)
    assert window.workbench.book.correlations[-1] == Correlation("North", "Quill", 0.555)
    assert shown(window, 2, "position_value") != "incomplete"


def test_a_correlation_typed_with_its_standard_error_shows_what_the_guess_costs(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(three_markets())
    pane = pane_of(window)
    assert shown(window, 0, "guess_band") == ""
    pane.view.setCurrentIndex(pane.model.index(0, 2))
    pane.view.edit(pane.view.currentIndex())
    editor = QApplication.focusWidget()
    assert isinstance(editor, QLineEdit)
    editor.setText("80 ± 4")
    qtbot.keyClick(editor, Qt.Key.Key_Return)
    settle(qtbot, window)
    assert window.workbench.book.correlations[0] == Correlation("North", "South", 0.8, 0.04)
    assert pane.model.text_of(0, 2) == "80.0 ±4"
    assert pane.model.typed(pane.model.index(0, 2)) == "80 ± 4"
    assert shown(window, 0, "guess_band") != ""
    assert shown(window, 1, "guess_band") == ""
    assert agrees_with_its_book(window)
    assert (
        pane.model.refusal(pane.model.index(0, 2), "80 ± -1") == 'expected a standard error of 0 or more, got "80 ± -1"'
    )
    assert pane.model.refusal(pane.model.index(0, 2), "80 ± x") == 'expected a number, got "x"'
