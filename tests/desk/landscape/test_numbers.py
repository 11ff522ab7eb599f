"""Round levels, notations, isolines and places of labels: the parts of the Landscape that need no screen."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from spreadgui.desk.landscape.isolines import isolines, joined
from spreadgui.desk.landscape.labels import Box, Line, Plot, place_labels
from spreadgui.desk.landscape.levels import levels_of, multiples, round_step
from spreadgui.desk.landscape.notation import Notation, finer, for_forwards, notation_for

sizes = st.floats(1e-250, 1e250)


@given(span=sizes, most=st.integers(1, 30))
def test_a_round_step_is_one_two_or_five_and_goes_in_no_more_often_than_asked(span: float, most: int) -> None:
    step = round_step(span, most)
    assert f"{step:e}"[0] in "125"
    assert span / step <= most * (1 + 1e-6)
    assert span / step > most / 2.6, "and not much less often"


@given(low=st.floats(-1e6, 1e6), reach=st.floats(1e-3, 1e6), signed=st.booleans())
def test_levels_hold_the_values_between_round_ends(low: float, reach: float, signed: bool) -> None:
    values = np.array([[low, low + reach]])
    found = levels_of(values, signed)
    if found.flat:
        return
    slack = 1e-6 * found.step
    assert found.used[0] <= values.min() + slack
    assert found.used[1] >= values.max() - slack
    assert all(values.min() < line < values.max() for line in found.lines)
    if found.signed:
        assert found.ramp[0] == -found.ramp[1]
    assert len(found.lines) <= 14


def test_one_negative_value_makes_a_quantity_signed_and_rounding_does_not() -> None:
    assert levels_of(np.array([[-3.0, 9.0]]), False).signed
    assert not levels_of(np.array([[-1e-13, 9.0]]), False).signed


@pytest.mark.parametrize("values", [[[0.0, 0.0]], [[7.0, 7.0]], [[0.97, 0.97 + 1e-15]], [[-2.0, -2.0]]])
def test_what_varies_by_rounding_only_is_flat(values: list[list[float]]) -> None:
    found = levels_of(np.array(values), False)
    assert found.flat
    assert found.lines.size == 0
    assert found.ramp[0] < found.ramp[1]


def test_multiples_include_both_ends() -> None:
    np.testing.assert_allclose(multiples(-0.3, 0.3, 0.1), [-0.3, -0.2, -0.1, 0.0, 0.1, 0.2, 0.3], atol=1e-15)


@pytest.mark.parametrize(
    ("notation", "value", "text"),
    [
        (notation_for(250.0, 50.0), -150.0, "−150"),
        (notation_for(0.05, 0.01), -0.02, "−0.02"),
        (finer(75.0, 5.0), 25.128, "25.13"),
        (finer(0.05, 0.01), -0.0189212, "−0.01892"),
        (for_forwards(45.0, 260.0), 110.0, "110.00"),
        (for_forwards(1.0e5, 9.0e5), 250000.0, "250\N{NARROW NO-BREAK SPACE}000"),
        (finer(0.0, 0.0), 0.0, "0.00"),
    ],
)
def test_numbers_are_written_as_a_desk_reads_them(notation: Notation, value: float, text: str) -> None:
    assert notation.text(value) == text


@given(largest=sizes)
def test_any_size_of_number_takes_little_room(largest: float) -> None:
    notation = finer(largest, round_step(largest, 10))
    assert len(notation.text(largest)) <= 12
    assert notation.text(largest).strip("0.") != "", "and is not rounded away"


def test_isolines_run_where_the_surface_has_their_value() -> None:
    long, short = np.linspace(50.0, 150.0, 41), np.linspace(5.0, 25.0, 31)
    values = np.add.outer(-7.0 * short, long)
    lines = isolines(long, short, values, np.array([-50.0, 0.0, 40.0]))
    assert [line.level for line in lines] == [-50.0, 0.0, 40.0]
    for line in lines:
        np.testing.assert_allclose(line.points[:, 0] - 7.0 * line.points[:, 1], line.level, atol=1e-9)
    x, y = joined(lines)
    assert np.isnan(x).sum() == np.isnan(y).sum() == 3


def test_level_ground_has_no_isoline() -> None:
    """A plateau whose rounding goes up and down about zero, beside a slope that truly crosses it."""
    noise = np.random.default_rng(7).normal(scale=1e-16, size=(41, 41))
    axis = np.linspace(0.0, 1.0, 41)
    hill = np.clip(axis - 0.5, 0.0, None) * (0.8 - axis)
    lines = isolines(axis, axis, hill[np.newaxis, :] + noise, np.array([0.0]))
    assert lines
    assert all(line.points[:, 0].min() > 0.45 for line in lines)
    assert any(np.allclose(line.points[:, 0], 0.8, atol=1e-3) for line in lines)


def plot(*obstacles: Box) -> Plot:
    return Plot(400.0, 300.0, obstacles, np.empty((0, 2)))


def straight(offset: float) -> Line:
    across = np.linspace(0.0, 400.0, 60)
    points = np.column_stack([across, offset + 300.0 - across])
    return Line(points[(points[:, 1] >= 0) & (points[:, 1] <= 300)], 34.0, 16.0)


def test_every_line_with_room_is_labelled_once_on_itself() -> None:
    lines = [straight(offset) for offset in range(-200, 300, 50)]
    placed = place_labels(lines, plot())
    assert sorted(index for index, _ in placed) == list(range(len(lines)))
    for index, box in placed:
        assert box.x + box.y == pytest.approx(300.0 + (-200 + 50 * index), abs=1e-6)


def test_lines_too_near_to_tell_apart_are_not_labelled() -> None:
    assert place_labels([straight(0.0), straight(2.0), straight(4.0)], plot()) == []


def test_no_label_covers_an_obstacle() -> None:
    point = Box(200.0, 100.0, 60.0, 60.0)
    for _, box in place_labels([straight(0.0), straight(60.0)], plot(point)):
        assert not box.overlaps(point)


def test_a_line_there_and_back_is_labelled_on_both_ways() -> None:
    there = straight(-60.0).points
    back = straight(60.0).points[::-1]
    placed = place_labels([Line(np.concatenate([there, back]), 34.0, 16.0)], plot())
    assert len(placed) == 2
    assert np.hypot(placed[0][1].x - placed[1][1].x, placed[0][1].y - placed[1][1].y) > 100
