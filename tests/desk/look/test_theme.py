"""A theme goes on whole, comes off whole, and follows what the user's system says."""

import re
from dataclasses import fields
from pathlib import Path

import pytest
from PySide6.QtCore import QByteArray, Qt
from PySide6.QtGui import QColor, QFont, QImage, QPalette
from PySide6.QtSvg import QSvgRenderer
from PySide6.QtWidgets import (
    QApplication,
    QCalendarWidget,
    QCheckBox,
    QComboBox,
    QLabel,
    QLineEdit,
    QMainWindow,
    QPushButton,
    QSlider,
    QTableWidget,
    QToolBar,
    QToolButton,
    QVBoxLayout,
    QWidget,
)
from pytestqt.qtbot import QtBot

from spreadgui.desk.look import theme as look
from spreadgui.desk.look.tokens import DARK, LIGHT, Palette

# The offscreen platform has no window manager to tell sizes to, and says so at every window shown.
pytestmark = pytest.mark.qt_log_ignore("does not support propagateSizeHints")

GLYPHS = Path(look.__file__).parent / "glyphs"
TNUM = QFont.Tag("tnum")


def test_without_a_word_from_the_platform_the_first_palette_decides(bare: QApplication) -> None:
    bare.setPalette(QPalette(QColor("#202020")))
    assert look.system_prefers_dark(bare)
    bare.setProperty("systemTextPoints", None)
    bare.setPalette(QPalette(QColor("#F0F0F0")))
    assert not look.system_prefers_dark(bare)


def test_a_theme_does_not_change_what_the_system_is_said_to_prefer(bare: QApplication) -> None:
    bare.setPalette(QPalette(QColor("#F0F0F0")))
    before = look.system_points(bare)
    look.apply(bare, look.theme_for(bare, dark=True).scaled(2))
    assert not look.system_prefers_dark(bare)
    assert look.system_points(bare) == before
    assert look.theme_for(bare).palette is LIGHT


def test_sizes_follow_the_text_size_of_the_user(bare: QApplication) -> None:
    font = bare.font()
    font.setPointSizeF(15)
    bare.setFont(font)
    theme = look.theme_for(bare, dark=False)
    assert theme.points == pytest.approx(15, abs=0.2)
    assert theme.small < theme.points < theme.title < theme.figure
    assert theme.scaled(2).figure == pytest.approx(2 * theme.figure, rel=0.02)


def test_a_size_given_in_pixels_is_understood(bare: QApplication) -> None:
    font = bare.font()
    font.setPixelSize(20)
    bare.setFont(font)
    assert 8 < look.theme_for(bare, dark=False).points < 20


def test_a_label_is_as_large_and_as_coloured_as_its_rank_and_tone(light: look.Theme, qtbot: QtBot) -> None:
    label = QLabel("3 412 880")
    qtbot.addWidget(label)
    look.set_rank(label, "figure")
    look.set_tone(label, "brick")
    label.ensurePolished()
    assert label.font().pointSizeF() == pytest.approx(light.figure)
    assert label.palette().windowText().color() == light.colour("brick")
    look.set_rank(label, "")
    look.set_tone(label, "")
    assert label.font().pointSizeF() == pytest.approx(light.points)
    assert label.palette().windowText().color() == light.colour("ink")


def test_figures_are_of_one_width_wherever_text_is_set(light: look.Theme, qtbot: QtBot) -> None:
    label = QLabel("112.03")
    qtbot.addWidget(label)
    look.set_rank(label, "figure")
    label.ensurePolished()
    assert label.font().featureValue(TNUM) == 1


def test_tabular_leaves_the_font_it_is_given_alone(bare: QApplication) -> None:
    font = QFont(bare.font())
    for tag in font.featureTags():
        font.unsetFeature(tag)
    assert look.tabular(font).featureValue(TNUM) == 1
    assert not font.isFeatureSet(TNUM)


@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=lambda palette: palette.name)
def test_qt_paints_with_the_colours_of_the_theme(bare: QApplication, palette: Palette) -> None:
    look.apply(bare, look.Theme(palette, 10))
    used = bare.palette()
    assert used.window().color() == QColor(palette.paper)
    assert used.base().color() == QColor(palette.panel)
    assert used.text().color() == QColor(palette.ink)
    assert used.placeholderText().color() == QColor(palette.muted)
    assert used.color(QPalette.ColorGroup.Disabled, QPalette.ColorRole.Text) == QColor(palette.muted)


def test_another_theme_leaves_nothing_of_the_first(bare: QApplication, qtbot: QtBot) -> None:
    light, dark = look.Theme(LIGHT, 10), look.Theme(DARK, 10)
    look.apply(bare, light)
    window = _window()
    qtbot.addWidget(window)
    window.show()
    in_light = _picture(window)
    look.apply(bare, dark)
    in_dark = _picture(window)
    fresh = _window()
    qtbot.addWidget(fresh)
    fresh.show()
    assert in_dark != in_light
    assert in_dark == _picture(fresh)
    look.apply(bare, light)
    assert _picture(window) == in_light


def test_a_larger_text_and_back_leaves_nothing_either(bare: QApplication, qtbot: QtBot) -> None:
    theme = look.Theme(LIGHT, 10)
    look.apply(bare, theme)
    window = _window()
    qtbot.addWidget(window)
    window.show()
    before = _picture(window)
    look.apply(bare, theme.scaled(1.6))
    assert _picture(window) != before
    look.apply(bare, theme)
    assert _picture(window) == before


def test_an_unknown_colour_is_an_error(light: look.Theme) -> None:
    with pytest.raises(AttributeError):
        light.colour("purple")


@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=lambda palette: palette.name)
def test_the_style_sheet_is_filled_in_and_names_drawings_that_exist(palette: Palette) -> None:
    sheet = look.stylesheet(look.Theme(palette, 10))
    assert "$" not in sheet
    used = re.findall(r'url\("([^"]+)"\)', sheet)
    assert len(used) > 10
    assert all(QSvgRenderer(QByteArray(Path(path).read_bytes())).isValid() for path in used)
    colours = {colour.upper() for colour in re.findall(r"#[0-9a-fA-F]{6}", sheet)}
    assert colours <= {*_colours(palette), palette.kelp_hover, palette.selected}


def test_the_small_drawings_differ_between_themes_in_colour_alone() -> None:
    light = {path.name: path.read_text(encoding="utf-8") for path in (GLYPHS / "light").glob("*.svg")}
    dark = {path.name: path.read_text(encoding="utf-8") for path in (GLYPHS / "dark").glob("*.svg")}
    assert light.keys() == dark.keys()
    token_of = {getattr(LIGHT, field.name): field.name for field in fields(Palette)}
    for name, drawn in light.items():
        found = re.findall(r"#[0-9A-F]{6}", drawn)
        assert len(found) == 1, name
        assert drawn.replace(found[0], getattr(DARK, token_of[found[0]])) == dark[name]


def test_an_entry_shows_that_it_is_refused_and_sound_again(light: look.Theme, qtbot: QtBot) -> None:
    entry = QLineEdit()
    qtbot.addWidget(entry)
    entry.resize(120, 28)
    sound = entry.grab().toImage()
    look.set_refused(entry, True)
    refused = entry.grab().toImage()
    assert refused.pixelColor(100, 14) == light.colour("brick_soft")
    look.set_refused(entry, False)
    assert entry.grab().toImage() == sound


def test_a_calendar_has_no_colour_of_its_own(light: look.Theme, qtbot: QtBot) -> None:
    calendar = QCalendarWidget()
    qtbot.addWidget(calendar)
    calendar.resize(300, 220)
    red = QColor(Qt.GlobalColor.red)
    assert _count(calendar, red) > 0
    look.calm_calendar(calendar, light)
    assert _count(calendar, red) == 0


@pytest.mark.parametrize("kind", [QLineEdit, QComboBox, QPushButton, QCheckBox, QSlider, QToolButton])
@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=lambda palette: palette.name)
def test_the_keyboard_shows_where_it_is(
    bare: QApplication, qtbot: QtBot, kind: type[QWidget], palette: Palette
) -> None:
    look.apply(bare, look.Theme(palette, 10))
    window = QWidget()
    qtbot.addWidget(window)
    column = QVBoxLayout(window)
    other, widget = QPushButton("other"), kind()
    column.addWidget(other)
    column.addWidget(widget)
    window.show()
    other.setFocus()
    qtbot.waitUntil(other.hasFocus)
    before = _count(widget, QColor(palette.kelp))
    widget.setFocus()
    qtbot.waitUntil(widget.hasFocus)
    assert _count(widget, QColor(palette.kelp)) > before + 20


def _colours(palette: Palette) -> set[str]:
    return {getattr(palette, field.name) for field in fields(palette) if field.name != "name"}


def _count(widget: QWidget, colour: QColor) -> int:
    drawn = widget.grab().toImage()
    return sum(drawn.pixelColor(x, y) == colour for x in range(drawn.width()) for y in range(drawn.height()))


def _picture(widget: QWidget) -> QImage:
    QApplication.processEvents()
    return widget.grab().toImage()


def _window() -> QMainWindow:
    """A window with one of most things in it; nothing has the keyboard, so that no cursor is drawn."""
    window = QMainWindow()
    window.setFixedSize(460, 460)
    bar = QToolBar()
    for words in ("New", "Open", "Save", "Undo", "Redo", "Insert row", "Delete row", "Help"):
        bar.addAction(words)
    window.addToolBar(bar)
    window.menuBar().addMenu("Book")
    table = QTableWidget(30, 3)
    off = QPushButton("Off")
    off.setEnabled(False)
    middle = QWidget()
    column = QVBoxLayout(middle)
    for widget in (QLineEdit("sound"), QComboBox(), QCheckBox("role exchange"), QSlider(), table, off, QLabel("words")):
        widget.setFocusPolicy(widget.focusPolicy().NoFocus)
        column.addWidget(widget)
    window.setCentralWidget(middle)
    window.statusBar().showMessage("26 current")
    return window
