"""Shifted lognormal legs: the plain methods at shift zero, Bachelier as the shifts grow, and what is refused."""

from __future__ import annotations

from typing import Any

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.pricing import (
    bachelier,
    bjerksund_stensland,
    black76,
    implied,
    kirk,
    margrabe,
    modified_kirk,
    shifted,
    yardstick,
)

ANY_STRIKE = [kirk, modified_kirk, bjerksund_stensland, yardstick]
LOGNORMAL = [*ANY_STRIKE, margrabe]
MARKET = (-8.0, -21.0, 9.0, 0.35, 0.45, 0.6, 0.75, 0.93)  # both legs print below zero
SHIFTS = {"shift_long": 40.0, "shift_short": 55.0}


@pytest.mark.parametrize("kind", ["call", "put", "forward"])
@pytest.mark.parametrize("method", LOGNORMAL)
def test_shifts_of_zero_change_no_digit(method: Any, kind: str) -> None:
    option = (112.0, 103.0, 0.0 if method is margrabe else -7.0, 0.3, 0.45, 0.6, 1.0, 0.93)
    assert shifted.value(method.value, *option, kind=kind) == method.value(*option, kind=kind)
    found = shifted.sensitivities(method.sensitivities, *option, kind=kind)
    assert found == method.sensitivities(*option, kind=kind)
    outright = (112.0, 103.0, 0.3, 1.0, 0.93)
    assert shifted.outright_value(*outright, kind=kind) == black76.value(*outright, kind=kind)
    assert shifted.outright_sensitivities(*outright, kind=kind) == black76.sensitivities(*outright, kind=kind)


@pytest.mark.parametrize("kind", ["call", "put"])
def test_the_payoff_summed_over_both_shifted_legs_is_the_yardsticks_value(kind: str) -> None:
    """A plain sum over the two normal factors, with the payoff of the legs as they print: nothing is shared with the
    program. Its kinks leave it some 1e-5."""
    long, short, strike, vol_long, vol_short, correlation, expiry, discount = MARKET
    z = np.linspace(-8.0, 8.0, 3201)
    one, other = z[:, None], correlation * z[:, None] + (1.0 - correlation**2) ** 0.5 * z
    root = expiry**0.5

    def leg(forward: float, shift: float, vol: float, factor: np.ndarray) -> np.ndarray:
        return (forward + shift) * np.exp(vol * root * factor - 0.5 * vol * vol * expiry) - shift

    spread = leg(long, 40.0, vol_long, one) - leg(short, 55.0, vol_short, other) - strike
    payoff = np.maximum(spread if kind == "call" else -spread, 0.0)
    weight = np.exp(-0.5 * z * z) * (z[1] - z[0]) / np.sqrt(2.0 * np.pi)
    summed = discount * float(weight @ payoff @ weight)
    assert shifted.value(yardstick.value, *MARKET, **SHIFTS, kind=kind) == pytest.approx(summed, abs=2e-5)


@pytest.mark.parametrize("kind", ["call", "put"])
@pytest.mark.parametrize("method", ANY_STRIKE)
def test_call_less_put_is_the_forward_of_the_legs_as_they_print(method: Any, kind: str) -> None:
    call, put = (shifted.sensitivities(method.sensitivities, *MARKET, **SHIFTS, kind=one) for one in ("call", "put"))
    assert call.value - put.value == pytest.approx(0.93 * (-8.0 + 21.0 - 9.0), abs=1e-12)
    assert call.delta_long - put.delta_long == pytest.approx(0.93, abs=1e-12)


@pytest.mark.parametrize("method", ANY_STRIKE)
def test_sensitivities_are_the_derivatives_in_the_legs_as_they_print(method: Any) -> None:
    """Kirk's formula is written down again at 50 digits; the others by differences of their own values."""
    found = shifted.sensitivities(method.sensitivities, *MARKET, **SHIFTS)
    step = 1e-4
    for place, name in ((0, "delta_long"), (1, "delta_short"), (3, "vega_long"), (4, "vega_short")):
        ends = []
        for sign in (1.0, -1.0):
            moved = list(MARKET)
            moved[place] += sign * step
            ends.append(shifted.value(method.value, *moved, **SHIFTS))
        assert getattr(found, name) == pytest.approx((ends[0] - ends[1]) / (2.0 * step), rel=2e-6, abs=1e-7), name


def test_kirk_on_shifted_legs_meets_the_formula_at_50_digits() -> None:
    with mp.workdps(50):

        def value(f1, f2, s1, s2, r, t):  # type: ignore[no-untyped-def]  # mpmath has no types
            long, short, k = f1 + 40, f2 + 55, mp.mpf(9) + 40 - 55
            # A moved strike of -6: the put on the legs swapped round with strike 6.
            q = long / (long - k)
            v = mp.sqrt((s2**2 - 2 * r * s1 * s2 * q + (s1 * q) ** 2) * t)
            d = mp.log(short / (long - k)) / v + v / 2
            return (long - k) * mp.ncdf(v - d) - short * mp.ncdf(-d)

        at = tuple(map(mp.mpf, (-8, -21, 0.35, 0.45, 0.6, 0.75)))
        unit = [tuple(1 if one == other else 0 for other in range(6)) for one in range(6)]
        exact = [float(value(*at)), *(float(mp.diff(value, at, order)) for order in unit)]
        cross = float(mp.diff(value, at, (1, 1, 0, 0, 0, 0)))
    found = shifted.sensitivities(kirk.sensitivities, *MARKET, **SHIFTS)
    same = [found.value, found.delta_long, found.delta_short, found.vega_long, found.vega_short]
    same += [found.correlation_sensitivity, -found.theta]
    assert [float(one) for one in same] == pytest.approx([0.93 * one for one in exact], rel=1e-11)
    assert float(found.gamma_cross) == pytest.approx(0.93 * cross, rel=1e-10)


@pytest.mark.parametrize("method", ANY_STRIKE)
def test_large_shifts_with_absolute_moves_held_lead_to_bachelier(method: Any) -> None:
    """Volatility times shifted forward held (common practice, no source): the gap falls like one over the shift."""
    long, short, strike, *_, correlation, expiry, discount = MARKET
    normal = bachelier.value(long, short, strike, 14.0, 11.0, correlation, expiry, discount)
    shifts = 10.0 ** np.arange(3.0, 7.0)
    found = shifted.value(
        method.value,
        *(long, short, strike, 14.0 / (long + shifts), 11.0 / (short + shifts), correlation, expiry, discount),
        shift_long=shifts,
        shift_short=shifts,
    )
    gaps = np.abs(found - normal)
    assert gaps[0] < 0.1
    assert np.all(gaps[1:] <= 0.13 * gaps[:-1] + 1e-8)
    outright = shifted.outright_value(long, -5.0, 14.0 / (long + shifts), expiry, discount, shift=shifts)
    flat = np.abs(outright - bachelier.outright_value(long, -5.0, 14.0, expiry, discount))
    assert np.all(flat[1:] <= 0.13 * flat[:-1] + 1e-8)


@given(
    shifts=st.tuples(st.floats(30.0, 400.0), st.floats(30.0, 400.0)),
    forwards=st.tuples(st.floats(-29.0, 100.0), st.floats(-29.0, 100.0)),
    strike=st.floats(-50.0, 50.0),
)
@settings(max_examples=100, deadline=None)
def test_the_option_on_shifted_legs_keeps_its_bounds(
    shifts: tuple[float, float], forwards: tuple[float, float], strike: float
) -> None:
    named = {"shift_long": shifts[0], "shift_short": shifts[1]}
    for method in ANY_STRIKE:
        value = shifted.value(method.value, *forwards, strike, 0.4, 0.3, 0.5, 1.0, **named)
        assert value >= max(forwards[0] - forwards[1] - strike, 0.0) - 1e-11
        assert value <= forwards[0] + shifts[0] + max(shifts[1] - shifts[0] - strike, 0.0) + 1e-11


def test_margrabe_holds_where_the_moved_strike_is_zero() -> None:
    strike = 55.1 - 40.3
    option = (-8.0, -21.0, strike, 0.35, 0.45, 0.6, 0.75)
    named = {"shift_long": 40.3, "shift_short": 55.1}
    assert shifted.arguments(-8.0, -21.0, strike, **named).strike == 0.0
    exact = shifted.value(margrabe.value, *option, **named)
    assert exact == pytest.approx(shifted.value(yardstick.value, *option, **named), abs=1e-12)
    with pytest.raises(ValueError, match=r"^strike: .*zero only"):
        shifted.value(margrabe.value, *MARKET, **SHIFTS)


def test_an_implied_correlation_is_found_on_shifted_legs() -> None:
    premium = shifted.value(yardstick.value, *MARKET, **SHIFTS)
    legs = shifted.arguments(*MARKET[:3], **SHIFTS)
    found, status = implied.correlation(premium, *legs, *MARKET[3:5], *MARKET[6:])
    assert status == "solved"
    assert found == pytest.approx(0.6, abs=1e-11)


def test_shapes_are_those_of_all_arguments() -> None:
    found = shifted.value(kirk.value, -8.0, np.full((3, 1), 2.0), 1.0, 0.3, 0.4, 0.5, 1.0, shift_long=[20.0, 30.0])
    assert found.shape == (3, 2)
    assert shifted.value(kirk.value, np.empty(0), 2.0, 1.0, 0.3, 0.4, 0.5, 1.0).shape == (0,)


@pytest.mark.parametrize(
    ("bad", "words"),
    [
        ({"shift_long": 8.0}, r"forward_long \+ shift_long: must be above zero, found 0.0"),
        ({"shift_short": [30.0, 20.0]}, r"forward_short \+ shift_short: must be above zero, found -1.0 at index 1"),
        ({"shift_long": np.nan}, "shift_long: must be finite"),
        ({"shift_short": np.inf}, "shift_short: must be finite"),
        ({"forward_long": -np.inf}, "forward_long: must be finite"),
        ({"strike": np.nan}, "strike: must be finite"),
        ({"shift_long": "a lot"}, "shift_long: expected real numbers"),
        ({"shift_long": [40.0, 40.0], "forward_long": [0.0] * 3}, r"shift_long: shape \(2,\) does not broadcast"),
        ({"vol_long": -0.1}, "vol_long: must be zero or above"),
        ({"kind": "Call"}, "kind: expected one of"),
    ],
)
def test_a_bad_argument_is_refused_by_its_name(bad: dict[str, Any], words: str) -> None:
    names = ("forward_long", "forward_short", "strike", "vol_long", "vol_short", "correlation", "expiry", "discount")
    arguments = {**dict(zip(names, MARKET, strict=True)), **SHIFTS, **bad}
    for call, given_method in ((shifted.value, kirk.value), (shifted.sensitivities, kirk.sensitivities)):
        with pytest.raises(ValueError, match=f"^{words}"):
            call(given_method, **arguments)  # type: ignore[operator]  # the union of the two signatures
    with pytest.raises(ValueError, match=r"^forward \+ shift: must be above zero"):
        shifted.outright_value(-5.0, 3.0, 0.3, 1.0, shift=5.0)
