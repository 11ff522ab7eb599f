"""The column register: complete, unambiguous, and true to what the desk types and reads."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from spreadgui.book.entries import EntryError
from spreadgui.book.fields import FIELDS
from spreadgui.pricing.methods import METHODS
from spreadgui.valuation.column import exact_texts, screen_texts
from spreadgui.valuation.columns import BY_COLUMN_KEY, COLUMNS, SCREEN_COLUMNS, VALUE_TABLE
from spreadgui.valuation.table import value_book
from spreadgui.valuation.typed import number_in_percent, percent_text, read_typed, typed_text
from tests.books import book_of, cap, season, spark

# The columns that others rely on to find in `spreadgui value --csv`.
PROMISED = (
    "name", "forward_long", "forward_short", "vol_long", "vol_short", "correlation", "years", "discount",
    "margrabe", "kirk", "modified_kirk", "bjerksund_stensland", "yardstick", "position_value",
    "delta_long", "delta_short", "gamma_long", "gamma_short", "gamma_cross", "vega_long", "vega_short",
    "correlation_sensitivity", "theta", "state",
)  # fmt: skip


def test_no_key_stands_twice_and_every_column_explains_itself() -> None:
    assert len(BY_COLUMN_KEY) == len(COLUMNS)
    for column in COLUMNS:
        assert column.heading
        assert column.help.endswith((".", ")"))
        assert (column.numbers is None) != (column.words is None)


def test_every_field_of_a_position_can_be_typed_on_the_screen() -> None:
    assert {column.field.key for column in SCREEN_COLUMNS if column.field} == {field.key for field in FIELDS}


def test_every_method_has_a_column_on_the_screen() -> None:
    assert {method.key for method in METHODS} <= {column.key for column in SCREEN_COLUMNS}


def test_the_value_table_holds_what_is_promised() -> None:
    assert set(PROMISED) <= set(VALUE_TABLE)
    assert len(set(VALUE_TABLE)) == len(VALUE_TABLE)


def test_name_and_value_are_pinned() -> None:
    assert [column.key for column in SCREEN_COLUMNS if column.pinned] == ["name", "position_value"]


def test_files_get_plain_derivatives_and_decimals_and_screens_their_stated_scaling() -> None:
    valued = value_book(book_of(spark()))
    rows = range(1)

    def both(key: str) -> tuple[str, str]:
        column = BY_COLUMN_KEY[key]
        return (
            exact_texts(column, valued.slate, valued.results, rows)[0],
            screen_texts(column, valued.slate, valued.results, rows)[0],
        )

    assert both("vol_long") == ("0.6", "60.0")
    exact, shown = both("vega_long")
    assert float(shown) == pytest.approx(float(exact) / 100, abs=1e-5)
    exact, shown = both("position_theta")
    assert float(shown.replace("−", "-").replace("\u202f", "")) == pytest.approx(float(exact) / 365, abs=1.0)


def test_position_columns_are_the_signed_quantity_times_the_unit_ones() -> None:
    valued = value_book(book_of(spark(), season(), cap()))
    for key in ("delta_long", "theta", "gamma_cross"):
        unit = BY_COLUMN_KEY[key].numbers(valued.slate, valued.results, slice(None))
        position = BY_COLUMN_KEY[f"position_{key}"].numbers(valued.slate, valued.results, slice(None))
        assert position == pytest.approx(unit * [1000.0, -500.0, 10.0])


def test_a_gap_is_the_method_less_the_yardstick() -> None:
    valued = value_book(book_of(spark()))
    gap = BY_COLUMN_KEY["kirk_gap"].numbers(valued.slate, valued.results, slice(None))
    assert gap == pytest.approx(valued.results.values("kirk") - valued.results.values("yardstick"))


def test_a_gap_in_per_cent_is_of_the_yardsticks_premium_and_absent_without_one() -> None:
    valued = value_book(book_of(spark(), spark(expiry=book_of().valuation_date, strike=1000.0)))
    share = BY_COLUMN_KEY["kirk_gap_share"].numbers(valued.slate, valued.results, slice(None))
    expected = valued.results.values("kirk")[0] / valued.results.values("yardstick")[0] - 1
    assert share[0] == pytest.approx(expected, abs=1e-12)
    assert math.isnan(share[1])


def test_the_rate_sensitivity_is_what_another_zero_rate_does() -> None:
    rows = (spark(), season(), cap(), spark(kind="forward"))
    found = value_book(book_of(*rows))
    column = BY_COLUMN_KEY["position_rate_sensitivity"].numbers(found.slate, found.results, slice(None))
    up, down = (value_book(book_of(*rows, zero_rate=0.03 + step)) for step in (1e-5, -1e-5))
    moved = (up.results.values("value") - down.results.values("value")) / 2e-5 * found.slate.values("quantity")
    assert column == pytest.approx(moved, rel=1e-6)


@given(st.floats(min_value=0, max_value=1e6, allow_nan=False))
def test_a_volatility_shown_for_editing_reads_back_to_the_last_digit(value: float) -> None:
    column = BY_COLUMN_KEY["vol_long"]
    assert read_typed(column, typed_text(column, value)) == value


@given(st.floats(min_value=-1e300, max_value=1e300))
def test_percent_text_reads_back_to_the_last_digit(value: float) -> None:
    assert number_in_percent(percent_text(value)) == value


@pytest.mark.parametrize(
    ("key", "text", "said"),
    [
        ("vol_long", "-5", 'expected a volatility of 0 % or more, got "-5"'),
        ("correlation", "101", 'expected a correlation from −100 to 100 %, got "101"'),
        ("correlation", "x", 'expected a number, got "x"'),
        ("strike", "12,5x", 'expected a number, got "12,5x"'),
        ("side", "hold", 'expected one of long, short, got "hold"'),
        ("expiry", "2027-02-30", 'expected a day written as 2027-01-15, got "2027-02-30"'),
        ("long_ratio", "0", 'expected a ratio above zero, got "0"'),
    ],
)
def test_a_wrong_entry_is_told_in_the_units_it_was_typed_in(key: str, text: str, said: str) -> None:
    with pytest.raises(EntryError) as caught:
        read_typed(BY_COLUMN_KEY[key], text)
    assert str(caught.value) == said


def test_a_cell_without_a_number_is_empty_in_files_and_on_screens() -> None:
    valued = value_book(book_of(spark(expiry=None)))
    assert math.isnan(valued.results.values("value")[0])
    for texts in (exact_texts, screen_texts):
        assert texts(BY_COLUMN_KEY["position_value"], valued.slate, valued.results, range(1)) == [""]
