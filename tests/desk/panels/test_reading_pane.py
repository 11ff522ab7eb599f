"""The Reading pane shows what the formulas say, in words where there is nothing to say, and never cuts a number."""

import math
import re
import subprocess
import sys
from collections.abc import Callable

import numpy as np
import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtGui import QColor, QFont, QFontMetrics, QGuiApplication, QImage
from PySide6.QtWidgets import QApplication, QLabel, QScrollArea, QStyleOptionViewItem, QWidget
from pytestqt.qtbot import QtBot

from spreadgui.desk.look import theme as look
from spreadgui.desk.look.pane import Figure
from spreadgui.desk.panels.reading import NO_POSITION, WAITING, ReadingPane
from spreadgui.desk.panels.reading_sheets import CAUTION
from spreadgui.desk.panels.sheet_view import PADDING, SheetView
from spreadgui.valuation.reading import Reading
from spreadgui.valuation.shown import number_text

# The offscreen platform has no window manager to tell sizes to, and says so at every window shown.
pytestmark = pytest.mark.qt_log_ignore("does not support propagateSizeHints")

Read = Callable[..., Reading]
MakePane = Callable[..., ReadingPane]
SIZES = [(620, 330), (500, 260)]
PRICED = ["spark", "sold spark", "exchange", "floor", "outright", "forward", "huge", "hopeless"]


def views(pane: ReadingPane) -> tuple[SheetView, SheetView]:
    methods, sensitivities = [
        view for view in pane.findChildren(SheetView) if view.accessibleName() not in ("Parts", "Days")
    ]
    assert (methods.accessibleName(), sensitivities.accessibleName()) == ("Methods", "Sensitivities")
    return methods, sensitivities


def texts(view: SheetView) -> list[list[str]]:
    model = view.model()
    return [
        [model.index(row, column).data() for column in range(model.columnCount())] for row in range(model.rowCount())
    ]


def figures(pane: ReadingPane) -> list[Figure]:
    return [figure for figure in pane.findChildren(Figure) if not figure.isHidden()]


def closing_words(pane: ReadingPane) -> str:
    """The line at the very bottom of the pane."""
    labels = [label for label in pane.findChildren(QLabel) if label.isVisible()]
    return max(labels, key=lambda label: label.mapTo(pane, QPoint(0, 0)).y()).text()


def number(text: str) -> float:
    """A number of a screen, read back."""
    return float(text.partition(" ")[0].replace("−", "-").replace("\N{NARROW NO-BREAK SPACE}", ""))


def test_it_starts_with_words_that_say_what_would_be_here(make_pane: MakePane) -> None:
    pane = make_pane()
    assert pane.is_empty()
    assert pane.title() == pane.accessibleName() == "Reading"
    assert NO_POSITION in [label.text() for label in pane.findChildren(QLabel) if label.isVisible()]


@pytest.mark.parametrize("name", ["spark", "sold spark", "floor", "outright"])
def test_the_headline_tells_value_unit_value_intrinsic_and_time_value(
    make_pane: MakePane, read: Read, name: str
) -> None:
    pane, reading = make_pane(), read(name)
    pane.show_reading(reading)
    shown = {figure.caption(): figure.value() for figure in figures(pane)}
    assert shown["position value"] == f"{number_text(reading.position_value, 0)} CRN"
    for caption, value in (
        ("unit value, CRN/MWh", reading.unit_value),
        ("intrinsic", reading.intrinsic),
        ("time value", reading.time_value),
    ):
        assert number(shown[caption]) == pytest.approx(value, abs=1e-4)
    assert pane.subtitle() == reading.subject
    assert pane.accessibleDescription() == reading.subject


def test_the_position_value_is_the_largest_figure(make_pane: MakePane, read: Read) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    first, *others = figures(pane)
    assert first.caption() == "position value"
    assert all(first.height() > other.height() for other in others)


def test_the_methods_stand_in_the_order_of_the_table_with_their_gaps(make_pane: MakePane, read: Read) -> None:
    pane, reading = make_pane(), read("sold spark", "bjerksund_stensland")
    pane.show_reading(reading)
    rows = texts(views(pane)[0])
    assert [row[0] for row in rows] == ["Margrabe", "Kirk", "Modified Kirk", "Bjerksund-Stensland", "Yardstick"]
    for method, row in zip(reading.methods[1:4], rows[1:4], strict=True):
        assert number(row[1]) == pytest.approx(method.unit_value, abs=1e-4)
        assert number(row[2]) == pytest.approx(method.gap, abs=5.1e-5)
        assert number(row[3]) == pytest.approx(method.position_gap, abs=1.0)
        assert number(row[4]) == pytest.approx(100 * method.gap_share, abs=1e-3)
        for text, value in zip(row[2:5], (method.gap, method.position_gap, method.gap_share), strict=True):
            assert text.startswith("+" if value > 0 else "−")
    assert [row[5] for row in rows[1:4]] == ["", "", "The book’s value"]
    assert re.fullmatch(r"Reference ±\de-1\d", rows[4][2])


def test_a_method_that_does_not_cover_the_strike_says_so_across_the_gaps(make_pane: MakePane, read: Read) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    view = views(pane)[0]
    assert texts(view)[0][1:3] == ["–", "Exact for a strike of zero, and only there."]
    assert view.columnSpan(0, 2) == 4
    pane.show_reading(read("exchange"))
    assert number(texts(view)[0][1]) == pytest.approx(read("exchange").unit_value, abs=1e-4)
    assert view.columnSpan(0, 2) == 1


def test_where_the_books_value_comes_from_is_told_in_words(make_pane: MakePane, read: Read) -> None:
    pane = make_pane()
    pane.show_reading(read("spark", "yardstick"))
    assert re.fullmatch(r"Reference ±\de-1\d; the book’s value", texts(views(pane)[0])[4][2])
    assert closing_words(pane) == "The book’s value: Yardstick. A model value is no quote."
    pane.resize(500, 260)
    pane.show_reading(read("spark", "modified_kirk"))
    assert closing_words(pane) == "The book’s value: modified Kirk. A model value is no quote."
    assert closing_words(pane).endswith(CAUTION)


def test_the_yardstick_stands_on_a_ground_of_its_own(make_pane: MakePane, read: Read, light: look.Theme) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    view = views(pane)[0]
    image = view.viewport().grab().toImage()
    middles = [image.pixelColor(3, view.rowViewportPosition(row) + 2) for row in range(5)]
    assert middles[4] == QColor(light.palette.paper)
    assert all(colour == QColor(light.palette.panel) for colour in middles[:4])


@pytest.mark.parametrize(("width", "height"), SIZES)
@pytest.mark.parametrize("name", ["spark", "sold spark", "floor"])
def test_sensitivities_are_the_formulas_times_their_scaling(
    make_pane: MakePane, read: Read, name: str, width: int, height: int
) -> None:
    pane, reading = make_pane(width, height), read(name)
    pane.show_reading(reading)
    shown = sensitivities_by_name(views(pane)[1])
    scales = {"vega_long": 0.01, "vega_short": 0.01, "correlation_sensitivity": 0.01, "theta": 1 / 365}
    for row, plain in zip(reading.sensitivity_rows, reading.sensitivities, strict=True):
        per_unit, position = shown[row.name]
        expected = plain * scales.get(row.key, 1.0)
        assert number(per_unit) == pytest.approx(expected, abs=5.1e-5)
        assert number(position) == pytest.approx(reading.quantity * expected, abs=0.51)
        assert position.endswith(row.unit)


def sensitivities_by_name(view: SheetView) -> dict[str, tuple[str, str]]:
    """The numbers shown, by the full name, whichever way the table is arranged."""
    found = {}
    for row, cells in enumerate(texts(view)):
        name = view.model().index(row, 0).data(Qt.ItemDataRole.AccessibleTextRole).partition(" per ")[0]
        if len(cells) == 3:
            found[name] = (cells[1], cells[2])
            continue
        found[name] = (cells[2], cells[3])
        if cells[4]:
            assert cells[4] == "short"
            found[name.replace("long", "short")] = (cells[5], cells[6])
    return found


def test_scalings_and_units_are_named(make_pane: MakePane, read: Read) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    view = views(pane)[1]
    assert [row[0] for row in texts(view)] == [
        "Delta per 1.00", "Gamma per 1.00", "Cross-gamma per 1.00", "Vega per 1 vol point", "Correlation per 0.01",
        "Theta per calendar day",
    ]  # fmt: skip
    units = {name: position.rpartition(" ")[2] for name, (_, position) in sensitivities_by_name(view).items()}
    assert units["Delta long"] == "MWh"
    assert units["Delta short"] == "GJ"
    assert units["Correlation sensitivity"] == units["Theta"] == units["Vega short"] == "CRN"


@pytest.mark.parametrize(("width", "height"), SIZES)
def test_a_leg_that_is_not_there_is_told_in_words_not_in_zeros(
    make_pane: MakePane, read: Read, width: int, height: int
) -> None:
    pane = make_pane(width, height)
    pane.show_reading(read("outright"))
    assert texts(views(pane)[0])[0][0] == "Black-76"
    shown = sensitivities_by_name(views(pane)[1])
    for name in ("Delta short", "Gamma short", "Vega short"):
        assert shown[name] == ("– no short leg", "")
    assert shown["Cross-gamma"] == shown["Correlation sensitivity"] == ("– one leg only", "")
    assert number(shown["Delta long"][0]) > 0


def test_a_forward_has_dashes_and_words_for_what_only_options_have(make_pane: MakePane, read: Read) -> None:
    pane = make_pane()
    pane.show_reading(read("forward"))
    shown = {figure.caption(): figure.value() for figure in figures(pane)}
    assert shown["intrinsic: none"] == shown["time value: none"] == "–"
    assert texts(views(pane)[0])[0][0] == "Discounted difference"
    assert sensitivities_by_name(views(pane)[1])["Vega long"] == ("– none in a forward", "")


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("incomplete", "Incomplete: the quantity is missing; the expiry is missing."),
        ("refused", "Refused: the short ratio is -7.1, not above zero."),
    ],
)
def test_a_position_without_a_price_says_why(make_pane: MakePane, read: Read, name: str, words: str) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    pane.show_reading(read(name))
    assert pane.is_empty()
    assert words in [label.text() for label in pane.findChildren(QLabel) if label.isVisible()]
    assert not any(view.isVisible() for view in views(pane))
    pane.show_reading(read("spark"))
    assert not pane.is_empty()


def test_nothing_shows_the_words_it_is_given(make_pane: MakePane, read: Read) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    pane.show_nothing("The book has no positions.")
    assert pane.is_empty()
    assert pane.subtitle() == pane.copied() == ""
    pane.show_waiting()
    assert not pane.is_waiting()


def inks(widget: QWidget) -> set[str]:
    """Every colour that a picture of `widget` holds."""
    image = widget.grab().toImage().convertToFormat(QImage.Format.Format_RGB32)
    pixels = np.frombuffer(image.constBits(), dtype=np.uint32) & 0xFFFFFF
    return {f"#{pixel:06X}" for pixel in np.unique(pixels).tolist()}


def test_waiting_fades_the_ink_and_says_so_and_a_reading_brings_it_back(
    make_pane: MakePane, read: Read, light: look.Theme
) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    before = [texts(view) for view in views(pane)]
    assert light.palette.ink in inks(views(pane)[0].viewport())
    pane.show_waiting()
    assert pane.is_waiting()
    assert closing_words(pane) == WAITING
    assert [texts(view) for view in views(pane)] == before
    for part in (*(view.viewport() for view in views(pane)), *figures(pane)):
        assert light.palette.ink not in inks(part)
        assert light.palette.muted in inks(part)
    pane.show_reading(read("spark"))
    assert not pane.is_waiting()
    assert light.palette.ink in inks(views(pane)[0].viewport())
    assert CAUTION in closing_words(pane)


def test_another_theme_recolours_everything(
    make_pane: MakePane, read: Read, light: look.Theme, qapp: QApplication
) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    dark = light.switched()
    look.apply(qapp, dark)
    pane.set_theme(dark)
    for view in views(pane):
        found = inks(view.viewport())
        assert dark.palette.ink in found
        assert dark.palette.panel in found
        assert not found & {light.palette.ink, light.palette.panel, light.palette.muted}


def cut_cells(view: SheetView) -> list[str]:
    """The texts that need more room than their cells (or the cells they span) have."""
    model, option = view.model(), QStyleOptionViewItem()
    cut = []
    for row in range(model.rowCount()):
        for column in range(model.columnCount()):
            index = model.index(row, column)
            room = sum(view.columnWidth(column + step) for step in range(view.columnSpan(row, column)))
            if view.itemDelegate().sizeHint(option, index).width() > room:
                cut.append(index.data())
    small = QFont(view.setting.fonts["small"])
    for column in range(model.columnCount()):
        words = model.headerData(column, Qt.Orientation.Horizontal)
        widest = max(QFontMetrics(small).horizontalAdvance(line) for line in words.split("\n"))
        if widest + 2 * PADDING > view.columnWidth(column):
            cut.append(words)
    return cut


@pytest.mark.parametrize("scale", [1.0, 1.4])
@pytest.mark.parametrize(("width", "height"), SIZES)
@pytest.mark.parametrize("name", PRICED)
def test_no_text_is_cut(
    make_pane: MakePane, read: Read, light: look.Theme, qapp: QApplication,
    name: str, width: int, height: int, scale: float,
) -> None:  # fmt: skip
    pane = make_pane(width, height)
    theme = light.scaled(scale)
    look.apply(qapp, theme)
    pane.set_theme(theme)
    pane.show_reading(read(name, "yardstick"))
    assert [cut_cells(view) for view in views(pane)] == [[], []]
    for figure in figures(pane):
        for label in figure.findChildren(QLabel):
            assert label.width() >= label.sizeHint().width(), label.text()
    for view in views(pane):
        assert view.height() >= view.horizontalHeader().height() + view.verticalHeader().length()


@pytest.mark.parametrize("name", ["spark", "sold spark", "exchange", "floor", "outright", "forward"])
def test_at_the_larger_size_all_is_in_sight_without_scrolling(make_pane: MakePane, read: Read, name: str) -> None:
    pane = make_pane(620, 330)
    pane.show_reading(read(name))
    for view in views(pane):
        assert view.visibleRegion().boundingRect() == view.rect()


@pytest.mark.parametrize("name", ["spark", "floor", "outright", "forward"])
def test_at_the_smaller_size_the_figures_stay_and_the_tables_scroll_down_only(
    make_pane: MakePane, read: Read, name: str, qtbot: QtBot
) -> None:
    pane = make_pane(500, 260)
    pane.show_reading(read(name))
    methods, sensitivities = views(pane)
    assert methods.width() <= pane.width()
    methods.setFocus()
    for _ in range(20):
        qtbot.keyClick(pane.window().focusWidget(), Qt.Key.Key_Down)
    last = sensitivities.model().rowCount() - 1
    rect = sensitivities.visualRect(sensitivities.model().index(last, 0))
    rect.translate(0, sensitivities.horizontalHeader().height())
    assert sensitivities.hasFocus()
    assert sensitivities.visibleRegion().boundingRect().contains(rect)
    assert all(figure.visibleRegion().boundingRect() == figure.rect() for figure in figures(pane))
    assert CAUTION in closing_words(pane)


def test_the_arrangement_follows_the_room(
    make_pane: MakePane, read: Read, light: look.Theme, qapp: QApplication
) -> None:
    pane = make_pane(620, 330)
    pane.show_reading(read("spark"))
    methods, sensitivities = views(pane)
    for size, scale, columns in (
        ((620, 330), 1.0, (6, 7)), ((500, 260), 1.0, (5, 3)), ((500, 260), 1.5, (5, 3)), ((900, 500), 1.2, (6, 7)),
    ):  # fmt: skip
        pane.resize(*size)
        theme = light.scaled(scale)
        look.apply(qapp, theme)
        pane.set_theme(theme)
        qapp.processEvents()
        assert (methods.model().columnCount(), sensitivities.model().columnCount()) == columns
        assert [cut_cells(view) for view in views(pane)] == [[], []]
        assert pane.findChild(QScrollArea).verticalScrollBar().isVisible() == (size == (500, 260))


def test_the_first_picture_of_another_position_shows_its_figures_whole(make_pane: MakePane, read: Read) -> None:
    pane = make_pane()
    for name in ("hopeless", "sold spark", "forward", "huge", "spark"):
        pane.show_reading(read(name))
        pane.show_waiting()
        for figure in figures(pane):
            for label in figure.findChildren(QLabel):
                assert label.width() >= label.sizeHint().width(), label.text()


def test_the_tables_stand_still_while_figures_change(make_pane: MakePane, read: Read, qapp: QApplication) -> None:
    pane = make_pane(500, 260)
    places = set()
    for name in ("spark", "huge", "floor", "outright"):
        pane.show_reading(read(name))
        qapp.processEvents()
        places.add(views(pane)[0].mapTo(pane, QPoint(0, 0)).y())
    assert len(places) == 1


def test_headings_explain_themselves(make_pane: MakePane, read: Read) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    tip = views(pane)[0].model().headerData(2, Qt.Orientation.Horizontal, Qt.ItemDataRole.ToolTipRole)
    assert tip == "The method’s unit value minus the Yardstick’s."


def test_tab_goes_from_table_to_table_and_out(make_pane: MakePane, read: Read, qtbot: QtBot) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    methods, sensitivities = views(pane)
    methods.setFocus()
    qtbot.keyClick(methods, Qt.Key.Key_Tab)
    assert sensitivities.hasFocus()
    qtbot.keyClick(sensitivities, Qt.Key.Key_Backtab)
    assert methods.hasFocus()


def test_arrows_walk_on_into_the_other_table_and_back(make_pane: MakePane, read: Read, qtbot: QtBot) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    methods, sensitivities = views(pane)
    methods.setFocus()
    methods.go_to(4, 1)
    qtbot.keyClick(methods, Qt.Key.Key_Down)
    assert sensitivities.hasFocus()
    assert (sensitivities.currentIndex().row(), sensitivities.currentIndex().column()) == (0, 1)
    qtbot.keyClick(sensitivities, Qt.Key.Key_Up)
    assert methods.hasFocus()
    assert methods.currentIndex().row() == 4


def copied_by_key(view: SheetView, qtbot: QtBot) -> list[list[str]]:
    view.setFocus()
    qtbot.keyClick(view, Qt.Key.Key_C, Qt.KeyboardModifier.ControlModifier)
    return [line.split("\t") for line in QGuiApplication.clipboard().text().splitlines()]


def test_a_copy_of_the_methods_holds_plain_numbers(make_pane: MakePane, read: Read, qtbot: QtBot) -> None:
    pane, reading = make_pane(), read("sold spark")
    pane.show_reading(reading)
    head, *rows = copied_by_key(views(pane)[0], qtbot)
    assert head == [
        "Method", "Unit value, CRN/MWh", "Formula gap, CRN/MWh", "Position gap, CRN", "Gap in %, of premium", "Remark",
    ]  # fmt: skip
    assert rows[0] == ["Margrabe", "", "", "", "", "Exact for a strike of zero, and only there."]
    kirk = reading.methods[1]
    expected = (kirk.unit_value, kirk.gap, kirk.position_gap, 100 * kirk.gap_share)
    assert [float(text) for text in rows[1][1:5]] == pytest.approx(expected, rel=1e-11)


@pytest.mark.parametrize(("width", "height"), SIZES)
def test_a_copy_of_the_sensitivities_is_one_line_each_whatever_the_arrangement(
    make_pane: MakePane, read: Read, qtbot: QtBot, width: int, height: int
) -> None:
    pane, reading = make_pane(width, height), read("spark")
    pane.show_reading(reading)
    head, *rows = copied_by_key(views(pane)[1], qtbot)
    assert head == ["Sensitivity", "Scaling", "Per MWh", "Position", "Unit of position", "Remark"]
    for line, row in zip(rows, reading.sensitivity_rows, strict=True):
        assert (line[0], line[1], line[4]) == (row.name, row.scaling, row.unit)
        assert float(line[2]) == pytest.approx(row.unit_value, rel=1e-11)
        assert float(line[3]) == pytest.approx(row.position_value, rel=1e-11)


def test_several_marked_cells_are_copied_as_they_stand(make_pane: MakePane, read: Read, qtbot: QtBot) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    view = views(pane)[0]
    view.setFocus()
    view.go_to(1, 0)
    qtbot.keyClick(view, Qt.Key.Key_Right, Qt.KeyboardModifier.ShiftModifier)
    assert copied_by_key(view, qtbot) == [texts(view)[1][:2]]


def test_the_whole_reading_can_be_copied(make_pane: MakePane, read: Read) -> None:
    pane, reading = make_pane(), read("spark")
    pane.show_reading(reading)
    acts = {act.text(): act for act in views(pane)[1].actions()}
    acts["Copy whole reading"].trigger()
    lines = [line.split("\t") for line in QGuiApplication.clipboard().text().splitlines()]
    assert lines[0] == [reading.subject]
    assert lines[1][0::2] == ["Position value", "CRN"]
    assert float(lines[1][1]) == pytest.approx(reading.position_value, rel=1e-11)
    starts = [line[0] for line in lines]
    assert {"Kirk", "Yardstick", "Delta short", "Correlation sensitivity"} <= set(starts)


def test_every_part_has_a_name_to_be_read_aloud(make_pane: MakePane, read: Read) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    for view in views(pane):
        model = view.model()
        assert all(model.headerData(column, Qt.Orientation.Horizontal) for column in range(model.columnCount()))
    for figure in figures(pane):
        assert figure.accessibleName() == f"{figure.caption()}: {figure.value()}"
    dash = views(pane)[0].model().index(0, 1)
    assert dash.data() == "–"
    assert dash.data(Qt.ItemDataRole.AccessibleTextRole) == "none"


def test_a_premium_too_small_for_a_share_is_explained(make_pane: MakePane, read: Read) -> None:
    pane = make_pane(500, 260)
    pane.show_reading(read("hopeless"))
    share = views(pane)[0].model().index(1, 4)
    assert share.data() == "–"
    assert share.data(Qt.ItemDataRole.ToolTipRole) == "Premium too small for a share"


def test_a_number_tells_all_its_digits_in_the_tooltip(make_pane: MakePane, read: Read) -> None:
    pane, reading = make_pane(), read("spark")
    pane.show_reading(reading)
    tip = views(pane)[0].model().index(1, 1).data(Qt.ItemDataRole.ToolTipRole)
    assert float(tip) == pytest.approx(reading.methods[1].unit_value, rel=1e-11)
    assert not math.isclose(float(tip), number(texts(views(pane)[0])[1][1]), rel_tol=1e-9)


def test_a_click_does_not_open_an_editor(make_pane: MakePane, read: Read, qtbot: QtBot) -> None:
    pane = make_pane()
    pane.show_reading(read("spark"))
    view = views(pane)[0]
    place = view.visualRect(view.model().index(1, 1)).center()
    qtbot.mouseDClick(view.viewport(), Qt.MouseButton.LeftButton, pos=place)
    assert view.state() == SheetView.State.NoState
    assert view.currentIndex().row() == 1


def test_the_pane_loads_no_formulas() -> None:
    """The window is painted before the formulas are loaded, so no pane may bring them in."""
    code = "import sys, spreadgui.desk.panels.reading; print(any(name.startswith('scipy') for name in sys.modules))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"
