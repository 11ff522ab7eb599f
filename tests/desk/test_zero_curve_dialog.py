"""The zero curve written down in its dialog reaches every discount factor."""

from __future__ import annotations

import datetime

import pytest
from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QApplication
from pytestqt.qtbot import QtBot

from spreadgui.book.entries import EntryError
from spreadgui.book.records import ZeroPoint
from spreadgui.desk.zero_curve_dialog import ZeroCurveDialog, curve_text, read_curve
from tests.books import book_of, cap, spark
from tests.desk.conftest import Desk
from tests.desk.test_window import agrees_with_its_book, settle, shown

BOOK = book_of(spark(), cap())


def test_points_come_back_from_their_text_in_the_order_of_their_days() -> None:
    points = (ZeroPoint(datetime.date(2027, 1, 5), 0.0305), ZeroPoint(datetime.date(2028, 1, 5), 0.04))
    assert read_curve(curve_text(points), BOOK) == points
    assert read_curve("2028-01-05 4 %\n\n2027-01-05;3.05", BOOK) == points
    assert read_curve("", BOOK) == ()


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("2027-01-05", "line 1: expected a day and a rate, as 2027-06-01 3.05"),
        ("2027-01-05 3\nsoon 3", 'line 2: expected a day written as 2027-01-15, got "soon"'),
        ("2027-01-05 3,5", 'line 1: expected a number, got "3,5"'),
        ("2027-01-05 3\n2027-01-05 4", "there is a zero rate for 2027-01-05 already"),
        ("2020-01-05 3", "there is no zero rate for a day after 2026-12-01"),
    ],
)
def test_a_wrong_line_is_told_with_its_number(text: str, said: str) -> None:
    with pytest.raises(EntryError) as refused:
        read_curve(text, BOOK)
    assert str(refused.value) == said


def test_the_curve_taken_over_discounts_every_row_and_undo_brings_the_flat_rate_back(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(BOOK)
    before = [shown(window, row, "discount") for row in range(2)]

    def write() -> None:
        dialog = QApplication.activeModalWidget()
        assert isinstance(dialog, ZeroCurveDialog)
        dialog.text.setPlainText("2027-01-05 x")
        dialog.buttons.buttons()[0].click()
        assert 'got "x"' in dialog.fault.text()
        dialog.text.setPlainText("2027-01-05 9")
        dialog.buttons.buttons()[0].click()

    QTimer.singleShot(50, write)
    window.bar.curve.click()
    settle(qtbot, window)
    assert window.workbench.book.zero_curve == (ZeroPoint(datetime.date(2027, 1, 5), 0.09),)
    assert not window.bar.rate.isEnabled()
    assert window.bar.curve.text() == "Curve (1)…"
    assert shown(window, 0, "rate") == "9.00"
    assert shown(window, 0, "discount") != before[0]
    assert agrees_with_its_book(window)
    window.acts.actions["undo"].trigger()
    settle(qtbot, window)
    assert [shown(window, row, "discount") for row in range(2)] == before
    assert window.bar.rate.isEnabled()
