"""Bachelier's formula: derivatives, laws, limits, and what it refuses."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor
from itertools import product
from typing import Any

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.pricing import bachelier
from spreadgui.pricing.results import Sensitivities

GOOD: dict[str, Any] = {
    "forward_long": -12.0,
    "forward_short": 3.0,
    "strike": -10.0,
    "vol_long": 20.0,
    "vol_short": 15.0,
    "correlation": 0.5,
    "expiry": 1.0,
    "discount": 0.95,
}
BAD = [
    ("forward_long", np.inf, "finite, found inf"),
    ("forward_short", np.nan, "finite, found nan"),
    ("forward_short", -1e80, "within 1e"),
    ("strike", [1.0, -np.inf], "finite, found -inf at index 1"),
    ("vol_long", -0.1, "zero or above, found -0.1"),
    ("vol_short", [0.1, np.nan], "finite, found nan at index 1"),
    ("vol_short", 1e80, "within 1e"),
    ("correlation", -1.0000001, "between -1 and 1"),
    ("expiry", -1e-9, "zero or above, found -1e-09"),
    ("discount", -0.5, "zero or above"),
    ("expiry", "soon", "expected real numbers"),
]
DISCOUNT = 0.93


@st.composite
def options(draw: st.DrawFn) -> tuple[float, ...]:
    """Forwards and strikes of either sign, deviations from nothing to far beyond them."""
    prices = [draw(st.floats(-200.0, 200.0)) for _ in range(3)]
    vols = [draw(st.one_of(st.just(0.0), st.floats(1e-3, 150.0))) for _ in range(2)]
    correlation = draw(st.one_of(st.floats(-1.0, 1.0), st.sampled_from([-1.0, 0.9999, 1.0])))
    return (*prices, *vols, correlation, draw(st.floats(0.0, 3.0)), draw(st.floats(0.0, 1.2)))


def size(option: tuple[float, ...]) -> float:
    return sum(map(abs, option[:5])) * 2.0 + 1e-6


def call(f1, f2, k, s1, s2, r, t):  # type: ignore[no-untyped-def]  # mpmath has no types
    s = mp.sqrt((s1**2 - 2 * r * s1 * s2 + s2**2) * t)
    x = f1 - f2 - k
    return x * mp.ncdf(x / s) + s * mp.npdf(x / s)


CASES = [
    (62.0, 55.0, 5.0, 20.0, 15.0, 0.7, 0.5),
    (-12.0, -30.0, 25.0, 18.0, 22.0, -0.4, 1.0),
    (15.0, 40.0, -31.0, 9.0, 12.0, 0.95, 2.0),
    (10.0, 20.0, 30.0, 5.0, 6.0, 0.2, 1.0),
    (50.0, 48.0, 2.5, 10.0, 10.5, 0.9999, 0.1),
]


@pytest.mark.parametrize("kind", ["call", "put"])
@pytest.mark.parametrize("case", CASES)
def test_sensitivities_are_the_derivatives(case: tuple[float, ...], kind: str) -> None:
    """Against differences taken by mpmath at 50 digits, relative 1e-12."""
    with mp.workdps(50):
        point = tuple(mp.mpf(number) for number in case)

        def value(*at):  # type: ignore[no-untyped-def]  # mpmath has no types
            return call(*at) - (at[0] - at[1] - at[2] if kind == "put" else 0)

        def derivative(*orders: int) -> mp.mpf:
            return mp.diff(value, point, (*orders, *(0,) * (7 - len(orders))))

        exact = Sensitivities(
            value(*point),
            derivative(1),
            derivative(0, 1),
            derivative(2),
            derivative(0, 2),
            derivative(1, 1),
            derivative(0, 0, 0, 1),
            derivative(0, 0, 0, 0, 1),
            derivative(0, 0, 0, 0, 0, 1),
            -derivative(0, 0, 0, 0, 0, 0, 1),
        )
    found = bachelier.sensitivities(*case, DISCOUNT, kind=kind)
    for field, number in exact._asdict().items():
        assert float(getattr(found, field)) == pytest.approx(DISCOUNT * float(number), rel=1e-12), field


def hard_cases() -> list[tuple[float, ...]]:
    """Correlation -0.9999..0.9999, deviations of a two-hundredth to two and a half times a price of 100, strikes up to
    three and a half deviations from the money, forwards and strikes of either sign."""
    draw = np.random.default_rng(20_260_104)
    cases = []
    for place in range(24):
        one, other = np.exp(draw.uniform(np.log(0.5), np.log(250.0), 2))
        correlation = (-0.9999, 0.9999, draw.uniform(-0.9999, 0.9999), 1.0 - 10.0 ** draw.uniform(-4, -1))[place % 4]
        width = np.sqrt((one - other) ** 2 + 2.0 * one * other * (1.0 - correlation))
        long, short = draw.uniform(-200.0, 200.0, 2)
        strike, time = long - short + draw.uniform(-3.5, 3.5) * width, draw.uniform(0.1, 2.0)
        cases.append(tuple(map(float, (long, short, strike, one / time**0.5, other / time**0.5, correlation, time))))
    return cases


@pytest.mark.parametrize("case", hard_cases())
def test_sensitivities_are_the_derivatives_over_a_hard_box(case: tuple[float, ...]) -> None:
    """Relative 1e-9 against differences at 50 digits, the value and the deltas as well: nothing here cancels."""
    names = ("delta_long", "delta_short", "vega_long", "vega_short", "correlation_sensitivity", "theta")
    with mp.workdps(50):
        point = tuple(mp.mpf(number) for number in case)
        firsts = [mp.diff(call, point, tuple(int(one == other) for other in range(7))) for one in (0, 1, 3, 4, 5, 6)]
        gamma = mp.diff(call, point, (2, 0, 0, 0, 0, 0, 0))
        exact = dict(zip(names, firsts, strict=True))
        exact |= {"value": call(*point), "gamma_long": gamma, "gamma_short": gamma, "gamma_cross": -gamma}
        exact["theta"] *= -1
        forward = {"value": point[0] - point[1] - point[2], "delta_long": 1, "delta_short": -1}
    for kind in ("call", "put"):
        found = bachelier.sensitivities(*case, DISCOUNT, kind=kind)
        for field, number in exact.items():
            expected = float(number - (forward.get(field, 0) if kind == "put" else 0))
            assert float(getattr(found, field)) == pytest.approx(DISCOUNT * expected, rel=1e-9, abs=0.0), (kind, field)


@given(option=options(), kind=st.sampled_from(["call", "put"]))
@settings(max_examples=80, deadline=None)
def test_every_limit_is_reached_as_fast_as_the_legs_reach_theirs(option: tuple[float, ...], kind: str) -> None:
    """The payoff moves by no more than a leg does, and two normals a deviation v apart are sqrt(2/pi) v apart on
    average; so the step onto a limit is bounded at every distance, with nothing to tune."""
    _, _, _, vol_long, vol_short, _, expiry, discount = option
    small = np.append(10.0 ** np.linspace(0.0, -18.0, 37), 0.0)
    root, mean = expiry**0.5, discount * (2.0 / np.pi) ** 0.5
    apart = np.sqrt(2.0 * small) * root
    steps = {
        3: (small, small * root),
        4: (small, small * root),
        6: (small, (vol_long + vol_short) * np.sqrt(small)),
        5: (1.0 - small, np.minimum(vol_long, vol_short) * np.sqrt(2.0 * (1.0 - (1.0 - small))) * root),
    }
    for place, (column, distance) in steps.items():
        value = bachelier.value(*option[:place], column, *option[place + 1 :], kind=kind)
        assert np.all(np.abs(value - value[-1]) <= mean * distance + 1e-14 * size(option)), place
    value = bachelier.value(*option[:5], small - 1.0, *option[6:], kind=kind)
    assert np.all(np.abs(value - value[-1]) <= mean * np.minimum(vol_long, vol_short) * apart + 1e-14 * size(option))


@given(option=options(), other=options(), kind=st.sampled_from(["call", "put"]))
@settings(max_examples=80, deadline=None)
def test_the_value_is_convex_in_forwards_and_strike_together(
    option: tuple[float, ...], other: tuple[float, ...], kind: str
) -> None:
    share = np.linspace(0.0, 1.0, 33)[:, None]
    path = (1.0 - share) * np.array(option[:3]) + share * np.array(other[:3])
    value = bachelier.value(*path.T, *option[3:], kind=kind)
    assert np.all(np.diff(value, 2) >= -4e-14 * (size(option) + size(other)))


@given(option=options())
@settings(max_examples=80, deadline=None)
def test_more_volatility_is_never_worth_less_from_the_other_legs_share_on(option: tuple[float, ...]) -> None:
    """The spread's variance s1^2 - 2 rho s1 s2 + s2^2 falls in s1 until s1 = rho s2 and rises from there."""
    turn = max(option[5] * option[4], 0.0)
    for column, sign in ((np.linspace(turn, turn + 150.0, 41), 1.0), (np.linspace(0.0, turn, 41), -1.0)):
        value = bachelier.value(*option[:3], column, *option[4:])
        assert np.all(sign * np.diff(value) >= -1e-14 * (size(option) + 300.0))


@pytest.mark.parametrize("kind", ["call", "put"])
@pytest.mark.parametrize("strike", [-60.0, -21.0, 5.0])
def test_outright_sensitivities_are_the_derivatives(strike: float, kind: str) -> None:
    with mp.workdps(50):

        def value(f, vol, t):  # type: ignore[no-untyped-def]  # mpmath has no types
            return call(f, 0, mp.mpf(strike), vol, 0, 0, t) - (f - mp.mpf(strike) if kind == "put" else 0)

        at = (mp.mpf(-20), mp.mpf(25), mp.mpf("0.5"))
        orders = [(0, 0, 0), (1, 0, 0), (2, 0, 0), (0, 1, 0), (0, 0, 1)]
        exact = [float(mp.diff(value, at, order)) for order in orders]
    exact[4] = -exact[4]
    found = bachelier.outright_sensitivities(-20.0, strike, 25.0, 0.5, DISCOUNT, kind=kind)
    assert [float(one) for one in found] == pytest.approx([DISCOUNT * one for one in exact], rel=1e-12)
    assert bachelier.outright_value(-20.0, strike, 25.0, 0.5, DISCOUNT, kind=kind) == found.value


def test_a_spread_with_one_still_leg_is_an_outright() -> None:
    spread = bachelier.sensitivities(-20.0, 7.0, 3.0, 25.0, 0.0, 0.4, 0.5, DISCOUNT)
    outright = bachelier.outright_sensitivities(-20.0, 10.0, 25.0, 0.5, DISCOUNT)
    for one, other in (("value", "value"), ("delta_long", "delta"), ("gamma_long", "gamma"), ("vega_long", "vega")):
        assert getattr(spread, one) == getattr(outright, other)
    assert spread.theta == outright.theta


@given(option=options())
@settings(max_examples=150, deadline=None)
def test_call_less_put_is_the_forward(option: tuple[float, ...]) -> None:
    with np.errstate(all="raise"):
        long, put, forward = (bachelier.sensitivities(*option, kind=kind) for kind in ("call", "put", "forward"))
    for field in Sensitivities._fields:
        scale = size(option) if field == "value" else max(1.0, abs(float(getattr(long, field))))
        assert abs(getattr(long, field) - getattr(put, field) - getattr(forward, field)) <= 1e-14 * scale, field


@given(option=options())
@settings(max_examples=150, deadline=None)
def test_a_call_is_the_put_on_the_legs_swapped_round_with_the_strike_turned(option: tuple[float, ...]) -> None:
    long, short, strike, vol_long, vol_short, *rest = option
    one = bachelier.sensitivities(*option)
    other = bachelier.sensitivities(short, long, -strike, vol_short, vol_long, *rest, kind="put")
    assert one.value == other.value
    assert one.delta_long == other.delta_short
    assert one.gamma_cross == other.gamma_cross
    assert one.vega_long == pytest.approx(other.vega_short, rel=1e-9, abs=1e-12)
    assert one.theta == other.theta


@given(option=options())
@settings(max_examples=150, deadline=None)
def test_a_value_is_intrinsic_and_at_most_what_the_deviation_costs_at_the_money(option: tuple[float, ...]) -> None:
    long, short, strike, vol_long, vol_short, correlation, expiry, discount = option
    free = np.sqrt(2.0 * vol_long * vol_short * (1.0 - correlation))
    total = np.hypot(vol_long - vol_short, free) * np.sqrt(expiry)
    for kind, sign in (("call", 1.0), ("put", -1.0)):
        intrinsic = discount * max(sign * (long - short - strike), 0.0)
        value = bachelier.value(*option, kind=kind)
        assert value >= intrinsic
        assert value <= intrinsic + discount * total / np.sqrt(2.0 * np.pi) + 1e-14 * size(option)


@given(option=options(), power=st.integers(-60, 60))
@settings(max_examples=100, deadline=None)
def test_values_grow_with_the_unit_of_money_and_move_with_its_origin(option: tuple[float, ...], power: int) -> None:
    unit = 2.0**power
    scaled = bachelier.value(*(one * unit for one in option[:5]), *option[5:])
    value = bachelier.value(*option)
    # The root of an odd power of two is no double; forty deviations out, where values end, that costs 40^2 last digits.
    assert scaled == pytest.approx(unit * value, rel=2e-12, abs=1e-300)
    # A forward of 512 and more keeps about 1e-13 of an amount: what is added to it loses its digits beyond.
    moved = bachelier.value(option[0] + 512.0, option[1] + 512.0, *option[2:])
    assert moved == pytest.approx(value, rel=1e-9, abs=1e-12 * (512.0 + size(option)))


@given(option=options())
@settings(max_examples=100, deadline=None)
def test_the_value_falls_in_correlation_rises_in_time_and_is_convex_in_the_forward(option: tuple[float, ...]) -> None:
    tiny = 1e-14 * size(option)
    by_correlation = bachelier.value(*option[:5], np.linspace(-1.0, 1.0, 41), *option[6:])
    assert np.all(np.diff(by_correlation) <= tiny)
    by_time = bachelier.value(*option[:6], np.linspace(0.0, 3.0, 41), option[7])
    assert np.all(np.diff(by_time) >= -tiny)
    by_forward = bachelier.value(option[0] + np.linspace(-50.0, 50.0, 101), *option[1:])
    assert np.all(np.diff(by_forward) >= -tiny)
    assert np.all(np.diff(by_forward, 2) >= -(tiny + 1e-12))


@pytest.mark.parametrize(
    "still", [{"expiry": 0.0}, {"vol_long": 0.0, "vol_short": 0.0}, {"vol_short": 20.0, "correlation": 1.0}]
)
@pytest.mark.parametrize(("kind", "sign"), [("call", 1.0), ("put", -1.0)])
def test_without_deviation_the_intrinsic_value_is_left(still: dict[str, float], kind: str, sign: float) -> None:
    strikes = np.array([-40.0, -15.0, 12.0])
    found = bachelier.sensitivities(**{**GOOD, "strike": strikes, **still}, kind=kind)
    moneyness = sign * (-15.0 - strikes)
    assert found.value.tolist() == (0.95 * np.maximum(moneyness, 0.0)).tolist()
    deltas = 0.95 * sign * np.array([*(1.0 if m > 0 else 0.5 if m == 0 else 0.0 for m in moneyness)])
    assert found.delta_long.tolist() == (deltas + 0.0).tolist()
    assert found.delta_short.tolist() == (0.0 - deltas).tolist()
    assert all(not np.any(column) for column in found[3:])


@pytest.mark.parametrize("name", ["expiry", "vol_long", "correlation"])
def test_the_limit_is_reached_without_a_jump(name: str) -> None:
    falling = np.concatenate((np.logspace(-2, -300, 60), [0.0]))
    moves: dict[str, dict[str, Any]] = {
        "expiry": {"expiry": falling},
        "vol_long": {"vol_long": falling, "vol_short": 0.0},
        "correlation": {"correlation": 1.0 - falling, "vol_short": 20.0},
    }
    found = bachelier.value(**{**GOOD, "strike": -15.0, "discount": 1.0, **moves[name]})
    root = falling if name == "vol_long" else np.sqrt(falling)
    assert np.all(found <= 20.0 * root)
    assert found[-1] == 0.0


def test_no_corner_gives_a_warning_a_nan_an_infinity_or_a_negative_zero() -> None:
    prices, vols = [-1e60, -100.0, -1e-300, 0.0, 1e-9, 100.0, 1e60], [0.0, 1e-300, 1e-12, 20.0, 1e60]
    ends = [-1.0, 0.3, 1.0 - 2e-16, 1.0]
    columns = np.array(list(product(prices, prices, [-150.0, 0.0, 100.0], vols, vols, ends, [0.0, 1e-300, 1.0, 1e6])))
    for kind in ("call", "put", "forward"):
        with np.errstate(all="raise"):
            found = bachelier.sensitivities(*columns.T, np.resize([1.0, 0.0, 0.5], len(columns)), kind=kind)
        for field in Sensitivities._fields:
            numbers = getattr(found, field)
            assert np.isfinite(numbers).all(), field
            assert not np.any(np.signbit(numbers) & (numbers == 0.0)), field


@pytest.mark.parametrize("call_name", ["value", "sensitivities"])
@pytest.mark.parametrize(("name", "bad", "words"), BAD)
def test_a_bad_number_is_refused_by_its_name(name: str, bad: object, words: str, call_name: str) -> None:
    with pytest.raises(ValueError, match=rf"^{name}: .*{words}"):
        getattr(bachelier, call_name)(**{**GOOD, name: bad})


def test_shapes_kinds_and_outright_arguments_are_refused_by_name() -> None:
    with pytest.raises(ValueError, match=r"^strike: shape \(2,\) does not broadcast with \(3,\)"):
        bachelier.value(**{**GOOD, "forward_long": [1.0, 2.0, 3.0], "strike": [1.0, 2.0]})
    with pytest.raises(ValueError, match=r"^kind: expected one of"):
        bachelier.sensitivities(**GOOD, kind="straddle")
    good = {"forward": -5.0, "strike": -3.0, "vol": 4.0, "expiry": 1.0, "discount": 0.9}
    for name, bad in (("forward", np.nan), ("strike", np.inf), ("vol", -1.0), ("expiry", -1.0), ("discount", -1.0)):
        with pytest.raises(ValueError, match=f"^{name}: "):
            bachelier.outright_sensitivities(**{**good, name: bad})


@pytest.mark.parametrize("kind", ["call", "put", "forward"])
@pytest.mark.parametrize(("shapes", "expected"), [(((), ()), ()), (((0,), ()), (0,)), (((4,), (3, 1)), (3, 4))])
def test_results_are_float_arrays_of_the_broadcast_shape(
    shapes: tuple[tuple[int, ...], tuple[int, ...]], expected: tuple[int, ...], kind: str
) -> None:
    arguments = {**GOOD, "forward_long": np.full(shapes[0], -12), "vol_long": np.full(shapes[1], 20)}
    outright = bachelier.outright_sensitivities(arguments["forward_long"], -10.0, arguments["vol_long"], 1.0, kind=kind)
    for array in (bachelier.value(**arguments, kind=kind), *bachelier.sensitivities(**arguments, kind=kind), *outright):
        assert (array.shape, array.dtype) == (expected, np.dtype(np.float64))
    assert np.all(bachelier.value(**arguments, kind=kind) == bachelier.value(**GOOD, kind=kind))


def test_neither_length_nor_executor_changes_a_digit() -> None:
    draw = np.random.default_rng(5)
    count = 150_000
    prices, vols = draw.normal(0.0, 50.0, (3, count)), draw.uniform(0.0, 40.0, (2, count))
    columns = (*prices, *vols, draw.uniform(-1.0, 1.0, count))
    whole = bachelier.sensitivities(*columns, 1.0)
    with ThreadPoolExecutor(2) as pool:
        threaded = bachelier.sensitivities(*columns, 1.0, executor=pool)
    for field in Sensitivities._fields:
        assert np.array_equal(getattr(whole, field), getattr(threaded, field))
    assert np.array_equal(bachelier.value(*columns, 1.0), whole.value)
    assert bachelier.value(*(column[-1] for column in columns), 1.0) == pytest.approx(whole.value[-1], rel=1e-14)
