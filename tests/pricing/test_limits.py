"""Limits: no volatility, no time, full correlation, no strike, far from the money, no discount factor."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest

from spreadgui.pricing import black76, methods, yardstick
from spreadgui.pricing.results import Sensitivities

KEYS = [method.key for method in methods.LOGNORMAL_METHODS]
HOSTILE = {
    "forward_long": [1e-9, 1.0, 100.0, 1e9],
    "forward_short": [1e-9, 100.0, 1e9],
    "strike": [-1e9, -150.0, -100.0, -99.9999999, -1e-300, 0.0, -0.0, 1e-300, 1e-10, 50.0, 1e9],
    "vol_long": [0.0, 1e-300, 1e-12, 0.3, 20.0],
    "vol_short": [0.0, 1e-12, 0.3, 20.0],
    "correlation": [-1.0, -1.0 + 2e-16, 0.0, 0.999999, 1.0 - 2e-16, 1.0],
    "expiry": [0.0, 1e-300, 1e-8, 1.0, 30.0],
}


def hostile_columns(key: str) -> list[np.ndarray]:
    columns = [np.array(column) for column in zip(*product(*HOSTILE.values()), strict=True)]
    chosen = methods.method(key).accepts(columns[2])
    return [column[chosen] for column in columns]


@pytest.mark.parametrize("kind", ["call", "put", "forward"])
@pytest.mark.parametrize("key", KEYS)
def test_no_corner_gives_a_warning_a_nan_an_infinity_or_a_negative_zero(key: str, kind: str) -> None:
    columns = hostile_columns(key)
    with np.errstate(all="raise"):
        found = methods.method(key).sensitivities(*columns, np.resize([1.0, 0.0, 0.5], columns[0].size), kind=kind)
    for field in Sensitivities._fields:
        numbers = getattr(found, field)
        assert np.isfinite(numbers).all(), field
        assert not np.any(np.signbit(numbers) & (numbers == 0.0)), field


@pytest.mark.parametrize("kind", ["call", "put"])
@pytest.mark.parametrize("key", KEYS)
def test_no_corner_breaks_the_bounds(key: str, kind: str) -> None:
    columns = hostile_columns(key)
    long, short, strike = columns[:3]
    value = methods.method(key).value(*columns, kind=kind)
    forward = long - short - strike
    low = np.maximum(forward if kind == "call" else -forward, 0.0)
    high = long + np.maximum(-strike, 0.0) if kind == "call" else short + np.maximum(strike, 0.0)
    rounding = 1e-14 * (long + short + np.abs(strike))
    assert np.all(value >= low - rounding)
    assert np.all(value <= high + rounding)


@pytest.mark.parametrize(("kind", "sign"), [("call", 1.0), ("put", -1.0)])
@pytest.mark.parametrize("still", [{"expiry": 0.0}, {"vol_long": 0.0, "vol_short": 0.0}])
@pytest.mark.parametrize("key", KEYS)
def test_without_time_or_volatility_the_intrinsic_value_is_left(
    key: str, still: dict[str, float], kind: str, sign: float
) -> None:
    strikes = np.zeros(3) if key == "margrabe" else np.array([5.0, 25.0, -10.0])
    arguments = {"vol_long": 0.3, "vol_short": 0.4, "correlation": 0.5, "expiry": 1.0, "discount": 0.9, **still}
    found = methods.method(key).sensitivities(100.0, 85.0, strikes, **arguments, kind=kind)
    moneyness = sign * (15.0 - strikes)
    assert found.value == pytest.approx(0.9 * np.maximum(moneyness, 0.0), abs=1e-13)
    assert found.delta_long.tolist() == (sign * 0.9 * (moneyness > 0.0)).tolist()
    assert found.delta_short.tolist() == (-sign * 0.9 * (moneyness > 0.0) + 0.0).tolist()
    assert all(not np.any(column) for column in found[3:])


@pytest.mark.parametrize("key", KEYS)
def test_at_the_kink_either_delta_is_one_half(key: str) -> None:
    strike = 0.0 if key == "margrabe" else 15.0
    found = methods.method(key).sensitivities(100.0, 100.0 - strike, strike, 0.3, 0.4, 0.5, 0.0)
    assert (float(found.value), float(found.delta_long), float(found.delta_short)) == (0.0, 0.5, -0.5)
    assert all(not np.any(column) for column in found[3:])


@pytest.mark.parametrize("key", KEYS)
@pytest.mark.parametrize("name", ["vol_long", "vol_short", "expiry"])
def test_the_limit_of_a_falling_argument_is_reached_without_a_jump(key: str, name: str) -> None:
    strike = 0.0 if key == "margrabe" else 12.0
    arguments = {"vol_long": 0.3, "vol_short": 0.4, "correlation": 0.5, "expiry": 1.0}
    falling = np.concatenate((np.logspace(-2, -22, 41), [0.0]))
    values = methods.method(key).value(100.0, 90.0, strike, **{**arguments, name: falling})
    gaps = np.abs(values - values[-1])
    growth = np.sqrt(falling) if name == "expiry" else falling
    assert np.all(gaps <= 60.0 * growth + 1e-12)


@pytest.mark.parametrize("end", [-1.0, 1.0])
@pytest.mark.parametrize("strike", [7.0, -7.0, 30.0, 1e-6])
def test_full_correlation_is_reached_without_a_jump(end: float, strike: float) -> None:
    away = np.concatenate((np.logspace(-3, -15.5, 26), [0.0]))
    found = yardstick.sensitivities(112.0, 103.0, strike, 0.3, 0.45, end * (1.0 - away), 1.0)
    for field in ("value", "delta_long", "delta_short", "gamma_long", "vega_short", "theta"):
        numbers = getattr(found, field)
        assert np.all(np.abs(numbers - numbers[-1]) <= (1.0 + abs(numbers[-1])) * (40.0 * away + 1e-9)), field


@pytest.mark.parametrize(
    ("correlation", "vols"), [(1.0, (0.2, 0.5)), (1.0, (0.5, 0.2)), (1.0, (0.3, 0.3)), (-1.0, (0.2, 0.5))]
)
@pytest.mark.parametrize("kind", ["call", "put"])
@pytest.mark.parametrize("forward_long", [80.0, 112.0, 150.0])
def test_one_factor_is_integrated_exactly(
    correlation: float, vols: tuple[float, float], kind: str, forward_long: float
) -> None:
    """Against a plain sum over two million points of the one normal, whose kinks leave it an error below 1e-9."""
    z, step = np.linspace(-9.0, 9.0, 2_000_001, retstep=True)
    long = forward_long * np.exp(vols[0] * z - 0.5 * vols[0] ** 2)
    short = 103.0 * np.exp(correlation * vols[1] * z - 0.5 * vols[1] ** 2)
    payoff = np.maximum((long - short - 7.0) * (1.0 if kind == "call" else -1.0), 0.0)
    summed = np.sum(payoff * np.exp(-0.5 * z * z)) * step / np.sqrt(2.0 * np.pi)
    value, error = yardstick.estimate(forward_long, 103.0, 7.0, *vols, correlation, 1.0, kind=kind)
    assert abs(value - summed) <= 2e-9
    assert error <= 1e-11


# Undiscounted calls on 1 against 13 and 0.5, deviations 0.0625 and 0.75, by adaptive integration of the conditional
# exercise probabilities at 50 digits, for the doubles nearest these correlations.
TWO_ARMS = {1.0 - 1e-6: 5.5651097720925854e-09, 1.0 - 1e-8: 5.5650205634768745e-09, 1.0 - 1e-12: 5.56501966247503e-09}


@pytest.mark.parametrize("correlation", TWO_ARMS)
def test_the_nearer_of_two_steep_arms_of_the_boundary_is_the_one_looked_at_closely(correlation: float) -> None:
    """Next to full correlation a short leg that moves more is met twice, at -5 and at -11 deviations here."""
    found = yardstick.value(1.0, 13.0, 0.5, 0.0625, 0.75, correlation, 1.0)
    assert found == pytest.approx(TWO_ARMS[correlation], rel=1e-10)


def test_where_two_arms_carry_weight_the_error_is_owned_up_to() -> None:
    """The one factor's value is the limit, and to first order the value rises by 1.14 times the distance from it."""
    away = np.append(np.logspace(-12.0, -15.5, 36), 0.0)
    value, error = yardstick.estimate(0.5, 1.0, -1.0, 2.0, 1.0, 1.0 - away, 1.0)
    assert np.all(np.abs(value - value[-1]) <= error + 1.2 * away)
    assert np.all(error <= 1e-8)


@pytest.mark.parametrize("kind", ["call", "put"])
@pytest.mark.parametrize("strike", [-140.0, -20.0, 0.0, 7.0])
def test_a_leg_without_volatility_leaves_black76(strike: float, kind: str) -> None:
    quiet_short = yardstick.value(112.0, 103.0, strike, 0.3, 0.0, 0.4, 2.0, 0.9, kind=kind)
    assert quiet_short == pytest.approx(black76.value(112.0, 103.0 + strike, 0.3, 2.0, 0.9, kind=kind), abs=1e-11)
    opposite = "put" if kind == "call" else "call"
    quiet_long = yardstick.value(112.0, 103.0, strike, 0.0, 0.3, 0.4, 2.0, 0.9, kind=kind)
    assert quiet_long == pytest.approx(black76.value(103.0, 112.0 - strike, 0.3, 2.0, 0.9, kind=opposite), abs=1e-11)


@pytest.mark.parametrize("strike", [0.0, -0.0, -25.0])
def test_an_outright_with_no_strike_to_pay_is_the_forward(strike: float) -> None:
    call = black76.sensitivities(80.0, strike, 0.4, 1.0, 0.9)
    assert tuple(map(float, call)) == (0.9 * (80.0 - strike), 0.9, 0.0, 0.0, 0.0)
    assert not np.any(black76.sensitivities(80.0, strike, 0.4, 1.0, 0.9, kind="put"))


def test_a_small_strike_is_margrabe_and_a_little() -> None:
    strikes = np.array([0.0, 1e-20, 1e-15, 1e-10, 1e-6])
    found = yardstick.sensitivities(112.0, 103.0, strikes, 0.3, 0.45, 0.6, 1.0)
    assert np.all(np.abs(found.value - found.value[0]) <= strikes + 1e-12)
    assert np.all(np.abs(found.gamma_cross - found.gamma_cross[0]) <= 1e-3 * strikes + 1e-13)


def test_a_margrabe_strike_other_than_zero_is_refused() -> None:
    with pytest.raises(ValueError, match=r"strike: .*zero only, found 0.1"):
        methods.method("margrabe").value(100.0, 90.0, [0.0, 0.1], 0.3, 0.4, 0.5, 1.0)


@pytest.mark.parametrize("key", ["kirk", "modified_kirk", "bjerksund_stensland"])
def test_the_published_form_refuses_a_strike_that_leaves_nothing_to_pay(key: str) -> None:
    method = methods.method(key)
    with pytest.raises(ValueError, match="strike: the published form"):
        method.value(100.0, 90.0, -90.0, 0.3, 0.4, 0.5, 1.0, role_exchange=False)
    assert method.value(100.0, 90.0, -90.0, 0.3, 0.4, 0.5, 1.0) > 100.0
