"""Pricing rows of a slate: the right formula with the right arguments for each kind and shape of row."""

from __future__ import annotations

import math

import numpy as np
import pytest

from spreadgui.book.records import Position
from spreadgui.pricing import bjerksund_stensland, black76, kirk, margrabe, yardstick
from spreadgui.valuation.price import price_rows
from spreadgui.valuation.results import OUTPUTS, SENSITIVITIES, output_row
from spreadgui.valuation.slate import build_slate
from spreadgui.valuation.table import value_book
from tests.books import EXPIRY, POWER, book_of, cap, season, spark

YEARS = 28 / 365
DISCOUNT = math.exp(-0.03 * YEARS)
SPARK = (108.0, 7.1 * 13.0, 5.0, 0.6, 0.5, 0.65, YEARS, DISCOUNT)
SEASON = (108.0, 80.0, -2.0, 0.6, 0.5, math.exp(-0.2), YEARS, DISCOUNT)


def outputs_of(*positions: Position, **book: object) -> dict[str, np.ndarray]:
    slate = build_slate(book_of(*positions, **book), 1)
    part = price_rows(slate, np.arange(len(slate)))
    assert not part.refused
    return dict(zip(OUTPUTS, part.outputs, strict=True))


def test_each_method_speaks_of_a_spread_with_the_ratios_folded_in() -> None:
    found = outputs_of(spark(), season())
    for method in (kirk, bjerksund_stensland, yardstick):
        key = method.__name__.rpartition(".")[2]
        expected = [float(method.value(*SPARK)), float(method.value(*SEASON, kind="put"))]
        assert found[key] == pytest.approx(expected, rel=1e-13)


def test_margrabe_speaks_only_where_the_strike_is_zero() -> None:
    found = outputs_of(spark(strike=0.0), spark())
    assert found["margrabe"][0] == pytest.approx(float(margrabe.value(*SPARK[:2], 0.0, *SPARK[3:])))
    assert math.isnan(found["margrabe"][1])


@pytest.mark.parametrize("method", ["kirk", "bjerksund_stensland", "yardstick"])
def test_value_and_sensitivities_come_from_the_books_method(method: str) -> None:
    module = {"kirk": kirk, "bjerksund_stensland": bjerksund_stensland, "yardstick": yardstick}[method]
    found, expected = outputs_of(spark(), method=method), module.sensitivities(*SPARK)
    assert found["value"][0] == found[method][0] == pytest.approx(float(expected.value))
    factors = {"delta_short": 7.1, "gamma_short": 7.1**2, "gamma_cross": 7.1}
    for key in SENSITIVITIES:
        carry = 0.03 * float(expected.value) if key == "theta" else 0.0
        assert found[key][0] == pytest.approx(factors.get(key, 1.0) * float(getattr(expected, key)) + carry, rel=1e-12)


def test_sensitivities_are_those_of_the_position_as_the_market_moves_it() -> None:
    """Central differences of the value under moved marks, ratios and carry included."""

    def value(**changed: object) -> float:
        return float(outputs_of(spark(**changed))["yardstick"][0])

    found, step = outputs_of(spark()), 1e-4
    up, down = value(own_forward_short=13.0 + step), value(own_forward_short=13.0 - step)
    assert found["delta_short"][0] == pytest.approx((up - down) / (2 * step), rel=1e-6)
    up, down = value(own_vol_long=0.6 + step), value(own_vol_long=0.6 - step)
    assert found["vega_long"][0] == pytest.approx((up - down) / (2 * step), rel=1e-6)
    day_before, day_after = (value(expiry=EXPIRY.replace(day=day)) for day in (30, 28))
    assert found["theta"][0] == pytest.approx(-(day_before - day_after) * 365 / 2, rel=2e-3)


def test_an_outright_is_black76_on_its_leg_by_every_method() -> None:
    found = outputs_of(cap())
    expected = black76.sensitivities(108.0, 110.0, 0.6, YEARS, DISCOUNT)
    for key in ("kirk", "bjerksund_stensland", "yardstick", "value"):
        assert found[key][0] == pytest.approx(float(expected.value))
    assert found["delta_long"][0] == pytest.approx(float(expected.delta))
    assert found["delta_short"][0] == found["gamma_cross"][0] == found["correlation_sensitivity"][0] == 0.0


def test_a_short_leg_alone_is_the_opposite_option_on_it() -> None:
    floor = Position(
        "floor", quantity=1.0, short_leg=POWER.name, short_delivery="2027-01", strike=-105.0, expiry=EXPIRY
    )
    found = outputs_of(floor)  # max(105 - F, 0): a put struck at 105
    expected = black76.sensitivities(108.0, 105.0, 0.6, YEARS, DISCOUNT, kind="put")
    assert found["yardstick"][0] == pytest.approx(float(expected.value))
    assert found["delta_short"][0] == pytest.approx(float(expected.delta))


def test_a_forward_needs_no_volatility_and_every_method_agrees_on_it() -> None:
    found = outputs_of(spark(kind="forward"))
    expected = DISCOUNT * (108.0 - 7.1 * 13.0 - 5.0)
    assert found["kirk"][0] == found["yardstick"][0] == pytest.approx(expected)
    assert found["delta_short"][0] == pytest.approx(-7.1 * DISCOUNT)
    assert found["vega_long"][0] == found["gamma_long"][0] == 0.0


def test_put_and_call_differ_by_the_forward() -> None:
    found = outputs_of(spark(), spark(kind="put"), spark(kind="forward"))
    for key in ("kirk", "bjerksund_stensland", "yardstick"):
        call, put, forward = found[key]
        assert call - put == pytest.approx(forward, abs=1e-9)


@pytest.mark.parametrize(
    "wild",
    [
        {"own_forward_long": 1e200, "long_ratio": 1e200},
        {"own_forward_long": 1e-200, "long_ratio": 1e-200},
        {"own_forward_long": 1e300, "quantity": 1e300},
        {"own_vol_long": 1e200},
        {"own_vol_long": 1e8, "own_vol_short": 1e8},
        {"own_forward_long": 1e308, "own_forward_short": 1e308},
        {"strike": 1e308},
        {"strike": -1e308},
        {"short_ratio": 1e160},
    ],
    ids=str,
)
def test_a_wild_row_is_refused_or_priced_and_its_neighbours_are_priced(wild: dict[str, float]) -> None:
    valued = value_book(book_of(spark(), spark(**wild), cap()))
    assert [valued.results.state[row] for row in (0, 2)] == [0, 0]
    row = valued.results.outputs[:, 1]
    if valued.results.state[1] == 0:
        assert np.isfinite(row[output_row("value") :]).all()
    else:
        assert valued.results.reason(1)
        assert np.isnan(row).all()


def test_the_limits_of_a_row_are_priced_at_their_true_value() -> None:
    at_expiry = {"expiry": book_of().valuation_date}
    found = outputs_of(
        spark(**at_expiry), spark(own_vol_long=0.0, own_vol_short=0.0), spark(own_correlation=1.0),
        spark(own_correlation=-1.0),
    )  # fmt: skip
    assert found["yardstick"][0] == pytest.approx(108.0 - 7.1 * 13.0 - 5.0)
    assert found["kirk"][1] == pytest.approx(DISCOUNT * (108.0 - 7.1 * 13.0 - 5.0))
    assert found["yardstick"][2] < found["yardstick"][3]
