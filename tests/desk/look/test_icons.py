"""The program's drawings: whole, of one make, and in the colours of the theme."""

import re
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree

import pytest
from PySide6.QtCore import QByteArray, QSize
from PySide6.QtGui import QColor, QIcon, QImage, QPixmap
from PySide6.QtSvg import QSvgRenderer
from PySide6.QtWidgets import QMainWindow, QToolButton
from pytestqt.qtbot import QtBot

from spreadgui import shipped
from spreadgui.desk.look import icons
from spreadgui.desk.look.theme import Theme
from spreadgui.desk.look.tokens import DARK, LIGHT, Palette

pytestmark = pytest.mark.usefixtures("bare")

DRAWINGS = sorted(shipped.folder("icons").glob("*.svg"))
EACH = pytest.mark.parametrize("path", DRAWINGS, ids=lambda path: path.stem)
NEEDED = {
    *("app", "new", "open", "save", "save-as", "undo", "redo", "search", "help", "about"),
    *("insert-row", "duplicate-row", "delete-row", "valuation-date", "method", "quantity"),
    *("contours", "crosshair", "reset-view", "theme-light", "theme-dark"),
    *("current", "pricing", "warning", "refused"),
}


def test_every_drawing_that_the_program_needs_is_there() -> None:
    assert set(icons.names()) >= NEEDED


@EACH
def test_a_drawing_is_sound_and_on_the_common_grid(path: Path) -> None:
    root = ElementTree.parse(path).getroot()
    assert root.tag == "{http://www.w3.org/2000/svg}svg"
    assert root.get("viewBox") == "0 0 24 24"
    assert QSvgRenderer(QByteArray(path.read_bytes())).isValid()


@EACH
def test_a_drawing_has_no_colour_of_its_own_but_for_the_mark(path: Path) -> None:
    colours = {value for _, value in _paints(path)} - {"none"}
    if path.stem == icons.MARK:
        assert LIGHT.kelp in colours
        assert "currentColor" not in colours
    else:
        assert colours == {"currentColor"}


@EACH
def test_a_drawing_keeps_clear_of_the_edge_of_its_grid(path: Path) -> None:
    drawn = icons.picture(path.stem, "#000000", 24).toImage()
    edge = {(x, y) for x in range(24) for y in range(24) if 0 in (x, y) or 23 in (x, y)}
    assert all(drawn.pixelColor(x, y).alpha() < 20 for x, y in edge)


def test_no_two_drawings_are_the_same() -> None:
    seen = {bytes(icons.picture(name, "#000000", 24).toImage().constBits()) for name in icons.names()}
    assert len(seen) == len(icons.names())


def test_an_unknown_drawing_is_named(light: Theme) -> None:
    with pytest.raises(KeyError, match="no-such-drawing"):
        icons.icon("no-such-drawing", light)


@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=lambda palette: palette.name)
def test_an_icon_takes_the_ink_and_the_accent_of_its_theme(light: Theme, palette: Palette) -> None:
    theme = replace(light, palette=palette)
    made = icons.icon("crosshair", theme)
    size = QSize(24, 24)
    assert _strongest(made.pixmap(size)) == QColor(theme.palette.ink)
    assert _strongest(made.pixmap(size, QIcon.Mode.Normal, QIcon.State.On)) == QColor(theme.palette.kelp)
    assert _strongest(made.pixmap(size, QIcon.Mode.Active)) == QColor(theme.palette.kelp)
    faint = _strongest(made.pixmap(size, QIcon.Mode.Disabled))
    assert faint not in (QColor(theme.palette.ink), QColor(theme.palette.kelp))
    assert _strongest(made.pixmap(size, QIcon.Mode.Disabled, QIcon.State.On)) == faint


def test_the_mark_keeps_its_colours_in_every_theme(light: Theme) -> None:
    size = QSize(128, 128)
    first = icons.icon(icons.MARK, light).pixmap(size).toImage()
    assert first == icons.icon(icons.MARK, light.switched()).pixmap(size).toImage()
    assert first.size() == size


@pytest.mark.parametrize("ratio", [1.0, 1.25, 1.5, 2.0])
def test_a_picture_has_every_pixel_of_its_screen(ratio: float) -> None:
    drawn = icons.picture("open", LIGHT.ink, 20, ratio)
    assert drawn.width() == round(20 * ratio)
    assert drawn.devicePixelRatio() == ratio


def test_another_theme_colours_the_icons_anew(light: Theme, qtbot: QtBot) -> None:
    window = QMainWindow()
    qtbot.addWidget(window)
    act = window.addToolBar("acts").addAction("Open")
    button = QToolButton(window)
    plain = QToolButton(window)
    icons.set_icon(act, "open", light)
    icons.set_icon(button, "save", light)
    dark = light.switched()
    icons.renew_icons(window, dark)
    size = QSize(24, 24)
    assert _strongest(act.icon().pixmap(size)) == QColor(dark.palette.ink)
    assert _strongest(button.icon().pixmap(size)) == QColor(dark.palette.ink)
    assert plain.icon().isNull()


def _paints(path: Path) -> list[tuple[str, str]]:
    found = []
    for element in ElementTree.parse(path).iter():
        assert "style" not in element.attrib
        found += [(key, element.attrib[key]) for key in ("fill", "stroke", "stop-color") if key in element.attrib]
    assert not re.search(r"url\(|<image|<text", path.read_text(encoding="utf-8"))
    return found


def _strongest(pixmap: QPixmap) -> QColor:
    """The colour of the pixel that is covered most."""
    drawn = pixmap.toImage().convertToFormat(QImage.Format.Format_ARGB32)
    colours = [drawn.pixelColor(x, y) for x in range(drawn.width()) for y in range(drawn.height())]
    best = max(colours, key=QColor.alpha)
    return QColor(best.red(), best.green(), best.blue())
