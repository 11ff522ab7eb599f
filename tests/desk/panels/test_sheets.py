"""Numbers of small tables: enough decimals, true signs, plain copies."""

import math

import pytest

from spreadgui.desk.panels.sheets import DASH, number_or_dash, plain_number, shared_decimals, signed_text, tabbed


@pytest.mark.parametrize(
    ("values", "digits", "least", "most", "expected"),
    [
        ([22.5774, 0.0131], 3, 2, 6, 4),
        ([22.5774], 6, 4, 7, 4),
        ([0.00001234], 2, 2, 6, 6),
        ([1e-12], 2, 2, 6, 2),  # rounded away whatever is done, so it has no say
        ([0.0, math.nan, math.inf], 2, 3, 6, 3),
        ([], 2, 3, 6, 3),
        ([1e9, 2e-9], 2, 0, 4, 0),
    ],
)
def test_a_column_has_the_decimals_its_smallest_number_needs(
    values: list[float], digits: int, least: int, most: int, expected: int
) -> None:
    assert shared_decimals(values, digits, least, most) == expected


def test_a_number_far_below_the_largest_may_be_left_without_a_say() -> None:
    assert shared_decimals([67_072.0, 4.18], 2, 0, 4) == 1
    assert shared_decimals([67_072.0, 4.18], 2, 0, 4, reach=1e-4) == 0


@pytest.mark.parametrize(
    ("value", "text"), [(0.5, "+0.50"), (-0.5, "−0.50"), (0.0, "0.00"), (0.001, "0.00"), (-0.001, "0.00")]
)
def test_a_difference_shows_its_sign_unless_it_rounds_to_nothing(value: float, text: str) -> None:
    assert signed_text(value, 2) == text


def test_what_does_not_exist_is_a_dash() -> None:
    assert number_or_dash(math.nan, 2) == signed_text(math.nan, 2) == DASH
    assert plain_number(math.nan) == plain_number(math.inf) == ""


def test_a_copy_separates_by_tabs_and_ends_each_line() -> None:
    assert tabbed([("a", "b"), ("", "c")]) == "a\tb\n\tc\n"
