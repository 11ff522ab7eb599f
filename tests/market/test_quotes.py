"""Marks and correlations looked up: the number, or the exact reason why there is none."""

from __future__ import annotations

import datetime
import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.book.records import Book, Correlation, Mark, Market
from spreadgui.market.quotes import Quotes, UnknownMarkError, quantity_unit

PATIENT = settings(deadline=None, max_examples=80)


def market(name: str, tie_strength: float = 0.0) -> Market:
    marks = (Mark("2027-01", 80.0, 0.5), Mark("2027-07", 60.0, 0.4))
    return Market(name, "CRN/MWh", tie_strength, marks=marks)


def quotes_of(*markets: Market, correlations: tuple[Correlation, ...] = ()) -> Quotes:
    return Quotes.of(
        Book(
            title="",
            currency="CRN",
            valuation_date=datetime.date(2026, 12, 1),
            markets=markets,
            correlations=correlations,
        )
    )


NORTH, SOUTH, TWICE = market("North", 0.4), market("South", 0.2), market("Quill")
QUOTES = quotes_of(NORTH, SOUTH, TWICE, TWICE, market("Lone"), correlations=(Correlation("North", "South", -0.8),))


def reason(name: str, delivery: str) -> tuple[str, bool]:
    with pytest.raises(UnknownMarkError) as caught:
        QUOTES.mark(name, delivery)
    return str(caught.value), caught.value.missing


def pair_reason(quotes: Quotes, *contracts: str) -> tuple[str, bool]:
    with pytest.raises(UnknownMarkError) as caught:
        quotes.correlation(*contracts)
    return str(caught.value), caught.value.missing


def test_a_market_and_a_mark_are_found_by_name_and_delivery() -> None:
    assert QUOTES.market("North") is NORTH
    assert QUOTES.mark("North", "2027-07") == Mark("2027-07", 60.0, 0.4)


@pytest.mark.parametrize(
    ("name", "delivery", "sentence", "missing"),
    [
        ("West", "2027-01", 'there is no market "West" in this book', False),
        ("north", "2027-01", 'there is no market "north" in this book', False),
        ("", "2027-01", 'there is no market "" in this book', False),
        ("West", "", 'there is no market "West" in this book', False),
        ("Quill", "2027-01", 'the market "Quill" is defined twice', False),
        ("North", "", "the delivery of North is missing", True),
        ("North", "2027-02", "North has no mark for 2027-02", True),
        ("North", "Jan 27", 'expected a delivery month written as 2027-01, got "Jan 27"', False),
        ("North", "2027-13", 'expected a delivery month written as 2027-01, got "2027-13"', False),
    ],
)
def test_a_mark_that_cannot_be_had_says_why_and_whether_it_is_a_gap_or_a_mistake(
    name: str, delivery: str, sentence: str, missing: bool
) -> None:
    assert reason(name, delivery) == (sentence, missing)


def test_two_deliveries_of_one_market_are_tied_by_its_strength() -> None:
    # exp(-0.4 * half a year), by hand
    assert QUOTES.correlation("North", "2027-01", "North", "2027-07") == pytest.approx(0.8187307530779818, rel=1e-15)
    assert QUOTES.correlation("North", "2027-01", "North", "2027-01") == 1.0


def test_two_markets_have_their_correlation_for_one_delivery_either_way_round() -> None:
    assert QUOTES.correlation("North", "2027-01", "South", "2027-01") == -0.8
    assert QUOTES.correlation("South", "2027-01", "North", "2027-01") == -0.8


def test_deliveries_of_two_markets_apart_are_tied_by_the_mean_of_the_two_strengths() -> None:
    # -0.8 * exp(-0.3 * half a year), by hand
    expected = -0.8 * 0.8607079764250578
    assert QUOTES.correlation("North", "2027-07", "South", "2027-01") == pytest.approx(expected, rel=1e-15)
    assert QUOTES.correlation("South", "2027-01", "North", "2027-07") == pytest.approx(expected, rel=1e-15)


def test_a_delivery_without_a_mark_has_a_correlation_all_the_same() -> None:
    assert QUOTES.correlation("North", "2031-01", "South", "2031-01") == -0.8


@pytest.mark.parametrize(
    ("contracts", "sentence", "missing"),
    [
        (("North", "2027-01", "Lone", "2027-01"), "the book has no correlation of North and Lone", True),
        (("West", "2027-01", "North", "2027-01"), 'there is no market "West" in this book', False),
        (("North", "2027-01", "West", "2027-01"), 'there is no market "West" in this book', False),
        (("West", "2027-01", "West", "2027-01"), 'there is no market "West" in this book', False),
        (("Quill", "2027-01", "North", "2027-01"), 'the market "Quill" is defined twice', False),
        (
            ("North", "x", "South", "2027-01"),
            'expected a delivery month written as 2027-01, got "x"',
            False,
        ),
        (
            ("North", "2027-01", "South", "2027-00"),
            'expected a delivery month written as 2027-01, got "2027-00"',
            False,
        ),
    ],
)
def test_a_correlation_that_cannot_be_had_says_why(contracts: tuple[str, ...], sentence: str, missing: bool) -> None:
    assert pair_reason(QUOTES, *contracts) == (sentence, missing)


@pytest.mark.parametrize("strength", [-1e-9, -1.0, -1e5, -1e308])
@pytest.mark.parametrize("delivery", ["2027-01", "2027-07"])
def test_a_tie_strength_below_zero_is_a_mistake_and_never_a_number(strength: float, delivery: str) -> None:
    quotes = quotes_of(market("Wrong", strength), SOUTH, correlations=(Correlation("Wrong", "South", 0.5),))
    sentence = f"the tie strength of Wrong is {strength:g}, below zero"
    assert pair_reason(quotes, "Wrong", "2027-01", "South", delivery) == (sentence, False)
    assert pair_reason(quotes, "South", "2027-01", "Wrong", delivery) == (sentence, False)
    assert pair_reason(quotes, "Wrong", "2027-01", "Wrong", delivery) == (sentence, False)


months = st.dates().map(lambda day: day.isoformat()[:7])
strengths = st.floats(min_value=0.0, allow_infinity=False)


@PATIENT
@given(strengths, strengths, st.floats(-1.0, 1.0), months, months)
def test_any_strengths_and_deliveries_only_weaken_a_correlation(
    first: float, second: float, correlation: float, long: str, short: str
) -> None:
    quotes = quotes_of(market("A", first), market("B", second), correlations=(Correlation("A", "B", correlation),))
    got = quotes.correlation("A", long, "B", short)
    assert math.isfinite(got)
    assert abs(got) <= abs(correlation)
    if long == short:
        assert got == correlation
    assert 0.0 <= quotes.correlation("A", long, "A", short) <= 1.0


def test_a_mark_or_a_correlation_standing_twice_is_a_mistake_and_never_one_of_the_two() -> None:
    twice = Market(
        "A", "CRN/MWh", marks=(Mark("2027-01", 80.0, 0.5), Mark("2027-01", 81.0, 0.5), Mark("2027-02", 1.0, 0.1))
    )
    quotes = quotes_of(twice, NORTH, correlations=(Correlation("A", "North", 0.5), Correlation("North", "A", 0.4)))
    with pytest.raises(UnknownMarkError, match=r"^A has more than one mark for 2027-01$") as caught:
        quotes.mark("A", "2027-01")
    assert not caught.value.missing
    assert quotes.mark("A", "2027-02").forward == 1.0
    sentence = "the book has more than one correlation of A and North"
    assert pair_reason(quotes, "A", "2027-01", "North", "2027-01") == (sentence, False)


def test_a_name_of_several_lines_is_told_in_one() -> None:
    quotes = quotes_of(market("a\nb"), NORTH)
    for act in (lambda: quotes.mark("a\nb", ""), lambda: quotes.correlation("a\nb", "", "North", "")):
        with pytest.raises(UnknownMarkError) as caught:
            act()
        assert str(caught.value).isprintable()


def test_an_index_does_not_follow_a_later_book() -> None:
    quotes = quotes_of(NORTH)
    quotes_of(market("North", 9.0))
    assert quotes.market("North").tie_strength == 0.4


@pytest.mark.parametrize(
    ("unit", "counted"), [("CRN/MWh", "MWh"), ("CRN/t CO2", "t CO2"), ("CRN", ""), ("", ""), ("CRN / GJ", "GJ")]
)
def test_a_price_unit_says_what_is_counted(unit: str, counted: str) -> None:
    assert quantity_unit(unit) == counted
