"""Every sensitivity of every method against differences taken at 50 digits.

The closed forms are written down here a second time, from the papers, in mpmath; the Yardstick is held against a
trapezoid sum of the conditional Black value over the short leg's normal factor, which shares nothing with its
boundary integral.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

import mpmath as mp
import numpy as np
import pytest

from spreadgui.pricing import black76, methods

Formula = Callable[..., mp.mpf]

# forward long, forward short, strike, vol long, vol short, correlation, expiry
CASES = {
    "near the money": (112.0, 103.0, 7.0, 0.30, 0.45, 0.6, 1.0),
    "in the money": (150.0, 80.0, 20.0, 0.25, 0.35, 0.8, 0.5),
    "out of the money": (90.0, 95.0, 12.0, 0.40, 0.20, -0.3, 0.75),
    "strike below zero": (60.0, 95.0, -20.0, 0.35, 0.50, 0.4, 2.0),
    "strike beyond the short forward": (30.0, 40.0, -55.0, 0.5, 0.3, 0.2, 1.5),
}
EXCHANGE_CASES = {name: (*case[:2], 0.0, *case[3:]) for name, case in CASES.items()}
DISCOUNT = 0.93


@pytest.fixture(autouse=True)
def _digits() -> Iterator[None]:
    with mp.workdps(50):
        yield


def ratio(f1: mp.mpf, g: mp.mpf, v: mp.mpf) -> mp.mpf:
    d = mp.log(f1 / g) / v + v / 2
    return f1 * mp.ncdf(d) - g * mp.ncdf(d - v)


def margrabe_call(f1, f2, k, s1, s2, r, t):  # type: ignore[no-untyped-def]  # mpmath has no types
    return ratio(f1, f2, mp.sqrt((s1**2 - 2 * r * s1 * s2 + s2**2) * t))


def kirk_call(f1, f2, k, s1, s2, r, t):  # type: ignore[no-untyped-def]  # mpmath has no types
    q = f2 / (f2 + k)
    return ratio(f1, f2 + k, mp.sqrt((s1**2 - 2 * r * s1 * s2 * q + (s2 * q) ** 2) * t))


def modified_kirk_call(f1, f2, k, s1, s2, r, t):  # type: ignore[no-untyped-def]  # mpmath has no types
    q = f2 / (f2 + k)
    s = mp.sqrt(s1**2 - 2 * r * s1 * s2 * q + (s2 * q) ** 2)
    slope = (s2 * q - r * s1) ** 2 * s2**2 * f2 * k / (2 * s**3 * (f2 + k) ** 2)
    return ratio(f1, f2 + k, (s + slope * (mp.log(f1) - mp.log(f2 + k))) * mp.sqrt(t))


def bjerksund_stensland_call(f1, f2, k, s1, s2, r, t):  # type: ignore[no-untyped-def]  # mpmath has no types
    a = f2 + k
    b = f2 / a
    v = mp.sqrt((s1**2 - 2 * b * r * s1 * s2 + b**2 * s2**2) * t)
    level = mp.log(f1 / a)
    d1 = (level + (s1**2 / 2 - b * r * s1 * s2 + b**2 * s2**2 / 2) * t) / v
    d2 = (level + (-(s1**2) / 2 + r * s1 * s2 + b**2 * s2**2 / 2 - b * s2**2) * t) / v
    d3 = (level + (-(s1**2) / 2 + b**2 * s2**2 / 2) * t) / v
    return f1 * mp.ncdf(d1) - f2 * mp.ncdf(d2) - k * mp.ncdf(d3)


def integral_call(f1, f2, k, s1, s2, r, t):  # type: ignore[no-untyped-def]  # mpmath has no types
    a, b = s1 * mp.sqrt(t), s2 * mp.sqrt(t)
    total, step = mp.mpf(0), mp.mpf(1) / 8
    for node in range(-84, 92):
        z = node * step
        g = k + f2 * mp.exp(b * z - b * b / 2)
        f = f1 * mp.exp(r * a * z - r * r * a * a / 2)
        total += mp.npdf(z) * ratio(f, g, a * mp.sqrt(1 - r * r))
    return total * step


FORMULAS: dict[str, Formula] = {
    "margrabe": margrabe_call,
    "kirk": kirk_call,
    "modified_kirk": modified_kirk_call,
    "bjerksund_stensland": bjerksund_stensland_call,
    "yardstick": integral_call,
}


def put(call: Formula) -> Formula:
    return lambda f1, f2, k, *rest: call(f1, f2, k, *rest) - (f1 - f2 - k)


def exchanged(call: Formula) -> Formula:
    """The opposite option on the legs swapped round, for strikes below zero."""
    return lambda f1, f2, k, s1, s2, r, t: put(call)(f2, f1, -k, s2, s1, r, t)


def differences(value: Formula, point: tuple[float, ...]) -> dict[str, mp.mpf]:
    """Central differences; steps of 1e-9 of an argument leave some 18 right digits at 50 of arithmetic."""
    base = [mp.mpf(number) for number in point]

    def moved(**moves: mp.mpf) -> mp.mpf:
        return value(*(x + moves.get(f"x{i}", 0) for i, x in enumerate(base)))

    def first(i: int) -> mp.mpf:
        h = mp.mpf("1e-10")
        return (moved(**{f"x{i}": h}) - moved(**{f"x{i}": -h})) / (2 * h)

    def second(i: int) -> mp.mpf:
        h = mp.mpf("1e-8") * base[i]
        return (moved(**{f"x{i}": h}) - 2 * moved() + moved(**{f"x{i}": -h})) / h**2

    def mixed() -> mp.mpf:
        h, g = mp.mpf("1e-8") * base[0], mp.mpf("1e-8") * base[1]
        corners = [(s * u) * moved(x0=s * h, x1=u * g) for s in (1, -1) for u in (1, -1)]
        return mp.fsum(corners) / (4 * h * g)

    return {
        "value": moved(),
        "delta_long": first(0),
        "delta_short": first(1),
        "gamma_long": second(0),
        "gamma_short": second(1),
        "gamma_cross": mixed(),
        "vega_long": first(3),
        "vega_short": first(4),
        "correlation_sensitivity": first(5),
        "theta": -first(6),
    }


@pytest.mark.parametrize("name", CASES)
@pytest.mark.parametrize("key", FORMULAS)
def test_sensitivities_are_the_derivatives(key: str, name: str) -> None:
    method = methods.method(key)
    case = (EXCHANGE_CASES if key == "margrabe" else CASES)[name]
    call = FORMULAS[key] if case[2] >= 0.0 else exchanged(FORMULAS[key])
    exact = differences(call, case)
    scale = {"gamma_long": 1.0 / case[0], "gamma_short": 1.0 / case[1], "gamma_cross": 1.0 / case[0]}
    for kind in ("call", "put"):
        found = method.sensitivities(*case, DISCOUNT, kind=kind)
        for field, number in exact.items():
            of_forward = {"value": case[0] - case[1] - case[2], "delta_long": 1.0, "delta_short": -1.0}.get(field, 0.0)
            expected = DISCOUNT * float(number - (of_forward if kind == "put" else 0.0))
            sized = scale.get(field, 1.0 if field.startswith("delta") else case[0])
            assert abs(float(getattr(found, field)) - expected) <= 2e-11 * sized, (kind, field)


@pytest.mark.parametrize("key", ["kirk", "modified_kirk", "bjerksund_stensland"])
def test_the_published_form_is_kept_for_strikes_below_zero_when_asked_for(key: str) -> None:
    case = CASES["strike below zero"]
    method = methods.method(key)
    exact = differences(FORMULAS[key], case)
    found = method.sensitivities(*case, DISCOUNT, role_exchange=False)
    for field, number in exact.items():
        assert abs(float(getattr(found, field)) - DISCOUNT * float(number)) <= 1e-10 * case[0], field
    assert abs(found.value - method.value(*case, DISCOUNT)) > 1e-3


@pytest.mark.parametrize("kind", ["call", "put"])
@pytest.mark.parametrize("strike", [70.0, 100.0, 160.0])
def test_black76_sensitivities_are_the_derivatives(kind: str, strike: float) -> None:
    sign = 1 if kind == "call" else -1

    def value(f, vol, t):  # type: ignore[no-untyped-def]  # mpmath has no types
        call = ratio(f, mp.mpf(strike), vol * mp.sqrt(t))
        return call if sign > 0 else call - f + strike

    found = black76.sensitivities(110.0, strike, 0.35, 0.8, DISCOUNT, kind=kind)
    at = (mp.mpf(110.0), mp.mpf(0.35), mp.mpf(0.8))
    exact = {
        "value": value(*at),
        "delta": mp.diff(value, at, (1, 0, 0)),
        "gamma": mp.diff(value, at, (2, 0, 0)),
        "vega": mp.diff(value, at, (0, 1, 0)),
        "theta": -mp.diff(value, at, (0, 0, 1)),
    }
    for field, number in exact.items():
        assert float(getattr(found, field)) == pytest.approx(DISCOUNT * float(number), rel=1e-11, abs=1e-12), field


def test_the_modified_kirk_skew_is_the_true_one_at_the_money() -> None:
    """The correction's whole point (Alos and Leon 2016): the slope of the implied volatility in ln F1 at the money as
    time runs short. Slopes of the price gap to the Yardstick at short expiry must shrink by an order from Kirk's to
    modified."""
    f2, k, s1, s2, r, t = 100.0, 25.0, 0.35, 0.45, 0.5, 0.02
    step = 0.02
    gaps = {}
    for key in ("kirk", "modified_kirk"):
        ends = [(f2 + k) * np.exp(move) for move in (-step, step)]
        gap = [
            methods.method(key).value(f1, f2, k, s1, s2, r, t)
            - methods.method("yardstick").value(f1, f2, k, s1, s2, r, t)
            for f1 in ends
        ]
        gaps[key] = abs(gap[1] - gap[0])
    assert gaps["modified_kirk"] < 0.1 * gaps["kirk"]
