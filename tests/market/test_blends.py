"""Blends as legs of positions: matched to their markets' marks, told of where they cannot be."""

from __future__ import annotations

import datetime
from typing import Any

import msgspec
import numpy as np
import pytest

from spreadgui.book.reading import read_book
from spreadgui.book.records import Blend, Book, Correlation, Mark, Market, Part, Position
from spreadgui.market.check import faults_of
from spreadgui.market.contracts import Law, resolve
from spreadgui.market.mix import Leg, matched
from spreadgui.market.quotes import Quotes
from spreadgui.market.touched import touches
from spreadgui.shipped import sample_book
from spreadgui.valuation.slate import build_slate, follow
from spreadgui.valuation.table import value_book
from tests.books import book_of
from tests.valuation.test_slate import same

DAY, EXPIRY = datetime.date(2026, 12, 1), datetime.date(2027, 12, 1)
POWER = Market("Power", "CRN/MWh", 0.5, marks=(Mark("2028-01", 90.0, 0.36), Mark("2028-02", 86.0, 0.34)))
GAS = Market("Gas", "CRN/GJ", 0.4, marks=(Mark("2028-01", 9.0, 0.43, 0.9), Mark("2028-02", 8.8, 0.4)))
CARBON = Market("Carbon", "CRN/t", 0.1, marks=(Mark("2028-01", 46.0, 0.35), Mark("2028-02", 46.2, 0.35)))
NIGHT = Market("Night", "CRN/MWh", dynamics="normal", marks=(Mark("2028-01", -3.0, 18.0),))
FUEL = Blend("Fuel", "CRN/MWh", (Part("Gas", 7.1), Part("Carbon", 0.4)))
PAIRS = (Correlation("Power", "Gas", 0.8), Correlation("Power", "Carbon", 0.5), Correlation("Gas", "Carbon", 0.45))


def position(**changed: Any) -> Position:
    fields: dict[str, Any] = {
        "name": "clean", "quantity": 100.0, "long_leg": "Power", "long_delivery": "2028-01", "short_leg": "Fuel",
        "short_delivery": "2028-01", "strike": 2.5, "expiry": EXPIRY,
    }  # fmt: skip
    return Position(**{**fields, **changed})


def book(*positions: Position, **changed: Any) -> Book:
    fields: dict[str, Any] = {
        "markets": (POWER, GAS, CARBON, NIGHT), "blends": (FUEL,), "correlations": PAIRS, "valuation_date": DAY,
    }  # fmt: skip
    return book_of(*positions, **{**fields, **changed})


def resolved(one: Position, **changed: Any) -> Any:
    some = book(one, **changed)
    return resolve(one, Quotes.of(some), some.valuation_date, some.zero_rate)


def test_a_blend_stands_at_its_weighted_sum_with_the_matched_volatility_and_correlation() -> None:
    found = resolved(position())
    fuel = Leg(np.array([7.1, 0.4]), np.array([9.0, 46.0]), np.zeros(2), np.array([0.43, 0.35]))
    power = Leg(np.ones(1), np.array([90.0]), np.zeros(1), np.array([0.36]))
    inside = np.array([[1.0, 0.45], [0.45, 1.0]])
    exact = matched(power, fuel, (np.eye(1), inside), np.array([[0.8, 0.5]]), 1.0, normal=False)
    assert not found.troubles
    assert found.forward_short == pytest.approx(7.1 * 9.0 + 0.4 * 46.0)
    assert found.vol_short == pytest.approx(exact.vol_short, rel=1e-13)
    assert found.vol_long == 0.36
    assert found.correlation == pytest.approx(exact.correlation, rel=1e-13)
    assert found.unit == "CRN/MWh"


def test_the_demo_books_blends_are_what_the_desk_wrote_down_by_hand_before() -> None:
    """The first version of the demo book carried the matched marks of its mixed legs in the rows."""
    old = read_book(sample_book("ardenmoor_winter").parent.parent / "tests" / "book" / "version_1.json")
    row = next(one for one in old.positions if one.name == "3:2:1 crack Jan-28")
    products = Blend("Products", "CRN/bbl", (Part("Marrowgate motor spirit", 2 / 3), Part("Marrowgate gasoil", 1 / 3)))
    cleared = msgspec.structs.replace(
        row, long_leg="Products", long_delivery=row.short_delivery, own_forward_long=None, own_vol_long=None,
        own_correlation=None,
    )  # fmt: skip
    some = msgspec.structs.replace(old, blends=(products,))
    found = resolve(cleared, Quotes.of(some), some.valuation_date, some.zero_rate)
    assert not found.troubles
    # The rows were written to four decimals.
    assert found.forward_long == pytest.approx(row.own_forward_long, abs=6e-5)
    assert found.vol_long == pytest.approx(row.own_vol_long, abs=6e-5)
    assert found.correlation == pytest.approx(row.own_correlation, abs=6e-5)


def test_own_marks_win_over_a_blends() -> None:
    found = resolved(position(own_forward_short=80.0, own_correlation=0.1))
    assert (found.forward_short, found.correlation) == (80.0, 0.1)
    assert found.vol_short == resolved(position()).vol_short


def test_two_blends_or_a_blend_alone_are_priced() -> None:
    other = Blend("Clean power", "CRN/MWh", (Part("Power", 1.0), Part("Carbon", 0.1)))
    rows = (position(long_leg="Clean power"), position(short_leg="", short_delivery="", long_leg="Fuel"))
    valued = value_book(book(*rows, blends=(FUEL, other)))
    assert valued.results.state.tolist() == [0, 0]
    assert (valued.results.values("value") > 0.0).all()


def test_a_strip_on_a_blend_has_a_daily_volatility_where_a_part_has_one() -> None:
    found = resolved(position(exercise="business days", expiry=None))
    assert not found.troubles
    assert found.strip is not None
    assert found.strip.daily_short > found.vol_short  # gas has 90 % inside the month
    assert np.isnan(found.strip.daily_long)


@pytest.mark.parametrize(
    ("blend", "said"),
    [
        (Blend("Fuel", "CRN/MWh"), 'the blend Fuel has no parts'),
        (Blend("Fuel", "CRN/MWh", (Part("Gas", -1.0),)), "the blend Fuel holds -1 of Gas; a weight is above zero"),
        (Blend("Fuel", "CRN/MWh", (Part("Oil", 1.0),)), 'there is no market "Oil" in this book'),
        (Blend("Fuel", "CRN/MWh", (Part("Gas", 1.0), Part("Night", 1.0))), "the blend Fuel mixes normal markets"),
    ],
)  # fmt: skip
def test_a_blend_that_cannot_be_matched_says_why_in_the_row(blend: Blend, said: str) -> None:
    found = resolved(position(), blends=(blend,))
    assert any(said in trouble.sentence for trouble in found.troubles), found.troubles


def test_a_part_without_a_mark_or_a_pair_without_a_correlation_makes_the_row_incomplete() -> None:
    missing = resolved(position(short_delivery="2029-01", long_delivery="2028-01"))
    assert "Gas has no mark for 2029-01 (in the blend Fuel)" in [trouble.sentence for trouble in missing.troubles]
    untied = resolved(position(), correlations=PAIRS[:1])
    assert untied.troubles


def test_a_normal_blend_beside_a_lognormal_leg_is_refused() -> None:
    nights = Blend("Fuel", "CRN/MWh", (Part("Night", 1.0),))
    found = resolved(position(), blends=(nights,))
    assert any("no formula prices the two together" in trouble.sentence for trouble in found.troubles)
    alone = resolved(position(long_leg="", long_delivery=""), blends=(nights,))
    assert alone.law is Law.NORMAL


def test_check_tells_every_fault_of_a_blend_at_its_place() -> None:
    wrong = (
        Blend("", "CRN/MWh", (Part("Gas", 1.0),)), Blend("Gas", "CRN/MWh", (Part("Gas", 1.0),)),
        Blend("X", "EUR/MWh", (Part("Oil", 0.0),)), Blend("Y", "CRN/MWh"),
    )  # fmt: skip
    told = [str(fault) for fault in faults_of(book(blends=wrong))]
    assert "blends[0].name: a blend needs a name" in told
    assert 'blends[1].name: "Gas" is the name of 2 markets or blends' in told
    assert "blends[2].unit: is in EUR, while the book counts in CRN" in told
    assert 'blends[2].parts[0].market: there is no market "Oil" in this book' in told
    assert "blends[2].parts[0].weight: is 0; a weight is above zero" in told
    assert 'blends[3].parts: the blend "Y" has no parts' in told


def test_a_mark_of_a_part_moves_the_positions_on_its_blends_and_no_others() -> None:
    rows = (
        position(),
        position(short_leg="Gas", short_ratio=7.1),
        position(short_delivery="2028-02", long_delivery="2028-02"),
    )
    old = book(*rows)
    carbon = msgspec.structs.replace(CARBON, marks=(Mark("2028-01", 50.0, 0.35), CARBON.marks[1]))
    new = msgspec.structs.replace(old, markets=(POWER, GAS, carbon, NIGHT))
    test = touches(old, new)
    assert [test(one) for one in rows] == [True, False, False]
    pair = (PAIRS[0], PAIRS[1], Correlation("Gas", "Carbon", 0.6))
    tied = msgspec.structs.replace(old, correlations=pair)
    for changed in (new, tied):
        assert same(follow(build_slate(old, 1), changed, 2).slate, build_slate(changed, 2))
