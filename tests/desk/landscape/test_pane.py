"""The Landscape as a user meets it: drawn, read off by mouse and keyboard, late, empty, in another theme."""

from __future__ import annotations

import re
from collections.abc import Callable

import numpy as np
import pytest
from PySide6.QtCore import QEvent, QPoint, QPointF, Qt
from PySide6.QtGui import QColor, QContextMenuEvent, QImage, QWheelEvent
from PySide6.QtWidgets import QApplication, QMenu
from pytestqt.qtbot import QtBot

from spreadgui.desk.landscape.items import rect_of
from spreadgui.desk.landscape.pane import NOTHING, LandscapePane
from spreadgui.desk.look.theme import Theme, apply
from spreadgui.pricing import bjerksund_stensland, kirk
from spreadgui.valuation.surface import QUANTITIES, Surface
from tests.books import DAY, cap, season, spark

Draw = Callable[..., Surface]
YEARS = 28 / 365
REST = (5.0, 0.6, 0.5, 0.65, YEARS, np.exp(-0.03 * YEARS))


def numbers(text: str) -> list[float]:
    """Every number of a readout, its true minus read as one."""
    return [float(found) for found in re.findall(r"-?\d+\.\d+", text.replace("−", "-"))]


def plot_centre(pane: LandscapePane) -> QPoint:
    frame = pane.contours.frame
    assert frame is not None
    return frame.plot.center().toPoint()


def test_it_says_what_would_be_here_before_anything_is_drawn(pane: LandscapePane) -> None:
    assert pane.is_empty()
    assert pane.surface is None
    assert pane.quantities.isVisible()
    assert "two legs" in NOTHING


def test_the_axes_and_the_subtitle_name_what_is_drawn(pane: LandscapePane, draw: Draw) -> None:
    pane.show_surface(draw())
    assert not pane.is_empty()
    assert pane.axis_titles() == (
        "Long: Ardenmoor South 2027-01, CRN/MWh",
        "Short: Pellan gas point 2027-01, CRN/GJ",
    )
    assert pane.subtitle() == "spark · value · Kirk · CRN/MWh"


def test_without_a_crosshair_it_reads_the_marks(pane: LandscapePane, draw: Draw) -> None:
    pane.show_surface(draw())
    expected = float(kirk.value(108.0, 7.1 * 13.0, *REST))
    assert numbers(pane.readout()) == [108.0, 13.0, pytest.approx(expected, abs=0.005)]
    assert pane.readout().startswith("At the marks: ")


@pytest.mark.parametrize("share", [(0.2, 0.3), (0.5, 0.5), (0.83, 0.11)])
def test_the_crosshair_reads_what_the_method_says_there(
    pane: LandscapePane, draw: Draw, qtbot: QtBot, share: tuple[float, float]
) -> None:
    surface = draw(method="bjerksund_stensland")
    pane.show_surface(surface)
    frame = pane.contours.frame
    assert frame is not None
    place = frame.plot.topLeft() + QPointF(share[0] * frame.plot.width(), share[1] * frame.plot.height())
    qtbot.mouseMove(pane.contours.viewport(), plot_centre(pane))
    qtbot.mouseMove(pane.contours.viewport(), place.toPoint())
    assert pane.contours.crosshair is not None
    long, short = pane.contours.crosshair
    read = numbers(pane.readout())
    assert read[:2] == [pytest.approx(long, abs=0.005), pytest.approx(short, abs=0.005)]
    across = (place.toPoint().x() - frame.plot.left()) / frame.plot.width()
    assert long == pytest.approx(surface.long[0] + across * (surface.long[-1] - surface.long[0]), rel=1e-9)
    # Bilinear between nodes a hundredth of the axis apart: the curvature leaves less than a cent here.
    assert read[2] == pytest.approx(float(bjerksund_stensland.value(long, 7.1 * short, *REST)), abs=0.01)


def test_the_crosshair_leaves_with_the_mouse(pane: LandscapePane, draw: Draw, qtbot: QtBot) -> None:
    pane.show_surface(draw())
    qtbot.mouseMove(pane.contours.viewport(), plot_centre(pane))
    assert pane.readout().startswith("At the crosshair: ")
    QApplication.sendEvent(pane.contours, QEvent(QEvent.Type.Leave))
    assert pane.contours.crosshair is None
    assert pane.readout().startswith("At the marks: ")


def test_arrow_keys_step_the_crosshair_and_escape_puts_it_away(pane: LandscapePane, draw: Draw, qtbot: QtBot) -> None:
    surface = draw()
    pane.show_surface(surface)
    pane.contours.setFocus()
    step = float(surface.long[1] - surface.long[0]), float(surface.short[1] - surface.short[0])
    qtbot.keyClick(pane.contours, Qt.Key.Key_Right)
    assert pane.contours.crosshair == pytest.approx((108.0 + step[0], 13.0))
    qtbot.keyClick(pane.contours, Qt.Key.Key_Up, Qt.KeyboardModifier.ShiftModifier)
    assert pane.contours.crosshair == pytest.approx((108.0 + step[0], 13.0 + 10 * step[1]))
    assert pane.readout() == pane.contours.accessibleDescription()
    for _ in range(30):
        qtbot.keyClick(pane.contours, Qt.Key.Key_Left, Qt.KeyboardModifier.ShiftModifier)
    assert pane.contours.crosshair is not None
    assert pane.contours.crosshair[0] == surface.long[0], "it stops at the edge"
    qtbot.keyClick(pane.contours, Qt.Key.Key_Escape)
    assert pane.contours.crosshair is None
    assert pane.readout().startswith("At the marks: ")


def test_a_crosshair_set_by_keyboard_stays_when_the_mouse_passes_over_another_pane(
    pane: LandscapePane, draw: Draw, qtbot: QtBot
) -> None:
    pane.show_surface(draw())
    qtbot.keyClick(pane.contours, Qt.Key.Key_Right)
    QApplication.sendEvent(pane.contours, QEvent(QEvent.Type.Leave))
    assert pane.contours.crosshair is not None


def test_the_crosshair_is_painted(pane: LandscapePane, draw: Draw) -> None:
    pane.show_surface(draw())
    before = pane.contours.grab().toImage()
    pane.contours.set_crosshair(110.0, 12.0)
    assert pane.contours.grab().toImage() != before
    pane.contours.put_crosshair_away()
    assert pane.contours.grab().toImage() == before


def test_a_new_surface_replaces_the_old(pane: LandscapePane, draw: Draw) -> None:
    pane.show_surface(draw())
    first, items = pane.contours.grab().toImage(), len(pane.contours.scene().items())
    other = draw(position=season(), quantity="delta_short", method="bjerksund_stensland")
    pane.show_surface(other)
    assert pane.surface is other
    assert pane.subtitle() == "season · delta short · Bjerksund-Stensland · per 1.00 of the short forward"
    assert pane.axis_titles()[1] == "Short: Ardenmoor South 2027-07, CRN/MWh"
    assert pane.contours.grab().toImage() != first
    assert len(pane.contours.scene().items()) == items, "items are filled again, not added"
    pane.show_surface(draw())
    assert pane.contours.grab().toImage() == first, "nothing of the other one is left"


@pytest.mark.parametrize(
    ("method", "position", "words"),
    [("kirk", cap(), "one leg"), ("margrabe", spark(), "does not cover"), ("kirk", spark(expiry=None), "expiry")],
)
def test_a_blank_surface_shows_its_reason_and_leaves_the_choices(
    pane: LandscapePane, draw: Draw, method: str, position: object, words: str
) -> None:
    pane.show_surface(draw())
    blank = draw(method=method, position=position)
    pane.show_surface(blank)
    assert pane.is_empty()
    assert words in blank.reason
    assert pane.methods.isVisible()
    pane.show_surface(draw())
    assert not pane.is_empty()


def test_choosing_asks_and_the_program_choosing_does_not(pane: LandscapePane, qtbot: QtBot) -> None:
    with qtbot.assertNotEmitted(pane.asked):
        pane.choose("theta", "yardstick")
    assert (pane.request(4).row, pane.request(4).quantity, pane.request(4).method) == (4, "theta", "yardstick")
    with qtbot.waitSignal(pane.asked):
        qtbot.keyClick(pane.quantities, Qt.Key.Key_Up)
    assert pane.request(0).quantity == "correlation_sensitivity"
    with qtbot.waitSignal(pane.asked):
        qtbot.keyClick(pane.methods, Qt.Key.Key_Up)
    assert pane.request(0).method == "bjerksund_stensland"


@pytest.mark.parametrize(("quantity", "method"), [("colour", "kirk"), ("value", "guess")])
def test_there_is_no_choosing_what_there_is_not(pane: LandscapePane, quantity: str, method: str) -> None:
    with pytest.raises(KeyError):
        pane.choose(quantity, method)
    assert pane.request(0).quantity == "value"


def test_a_late_surface_fades_and_says_so_and_comes_back(pane: LandscapePane, draw: Draw, qtbot: QtBot) -> None:
    pane.show_surface(draw())
    fresh = pane.contours.grab().toImage()
    pane.show_waiting()
    assert pane.contours.grab().toImage() == fresh, "never at once: it would blink"
    qtbot.waitUntil(pane.is_faded)
    assert pane.readout() == "Pricing"
    assert pane.subtitle().endswith("· pricing")
    assert contrast_in(pane.contours.grab().toImage()) < contrast_in(fresh)
    pane.show_waiting()
    pane.show_surface(draw())
    assert not pane.is_faded()
    assert pane.contours.grab().toImage() == fresh


def contrast_in(image: QImage) -> float:
    """How far the lightness of the middle of a picture varies."""
    lightness = [QColor(image.pixel(x, image.height() // 2)).lightnessF() for x in range(60, image.width() - 90)]
    return float(np.std(lightness))


def test_a_surface_that_comes_at_once_never_fades(pane: LandscapePane, draw: Draw, qtbot: QtBot) -> None:
    pane.show_surface(draw())
    pane.show_waiting()
    pane.show_surface(draw())
    qtbot.wait(250)
    assert not pane.is_faded()


def test_waiting_with_nothing_drawn_says_pricing(pane: LandscapePane, qtbot: QtBot) -> None:
    pane.show_waiting()
    qtbot.wait(250)
    assert pane.is_empty()
    assert not pane.is_faded()
    pane.show_nothing("No position.")
    assert pane.subtitle() == ""


def test_another_theme_recolours_everything(pane: LandscapePane, draw: Draw, light: Theme, qapp: QApplication) -> None:
    pane.show_surface(draw())
    before = pane.contours.grab().toImage()
    dark = light.switched()
    apply(qapp, dark)
    pane.set_theme(dark)
    after = pane.contours.grab().toImage()
    frame = pane.contours.frame
    assert frame is not None
    outside = QPoint(2, before.height() - 2)
    assert QColor(before.pixel(outside)) == light.colour("panel")
    assert QColor(after.pixel(outside)) == dark.colour("panel")
    out_of_the_money = (frame.plot.topLeft() + QPointF(5.0, 5.0)).toPoint()
    assert QColor(after.pixel(out_of_the_money)).lightnessF() < 0.25
    apply(qapp, light)
    pane.set_theme(light)
    assert pane.contours.grab().toImage() == before


def test_larger_text_makes_room_for_itself(pane: LandscapePane, draw: Draw, light: Theme) -> None:
    pane.show_surface(draw())
    small = pane.contours.frame
    pane.set_theme(light.scaled(1.6))
    large = pane.contours.frame
    assert small is not None
    assert large is not None
    assert large.plot.left() > small.plot.left()
    assert large.plot.bottom() < small.plot.bottom()


@pytest.mark.parametrize("size", [(700, 560), (560, 400), (380, 320)])
@pytest.mark.parametrize("quantity", [quantity.key for quantity in QUANTITIES])
@pytest.mark.parametrize("position", [spark(), season(), spark(expiry=DAY)], ids=["spark", "season", "today"])
def test_labels_lie_inside_the_plot_and_clear_of_each_other_and_of_the_point(
    pane: LandscapePane, draw: Draw, size: tuple[int, int], quantity: str, position: object
) -> None:
    pane.resize(*size)
    pane.show_surface(draw(quantity, position=position))
    pane.grab()
    contours = pane.contours
    assert contours.frame is not None
    assert contours.point_label is not None
    boxes = [label.box for label in contours.labels] + [contours.point_label.box]
    for box in boxes:
        rect = rect_of(box)
        assert rect.left() >= 0
        assert rect.top() >= 0
        assert rect.right() <= contours.frame.plot.width()
        assert rect.bottom() <= contours.frame.plot.height()
    for index, box in enumerate(boxes):
        assert not any(box.overlaps(other) for other in boxes[index + 1 :])
    point = contours.frame.place(*pane.surface.current[:2]) - contours.frame.plot.topLeft()  # type: ignore[union-attr]  # just drawn
    assert not any(rect_of(box).contains(point) for box in boxes)


def test_most_isolines_have_their_value_written_on_them(pane: LandscapePane, draw: Draw) -> None:
    surface = draw()
    pane.show_surface(surface)
    contours = pane.contours
    assert contours.frame is not None
    assert len(contours.labels) >= 7
    for label in contours.labels:
        place = contours.frame.plot.topLeft() + QPointF(label.box.x, label.box.y)
        assert surface.value_at(*contours.frame.forwards(place)) == pytest.approx(float(label.text), rel=0.02, abs=0.2)


def test_zero_has_the_grounds_colour_for_a_signed_quantity(pane: LandscapePane, draw: Draw, light: Theme) -> None:
    surface = draw("theta")
    pane.show_surface(surface)
    levels = pane.contours.drawn.levels  # type: ignore[union-attr]  # just drawn
    assert levels.signed
    assert levels.ramp[0] == -levels.ramp[1]
    assert levels.used[0] <= surface.values.min() < surface.values.max() <= levels.used[1]
    image = pane.contours.drawing.image
    assert image.levels == pytest.approx([0.0, 1.0])
    nearest = np.unravel_index(np.argmin(np.abs(surface.values)), surface.values.shape)
    assert image.image[nearest] == pytest.approx(0.5, abs=1e-3)
    centre = QColor(*(int(part) for part in image.lut[len(image.lut) // 2]))
    assert centre == light.colour("panel")


def test_an_unsigned_quantity_starts_at_the_grounds_colour(pane: LandscapePane, draw: Draw) -> None:
    pane.show_surface(draw())
    levels = pane.contours.drawn.levels  # type: ignore[union-attr]  # just drawn
    assert not levels.signed
    assert levels.ramp == levels.used
    assert levels.ramp[0] == 0.0


def test_a_node_is_painted_where_its_forwards_stand(pane: LandscapePane, draw: Draw, light: Theme) -> None:
    """The last node in the money is the deepest colour, in the lower right corner; the boundary is amber."""
    surface = draw()
    pane.show_surface(surface)
    picture, frame = pane.contours.grab().toImage(), pane.contours.frame
    assert frame is not None
    corner = QColor(picture.pixel((frame.plot.bottomRight() - QPointF(4, 4)).toPoint()))
    other = QColor(picture.pixel((frame.plot.topLeft() + QPointF(4, 4)).toPoint()))
    assert corner.lightnessF() < 0.5 < 0.95 < other.lightnessF()
    long, short = surface.boundary
    along = [frame.place(*(surface.boundary @ (1 - share, share))) for share in np.linspace(0.05, 0.35, 40)]
    amber = light.colour("amber")
    hues = [QColor(picture.pixel(place.toPoint())) for place in along]
    assert sum(abs(colour.hue() - amber.hue()) < 12 and colour.saturationF() > 0.6 for colour in hues) > 10
    assert long[0] < long[1]
    assert short[0] < short[1]


@pytest.mark.parametrize(
    ("position", "quantity"),
    [
        (spark(strike=9000.0), "value"),
        (spark(strike=9000.0), "delta_short"),
        (spark(strike=9000.0), "theta"),
        (spark(kind="forward"), "delta_long"),
        (spark(kind="forward"), "vega_long"),
    ],
)
def test_a_flat_surface_says_so(pane: LandscapePane, draw: Draw, position: object, quantity: str) -> None:
    pane.show_surface(draw(quantity, position=position))
    pane.grab()
    assert pane.contours.drawn.levels.flat  # type: ignore[union-attr]  # just drawn
    assert pane.contours.labels == ()
    assert "flat: " in pane.legend.accessibleName()
    assert " everywhere" in pane.legend.accessibleName()


@pytest.mark.parametrize(
    "position",
    [
        spark(own_vol_long=0.0, own_vol_short=0.0),
        spark(own_forward_long=1.1e9, own_forward_short=1.5e8, strike=1e7),
        spark(own_forward_long=1.1e-9, own_forward_short=1.5e-10, strike=0.0),
        spark(own_forward_long=1e45, own_forward_short=1e44),
        spark(own_vol_long=9.0, own_correlation=-1.0),
        spark(strike=-4000.0),
        spark(kind="forward", own_forward_long=-20.0, own_forward_short=0.0),
    ],
    ids=["still", "huge", "tiny", "astronomic", "wild", "deep", "below zero"],
)
@pytest.mark.parametrize("quantity", [quantity.key for quantity in QUANTITIES])
def test_odd_surfaces_are_painted_without_a_word_from_qt(
    pane: LandscapePane, draw: Draw, position: object, quantity: str
) -> None:
    surface = draw(quantity, position=position)
    assert surface.reason == ""
    pane.show_surface(surface)
    pane.contours.set_crosshair(*surface.current[:2])
    assert not pane.grab().isNull()
    assert len(pane.readout()) < 160


def test_large_numbers_take_a_power_of_ten(pane: LandscapePane, draw: Draw) -> None:
    pane.show_surface(draw(position=spark(own_forward_long=1.1e9, own_forward_short=1.5e8, strike=1e7)))
    assert pane.axis_titles()[0] == "Long: Ardenmoor South 2027-01, 10⁹ CRN/MWh"
    assert "× 10⁹" in pane.readout()


def test_the_legend_speaks_of_what_is_drawn(pane: LandscapePane, draw: Draw) -> None:
    pane.show_surface(draw())
    assert pane.legend.accessibleName() == (
        "Legend: point: marks now; dashed: exercise boundary at expiry; dotted: 1 and 2 standard deviations at expiry"
    )
    pane.show_surface(draw(position=spark(strike=5000.0, own_vol_long=0.0, own_vol_short=0.0)))
    assert "boundary" not in pane.legend.accessibleName()
    assert "deviations" not in pane.legend.accessibleName()
    pane.show_surface(draw(position=spark(kind="forward")))
    assert "payoff of zero at expiry" in pane.legend.accessibleName()
    assert "every method" in pane.subtitle()


def test_the_legend_takes_another_line_where_it_must(pane: LandscapePane, draw: Draw) -> None:
    pane.show_surface(draw())
    assert pane.legend.heightForWidth(pane.legend.sizeHint().width()) == pane.legend.sizeHint().height()
    assert pane.legend.heightForWidth(pane.legend.minimumSizeHint().width()) == 3 * pane.legend.sizeHint().height()


def test_a_screen_reader_hears_subject_range_and_the_value_at_the_marks(pane: LandscapePane, draw: Draw) -> None:
    surface = draw()
    pane.show_surface(surface)
    assert pane.contours.accessibleName() == "Landscape of spark: value over its two forwards"
    said = pane.contours.accessibleDescription()
    assert numbers(said)[:2] == [
        pytest.approx(surface.values.min(), abs=0.01),
        pytest.approx(surface.values.max(), abs=0.01),
    ]
    assert pane.readout() in said
    assert "Arrow keys" in said


def test_the_view_does_not_zoom_drag_or_open_a_menu(pane: LandscapePane, draw: Draw, qtbot: QtBot) -> None:
    pane.show_surface(draw())
    box, viewport, centre = pane.contours.drawing.box, pane.contours.viewport(), plot_centre(pane)
    before = box.viewRange()
    wheel = QWheelEvent(
        QPointF(centre), QPointF(viewport.mapToGlobal(centre)), QPoint(), QPoint(0, 120), Qt.MouseButton.NoButton,
        Qt.KeyboardModifier.NoModifier, Qt.ScrollPhase.NoScrollPhase, False,
    )  # fmt: skip
    QApplication.sendEvent(viewport, wheel)
    for button in (Qt.MouseButton.LeftButton, Qt.MouseButton.MiddleButton, Qt.MouseButton.RightButton):
        qtbot.mousePress(viewport, button, pos=centre)
        qtbot.mouseMove(viewport, centre + QPoint(40, 20))
        qtbot.mouseRelease(viewport, button, pos=centre + QPoint(40, 20))
    menu = QContextMenuEvent(QContextMenuEvent.Reason.Mouse, centre, viewport.mapToGlobal(centre))
    QApplication.sendEvent(viewport, menu)
    assert box.viewRange() == before == [[0.0, 1.0], [0.0, 1.0]]
    assert not [widget for widget in QApplication.topLevelWidgets() if isinstance(widget, QMenu) and widget.isVisible()]


def test_the_keyboard_goes_to_the_plot_or_to_the_choices(pane: LandscapePane, draw: Draw, qtbot: QtBot) -> None:
    pane.activateWindow()
    pane.setFocus()
    qtbot.waitUntil(pane.quantities.hasFocus)
    pane.show_surface(draw())
    pane.setFocus()
    assert pane.contours.hasFocus()
