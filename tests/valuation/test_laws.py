"""Markets that move by another law than the lognormal: their rows are priced by it, or refused in a sentence."""

from __future__ import annotations

from typing import Any

import msgspec
import numpy as np
import pytest

from spreadgui.book.records import Book, Correlation, Mark, Market, Position
from spreadgui.market.contracts import Law
from spreadgui.pricing import bachelier, black76, kirk, shifted, yardstick
from spreadgui.valuation.price import price_rows
from spreadgui.valuation.reading import read_position
from spreadgui.valuation.results import OUTPUTS, State, output_row
from spreadgui.valuation.slate import build_slate
from spreadgui.valuation.surface import SurfaceRequest, draw_surface
from spreadgui.valuation.table import value_book
from tests.books import EXPIRY, book_of

YEARS, DISCOUNT = 28 / 365, float(np.exp(-0.03 * 28 / 365))
NORTH = Market("North", "CRN/MWh", dynamics="shifted lognormal", shift=20.0, marks=(Mark("2027-01", -4.0, 0.7),))
SOUTH = Market("South", "CRN/MWh", dynamics="shifted lognormal", shift=5.0, marks=(Mark("2027-01", 30.0, 0.5),))
PLAIN = Market("Plain", "CRN/MWh", marks=(Mark("2027-01", 25.0, 0.4),))
NIGHT = Market("Night", "CRN/MWh", dynamics="normal", marks=(Mark("2027-01", -3.0, 18.0),))
DAWN = Market("Dawn", "CRN/MWh", dynamics="normal", marks=(Mark("2027-01", 4.0, 12.0),))
ALL = (NORTH, SOUTH, PLAIN, NIGHT, DAWN)


def position(long: str, short: str, **changed: Any) -> Position:
    fields: dict[str, Any] = {
        "name": f"{long} {short}", "quantity": 100.0, "long_leg": long, "short_leg": short, "strike": -20.0,
        "long_delivery": "2027-01" if long else "", "short_delivery": "2027-01" if short else "", "expiry": EXPIRY,
        "long_ratio": 1.0, "short_ratio": 1.0,
    }  # fmt: skip
    return Position(**{**fields, **changed})


def book(*positions: Position, **changed: Any) -> Book:
    names = [market.name for market in ALL]
    pairs = [Correlation(a, b, 0.6) for place, a in enumerate(names) for b in names[place + 1 :]]
    return book_of(*positions, markets=ALL, correlations=tuple(pairs), **changed)


def found(some: Book) -> dict[str, float]:
    slate = build_slate(some, 1)
    assert not slate.troubles, slate.troubles
    return dict(zip(OUTPUTS, price_rows(slate, np.array([0])).outputs[:, 0].tolist(), strict=True))


def test_two_shifted_legs_are_priced_by_every_lognormal_method_on_their_shifted_forwards() -> None:
    some = found(book(position("North", "South", short_ratio=1.5)))
    given = (-4.0, 45.0, -20.0, 0.7, 0.5, 0.6, YEARS, DISCOUNT)
    shifts = {"shift_long": 20.0, "shift_short": 7.5}  # a shift goes with its leg's ratio
    assert some["value"] == pytest.approx(float(shifted.value(yardstick.value, *given, **shifts)), rel=1e-14)
    assert some["kirk"] == pytest.approx(float(shifted.value(kirk.value, *given, **shifts)), rel=1e-14)
    assert np.isnan(some["bachelier"])


def test_a_lognormal_leg_beside_a_shifted_one_has_a_shift_of_zero() -> None:
    some = found(book(position("North", "Plain")))
    exact = shifted.value(yardstick.value, -4.0, 25.0, -20.0, 0.7, 0.4, 0.6, YEARS, DISCOUNT, shift_long=20.0)
    assert some["value"] == pytest.approx(float(exact), rel=1e-14)


def test_two_normal_legs_are_bacheliers_whatever_the_book_asks_for() -> None:
    for method in ("kirk", "yardstick"):
        some = found(book(position("Night", "Dawn", short_ratio=2.0), method=method))
        exact = bachelier.sensitivities(-3.0, 8.0, -20.0, 18.0, 24.0, 0.6, YEARS, DISCOUNT)
        assert some["value"] == some["bachelier"] == pytest.approx(float(exact.value), rel=1e-14)
        assert some["vega_short"] == pytest.approx(2.0 * float(exact.vega_short), rel=1e-14)
        assert some["delta_short"] == pytest.approx(2.0 * float(exact.delta_short), rel=1e-14)
        assert np.isnan(some["kirk"])
        assert np.isnan(some["yardstick"])


def test_a_normal_leg_and_a_lognormal_one_are_refused_in_a_sentence_but_their_difference_is_priced() -> None:
    mixed = book(position("Night", "Plain"), position("Night", "Plain", kind="forward"), position("North", "South"))
    valued = value_book(mixed)
    assert valued.results.state.tolist() == [State.REFUSED, State.CURRENT, State.CURRENT]
    assert valued.results.reason(0) == "Night is normal and Plain is lognormal: no formula prices the two together"
    assert valued.results.values("value")[1] == pytest.approx(DISCOUNT * (-3.0 - 25.0 + 20.0))


def test_an_outright_of_either_law_is_priced_by_its_own_formula() -> None:
    normal = found(book(position("Night", "", strike=2.0)))
    assert normal["value"] == pytest.approx(
        float(bachelier.outright_value(-3.0, 2.0, 18.0, YEARS, DISCOUNT)), rel=1e-14
    )
    lifted = found(book(position("North", "", strike=2.0)))
    assert lifted["value"] == pytest.approx(float(black76.value(16.0, 22.0, 0.7, YEARS, DISCOUNT)), rel=1e-14)
    sold = found(book(position("", "North", strike=3.0)))  # a short leg alone: max(-F - K, 0), a put at -K
    put = black76.value(16.0, 17.0, 0.7, YEARS, DISCOUNT, kind="put")
    assert sold["value"] == pytest.approx(float(put), rel=1e-14)


def test_a_leg_of_own_marks_moves_as_the_other_one_does() -> None:
    own = {"own_forward_short": 4.0, "own_vol_short": 12.0, "own_correlation": 0.6, "short_delivery": ""}
    some = book(position("Night", "", **own))
    assert build_slate(some, 1).law.tolist() == [Law.NORMAL]
    assert found(some)["value"] == pytest.approx(found(book(position("Night", "Dawn")))["value"], rel=1e-14)


def test_a_forward_that_its_shift_does_not_lift_above_zero_is_refused() -> None:
    valued = value_book(book(position("North", "South", own_forward_long=-20.0)))
    assert valued.results.reason(0) == (
        "the long forward is -20 with its shift of 20; the two must come to more than zero"
    )


@pytest.mark.parametrize("pair", [("North", "South"), ("Night", "Dawn")])
@pytest.mark.parametrize("quantity", ["value", "delta_long", "vega_short", "correlation_sensitivity", "theta"])
def test_a_surface_agrees_with_the_row_where_the_marks_stand(pair: tuple[str, str], quantity: str) -> None:
    slate = build_slate(book(position(*pair, short_ratio=1.5)), 1)
    surface = draw_surface(slate, SurfaceRequest(0, quantity, "yardstick", 21))
    assert not surface.reason
    assert surface.method == ("Yardstick" if pair[0] == "North" else "Bachelier")
    scale = {"vega_short": 0.01, "correlation_sensitivity": 0.01, "theta": 1 / 365}.get(quantity, 1.0)
    row = price_rows(slate, np.array([0])).outputs[output_row(quantity), 0]
    assert surface.current[2] == pytest.approx(scale * float(row), rel=1e-12)
    assert surface.long[0] < 0.0 < surface.long[-1]
    assert len(surface.rings) == 2


def test_a_reading_under_normal_forwards_tells_the_one_exact_method_and_vegas_per_unit_of_price() -> None:
    reading = read_position(build_slate(book(position("Night", "Dawn")), 1), 0)
    assert [method.name for method in reading.methods] == ["Bachelier"]
    assert reading.method == "Bachelier"
    assert reading.absolute_vols
    vega = next(row for row in reading.sensitivity_rows if row.key == "vega_long")
    assert vega.scaling == "per 1.00"
    exact = bachelier.sensitivities(-3.0, 4.0, -20.0, 18.0, 12.0, 0.6, YEARS, DISCOUNT)
    assert vega.unit_value == pytest.approx(float(exact.vega_long), rel=1e-14)


def test_margrabe_speaks_where_the_shifts_leave_no_strike() -> None:
    level = book(position("North", "South", strike=-15.0, own_forward_long=14.0))  # 20 - 5 - 15
    assert found(level)["margrabe"] == pytest.approx(found(level)["value"], rel=1e-9)
    assert np.isnan(found(book(position("North", "South", strike=0.0)))["margrabe"])
    reading = read_position(build_slate(level, 1), 0)
    assert next(method for method in reading.methods if method.key == "margrabe").remark == ""


def test_a_shift_that_is_far_out_approaches_bacheliers_value() -> None:
    """As the shift grows with vol times shifted forward held, the legs become normal (common practice, no source)."""
    far = 1e5
    markets = tuple(
        msgspec.structs.replace(
            market, dynamics="shifted lognormal", shift=far,
            marks=(Mark("2027-01", mark.forward, mark.volatility / (mark.forward + far)),),
        )
        for market in (NIGHT, DAWN) for mark in market.marks
    )  # fmt: skip
    some = msgspec.structs.replace(book(position("Night", "Dawn", strike=-5.0)), markets=markets)
    normal = found(book(position("Night", "Dawn", strike=-5.0)))["value"]
    assert found(some)["value"] == pytest.approx(normal, rel=1e-4)
