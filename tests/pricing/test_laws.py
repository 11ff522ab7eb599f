"""Laws every method must keep, whatever the numbers: put-call parity, bounds, symmetry, homogeneity."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.pricing import black76, margrabe, methods, yardstick

ALL = methods.LOGNORMAL_METHODS
ANY_STRIKE = [method for method in ALL if method.accepts(1.0)]
KEYS = [method.key for method in ALL]
ANY_STRIKE_KEYS = [method.key for method in ANY_STRIKE]


@st.composite
def options(draw: st.DrawFn, *, zero_strike: bool = False) -> tuple[float, ...]:
    """Forwards, strike, volatilities, correlation, expiry and discount over a wide box."""
    forward_short = draw(st.floats(1.0, 500.0))
    forward_long = forward_short * draw(st.floats(0.05, 20.0))
    strike = 0.0 if zero_strike else forward_short * draw(st.floats(-2.0, 2.0))
    vols = draw(st.floats(0.0, 1.5)), draw(st.floats(0.0, 1.5))
    correlation = draw(st.one_of(st.floats(-1.0, 1.0), st.sampled_from([-1.0, 0.9999, 1.0])))
    return (
        forward_long,
        forward_short,
        strike,
        *vols,
        correlation,
        draw(st.floats(0.0, 3.0)),
        draw(st.floats(0.0, 1.2)),
    )


def drawn_for(key: str, data: st.DataObject) -> tuple[float, ...]:
    return data.draw(options(zero_strike=key == "margrabe"))


def size(option: tuple[float, ...]) -> float:
    return option[0] + option[1] + abs(option[2])


@pytest.mark.parametrize("key", KEYS)
@given(data=st.data())
@settings(max_examples=60, deadline=None)
def test_call_less_put_is_the_forward(key: str, data: st.DataObject) -> None:
    option = drawn_for(key, data)
    with np.errstate(all="raise"):
        call, put, forward = (
            methods.method(key).sensitivities(*option, kind=kind) for kind in ("call", "put", "forward")
        )
    for field in call._fields:
        scale = max(size(option), 1e-3) if field in ("value", "vega_long", "vega_short", "theta") else 1.0
        if field.startswith("gamma") or field in ("correlation_sensitivity", "theta"):
            scale = max(1.0, abs(float(getattr(call, field)))) * size(option)
        gap = getattr(call, field) - getattr(put, field) - getattr(forward, field)
        assert abs(gap) <= 1e-12 * scale, field


@pytest.mark.parametrize("key", KEYS)
@given(data=st.data())
@settings(max_examples=60, deadline=None)
def test_a_value_lies_between_its_intrinsic_value_and_what_can_be_received(key: str, data: st.DataObject) -> None:
    option = drawn_for(key, data)
    long, short, strike, *_, discount = option
    for kind, sign, most in (("call", 1.0, long + max(-strike, 0.0)), ("put", -1.0, short + max(strike, 0.0))):
        with np.errstate(all="raise"):
            value = methods.method(key).value(*option, kind=kind)
        rounding = 1e-14 * size(option)
        assert value >= discount * max(sign * (long - short - strike), 0.0) - rounding
        assert value <= discount * most + rounding


@pytest.mark.parametrize("key", ANY_STRIKE_KEYS)
@given(option=options(zero_strike=True))
@settings(max_examples=60, deadline=None)
def test_a_strike_of_zero_is_margrabes_case(key: str, option: tuple[float, ...]) -> None:
    found, exact = methods.method(key).sensitivities(*option), margrabe.sensitivities(*option)
    assert abs(found.value - exact.value) <= 2e-14 * size(option)
    for field in ("delta_long", "delta_short"):
        assert abs(getattr(found, field) - getattr(exact, field)) <= 1e-8


@pytest.mark.parametrize("key", KEYS)
@given(data=st.data())
@settings(max_examples=60, deadline=None)
def test_a_call_is_the_put_on_the_legs_swapped_round_with_the_strike_turned(key: str, data: st.DataObject) -> None:
    """An identity for every method: both sides come to the same oriented legs, unless the strike is zero."""
    long, short, strike, vol_long, vol_short, *rest = drawn_for(key, data)
    method = methods.method(key)
    call = method.sensitivities(long, short, strike, vol_long, vol_short, *rest)
    put = method.sensitivities(short, long, -strike, vol_short, vol_long, *rest, kind="put")
    tolerance = 2e-14 * (long + short + abs(strike))
    assert abs(call.value - put.value) <= tolerance
    if strike != 0.0:
        assert call.delta_long == put.delta_short
        assert call.gamma_short == put.gamma_long
        assert call.vega_long == put.vega_short
        assert call.theta == put.theta


@pytest.mark.parametrize("key", KEYS)
@given(data=st.data(), power=st.integers(-40, 40))
@settings(max_examples=60, deadline=None)
def test_values_grow_with_the_unit_of_money(key: str, data: st.DataObject, power: int) -> None:
    """Powers of two, so that no rounding excuses a difference beyond the last digits."""
    option, unit = drawn_for(key, data), 2.0**power
    method = methods.method(key)
    scaled = (option[0] * unit, option[1] * unit, option[2] * unit, *option[3:])
    assert method.value(*scaled) == pytest.approx(
        unit * method.value(*option), rel=1e-12, abs=unit * 1e-14 * size(option)
    )


@given(option=options())
@settings(max_examples=60, deadline=None)
def test_the_true_value_falls_as_correlation_grows(option: tuple[float, ...]) -> None:
    correlations = np.linspace(-1.0, 1.0, 41)
    values, errors = yardstick.estimate(*option[:5], correlations, *option[6:])
    assert np.all(np.diff(values) <= errors[1:] + errors[:-1])


@given(option=options())
@settings(max_examples=60, deadline=None)
def test_the_bjerksund_stensland_rule_is_worth_no_more_than_the_best(option: tuple[float, ...]) -> None:
    """Their formula values an exercise rule that can be followed (2014), so it never exceeds the true value."""
    rule = methods.method("bjerksund_stensland").value(*option)
    best, error = yardstick.estimate(*option)
    assert rule <= best + error + 1e-13 * size(option)


@given(
    forward=st.floats(1.0, 500.0),
    moneyness=st.floats(-2.0, 5.0),
    deviation=st.floats(0.0, 2.5),
    expiry=st.floats(0.02, 3.0),
    discount=st.floats(0.0, 1.2),
)
@settings(max_examples=100, deadline=None)
def test_an_option_on_one_forward_keeps_parity_bounds_and_shape(
    forward: float, moneyness: float, deviation: float, expiry: float, discount: float
) -> None:
    strike, vol = forward * moneyness, deviation / expiry**0.5
    room = 1e-14 * (forward + abs(strike))
    with np.errstate(all="raise"):
        call, put, sure = (
            black76.value(forward, strike, vol, expiry, discount, kind=kind) for kind in ("call", "put", "forward")
        )
    assert abs(call - put - sure) <= room
    assert max(float(sure), 0.0) - room <= call <= discount * (forward + max(-strike, 0.0)) + room
    assert max(-float(sure), 0.0) - room <= put <= discount * max(strike, 0.0) + room
    strikes = forward * np.linspace(-1.0, 3.0, 81)
    by_strike = black76.value(forward, strikes, vol, expiry)
    assert np.all(np.diff(by_strike) <= room)
    assert np.all(np.diff(by_strike, 2) >= -4e-14 * forward)
    assert np.all(np.diff(black76.value(forward, strike, np.linspace(0.0, 3.0, 41), expiry)) >= -room)
    assert np.all(np.diff(black76.value(forward, strike, vol, np.linspace(0.0, 3.0, 41))) >= -room)
    grown = black76.value(1.7 * forward, 1.7 * strike, vol, expiry, discount)
    assert abs(grown - 1.7 * call) <= 4.0 * room


def test_the_table_of_methods_is_in_order_and_names_one_reference() -> None:
    assert [method.key for method in methods.METHODS] == [*KEYS, "bachelier"]
    assert [method.key for method in methods.NORMAL_METHODS] == ["bachelier"]
    assert KEYS == ["margrabe", "kirk", "modified_kirk", "bjerksund_stensland", "yardstick"]
    assert [method.key for method in ALL if method.reference] == ["yardstick"]
    assert methods.method("margrabe").accepts(np.array([0.0, -0.0, 1e-300, 5.0])).tolist() == [True, True, False, False]
    with pytest.raises(ValueError, match="method: expected one of margrabe, kirk"):
        methods.method("kirks")
