"""A pane names itself, cuts what does not fit, and never stands blank."""

import pytest
from PySide6.QtCore import QEvent, Qt
from PySide6.QtWidgets import QApplication, QHBoxLayout, QLabel, QLineEdit, QToolButton, QWidget
from pytestqt.qtbot import QtBot

from spreadgui.desk.look import theme as look
from spreadgui.desk.look.pane import Choice, ElidedLabel, Figure, Pane

# The offscreen platform has no window manager to tell sizes to, and says so at every window shown.
pytestmark = pytest.mark.qt_log_ignore("does not support propagateSizeHints")

LONG = "value · Bjerksund–Stensland · CRN/MWh · Ardenmoor South spark Jan-27, long call of 18 600 MWh"


def test_a_subtitle_that_does_not_fit_is_cut_and_told_in_the_tooltip(light: look.Theme, qtbot: QtBot) -> None:
    pane = _shown(qtbot, Pane("Landscape", QLabel("body")))
    pane.resize(300, 200)
    pane.set_subtitle(LONG, "tip")
    label = pane.findChild(ElidedLabel)
    assert label.is_cut()
    assert label.text().endswith("…")
    assert label.toolTip() == LONG
    assert pane.subtitle() == LONG
    pane.resize(1400, 200)
    assert label.text() == LONG
    assert label.toolTip() == "tip"


def test_a_larger_text_cuts_the_subtitle_anew(light: look.Theme, qtbot: QtBot, bare: QApplication) -> None:
    pane = _shown(qtbot, Pane("Landscape", QLabel("body")))
    pane.set_subtitle(LONG)
    label = pane.findChild(ElidedLabel)
    pane.resize(pane.width() - label.width() + label.fontMetrics().horizontalAdvance(LONG) + 20, 200)
    assert not label.is_cut()
    look.apply(bare, light.scaled(1.5))
    QApplication.processEvents()
    assert label.is_cut()


def test_a_pane_without_a_body_shows_its_words(light: look.Theme, qtbot: QtBot) -> None:
    pane = _shown(qtbot, Pane("Reading"))
    pane.show_empty("Choose a position.")
    assert pane.is_empty()
    shown = [label for label in pane.findChildren(QLabel) if label.isVisible() and label.text() == "Choose a position."]
    assert len(shown) == 1
    pane.show_body()
    assert pane.is_empty()


def test_the_empty_words_hide_the_body_until_there_is_something_to_show(light: look.Theme, qtbot: QtBot) -> None:
    body = QLineEdit()
    pane = _shown(qtbot, Pane("Reading", body))
    assert body.isVisible()
    pane.show_empty("Choose a position.")
    assert not body.isVisible()
    pane.show_body()
    assert body.isVisible()
    assert not pane.is_empty()


def test_another_body_takes_the_place_of_the_first(light: look.Theme, qtbot: QtBot) -> None:
    first, second = QLabel("first"), QLabel("second")
    pane = _shown(qtbot, Pane("Reading", first))
    with qtbot.waitSignal(first.destroyed):
        pane.set_body(second)
        QApplication.sendPostedEvents(None, QEvent.Type.DeferredDelete)
    assert pane.body() is second
    assert second.isVisible()


def test_the_edge_takes_the_accent_while_the_keyboard_is_inside(light: look.Theme, qtbot: QtBot) -> None:
    window = QWidget()
    row = QHBoxLayout(window)
    entries = QLineEdit(), QLineEdit()
    panes = [Pane(name, entry) for name, entry in zip(("Positions", "Marks"), entries, strict=True)]
    for pane in panes:
        row.addWidget(pane)
    _shown(qtbot, window)
    for place in (0, 1):
        entries[place].setFocus()
        qtbot.waitUntil(entries[place].hasFocus)
        assert _edge(panes[place]) == light.colour("kelp").name()
        assert _edge(panes[1 - place]) == light.colour("line").name()


def test_a_pane_that_is_gone_does_not_hear_of_the_keyboard(light: look.Theme, qtbot: QtBot) -> None:
    pane = Pane("Marks", QLabel("body"))
    pane.deleteLater()
    QApplication.sendPostedEvents(None, QEvent.Type.DeferredDelete)
    entry = QLineEdit()
    _shown(qtbot, entry)
    entry.setFocus()
    qtbot.waitUntil(entry.hasFocus)


def test_a_choice_turns_into_a_list_where_its_row_would_push_the_title_out(light: look.Theme, qtbot: QtBot) -> None:
    pane = Pane("Marks", QLabel("body"))
    choice = Choice(["Marks", "Correlations", "Blends", "Estimates", "Zero curve"], "Table")
    pane.add_tool(choice)
    _shown(qtbot, pane)
    pane.resize(800, 200)
    assert not choice.is_narrow()
    pane.resize(pane.minimumSizeHint().width(), 200)
    QApplication.processEvents()
    assert choice.is_narrow()
    assert pane.rect().contains(choice.mapTo(pane, choice.rect().bottomRight()))
    title = pane.findChild(QLabel, "paneTitle")
    assert title.width() >= title.fontMetrics().horizontalAdvance("Marks")
    pane.resize(800, 200)
    assert not choice.is_narrow()


def test_tools_stand_at_the_right_end_in_order(light: look.Theme, qtbot: QtBot) -> None:
    pane = Pane("Landscape", QLabel("body"))
    first, second = QToolButton(), QToolButton()
    pane.add_tool(first)
    pane.add_tool(second)
    _shown(qtbot, pane)
    pane.resize(600, 200)
    QApplication.processEvents()
    assert first.x() < second.x()
    assert pane.width() - second.geometry().right() < 20


def test_titles_of_panes_with_and_without_tools_stand_at_one_height(light: look.Theme, qtbot: QtBot) -> None:
    plain, tooled = Pane("Positions", QLabel("body")), Pane("Landscape", QLabel("body"))
    tooled.add_tool(Choice(["Contours", "Relief"], "Drawing"))
    centres = []
    for pane in (plain, tooled):
        _shown(qtbot, pane)
        centres.append(pane.findChild(QLabel, "paneTitle").geometry().center().y())
    assert abs(centres[0] - centres[1]) <= 1


def test_a_screen_reader_hears_the_pane_and_what_it_shows(light: look.Theme, qtbot: QtBot) -> None:
    body = QLabel("body")
    pane = Pane("Landscape", body)
    qtbot.addWidget(pane)
    pane.set_subtitle(LONG)
    assert pane.accessibleName() == "Landscape"
    assert pane.accessibleDescription() == LONG
    assert body.accessibleName() == "Landscape"


@pytest.mark.parametrize("small", [False, True])
def test_a_figure_is_large_tabular_and_named(light: look.Theme, qtbot: QtBot, small: bool) -> None:
    figure = Figure("value, CRN", small=small)
    _shown(qtbot, figure)
    figure.set_value("−241 930", tone="muted", tip="late")
    value, caption = figure.findChildren(QLabel)
    assert value.font().pointSizeF() > light.points > caption.font().pointSizeF()
    assert value.palette().windowText().color() == light.colour("muted")
    assert figure.accessibleName() == "value, CRN: −241 930"
    assert figure.toolTip() == "late"
    figure.set_caption("per MWh")
    assert figure.accessibleName() == "per MWh: −241 930"
    assert (figure.value(), figure.caption()) == ("−241 930", "per MWh")


def test_words_with_angle_brackets_are_shown_as_they_are(light: look.Theme, qtbot: QtBot) -> None:
    pane = _shown(qtbot, Pane("<b>Marks</b>"))
    pane.set_subtitle("<i>gas</i>")
    plain = Qt.TextFormat.PlainText
    assert {label.textFormat() for label in pane.findChildren(QLabel)} == {plain}


def _shown(qtbot: QtBot, widget: QWidget) -> QWidget:
    qtbot.addWidget(widget)
    widget.show()
    QApplication.processEvents()
    return widget


def _edge(pane: Pane) -> str:
    drawn = pane.grab().toImage()
    return drawn.pixelColor(0, drawn.height() // 2).name()
