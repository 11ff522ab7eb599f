"""The colours can be read, and the ramps of the Landscape rise evenly."""

import re
from dataclasses import FrozenInstanceError
from pathlib import Path

import numpy as np
import pytest

from spreadgui.desk.look import ramps, tokens
from spreadgui.desk.look.tokens import DARK, LIGHT, MARK_PAIRS, TEXT_PAIRS, Palette

PALETTES = pytest.mark.parametrize("palette", [LIGHT, DARK], ids=lambda palette: palette.name)
SHEET = Path(tokens.__file__).with_name("program.qss")


@PALETTES
@pytest.mark.parametrize(("text", "ground"), TEXT_PAIRS)
def test_every_text_can_be_read_on_its_ground(palette: Palette, text: str, ground: str) -> None:
    # 4.5 : 1 is WCAG 2.2, success criterion 1.4.3.
    assert tokens.contrast(getattr(palette, text), getattr(palette, ground)) >= 4.5


@PALETTES
@pytest.mark.parametrize(("mark", "ground"), MARK_PAIRS)
def test_every_mark_can_be_seen_on_its_ground(palette: Palette, mark: str, ground: str) -> None:
    # 3 : 1 is WCAG 2.2, success criterion 1.4.11.
    assert tokens.contrast(getattr(palette, mark), getattr(palette, ground)) >= 3


def test_the_style_sheet_uses_no_pair_that_is_not_declared() -> None:
    pairs = set()
    for _, body in re.findall(r"([^{}]+)\{([^{}]*)\}", SHEET.read_text(encoding="utf-8").replace("${", "$(")):
        text = re.search(r"(?<![\w-])color: \$(\w+)", body)
        ground = re.search(r"(?<![\w-])background: \$(\w+)", body)
        if text and ground:
            pairs.add((text[1], ground[1]))
    assert len(pairs) > 5
    assert pairs - set(TEXT_PAIRS) == set()


def test_contrast_agrees_with_the_known_ends_of_the_scale() -> None:
    # #767676 is widely quoted as the lightest grey that passes 4.5 : 1 on white, at 4.54 (from memory).
    assert tokens.contrast("#767676", "#FFFFFF") == pytest.approx(4.54, abs=0.005)
    assert tokens.contrast("#777777", "#FFFFFF") < 4.5
    assert tokens.contrast("#FFFFFF", "#767676") == tokens.contrast("#767676", "#FFFFFF")


@pytest.mark.parametrize("wrong", ["", "0E6A63", "#FFF", "#GGGGGG", "red"])
def test_a_colour_that_is_none_is_refused(wrong: str) -> None:
    with pytest.raises(ValueError, match=r"colour|invalid literal"):
        tokens.rgb(wrong)


def test_light_and_dark_are_told_apart() -> None:
    assert DARK.is_dark
    assert not LIGHT.is_dark


def test_a_palette_cannot_be_changed() -> None:
    with pytest.raises(FrozenInstanceError):
        LIGHT.ink = "#000000"  # type: ignore[misc]  # the point of the test


@PALETTES
@pytest.mark.parametrize("count", [2, 3, 33, 256, 512])
def test_the_sequential_ramp_goes_from_the_ground_to_deep_kelp_in_one_direction(palette: Palette, count: int) -> None:
    rows = ramps.sequential(palette, count)
    assert rows.shape == (count, 3)
    assert rows.dtype == np.uint8
    assert tuple(rows[0]) == tokens.rgb(palette.panel)
    assert tuple(rows[-1]) == tokens.rgb(palette.deep_kelp)
    steps = np.diff(_lightness(rows)) * (1 if palette.is_dark else -1)
    assert steps.min() >= 0


@PALETTES
def test_equal_steps_of_a_ramp_look_equal(palette: Palette) -> None:
    steps = np.abs(np.diff(_lightness(ramps.sequential(palette, 16))))
    assert steps.max() < 1.2 * steps.min()


@PALETTES
@pytest.mark.parametrize("count", [3, 65, 257])
def test_the_diverging_ramp_has_the_ground_at_zero_and_two_arms_of_one_weight(palette: Palette, count: int) -> None:
    rows = ramps.diverging(palette, count)
    assert rows.shape == (count, 3)
    assert tuple(rows[count // 2]) == tokens.rgb(palette.panel)
    assert tuple(rows[-1]) == tokens.rgb(palette.deep_kelp)
    level = _lightness(rows)
    away = 1 if palette.is_dark else -1
    assert (np.diff(level[count // 2 :]) * away).min() >= 0
    assert (np.diff(level[: count // 2 + 1]) * away).max() <= 0
    # Rounding to whole channels leaves less than one unit of L*, a just noticeable difference (CIE 15:2004).
    assert np.abs(level - level[::-1]).max() < 1


@PALETTES
def test_the_arms_of_the_diverging_ramp_are_brick_and_kelp(palette: Palette) -> None:
    rows = ramps.diverging(palette, 65).astype(int)
    below, above = rows[16], rows[48]
    assert below[0] > below[1] + 20
    assert above[1] > above[0] + 20


@pytest.mark.parametrize("count", [-1, 0, 1])
def test_a_sequential_ramp_needs_two_rows(count: int) -> None:
    with pytest.raises(ValueError, match="count"):
        ramps.sequential(LIGHT, count)


@pytest.mark.parametrize("count", [0, 1, 2, 256])
def test_a_diverging_ramp_needs_a_row_for_zero(count: int) -> None:
    with pytest.raises(ValueError, match="count"):
        ramps.diverging(LIGHT, count)


def test_lightness_agrees_with_published_values() -> None:
    # L* of the sRGB primaries, D65: 53.24, 87.73, 32.30 (Lindbloom's colour calculator; from memory).
    rows = np.array([[255, 0, 0], [0, 255, 0], [0, 0, 255], [255, 255, 255], [0, 0, 0]], dtype=np.uint8)
    np.testing.assert_allclose(ramps.lightness(rows), [53.24, 87.73, 32.30, 100, 0], atol=0.02)


def _lightness(rows: np.ndarray) -> np.ndarray:
    """L* out of WCAG's luminance, a road of its own beside the ramp's own arithmetic."""
    light = np.array([tokens.luminance("#" + "".join(f"{channel:02X}" for channel in row)) for row in rows])
    return np.where(light > 216 / 24389, 116 * np.cbrt(light) - 16, light * 24389 / 27)
