"""Laws of the true value under two lognormal legs, over the hard box, and the same legs shifted.

None needs a figure from outside: each is a theorem on max(S1 - S2 - K, 0) with jointly lognormal martingales, proved in
a line where it is used. What every method must keep (parity, bounds, role exchange, scale) is in test_laws.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from scipy.special import ndtr

from spreadgui.pricing import bjerksund_stensland, kirk, margrabe, methods, modified_kirk, shifted, yardstick

Array = NDArray[np.float64]
Option = tuple[float, ...]

ANY_STRIKE = [kirk, modified_kirk, bjerksund_stensland, yardstick]
KEYS = [method.key for method in methods.LOGNORMAL_METHODS]
ROUNDING = 4e-15


@st.composite
def options(draw: st.DrawFn) -> Option:
    """Forward long and short, strike, vols, correlation, expiry: strikes of -2..2 short forwards, deviations to expiry
    0..2.5, correlation within 0.9999 or at an end."""
    short = draw(st.floats(1.0, 500.0))
    long = short * draw(st.floats(0.05, 20.0))
    strike = short * draw(st.one_of(st.floats(-2.0, 2.0), st.sampled_from([0.0, -1.0, 1e-9, -1e-9])))
    expiry = draw(st.floats(0.02, 3.0))
    deviations = [draw(st.one_of(st.floats(0.0, 2.5), st.floats(0.005, 0.1))) for _ in range(2)]
    correlation = draw(st.one_of(st.floats(-0.9999, 0.9999), st.sampled_from([-1.0, -0.9999, 0.9999, 1.0])))
    return long, short, strike, *(one / expiry**0.5 for one in deviations), correlation, expiry


def size(option: Option) -> float:
    return option[0] + option[1] + abs(option[2])


def along(option: Option, place: int, column: Any, kind: str = "call") -> tuple[Array, Array]:
    """Values and their own error bounds with one argument replaced by a column."""
    value, error = yardstick.estimate(*option[:place], column, *option[place + 1 :], kind=kind)
    return value, error + ROUNDING * (size(option) + (np.abs(column) if place < 3 else 0.0))


@given(option=options())
@settings(max_examples=60, deadline=None)
def test_a_call_rises_with_the_long_forward_and_falls_with_the_short_one_and_the_strike(option: Option) -> None:
    """And by no more than what is moved: the payoff moves so in each."""
    for place, sign in ((0, 1.0), (1, -1.0), (2, -1.0)):
        grid = np.linspace(-2.0, 2.0, 41) * option[1] if place == 2 else option[place] * np.geomspace(0.1, 10.0, 41)
        value, error = along(option, place, grid)
        move, room = sign * np.diff(value), error[1:] + error[:-1]
        assert np.all(move >= -room), place
        assert np.all(move <= np.diff(grid) + room), place
        put, put_error = along(option, place, grid, "put")
        assert np.all(sign * np.diff(put) <= put_error[1:] + put_error[:-1]), place


@given(first=options(), second=options(), kind=st.sampled_from(["call", "put"]))
@settings(max_examples=100, deadline=None)
def test_the_value_is_convex_in_forwards_and_strike_together(first: Option, second: Option, kind: str) -> None:
    """The payoff is convex in all three, and each leg is its forward times a factor that knows no forward. The line
    crosses strikes of zero, where the legs change roles, and strikes that take all of the short forward."""
    ends = np.array([first[:3], second[:3]])
    share = np.linspace(0.0, 1.0, 33)[:, None]
    path = (1.0 - share) * ends[0] + share * ends[1]
    value, error = yardstick.estimate(*path.T, *first[3:], kind=kind)
    error += ROUNDING * np.abs(path).sum(axis=1)
    assert np.all(value[2:] - 2.0 * value[1:-1] + value[:-2] >= -(error[2:] + 2.0 * error[1:-1] + error[:-2]))


@given(option=options())
@settings(max_examples=100, deadline=None)
def test_gammas_are_those_of_a_convex_function(option: Option) -> None:
    found = yardstick.sensitivities(*option)
    assert found.gamma_long >= 0.0
    assert found.gamma_short >= 0.0
    assert found.gamma_cross <= 0.0
    product = float(found.gamma_long * found.gamma_short)
    assert float(found.gamma_cross) ** 2 <= product * (1.0 + 1e-9) + 1e-300


@given(option=options())
@settings(max_examples=60, deadline=None)
def test_more_time_is_never_worth_less_before_discounting(option: Option) -> None:
    """Jensen: the payoff is convex and the legs are martingales."""
    for kind in ("call", "put"):
        value, error = along(option, 6, np.linspace(0.0, 2.5, 51), kind)
        assert np.all(np.diff(value) >= -(error[1:] + error[:-1]))


@given(option=options())
@settings(max_examples=60, deadline=None)
def test_more_volatility_is_never_worth_less_where_the_legs_do_not_hedge_each_other(option: Option) -> None:
    """dV/da has the sign of a S1 - rho b S2 averaged over the exercise boundary S1 = S2 + K. That is never negative for
    rho at or below zero, nor for a at or above rho b where K is not negative and so S1 not below S2; the short leg's
    alike, with a negative strike. Elsewhere a value may fall as one volatility rises: see the next test."""
    long, short, strike, vol_long, vol_short, correlation, expiry = option
    grid = np.linspace(0.0, 2.5, 41) / expiry**0.5
    opposed = (long, short, strike, vol_long, vol_short, -abs(correlation), expiry)
    for place in (3, 4):
        value, error = along(opposed, place, grid)
        assert np.all(np.diff(value) >= -(error[1:] + error[:-1])), place
    for place, other, turned in ((3, vol_short, abs(strike)), (4, vol_long, -abs(strike))):
        rising = np.linspace(abs(correlation) * other, max(2.5 / expiry**0.5, other), 41)
        value, error = along((long, short, turned, vol_long, vol_short, abs(correlation), expiry), place, rising)
        assert np.all(np.diff(value) >= -(error[1:] + error[:-1])), place


def test_a_value_falls_as_a_volatility_rises_towards_its_share_of_the_other_leg() -> None:
    """Margrabe's variance a^2 - 2 rho a b + b^2 falls until a = rho b; strikes near zero follow it."""
    grid = np.linspace(0.0, 0.8 * 0.5, 21)
    for strike in (0.0, 1e-6, -1e-6):
        assert np.all(np.diff(yardstick.value(100.0, 100.0, strike, grid, 0.5, 0.8, 1.0)) < 0.0)
        assert yardstick.sensitivities(100.0, 100.0, strike, 0.2, 0.5, 0.8, 1.0).vega_long < 0.0


@given(option=options(), factor=st.floats(1e-6, 1e6))
@settings(max_examples=100, deadline=None)
def test_the_value_is_homogeneous_of_degree_one_and_euler_holds(option: Option, factor: float) -> None:
    """The amounts times any factor; and V = F1 dV/dF1 + F2 dV/dF2 + K dV/dK, dV/dK by the value being the price of
    exercise: it lies between -1 and 0."""
    value, error = yardstick.estimate(*option)
    scaled, scaled_error = yardstick.estimate(*(factor * one for one in option[:3]), *option[3:])
    # A factor that is no power of two moves every amount by half a last digit; a unit of it is worth a unit.
    assert abs(scaled - factor * value) <= scaled_error + factor * (error + ROUNDING * size(option))
    found = yardstick.sensitivities(*option)
    left = float(found.value - option[0] * found.delta_long - option[1] * found.delta_short)
    room = float(error) + 1e-11 * (option[0] + option[1])
    assert min(-option[2], 0.0) - room <= left <= max(-option[2], 0.0) + room


@given(option=options())
@settings(max_examples=60, deadline=None)
def test_the_value_falls_with_correlation_at_every_distance_from_the_ends(option: Option) -> None:
    near = np.geomspace(1e-15, 1e-2, 27)
    correlations = np.concatenate(([-1.0], -1.0 + near, np.linspace(-0.98, 0.98, 15), 1.0 - near[::-1], [1.0]))
    for kind in ("call", "put"):
        value, error = along(option, 5, correlations, kind)
        assert np.all(np.diff(value) <= error[1:] + error[:-1])
    assert yardstick.sensitivities(*option).correlation_sensitivity <= 0.0


def distance(forward: float, deviation: Any) -> Array:
    """E|S - S'| of two lognormals of one forward whose logarithms differ by this deviation: twice Margrabe's value at
    the money."""
    return np.asarray(2.0 * forward * (2.0 * ndtr(0.5 * np.asarray(deviation)) - 1.0))


SMALL = 10.0 ** np.linspace(-0.5, -17.0, 34)


@given(option=options(), kind=st.sampled_from(["call", "put"]))
@settings(max_examples=80, deadline=None)
def test_every_limit_is_reached_as_fast_as_the_legs_reach_theirs(option: Option, kind: str) -> None:
    """The payoff moves by no more than either leg or the strike does; so two values differ by at most the expected
    distance of the legs. That bounds the step onto the limit at every distance, with nothing to tune."""
    long, short, _, vol_long, vol_short, _, expiry = option
    root = expiry**0.5
    reach = {
        3: (np.append(SMALL, 0.0), distance(long, np.append(SMALL, 0.0) * root)),
        4: (np.append(SMALL, 0.0), distance(short, np.append(SMALL, 0.0) * root)),
        6: (
            np.append(SMALL, 0.0),
            distance(long, vol_long * np.sqrt(np.append(SMALL, 0.0)))
            + distance(short, vol_short * np.sqrt(np.append(SMALL, 0.0))),
        ),
        2: (np.append(SMALL * short, 0.0), np.append(SMALL * short, 0.0)),
    }
    for place, (column, allowed) in reach.items():
        for sign in (1.0, -1.0) if place == 2 else (1.0,):
            value, error = along(option, place, sign * column, kind)
            assert np.all(np.abs(value - value[-1]) <= allowed + error + error[-1]), place
    for end in (-1.0, 1.0):
        near = end * (1.0 - np.append(SMALL, 0.0))
        apart = np.sqrt(2.0 * (1.0 - np.abs(near))) * root
        allowed = np.minimum(distance(long, vol_long * apart), distance(short, vol_short * apart))
        value, error = along(option, 5, near, kind)
        assert np.all(np.abs(value - value[-1]) <= allowed + error + error[-1]), end


@pytest.mark.parametrize("key", KEYS)
@given(option=options(), kind=st.sampled_from(["call", "put"]))
@settings(max_examples=40, deadline=None)
def test_no_method_jumps_onto_a_limit(key: str, option: Option, kind: str) -> None:
    """Volatility, expiry and strike going to zero: the step shrinks at least like the square root of the distance,
    whatever the method; and correlation to its ends. Modified Kirk's correction alone has no limit where Kirk's
    volatility vanishes: what it comes to there depends on the way."""
    method = methods.method(key)
    long, short = option[:2]
    apart = abs(option[3] - option[4]) + (option[3] * option[4] * (1.0 - option[5])) ** 0.5
    assume(key != "modified_kirk" or apart > 0.1 * (option[3] + option[4]))
    if key == "margrabe":
        option = (long, short, 0.0, *option[3:])
    off = np.array([1e-8, 1e-10, 1e-13, 1e-16, 1e-300, 0.0])
    places = [3, 4, 6] + ([2] if key != "margrabe" else []) + ([5] if key != "modified_kirk" else [])
    for place in places:
        for end in (1.0, -1.0) if place in (2, 5) else (1.0,):
            column = end * (1.0 - off) if place == 5 else end * off * (short if place == 2 else 1.0)
            value = method.value(*option[:place], column, *option[place + 1 :], kind=kind)
            room = 10.0 * (1.0 + long / short) * (long + short) * np.sqrt(off)
            assert np.all(np.abs(value - value[-1]) <= room + 1e-13 * size(option)), (place, end)


# Shifted legs: the forwards as they print, the shifts, and a method on them.


@st.composite
def shifted_options(draw: st.DrawFn) -> tuple[Option, dict[str, float]]:
    """The same box on the shifted legs, with forwards as they print from far below zero to above."""
    long, short, strike, *rest = draw(options())
    lifts = [draw(st.floats(-200.0, 600.0)) for _ in range(2)]
    printed = (long - lifts[0], short - lifts[1], strike - (lifts[0] - lifts[1]), *rest)
    assume(printed[0] + lifts[0] > 0.0)
    assume(printed[1] + lifts[1] > 0.0)
    return printed, {"shift_long": lifts[0], "shift_short": lifts[1]}


def shifted_size(option: Option, shifts: dict[str, float]) -> float:
    return size(option) + abs(option[0]) + abs(option[1]) + sum(map(abs, shifts.values()))


@pytest.mark.parametrize("method", ANY_STRIKE, ids=lambda one: one.__name__.rsplit(".", 1)[-1])
@given(drawn=shifted_options(), discount=st.floats(0.0, 1.2))
@settings(max_examples=60, deadline=None)
def test_shifted_legs_keep_parity_bounds_and_the_exchange_of_roles(
    method: Any, drawn: tuple[Option, dict[str, float]], discount: float
) -> None:
    option, shifts = drawn
    long, short, strike, vol_long, vol_short, correlation, expiry = option
    room = 4e-14 * shifted_size(option, shifts)
    with np.errstate(all="raise"):
        call, put, forward = (
            shifted.value(method.value, *option, discount, **shifts, kind=kind) for kind in ("call", "put", "forward")
        )
    assert abs(forward - discount * (long - short - strike)) <= room
    assert abs(call - put - forward) <= room
    moved = strike + shifts["shift_long"] - shifts["shift_short"]
    assert max(float(forward), 0.0) - room <= call <= discount * (long + shifts["shift_long"] + max(-moved, 0.0)) + room
    assert (
        max(-float(forward), 0.0) - room <= put <= discount * (short + shifts["shift_short"] + max(moved, 0.0)) + room
    )
    exchanged = shifted.value(
        method.value,
        *(short, long, -strike, vol_short, vol_long, correlation, expiry, discount),
        shift_long=shifts["shift_short"],
        shift_short=shifts["shift_long"],
        kind="put",
    )
    assert abs(call - exchanged) <= room


@given(drawn=shifted_options(), power=st.integers(-30, 30))
@settings(max_examples=60, deadline=None)
def test_shifted_legs_grow_with_the_unit_and_do_not_care_where_zero_is(
    drawn: tuple[Option, dict[str, float]], power: int
) -> None:
    """The unit of money scales forwards, strike and shifts; a moved origin of both prices moves their shifts back."""
    option, shifts = drawn
    value = shifted.value(yardstick.value, *option, **shifts)
    room = 4e-14 * shifted_size(option, shifts)
    unit = 2.0**power
    grown = shifted.value(
        yardstick.value,
        *(unit * one for one in option[:3]),
        *option[3:],
        **{name: unit * shift for name, shift in shifts.items()},
    )
    assert abs(grown - unit * value) <= unit * room
    moved = shifted.value(
        yardstick.value,
        *(option[0] + 64.0, option[1] + 64.0, *option[2:]),
        **{name: shift - 64.0 for name, shift in shifts.items()},
    )
    # The rounding of the legs is worth its own size, the error of the integral that of the larger leg.
    assert abs(moved - value) <= 2.0 * room + 4e-12 * (
        option[0] + shifts["shift_long"] + option[1] + shifts["shift_short"]
    )


@given(drawn=shifted_options())
@settings(max_examples=40, deadline=None)
def test_margrabe_on_shifted_legs_meets_the_yardstick_where_the_moved_strike_is_zero(
    drawn: tuple[Option, dict[str, float]],
) -> None:
    option, shifts = drawn
    zero = shifts["shift_short"] - shifts["shift_long"]
    option = (*option[:2], zero, *option[3:])
    for kind in ("call", "put"):
        exact = shifted.value(margrabe.value, *option, **shifts, kind=kind)
        found = shifted.value(yardstick.value, *option, **shifts, kind=kind)
        assert abs(exact - found) <= 1e-13 * shifted_size(option, shifts)
