"""The whole window, driven as a user would: real keys, the real thread, real files."""

from __future__ import annotations

from pathlib import Path

import pytest
from PySide6.QtCore import QPoint, Qt, QTimer
from PySide6.QtWidgets import QApplication, QLineEdit, QMessageBox
from pytestqt.qtbot import QtBot

from spreadgui import shipped
from spreadgui.book.reading import read_book
from spreadgui.book.records import Book
from spreadgui.book.writing import book_bytes
from spreadgui.desk.acts import ACTS
from spreadgui.desk.window import Window
from spreadgui.pricing import yardstick
from spreadgui.valuation import price
from spreadgui.valuation.results import State
from spreadgui.valuation.table import value_book
from tests.books import book_of, spark
from tests.desk.conftest import Desk


def go(window: Window, row: int, key: str) -> None:
    window.positions.view.go_to(row, window.positions.model.column(key))
    window.positions.view.setFocus()


def type_into(qtbot: QtBot, window: Window, text: str, end: Qt.Key | None = Qt.Key.Key_Return) -> QLineEdit:
    """Type over the current cell, as a user does: the first key opens the editor."""
    view = window.positions.view
    qtbot.keyClick(view, text[0])
    editor = QApplication.focusWidget()
    assert isinstance(editor, QLineEdit)
    qtbot.keyClicks(editor, text[1:])
    if end is not None:
        qtbot.keyClick(editor, end)
    return editor


def shown(window: Window, row: int, key: str) -> str:
    model = window.positions.model
    return str(model.data(model.index(row, model.column(key))))


def settle(qtbot: QtBot, window: Window) -> None:
    qtbot.waitUntil(lambda: window.workbench.idle, timeout=20_000)


def agrees_with_its_book(window: Window) -> bool:
    """Whether every number in the grid is what pricing the book from nothing gives."""
    anew = value_book(window.workbench.book)
    live = window.workbench.results
    same = (live.outputs == anew.results.outputs) | (live.outputs != live.outputs) & (
        anew.results.outputs != anew.results.outputs
    )
    return bool(same.all()) and live.state.tolist() == anew.results.state.tolist()


def test_the_demo_book_opens_with_every_row_priced(desk: Desk, demo_book: Book) -> None:
    window = desk.open(demo_book)
    assert set(window.workbench.results.state.tolist()) == {State.CURRENT}
    assert agrees_with_its_book(window)
    assert "all current" in window.status.text()
    assert window.reading.subtitle().startswith(demo_book.positions[0].name)
    assert demo_book.positions[0].name in window.landscape.subtitle()


def test_a_new_volatility_typed_in_moves_value_reading_and_landscape(desk: Desk, demo_book: Book, qtbot: QtBot) -> None:
    window = desk.open(demo_book)
    row = 2
    go(window, row, "vol_long")
    settle(qtbot, window)
    value, copied = shown(window, row, "position_value"), window.reading.copied()
    surface = window.landscape.surface
    others = [shown(window, other, "position_value") for other in range(len(demo_book.positions)) if other != row]
    type_into(qtbot, window, "95")
    settle(qtbot, window)
    assert window.workbench.book.positions[row].own_vol_long == 0.95
    assert shown(window, row, "vol_long") == "95.0"
    assert shown(window, row, "position_value") != value
    assert window.positions.view.current_row() == row + 1  # Enter goes on to the next row
    go(window, row, "vol_long")
    settle(qtbot, window)
    assert window.reading.copied() != copied
    assert window.landscape.surface.current[2] != surface.current[2]
    assert agrees_with_its_book(window)
    still = [shown(window, other, "position_value") for other in range(len(demo_book.positions)) if other != row]
    assert still == others


def test_nonsense_is_kept_in_the_editor_told_of_and_does_not_reach_the_book(
    desk: Desk, two_market_book: Book, qtbot: QtBot
) -> None:
    window = desk.open(two_market_book)
    go(window, 0, "strike")
    before, value = window.workbench.book, shown(window, 0, "position_value")
    editor = type_into(qtbot, window, "12,5x")
    note = window.positions.view.cells._note
    assert editor.isVisible()
    assert editor.text() == "12,5x"
    assert note.isVisible()
    assert note.text() == 'expected a number, got "12,5x"'
    assert not note.geometry().intersects(editor.geometry())
    assert window.positions.view.viewport().rect().contains(note.geometry())
    assert window.workbench.book is before
    assert shown(window, 0, "position_value") == value
    editor.setText("12.5")
    assert not note.isVisible()
    qtbot.keyClick(editor, Qt.Key.Key_Return)
    settle(qtbot, window)
    assert window.workbench.book.positions[0].strike == 12.5
    assert shown(window, 0, "position_value") != value


def test_escape_puts_a_wrong_entry_away(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(two_market_book)
    go(window, 0, "expiry")
    editor = type_into(qtbot, window, "soon")
    qtbot.keyClick(editor, Qt.Key.Key_Escape)
    assert not window.positions.view.cells._note.isVisible()
    assert window.workbench.book is two_market_book
    assert not window.workbench.modified


def test_a_wrong_entry_left_by_the_mouse_stays_and_other_cells_can_be_edited_meanwhile(
    desk: Desk, two_market_book: Book, qtbot: QtBot
) -> None:
    window = desk.open(two_market_book)
    view = window.positions.view
    go(window, 0, "strike")
    editor = type_into(qtbot, window, "12,5x", end=None)
    place = view.visualRect(window.positions.model.index(1, window.positions.model.column("strike"))).center()
    qtbot.mouseClick(view.viewport(), Qt.MouseButton.LeftButton, pos=place)
    assert editor.isVisible()
    assert editor.text() == "12,5x"
    assert view.cells._note.isVisible()
    go(window, 2, "strike")
    type_into(qtbot, window, "99")
    assert window.workbench.book.positions[2].strike == 99.0
    assert window.workbench.book.positions[0].strike == two_market_book.positions[0].strike
    assert editor.text() == "12,5x"
    editor.setFocus()
    qtbot.keyClick(editor, Qt.Key.Key_Escape)
    assert not view.cells._note.isVisible()


def test_another_book_of_the_same_length_is_read_anew(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(book_of(spark(name="first")))
    window.workbench.open(book_of(spark(name="second", strike=1.0)))
    settle(qtbot, window)
    assert window.reading.subtitle().startswith("second")
    assert window.landscape.surface.subject == "second"


def test_a_burst_of_edits_ends_in_the_last_state_with_no_stale_number(
    desk: Desk, demo_book: Book, qtbot: QtBot
) -> None:
    window = desk.open(demo_book)
    model = window.positions.model
    place = model.column("strike")
    for number in range(200):
        row = number % 7
        assert model.setData(model.index(row, place), f"{number / 10}")
        if number % 13 == 0:
            QApplication.processEvents()
    settle(qtbot, window)
    assert [position.strike for position in window.workbench.book.positions[:7]] == [
        max(number for number in range(200) if number % 7 == row) / 10 for row in range(7)
    ]
    assert set(window.workbench.results.state.tolist()) == {State.CURRENT}
    assert agrees_with_its_book(window)
    for row in range(7):
        assert shown(window, row, "position_value") == model.columns[model.column("position_value")].shown(
            float(window.workbench.slate.values("quantity")[row] * window.workbench.results.values("value")[row])
        )


def test_undo_and_redo_go_through_every_edit(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(two_market_book)
    go(window, 0, "strike")
    type_into(qtbot, window, "7")
    go(window, 1, "name")
    window.acts.actions["duplicate_rows"].trigger()
    window.acts.actions["delete_rows"].trigger()
    window.acts.actions["insert_row"].trigger()
    edited = window.workbench.book
    assert window.workbench.modified
    for _ in range(4):
        window.acts.actions["undo"].trigger()
    settle(qtbot, window)
    assert window.workbench.book == two_market_book
    assert not window.workbench.modified
    assert not window.acts.actions["undo"].isEnabled()
    for _ in range(4):
        window.acts.actions["redo"].trigger()
    settle(qtbot, window)
    assert window.workbench.book == edited
    assert agrees_with_its_book(window)


def test_a_broken_formula_is_told_and_the_next_edit_prices(
    desk: Desk, two_market_book: Book, qtbot: QtBot, monkeypatch: pytest.MonkeyPatch
) -> None:
    window = desk.open(two_market_book)

    def breaks(*_arguments: object) -> None:
        raise RuntimeError("a wheel came off")

    go(window, 0, "strike")
    with monkeypatch.context() as broken:
        broken.setattr(price, "price_rows", breaks)
        type_into(qtbot, window, "7")
        settle(qtbot, window)
    assert "a wheel came off" in window.message.sentence()
    assert window.message.isVisible()
    assert shown(window, 0, "position_value") == "refused"
    assert shown(window, 1, "position_value") not in ("", "refused")
    go(window, 0, "strike")
    type_into(qtbot, window, "8")
    settle(qtbot, window)
    assert set(window.workbench.results.state.tolist()) == {State.CURRENT}
    assert not window.message.isVisible()
    assert agrees_with_its_book(window)


def test_a_book_saved_and_opened_again_is_equal(
    desk: Desk, two_market_book: Book, qtbot: QtBot, tmp_path: Path
) -> None:
    window, path = desk.open(two_market_book), tmp_path / "book.json"
    go(window, 0, "name")
    type_into(qtbot, window, "spark, own words")
    assert window.isWindowModified()
    assert window.files.write(path)
    assert not window.isWindowModified()
    saved = window.workbench.book
    assert read_book(path) == saved
    assert window.files.open(path)
    settle(qtbot, window)
    assert window.workbench.book == saved
    assert window.files.recent() == [path.resolve()]
    assert path.read_bytes() == book_bytes(saved)


DEMO = shipped.sample_book("ardenmoor_winter").read_bytes()


@pytest.mark.parametrize(
    "content",
    [
        b"", b"{", DEMO[:5000], b"\x00\x01\x02", b'{"format": "other"}', b"[" * 10_000,
        DEMO.replace(b'"version": 2', b'"version": 99'), DEMO.replace(b"0.032", b'"x"'),
    ],
    ids=["empty", "cut at once", "cut", "binary", "foreign", "deep", "newer", "wrong entry"],
)  # fmt: skip
def test_a_file_that_cannot_be_read_is_told_of_and_the_open_book_stays(
    desk: Desk, two_market_book: Book, tmp_path: Path, content: bytes
) -> None:
    window, path = desk.open(two_market_book), tmp_path / "broken.json"
    path.write_bytes(content)
    assert not window.files.open(path)
    assert "broken.json was not opened" in window.message.sentence()
    assert window.workbench.book is two_market_book
    assert set(window.workbench.results.state.tolist()) == {State.CURRENT}


def test_a_file_too_large_to_be_a_book_is_told_of_without_reading_it(
    desk: Desk, two_market_book: Book, tmp_path: Path
) -> None:
    window, path = desk.open(two_market_book), tmp_path / "huge.json"
    with path.open("wb") as huge:
        huge.truncate(2**30)  # a hole: it takes no room on the disk
    assert not window.files.open(path)
    assert "larger than" in window.message.sentence()
    assert window.workbench.book is two_market_book


def test_a_folder_that_cannot_be_written_to_is_told_of_and_nothing_is_lost(
    desk: Desk, two_market_book: Book, qtbot: QtBot
) -> None:
    window = desk.open(two_market_book)
    go(window, 0, "strike")
    type_into(qtbot, window, "7")
    assert not window.files.write(Path("/proc/nowhere/book.json"))
    assert "was not saved" in window.message.sentence()
    assert window.workbench.modified


def answer(button: QMessageBox.StandardButton) -> None:
    """Press a button of the question that comes up next."""

    def press() -> None:
        box = QApplication.activeModalWidget()
        assert isinstance(box, QMessageBox)
        box.button(button).click()

    QTimer.singleShot(50, press)


def test_closing_asks_about_unsaved_changes(desk: Desk, two_market_book: Book, qtbot: QtBot, tmp_path: Path) -> None:
    window, path = desk.open(two_market_book, tmp_path / "book.json"), tmp_path / "book.json"
    go(window, 0, "strike")
    type_into(qtbot, window, "7")
    answer(QMessageBox.StandardButton.Cancel)
    assert not window.close()
    assert not path.exists()
    answer(QMessageBox.StandardButton.Save)
    assert window.close()
    assert read_book(path).positions[0].strike == 7.0


def test_a_new_book_keeps_the_markets_and_says_what_to_do(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(two_market_book)
    window.acts.actions["new"].trigger()
    settle(qtbot, window)
    assert window.workbench.book.markets == two_market_book.markets
    assert window.positions.is_empty()
    window.acts.actions["insert_row"].trigger()
    settle(qtbot, window)
    assert not window.positions.is_empty()
    assert shown(window, 0, "position_value") == "incomplete"
    assert "quantity is missing" in window.positions.model.tip(window.positions.model.index(0, 1))


def test_the_whole_books_entries_are_edited_in_the_strip_above(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(two_market_book)
    value = shown(window, 0, "position_value")
    window.bar.date.setFocus()
    window.bar.date.selectAll()
    qtbot.keyClicks(window.bar.date, "2026-12-20")
    qtbot.keyClick(window.bar.date, Qt.Key.Key_Return)
    settle(qtbot, window)
    assert str(window.workbench.book.valuation_date) == "2026-12-20"
    assert shown(window, 0, "position_value") != value
    window.bar.rate.setText("four")
    window.bar.rate.editingFinished.emit()
    assert window.workbench.book.zero_rate == two_market_book.zero_rate
    assert window.bar.rate.text() == "four"
    assert window.bar.rate.toolTip() == 'expected a number, got "four"'


def test_the_method_of_the_book_decides_its_value(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(two_market_book)
    place = window.bar.method.findData("kirk")
    window.bar.method.setCurrentIndex(place)
    window.bar.method.activated.emit(place)
    settle(qtbot, window)
    results = window.workbench.results
    assert results.values("value").tolist() == results.values("kirk").tolist()
    assert "Kirk" in window.reading.copied()


def test_every_act_has_a_handler_and_no_key_is_given_twice(desk: Desk, two_market_book: Book) -> None:
    window = desk.open(two_market_book)
    assert set(window.handlers) == {act.id for act in ACTS}
    keys = [act.keys for act in ACTS if act.keys]
    assert len(keys) == len(set(keys))
    assert {act.icon for act in ACTS if act.icon} <= {path.stem for path in shipped.folder("icons").glob("*.svg")}


def test_name_and_value_stay_in_sight_while_the_inputs_scroll(desk: Desk, demo_book: Book, qtbot: QtBot) -> None:
    window = desk.open(demo_book)
    view = window.positions.view
    go(window, 3, "note")
    assert view.horizontalScrollBar().value() > 0
    pinned = view.pinned
    assert pinned.isVisible()
    assert pinned.columnViewportPosition(window.positions.model.column("position_value")) < pinned.width()
    go(window, 3, "side")
    left = view.columnViewportPosition(window.positions.model.column("side"))
    assert left >= view.pinned_width()  # not under the pinned columns
    row_height = view.rowHeight(0)
    view.verticalScrollBar().setValue(5)
    assert pinned.rowAt(row_height // 2) == view.rowAt(row_height // 2) == 5


def test_a_pinned_cell_is_edited_where_it_is_seen(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(two_market_book)
    go(window, 1, "name")
    editor = type_into(qtbot, window, "renamed")
    assert editor.parentWidget() is window.positions.view.pinned.viewport()
    assert window.workbench.book.positions[1].name == "renamed"
    assert window.positions.view.hasFocus()


def test_clearing_an_own_mark_returns_the_row_to_marks(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(two_market_book)
    value = shown(window, 0, "position_value")
    go(window, 0, "forward_long")
    type_into(qtbot, window, "120")
    settle(qtbot, window)
    model = window.positions.model
    index = model.index(0, model.column("forward_long"))
    assert "Own mark" in model.tip(index)
    assert shown(window, 0, "position_value") != value
    go(window, 0, "forward_long")
    window.acts.actions["clear"].trigger()
    settle(qtbot, window)
    assert window.workbench.book.positions[0].own_forward_long is None
    assert "From Marks" in model.tip(index)
    assert shown(window, 0, "position_value") == value


def test_delete_empties_cells_only_while_the_keyboard_is_in_the_grid(
    desk: Desk, two_market_book: Book, qtbot: QtBot
) -> None:
    window = desk.open(two_market_book)
    go(window, 0, "name")
    window.reading.setFocus()
    qtbot.keyClick(QApplication.focusWidget(), Qt.Key.Key_Delete)
    assert window.workbench.book is two_market_book
    window.positions.view.setFocus()
    qtbot.keyClick(window.positions.view, Qt.Key.Key_Delete)
    assert window.workbench.book.positions[0].name == ""


def test_looking_into_a_cell_is_no_edit(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(two_market_book)
    for key in ("vol_long", "strike", "side", "expiry", "long_leg"):
        go(window, 0, key)
        window.acts.actions["edit_cell"].trigger()
        qtbot.keyClick(QApplication.focusWidget(), Qt.Key.Key_Return)
    assert window.workbench.book is two_market_book
    assert not window.workbench.modified


def test_a_choice_is_made_by_keyboard(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(two_market_book)
    go(window, 0, "kind")
    window.acts.actions["edit_cell"].trigger()
    editor = QApplication.focusWidget()
    qtbot.keyClick(editor, Qt.Key.Key_Down)
    qtbot.keyClick(editor, Qt.Key.Key_Return)
    settle(qtbot, window)
    assert window.workbench.book.positions[0].kind == "put"


def test_the_landscape_follows_the_row_and_its_choices(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(two_market_book)
    go(window, 1, "name")
    settle(qtbot, window)
    surface = window.landscape.surface
    assert surface.subject == "season"
    assert surface.axes == ("Ardenmoor South 2027-01, CRN/MWh", "Ardenmoor South 2027-07, CRN/MWh")
    window.landscape.choose("delta_long", "yardstick")
    window.landscape.asked.emit()
    settle(qtbot, window)
    position = window.workbench.slate
    cell = {key: float(position.values(key)[1]) for key in ("correlation", "years", "discount")}
    expected = yardstick.sensitivities(
        108.0, 80.0, -2.0, 0.6, 0.5, cell["correlation"], cell["years"], cell["discount"], kind="put"
    )
    assert window.landscape.surface.current[2] == pytest.approx(float(expected.delta_long))
    go(window, 2, "name")
    settle(qtbot, window)
    assert window.landscape.is_empty()


def test_both_looks_dress_the_whole_window(desk: Desk, two_market_book: Book, qtbot: QtBot) -> None:
    window = desk.open(two_market_book)
    light = window.grab().toImage().pixelColor(QPoint(4, 300)).lightness()
    window.switch_look()
    settle(qtbot, window)
    dark = window.grab().toImage().pixelColor(QPoint(4, 300)).lightness()
    assert light > 200
    assert dark < 60
    window.switch_look()


def test_a_fault_of_the_program_is_told_in_the_window_not_as_a_traceback(desk: Desk, two_market_book: Book) -> None:
    from spreadgui.desk.program import _stumble

    window = desk.open(two_market_book)
    _stumble(window, KeyError("lost"))
    assert "KeyError" in window.message.sentence()
    assert "The book is as it was" in window.message.sentence()
