"""Bachelier's and Black's formulas against the outside world.

Black-76: two handbook figures, both **from memory**, the pages not at hand when this was written: - E. G. Haug, The
Complete Guide to Option Pricing Formulas: futures 19, strike 19, nine months, rate 10 %, volatility 28 %;
  call and put 1.7011 each.
- J. C. Hull, Options, Futures, and Other Derivatives: futures 20, strike 20, four months, rate 9 %, volatility 25 %;
put 1.12.

Bachelier: no printed figure was found. His own law, that at the money the option costs what the standard deviation
costs, over sqrt(2 pi) (Bachelier 1900, from memory), is one check; the others are two computations that share nothing
with the program or with each other: the textbook formula at 40 digits, and the payoff summed over both legs.
"""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from spreadgui.pricing import bachelier, black76

HAUG = ((19.0, 19.0, 0.28, 0.75), 0.10, ("call", "put"), 1.7011, 4)
HULL = ((20.0, 20.0, 0.25, 4.0 / 12.0), 0.09, ("put",), 1.12, 2)


@pytest.mark.parametrize("figure", [HAUG, HULL], ids=["Haug (from memory)", "Hull (from memory)"])
def test_black76_meets_the_handbook_figures(
    figure: tuple[tuple[float, ...], float, tuple[str, ...], float, int],
) -> None:
    option, rate, kinds, printed, decimals = figure
    for kind in kinds:
        found = black76.value(*option, np.exp(-rate * option[3]), kind=kind)
        assert abs(found - printed) <= 0.5 * 10.0**-decimals


# forward long, forward short, strike, absolute vols, correlation, expiry: prices of either sign
SPREADS = {
    "near the money": (62.0, 55.0, 5.0, 20.0, 15.0, 0.7, 0.5),
    "both prints below zero": (-12.0, -30.0, 25.0, 18.0, 22.0, -0.4, 1.0),
    "short leg above, strike below zero": (15.0, 40.0, -31.0, 9.0, 12.0, 0.95, 2.0),
    "far out of the money": (10.0, 20.0, 30.0, 5.0, 6.0, 0.2, 1.0),
    "far in the money": (90.0, 10.0, 20.0, 8.0, 9.0, 0.9, 1.0),
    "next to full correlation": (50.0, 48.0, 2.5, 10.0, 10.5, 0.9999, 1.0),
    "opposed legs": (50.0, 48.0, 2.5, 10.0, 10.5, -1.0, 1.0),
}


def at_40_digits(f1: float, f2: float, k: float, s1: float, s2: float, r: float, t: float) -> float:
    with mp.workdps(40):
        one, other, rho = mp.mpf(s1), mp.mpf(s2), mp.mpf(r)
        s = mp.sqrt((one**2 - 2 * rho * one * other + other**2) * mp.mpf(t))
        x = mp.mpf(f1) - mp.mpf(f2) - mp.mpf(k)
        return float(x * mp.ncdf(x / s) + s * mp.npdf(x / s))


def summed(f1: float, f2: float, k: float, s1: float, s2: float, r: float, t: float) -> float:
    """The payoff over both legs' normal factors: the trapezoid rule over the short leg's, and inside it
    Gauss-Legendre from where the option comes into the money."""
    nodes, weights = np.polynomial.legendre.leggauss(120)
    outer = np.arange(-11.0, 11.01, 0.05)[:, None]
    short, own = f2 + s2 * t**0.5 * outer, s1 * t**0.5 * (1.0 - r * r) ** 0.5
    expected = f1 + r * s1 * t**0.5 * outer
    low = np.clip((short + k - expected) / max(own, 1e-300), -11.0, 11.0)
    inner = low + (11.0 - low) * 0.5 * (nodes + 1.0)
    payoff = np.maximum(expected + own * inner - short - k, 0.0)
    density = np.exp(-0.5 * (inner * inner + outer * outer)) / (2.0 * np.pi)
    return float(np.sum(payoff * density * weights * 0.5 * (11.0 - low)) * 0.05)


@pytest.mark.parametrize("name", SPREADS)
def test_the_spread_formula_meets_40_digits_and_the_payoff_summed_over_both_legs(name: str) -> None:
    case = SPREADS[name]
    found = float(bachelier.value(*case))
    exact = at_40_digits(*case)
    assert found == pytest.approx(exact, rel=2e-14)
    if abs(case[5]) < 0.999:
        assert summed(*case) == pytest.approx(exact, rel=1e-12, abs=1e-13)


def test_a_far_strike_keeps_its_digits() -> None:
    strikes = np.array([-100.0, 20.0, 60.0, 150.0, 300.0])
    found = bachelier.outright_value(5.0, strikes, 9.0, 1.0)
    exact = [at_40_digits(5.0, 0.0, strike, 9.0, 0.0, 0.0, 1.0) for strike in strikes]
    assert exact[-1] < 1e-230
    assert found == pytest.approx(exact, rel=1e-12, abs=0.0)


def test_at_the_money_the_option_costs_its_deviation_over_the_root_of_two_pi() -> None:
    found = bachelier.value(-7.0, 5.0, -12.0, 3.0, 4.0, 0.0, 4.0, 0.9)
    assert found == pytest.approx(0.9 * 10.0 / np.sqrt(2.0 * np.pi), rel=1e-15)
