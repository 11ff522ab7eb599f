"""Driven by keyboard: the gap tolerance, quoted premiums, strips and normal markets reach every pane."""

from __future__ import annotations

import msgspec
import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication
from pytestqt.qtbot import QtBot

from spreadgui.book.records import Book
from spreadgui.desk.grid.cells import Look
from spreadgui.valuation.results import State
from tests.books import book_of, spark
from tests.desk.conftest import Desk
from tests.desk.test_window import go, settle, shown, type_into
from tests.valuation.test_laws import book as book_of_laws
from tests.valuation.test_laws import position
from tests.valuation.test_strips import book as strip_book
from tests.valuation.test_strips import strip
from tests.valuation.test_trust import WIDE


def test_another_tolerance_marks_other_rows_in_words_and_colour_and_undo_takes_it_back(
    desk: Desk, qtbot: QtBot
) -> None:
    window = desk.open(book_of(spark(), WIDE))
    model, bar = window.positions.model, window.bar.tolerance
    place, words = model.column("kirk_gap_share"), model.column("formula_check")
    assert model.cell(model.index(1, place)).look is not Look.BEYOND
    bar.setFocus()
    bar.selectAll()
    QTest.keyClicks(bar, "0.0001")
    QTest.keyClick(bar, Qt.Key.Key_Return)
    settle(qtbot, window)
    assert window.workbench.book.gap_tolerance == 1e-6
    assert model.cell(model.index(1, place)).look is Look.BEYOND
    assert "beyond: Kirk" in model.text(1, words)
    assert "beyond 0.0001 %" in window.status.text()
    assert "beyond the gap tolerance" in model.spoken(model.index(1, place))
    window.acts.actions["undo"].trigger()
    settle(qtbot, window)
    assert bar.text() == "1"
    assert model.cell(model.index(1, place)).look is not Look.BEYOND
    assert "Kirk beyond 0.0001" not in window.status.text()


def test_a_wrong_tolerance_is_told_and_not_taken(desk: Desk) -> None:
    window = desk.open(book_of(spark()))
    window.bar.tolerance.setText("-2")
    window.bar.tolerance.editingFinished.emit()
    assert window.workbench.book.gap_tolerance == 0.01
    assert window.bar.tolerance.toolTip() == 'expected a tolerance of 0 % or more, got "-2"'


def test_a_premium_typed_in_gives_its_correlation_in_the_grid_and_the_reading(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book_of(spark()))
    go(window, 0, "quoted_premium")
    type_into(qtbot, window, "12.5")
    settle(qtbot, window)
    assert shown(window, 0, "implied_status") == "solved"
    implied = shown(window, 0, "implied_correlation")
    assert implied
    assert f"implied correlation {implied} ± " in window.reading.copied()
    assert window.reading._quote.isVisible()
    go(window, 0, "quoted_premium")
    window.acts.actions["clear"].trigger()
    settle(qtbot, window)
    assert window.workbench.book.positions[0].quoted_premium is None
    assert shown(window, 0, "implied_correlation") == ""
    assert not window.reading._quote.isVisible()


def test_an_exercise_chosen_in_the_grid_makes_a_strip_that_unfolds_by_day(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book_of(spark(expiry=None), spark()))
    assert State(int(window.workbench.results.state[0])) is State.INCOMPLETE
    model = window.positions.model
    assert model.choices(model.index(0, model.column("exercise"))) == ("once", "business days", "all days")
    assert model.setData(model.index(0, model.column("exercise")), "all days")
    settle(qtbot, window)
    assert State(int(window.workbench.results.state[0])) is State.CURRENT
    assert shown(window, 0, "expiry") == "2026-12-31 to 2027-01-29"
    reading = window.reading
    assert reading._unfold.isVisible()
    assert reading._unfold.text() == "Unfold 31 days"
    reading._unfold.setFocus()
    qtbot.keyClick(reading._unfold, Qt.Key.Key_Space)
    assert reading.unfolded()
    assert len(reading._days.sheet().rows) == 31
    assert reading._unfold.text() == "Fold 31 days"
    assert reading._days.sheet().rows[0][0].text == "2027-01-01"
    assert reading.copied().count("\n2027-01-") == 31
    go(window, 1, "name")
    settle(qtbot, window)
    assert not reading.unfolded()
    assert reading._days.isHidden()
    go(window, 0, "name")
    settle(qtbot, window)
    assert reading.unfolded()  # as it was left


def test_arrow_keys_walk_through_the_days_and_keep_them_in_sight(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(strip_book(strip()))
    reading = window.reading
    reading._unfold.setChecked(True)
    QApplication.processEvents()
    reading._sensitivities.setFocus()
    for _ in range(40):
        qtbot.keyClick(window.focusWidget(), Qt.Key.Key_Down)
    assert reading._days.hasFocus()
    row = reading._days.currentIndex()
    assert row.row() == 19
    rect = reading._days.visualRect(row).translated(0, reading._days.horizontalHeader().height())
    assert reading._days.visibleRegion().boundingRect().contains(rect)


def test_a_volatility_of_a_normal_market_is_an_amount_and_typed_as_one(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book_of_laws(position("Night", "Dawn"), position("North", "South")))
    assert shown(window, 0, "vol_long") == "18.0 abs."
    assert shown(window, 1, "vol_long") == "70.0"
    go(window, 0, "vol_long")
    assert window.positions.model.typed(window.positions.view.currentIndex()) == "18"
    type_into(qtbot, window, "21.5")
    settle(qtbot, window)
    assert window.workbench.book.positions[0].own_vol_long == 21.5
    assert shown(window, 0, "vol_long") == "21.5 abs."
    go(window, 0, "vol_long")
    settle(qtbot, window)
    assert "Bachelier" in window.landscape.subtitle()


@pytest.mark.parametrize("method", ["kirk", "yardstick"])
def test_the_status_line_says_what_rests_on_a_formula_beyond_its_tolerance(desk: Desk, method: str) -> None:
    book: Book = msgspec.structs.replace(book_of(spark(), WIDE), method=method, gap_tolerance=1e-6)
    window = desk.open(book)
    said = "of the book’s value on Kirk beyond 0.0001 %" if method == "kirk" else "beyond 0.0001 % for "
    assert said in window.status.text()
