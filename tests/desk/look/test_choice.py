"""A choice is one stop of the keyboard, tells what the user chose, and keeps to what is available."""

import pytest
from PySide6.QtCore import Qt
from PySide6.QtWidgets import QComboBox, QLineEdit, QToolButton, QVBoxLayout, QWidget
from pytestqt.qtbot import QtBot

from spreadgui.desk.look.choice import Choice
from spreadgui.desk.look.theme import Theme

# The offscreen platform has no window manager to tell sizes to, and says so at every window shown.
pytestmark = pytest.mark.qt_log_ignore("does not support propagateSizeHints")

Key = Qt.Key


@pytest.fixture
def choice(light: Theme, qtbot: QtBot) -> Choice:
    """Contours, Relief and Slice, shown, with the keyboard on the row."""
    made = Choice([("contours", "Contours"), ("relief", "Relief"), ("slice", "Slice")], "Drawing")
    qtbot.addWidget(made)
    made.show()
    _chip(made).setFocus()
    qtbot.waitUntil(_chip(made).hasFocus)
    return made


def test_the_first_choice_is_chosen_and_plain_words_are_their_own_keys(light: Theme, qtbot: QtBot) -> None:
    made = Choice(["Marks", "Blends"], "Table")
    qtbot.addWidget(made)
    assert made.current() == "Marks"
    assert made.keys() == ("Marks", "Blends")


def test_a_click_chooses_and_tells_once(choice: Choice, qtbot: QtBot) -> None:
    heard: list[str] = []
    choice.chosen.connect(heard.append)
    chip = choice.findChildren(QToolButton)[1]
    qtbot.mouseClick(chip, Qt.MouseButton.LeftButton)
    qtbot.mouseClick(chip, Qt.MouseButton.LeftButton)
    assert heard == ["relief"]
    assert choice.current() == "relief"
    assert [button.isChecked() for button in choice.findChildren(QToolButton)] == [False, True, False]


def test_the_arrow_keys_go_along_the_row_and_stop_at_its_ends(choice: Choice, qtbot: QtBot) -> None:
    heard: list[str] = []
    choice.chosen.connect(heard.append)
    for key in (Key.Key_Left, Key.Key_Right, Key.Key_Right, Key.Key_Right, Key.Key_Home, Key.Key_End):
        qtbot.keyClick(_chip(choice), key)
        assert _chip(choice).hasFocus()
    assert heard == ["relief", "slice", "contours", "slice"]


def test_the_arrow_keys_follow_the_direction_of_reading(choice: Choice, qtbot: QtBot) -> None:
    choice.setLayoutDirection(Qt.LayoutDirection.RightToLeft)
    qtbot.keyClick(_chip(choice), Key.Key_Left)
    assert choice.current() == "relief"
    qtbot.keyClick(_chip(choice), Key.Key_End)
    assert choice.current() == "slice"


def test_what_is_switched_off_is_passed_over_and_says_why(choice: Choice, qtbot: QtBot) -> None:
    choice.set_available("relief", False, "needs both underlyings")
    qtbot.keyClick(_chip(choice), Key.Key_Right)
    assert choice.current() == "slice"
    chip = choice.findChildren(QToolButton)[1]
    assert not chip.isEnabled()
    assert chip.toolTip() == "needs both underlyings"


def test_the_program_chooses_without_telling(choice: Choice) -> None:
    heard: list[str] = []
    choice.chosen.connect(heard.append)
    choice.set_current("slice")
    assert (choice.current(), heard) == ("slice", [])


def test_the_row_is_one_stop_of_the_tab_key(light: Theme, qtbot: QtBot) -> None:
    window = QWidget()
    qtbot.addWidget(window)
    column = QVBoxLayout(window)
    before, made, after = QLineEdit(), Choice(["a", "b", "c"], "Letter"), QLineEdit()
    for widget in (before, made, after):
        column.addWidget(widget)
    made.set_current("b")
    window.show()
    before.setFocus()
    qtbot.waitUntil(before.hasFocus)
    qtbot.keyClick(before, Key.Key_Tab)
    assert _chip(made).hasFocus()
    qtbot.keyClick(_chip(made), Key.Key_Tab)
    assert after.hasFocus()


def test_the_row_stands_still_when_another_is_chosen(choice: Choice) -> None:
    width = choice.row_width()
    for key in ("slice", "relief", "contours"):
        choice.set_current(key)
        assert choice.row_width() == width


def test_a_list_chooses_as_the_row_does_and_keeps_the_keyboard(choice: Choice, qtbot: QtBot) -> None:
    heard: list[str] = []
    choice.chosen.connect(heard.append)
    choice.set_available("relief", False, "why not")
    choice.set_narrow(True)
    narrow = choice.findChild(QComboBox)
    assert choice.is_narrow()
    assert narrow.isVisible()
    assert narrow.hasFocus()
    qtbot.keyClick(narrow, Key.Key_Down)
    assert heard == ["slice"]
    choice.set_narrow(False)
    assert not narrow.isVisible()
    assert _chip(choice).text() == "Slice"
    assert _chip(choice).hasFocus()


def test_a_screen_reader_hears_what_is_chosen_here(choice: Choice) -> None:
    assert choice.accessibleName() == "Drawing"
    assert [chip.accessibleName() for chip in choice.findChildren(QToolButton)] == ["Contours", "Relief", "Slice"]
    assert choice.findChild(QComboBox).accessibleName() == "Drawing"


@pytest.mark.parametrize("wrong", [[], ["a", "a"], [("a", "x"), ("a", "y")]])
def test_choices_without_difference_are_refused(light: Theme, wrong: list[str]) -> None:
    with pytest.raises(ValueError, match="choices"):
        Choice(wrong, "Letter")


def test_an_unknown_key_is_named(choice: Choice) -> None:
    with pytest.raises(KeyError, match="cube"):
        choice.set_current("cube")
    assert choice.current() == "contours"


def _chip(choice: Choice) -> QToolButton:
    """The chip that is chosen."""
    return next(chip for chip in choice.findChildren(QToolButton) if chip.isChecked())
