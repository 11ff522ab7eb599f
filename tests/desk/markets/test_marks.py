"""Marks in the window: a mark typed moves the positions that read it, and no others."""

from __future__ import annotations

import datetime

import msgspec
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QLineEdit
from pytestqt.qtbot import QtBot

from spreadgui.book.records import Book
from spreadgui.desk.markets.marks_pane import MarksPane
from spreadgui.desk.window import Window
from spreadgui.valuation.results import State
from tests.books import POWER, book_of, cap, season, spark
from tests.desk.conftest import Desk
from tests.desk.test_window import agrees_with_its_book, settle, shown


def marks_of(window: Window, market: str) -> MarksPane:
    assert window.markets is not None
    window.markets.marks.choose(market)
    window.handlers["go_marks"]()
    return window.markets.marks


def go(pane: MarksPane, period: str, key: str) -> None:
    row = next(row for row in range(pane.model.rowCount()) if pane.model.period(row).name == period)
    place = next(place for place, column in enumerate(pane.model.columns) if column.key == key)
    pane.view.setCurrentIndex(pane.model.index(row, place))


def type_mark(qtbot: QtBot, pane: MarksPane, text: str, end: Qt.Key = Qt.Key.Key_Return) -> QLineEdit:
    qtbot.keyClick(pane.view, text[0])
    editor = QApplication.focusWidget()
    assert isinstance(editor, QLineEdit)
    qtbot.keyClicks(editor, text[1:])
    qtbot.keyClick(editor, end)
    return editor


def text(pane: MarksPane, period: str, key: str) -> str:
    go(pane, period, key)
    return pane.model.text(pane.view.currentIndex().row(), pane.view.currentIndex().column())


def test_a_mark_typed_moves_the_rows_that_read_it_and_undo_brings_all_back(
    desk: Desk, demo_book: Book, qtbot: QtBot
) -> None:
    window = desk.open(demo_book)
    before = [shown(window, row, "position_value") for row in range(len(demo_book.positions))]
    pane = marks_of(window, "Pellan gas point")
    go(pane, "2028-01", "forward")
    type_mark(qtbot, pane, "11.5")
    settle(qtbot, window)
    after = [shown(window, row, "position_value") for row in range(len(demo_book.positions))]
    legs = {("Pellan gas point", "2028-01"), ("Quay 3 fuel", "2028-01"), ("Loomgate fuel", "2028-01")}
    reads = [
        bool({(one.long_leg, one.long_delivery), (one.short_leg, one.short_delivery)} & legs)
        for one in demo_book.positions
    ]
    assert 3 < sum(reads) < 15
    assert [old != new for old, new in zip(before, after, strict=True)] == reads
    assert agrees_with_its_book(window)
    assert text(pane, "2028-01", "forward") == "11.50"
    assert "forward of Pellan gas point 2028-01" in str(window.workbench.undo_words)
    window.acts.actions["undo"].trigger()
    settle(qtbot, window)
    assert [shown(window, row, "position_value") for row in range(len(demo_book.positions))] == before
    assert window.workbench.book == demo_book


def test_a_quarter_typed_spreads_over_its_months(desk: Desk, demo_book: Book, qtbot: QtBot) -> None:
    window = desk.open(demo_book)
    pane = marks_of(window, "Ardenmoor South")
    months = ("2027-01", "2027-02", "2027-03")
    old = [next(mark.forward for mark in demo_book.markets[1].marks if mark.delivery == month) for month in months]
    go(pane, "2027 Q1", "forward")
    type_mark(qtbot, pane, "100")
    settle(qtbot, window)
    assert text(pane, "2027 Q1", "forward") == "100.00"
    new = [
        next(mark.forward for mark in window.workbench.book.markets[1].marks if mark.delivery == month)
        for month in months
    ]
    ratios = [one / other for one, other in zip(new, old, strict=True)]
    assert max(ratios) - min(ratios) < 1e-12
    assert agrees_with_its_book(window)


def test_nonsense_is_told_beside_the_cell_and_changes_nothing(desk: Desk, demo_book: Book, qtbot: QtBot) -> None:
    window = desk.open(demo_book)
    pane = marks_of(window, "Ardenmoor South")
    go(pane, "2027-05", "volatility")
    editor = type_mark(qtbot, pane, "-5")
    assert editor.isVisible()
    assert pane.view.cells._note.text() == 'expected a volatility of 0 % or more, got "-5"'
    assert window.workbench.book is demo_book
    qtbot.keyClick(editor, Qt.Key.Key_Escape)
    go(pane, "2027-05", "forward")
    assert pane.model.refusal(pane.view.currentIndex(), "") == "a mark needs a forward"


def test_a_volatility_is_in_per_cent_and_in_the_unit_for_a_normal_market(
    desk: Desk, demo_book: Book, qtbot: QtBot
) -> None:
    window = desk.open(demo_book)
    pane = marks_of(window, "Quill Island nights")
    assert text(pane, "2027-04", "volatility") == "27.00"
    assert str(pane.model.headerData(2, Qt.Orientation.Horizontal)).endswith("CRN/MWh")
    type_mark(qtbot, pane, "30.5")
    assert window.workbench.book.markets[10].marks[1].volatility == 30.5
    pane = marks_of(window, "Ardenmoor South")
    go(pane, "2027-04", "volatility")
    type_mark(qtbot, pane, "52.5")
    assert window.workbench.book.markets[1].marks[3].volatility == 0.525


def test_a_block_copied_can_be_pasted_back_and_a_wrong_one_changes_nothing(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book_of(spark(), season(), cap()))
    pane = marks_of(window, POWER.name)
    view = pane.view
    view.setCurrentIndex(pane.model.index(0, 1))
    view.selectAll()
    QTest.keySequence(view, "Ctrl+C")
    copied = QGuiApplication.clipboard().text()
    assert copied.splitlines()[1].split("\t")[:3] == ["2027-01", "108", "60"]
    changed = copied.replace("\t108\t60", "\t111\t62").replace("2027-07\t80", "2027-07\t81.5")
    QGuiApplication.clipboard().setText(changed)
    view.setCurrentIndex(pane.model.index(0, 0))
    QTest.keySequence(view, "Ctrl+V")
    settle(qtbot, window)
    marks = window.workbench.book.markets[0].marks
    assert [(mark.forward, mark.volatility) for mark in marks] == [(111.0, 0.62), (81.5, 0.5)]
    assert agrees_with_its_book(window)
    book = window.workbench.book
    for wrong, said in (("111\tx", "expected a number"), ("1\n2\n3\n4\n5\n6", "reaches beyond")):
        QGuiApplication.clipboard().setText(wrong)
        view.setCurrentIndex(pane.model.index(1, 1))
        QTest.keySequence(view, "Ctrl+V")
        assert said in window.status.currentMessage()
        assert window.workbench.book is book


def test_a_delivery_is_added_beside_its_neighbour_and_taken_away_again(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book_of(spark(long_delivery="2027-03")))
    assert State(int(window.workbench.results.state[0])) is not State.CURRENT
    pane = marks_of(window, POWER.name)
    pane.month.setFocus()
    QTest.keyClicks(pane.month, "2027-03")
    QTest.keyClick(pane.month, Qt.Key.Key_Return)
    settle(qtbot, window)
    assert State(int(window.workbench.results.state[0])) is State.CURRENT
    assert pane.model.period(pane.view.currentIndex().row()).name == "2027-03"
    assert text(pane, "2027-03", "forward") == "108.00"
    pane.month.setText("March")
    QTest.keyClick(pane.month, Qt.Key.Key_Return)
    assert "expected a delivery month" in window.status.currentMessage()
    go(pane, "2027-03", "forward")
    pane.remove_rows()
    settle(qtbot, window)
    assert State(int(window.workbench.results.state[0])) is State.INCOMPLETE
    assert len(window.workbench.book.markets[0].marks) == 2


def test_what_holds_for_a_market_is_set_above_its_marks(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book_of(spark(), cap()))
    pane = marks_of(window, POWER.name)
    bar = pane.bar
    for line, typed in ((bar.lot_size, "744"), (bar.tie_strength, "0.6"), (bar.holidays, "2027-01-01, 2026-12-25")):
        line.setText(typed)
        line.editingFinished.emit()
    bar.lot_rule.setCurrentText("per day")
    bar.lot_rule.activated.emit(2)
    market = window.workbench.book.markets[0]
    assert (market.lot_size, market.tie_strength, market.lot_rule) == (744.0, 0.6, "per day")
    assert market.holidays == (datetime.date(2026, 12, 25), datetime.date(2027, 1, 1))
    before = window.workbench.book
    for line, typed, said in (
        (bar.lot_size, "0", "expected a number above zero"), (bar.holidays, "Christmas", "expected a day written"),
        (bar.business_days, "Mon", "expected a 1 or a 0"), (bar.tie_strength, "-1", "zero or more"),
    ):  # fmt: skip
        line.setText(typed)
        line.editingFinished.emit()
        assert said in line.toolTip()
    assert window.workbench.book is before


def test_another_law_reprices_and_one_without_a_shift_drops_it(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book_of(cap()))
    pane = marks_of(window, POWER.name)
    value = shown(window, 0, "position_value")
    pane.bar.dynamics.setCurrentText("shifted lognormal")
    pane.bar.dynamics.activated.emit(1)
    pane.bar.shift.setText("40")
    pane.bar.shift.editingFinished.emit()
    settle(qtbot, window)
    assert window.workbench.book.markets[0].shift == 40.0
    assert shown(window, 0, "position_value") != value
    pane.bar.dynamics.setCurrentText("lognormal")
    pane.bar.dynamics.activated.emit(0)
    settle(qtbot, window)
    assert window.workbench.book.markets[0].shift == 0.0
    assert shown(window, 0, "position_value") == value
    assert agrees_with_its_book(window)


def test_a_book_without_markets_says_what_would_be_here(desk: Desk) -> None:
    window = desk.open(msgspec.structs.replace(book_of(), markets=(), correlations=()))
    assert window.markets is not None
    assert window.markets.marks.model.rowCount() == 0
    window.workbench.open(book_of(spark()))
    assert window.markets.marks.model.rowCount() > 0


def test_the_chart_points_at_the_delivery_of_the_current_row(desk: Desk, demo_book: Book) -> None:
    window = desk.open(demo_book)
    pane = marks_of(window, "Ardenmoor South")
    go(pane, "2027-03", "forward")
    assert [line.value() for line in pane.chart._lines] == [2.5, 2.5]
    assert all(line.isVisible() for line in pane.chart._lines)
    go(pane, "2027 Q2", "forward")
    assert not any(line.isVisible() for line in pane.chart._lines)
    assert "Ardenmoor South: forwards from" in pane.chart.accessibleDescription()
