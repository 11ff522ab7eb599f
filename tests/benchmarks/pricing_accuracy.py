"""How accurate the methods are. Prints the figures quoted in the docstrings of spreadgui.pricing.

    python tests/benchmarks/pricing_accuracy.py [cases in the hard box]

First the Yardstick over the hard box, and over an ordinary one, against a slow integration that shares no idea with
it: the conditional Black value of the long leg, summed over the short leg's normal factor by 16-node Gauss-Legendre
panels that are graded towards every point where the conditional option passes through the money. That integration is
itself first held against tests/reference/integrated.csv. Then the closed forms over the ordinary box against the
Yardstick; the closed forms on shifted legs; Margrabe, Black-76 and Bachelier, which are exact, against 40 digits; and
by how much Bachelier's model differs from two lognormal legs of the same absolute volatility.
"""

from __future__ import annotations

import csv
import sys
from collections.abc import Callable
from pathlib import Path
from typing import NamedTuple

import mpmath as mp
import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from spreadgui.pricing import bachelier, black76, margrabe, methods, shifted, yardstick

Array = NDArray[np.float64]

NODES, WEIGHTS = np.polynomial.legendre.leggauss(16)
REFERENCE = Path(__file__).parent.parent / "reference" / "integrated.csv"


class Options(NamedTuple):
    """Undiscounted options of one year, so that a volatility is a deviation to expiry."""

    forward_long: Array
    forward_short: Array
    strike: Array
    vol_long: Array
    vol_short: Array
    correlation: Array


def hard_box(draw: np.random.Generator, count: int) -> Options:
    """Correlation -0.9999..0.9999 (half of them crowded to the ends), deviations 0.005..2.5 (three in ten nearly
    equal), strikes -2..2 short forwards (some tiny), long forwards within four deviations of the money."""
    short = np.full(count, 100.0)
    strike = short * draw.uniform(-2.0, 2.0, count) * draw.choice([1.0, 0.1, 0.01, 1e-4], count)
    low, high = np.log(0.005), np.log(2.5)
    long_vol, short_vol = np.exp(draw.uniform(low, high, count)), np.exp(draw.uniform(low, high, count))
    alike = np.clip(long_vol * draw.uniform(0.9, 1.1, count), 0.005, 2.5)
    short_vol = np.where(draw.random(count) < 0.3, alike, short_vol)
    crowded = draw.choice([-1.0, 1.0], count) * (1.0 - 10.0 ** draw.uniform(-4.0, -0.5, count))
    correlation = np.where(draw.random(count) < 0.5, draw.uniform(-0.9999, 0.9999, count), crowded)
    spread = np.sqrt((long_vol - short_vol) ** 2 + 2.0 * long_vol * short_vol * (1.0 - correlation))
    money = np.where(short + strike > 1.0, short + strike, short)
    return Options(
        money * np.exp(draw.uniform(-4.0, 4.0, count) * spread), short, strike, long_vol, short_vol, correlation
    )


def ordinary_box(draw: np.random.Generator, count: int) -> Options:
    """Strikes -0.5..0.5 short forwards, long forwards within two deviations of the money, volatilities 10..60 % over
    0.1..3 years, correlation -0.9..0.95."""
    short, root_time = np.full(count, 100.0), np.sqrt(draw.uniform(0.1, 3.0, count))
    strike = short * draw.uniform(-0.5, 0.5, count)
    long_vol, short_vol = draw.uniform(0.1, 0.6, count) * root_time, draw.uniform(0.1, 0.6, count) * root_time
    correlation = draw.uniform(-0.9, 0.95, count)
    spread = np.sqrt((long_vol - short_vol) ** 2 + 2.0 * long_vol * short_vol * (1.0 - correlation))
    long = (short + strike) * np.exp(draw.uniform(-2.0, 2.0, count) * spread)
    return Options(long, short, strike, long_vol, short_vol, correlation)


def corner_box(draw: np.random.Generator, count: int, wider: float = 1.0) -> Options:
    """The hard box with correlations 1e-4 to 1e-15 away from one or minus one, its deviations times `wider`."""
    away = draw.choice([-1.0, 1.0], count) * (1.0 - 10.0 ** draw.uniform(-15.0, -4.0, count))
    options = hard_box(draw, count)
    one, other = wider * options.vol_long, wider * options.vol_short
    spread = np.sqrt((one - other) ** 2 + 2.0 * one * other * (1.0 - away))
    money = np.where(options.forward_short + options.strike > 1.0, options.forward_short + options.strike, 100.0)
    long = money * np.exp(draw.uniform(-4.0, 4.0, count) * spread)
    return options._replace(forward_long=long, vol_long=one, vol_short=other, correlation=away)


def panel_ends(f1: float, f2: float, k: float, a: float, b: float, r: float) -> Array:
    """Ends of the panels: half-unit steps, and steps that double away from each crossing of the money and each
    extreme of the conditional moneyness, from a sixteenth of the conditional option's own width."""
    low, high = min(0.0, b, r * a) - 9.5, max(0.0, b, r * a) + 9.5

    def money(z: Array) -> Array:
        return (
            np.log(f1)
            + r * a * z
            - 0.5 * (r * a) ** 2
            - np.log(np.maximum(k + f2 * np.exp(b * z - 0.5 * b * b), 1e-300))
        )

    grid = np.linspace(low, high, 4001)
    level = money(grid)
    centres = list(grid[:-1][np.sign(level[:-1]) != np.sign(level[1:])])
    inner = (level[1:-1] >= level[:-2]) & (level[1:-1] >= level[2:]) | (level[1:-1] <= level[:-2]) & (
        level[1:-1] <= level[2:]
    )
    centres += list(grid[1:-1][inner][:4])
    ends = [np.arange(low, high, 0.5), [high]]
    if k < 0.0:
        # Where the amount paid passes through zero the integrand is smooth but not analytic: it wants ever finer
        # panels.
        nothing, fine = (np.log(-k / f2) + 0.5 * b * b) / b, 1e-10 * 2.0 ** np.arange(38)
        ends += [[nothing], nothing + fine, nothing - fine]
    for centre in centres:
        left, right = centre - (grid[1] - grid[0]), centre + (grid[1] - grid[0])
        if money(np.array([left]))[0] * money(np.array([right]))[0] < 0.0:
            for _ in range(50):
                middle = 0.5 * (left + right)
                same = money(np.array([left]))[0] * money(np.array([middle]))[0] > 0.0
                left, right = (middle, right) if same else (left, middle)
            centre = 0.5 * (left + right)
        received = f2 * np.exp(b * centre - 0.5 * b * b)
        steepness = max(abs(r * a - b * received / max(k + received, 1e-300)), abs(r) * a + b)
        width = max(a * np.sqrt(1.0 - r * r) / steepness, 1e-9) / 16.0
        steps = width * 2.0 ** np.arange(np.ceil(np.log2(20.0 / width)))
        ends += [[centre], centre + steps, centre - steps]
    together = np.unique(np.concatenate(ends))
    return together[(together >= low) & (together <= high)]


def integrated(f1: float, f2: float, k: float, a: float, b: float, r: float) -> tuple[float, float]:
    """Value and long delta of the undiscounted call."""
    ends = panel_ends(f1, f2, k, a, b, r)
    half = 0.5 * np.diff(ends)
    z = (0.5 * (ends[1:] + ends[:-1])[:, None] + half[:, None] * NODES).ravel()
    weight = (half[:, None] * WEIGHTS).ravel() * np.exp(-0.5 * z * z) / np.sqrt(2.0 * np.pi)
    lift = np.exp(r * a * z - 0.5 * (r * a) ** 2)
    paid = k + f2 * np.exp(b * z - 0.5 * b * b)
    own = a * np.sqrt((1.0 - r) * (1.0 + r))
    with np.errstate(all="ignore"):
        upper = np.where(paid > 0.0, np.log(f1 * lift / paid) / own + 0.5 * own, np.inf)
    exercised, repaid = ndtr(upper), ndtr(upper - own)
    return float(np.sum(weight * (f1 * lift * exercised - paid * repaid))), float(np.sum(weight * lift * exercised))


def error_of_the_integration() -> float:
    """Worst error against integrated.csv, in units of 1e-10 of the value plus 1e-12 of the larger forward."""
    with REFERENCE.open(newline="", encoding="utf-8") as table:
        rows = list(csv.DictReader(table))
    worst = 0.0
    for row in rows:
        f1, f2, k, s1, s2, r, t = (float(row[name]) for name in ("F1", "F2", "K", "sigma1", "sigma2", "rho", "T"))
        found, _ = integrated(f1, f2, k, s1 * t**0.5, s2 * t**0.5, r)
        exact = float(row["exact"])
        worst = max(worst, abs(found - exact) / (1e-10 * exact + 1e-12 * max(f1, f2)))
    return worst


def quantiles(errors: Array) -> str:
    median, high, worst = np.quantile(errors, (0.5, 0.99, 1.0))
    return f"median {median:8.1e}   99th percentile {high:8.1e}   worst {worst:8.1e}"


def yardstick_figures(name: str, options: Options) -> None:
    exact = np.array([integrated(*map(float, row)) for row in zip(*options, strict=True)])
    found = yardstick.sensitivities(*options, 1.0)
    _, bound = yardstick.estimate(*options, 1.0)
    larger = np.maximum(options.forward_long, options.forward_short)
    gap = np.abs(found.value - exact[:, 0])
    print(f"Yardstick, {name}, {gap.size} options against the conditional integration")
    print("  |error| / max(value, larger forward / 100)", quantiles(gap / np.maximum(exact[:, 0], 0.01 * larger)))
    print("  |error| / (1e-10 value + 1e-12 larger)    ", quantiles(gap / (1e-10 * exact[:, 0] + 1e-12 * larger)))
    print("  |error of the long delta|                 ", quantiles(np.abs(found.delta_long - exact[:, 1])))
    print("  own error bound / larger forward          ", quantiles(bound / larger))
    # The comparison integral has rounding of its own, some 1e-14 of the forwards it adds up.
    print(
        "  options with error above their own bound  ",
        int(np.sum(gap > bound + 2e-14 * (larger + np.abs(options.strike)))),
    )


def closed_form_figures(options: Options) -> None:
    exact = yardstick.value(*options, 1.0)
    print(f"Closed forms, ordinary box, {exact.size} options against the Yardstick: |error| / short forward")
    for method in methods.LOGNORMAL_METHODS:
        if method.reference or not method.accepts(1.0):
            continue
        for sign, label in ((1.0, "strike above zero"), (-1.0, "strike below zero")):
            chosen = np.sign(options.strike) == sign
            picked = Options(*(column[chosen] for column in options))
            gap = np.abs(method.value(*picked, 1.0) - exact[chosen]) / picked.forward_short
            print(f"  {method.name:22}{label:20}", quantiles(gap))
            if sign < 0.0:
                published = (
                    np.abs(method.value(*picked, 1.0, role_exchange=False) - exact[chosen]) / picked.forward_short
                )
                print(f"  {'':22}{'  published form':20}", quantiles(published))


class ShiftedOptions(NamedTuple):
    """Options of one year on legs that may print below zero; the shifts last."""

    forward_long: Array
    forward_short: Array
    strike: Array
    vol_long: Array
    vol_short: Array
    correlation: Array
    shift_long: Array
    shift_short: Array


def shifted_box(draw: np.random.Generator, count: int) -> ShiftedOptions:
    """Forwards -20..100, shifts that leave the shifted forwards between 20 and 150, strikes -30..30, volatilities of
    the shifted forwards 10..60 % over 0.1..3 years, correlation -0.9..0.95."""
    root_time = np.sqrt(draw.uniform(0.1, 3.0, count))
    forwards, lifted = draw.uniform(-20.0, 100.0, (2, count)), draw.uniform(20.0, 150.0, (2, count))
    vols = draw.uniform(0.1, 0.6, (2, count)) * root_time
    return ShiftedOptions(
        *forwards,
        draw.uniform(-30.0, 30.0, count),
        *vols,
        draw.uniform(-0.9, 0.95, count),
        *(lifted - forwards),
    )


def shifted_figures(draw: np.random.Generator, count: int) -> None:
    options = shifted_box(draw, count)
    plain, shifts = options[:6], {"shift_long": options.shift_long, "shift_short": options.shift_short}
    exact = shifted.value(yardstick.value, *plain, 1.0, **shifts)
    print(f"Shifted legs, {count} options: |error| / shifted short forward")
    lifted = options.forward_short + options.shift_short
    for method in methods.LOGNORMAL_METHODS:
        if not method.reference and method.accepts(1.0):
            gap = np.abs(shifted.value(method.value, *plain, 1.0, **shifts) - exact)
            print(f"  {method.name:42}", quantiles(gap / lifted), " in money", quantiles(gap))
    few = slice(0, 2000)
    legs = shifted.arguments(*options[:3], *options[6:])
    rows = zip(*(column[few] for column in (*legs, *options[3:6])), strict=True)
    independent = np.array([integrated(*map(float, row))[0] for row in rows])
    print(f"  {'Yardstick, 2000 of them, integration':42}", quantiles(np.abs(exact[few] - independent) / lifted[few]))


def exact_digits(formula: Callable[..., mp.mpf], options: tuple[Array, ...]) -> Array:
    """A formula written for mpmath at every row, at 40 digits, rounded once at the end."""
    with mp.workdps(40):
        return np.array([float(formula(*(mp.mpf(float(one)) for one in row))) for row in zip(*options, strict=True)])


def exchange_call(f1: mp.mpf, f2: mp.mpf, s1: mp.mpf, s2: mp.mpf, r: mp.mpf) -> mp.mpf:
    return black_call(f1, f2, mp.sqrt(s1**2 - 2 * r * s1 * s2 + s2**2))


def black_call(forward: mp.mpf, strike: mp.mpf, vol: mp.mpf) -> mp.mpf:
    upper = mp.log(forward / strike) / vol + vol / 2
    return forward * mp.ncdf(upper) - strike * mp.ncdf(upper - vol)


def normal_call(f1: mp.mpf, f2: mp.mpf, k: mp.mpf, s1: mp.mpf, s2: mp.mpf, r: mp.mpf) -> mp.mpf:
    deviation = mp.sqrt(s1**2 - 2 * r * s1 * s2 + s2**2)
    moneyness = f1 - f2 - k
    return moneyness * mp.ncdf(moneyness / deviation) + deviation * mp.npdf(moneyness / deviation)


def margrabe_figures(options: Options) -> None:
    """At a strike of zero the Yardstick is Margrabe's formula, so it says nothing there: the two judges are 40 digits
    and the conditional integration, and the Yardstick's own boundary integral just off the strike of zero."""
    at = options._replace(strike=np.zeros_like(options.strike))
    larger = np.maximum(at.forward_long, at.forward_short)
    found = margrabe.value(*at, 1.0)
    digits = exact_digits(exchange_call, (at.forward_long, at.forward_short, at.vol_long, at.vol_short, at.correlation))
    summed = np.array([integrated(*map(float, row))[0] for row in zip(*at, strict=True)])
    near = yardstick.value(*at._replace(strike=np.full_like(larger, 1e-13)), 1.0)
    print(f"Margrabe, hard box at a strike of zero, {larger.size} options: |error| / larger forward")
    print("  against 40 digits                         ", quantiles(np.abs(found - digits) / larger))
    print("  against the conditional integration       ", quantiles(np.abs(found - summed) / larger))
    print("  against the Yardstick at a strike of 1e-13", quantiles(np.abs(found - near) / larger))


def black_figures(draw: np.random.Generator, count: int) -> None:
    vol = np.exp(draw.uniform(np.log(0.005), np.log(2.5), count))
    strike = 100.0 * np.exp(draw.uniform(-4.0, 4.0, count) * vol)
    forward = np.full(count, 100.0)
    exact, found = exact_digits(black_call, (forward, strike, vol)), black76.value(forward, strike, vol, 1.0)
    print(f"Black-76, deviations 0.005..2.5, strikes within four of them, {count} options against 40 digits")
    print("  |error| / forward                         ", quantiles(np.abs(found - exact) / 100.0))
    print("  |error| / value                           ", quantiles(np.abs(found - exact) / exact))


def bachelier_figures(draw: np.random.Generator, count: int) -> None:
    forwards, vols = (
        draw.uniform(-200.0, 200.0, (2, count)),
        np.exp(draw.uniform(np.log(0.5), np.log(250.0), (2, count))),
    )
    correlation = 1.0 - 2.0 * 10.0 ** draw.uniform(-4.3, 0.0, count)
    correlation *= draw.choice([-1.0, 1.0], count)
    deviation = np.sqrt((vols[0] - vols[1]) ** 2 + 2.0 * vols[0] * vols[1] * (1.0 - correlation))
    strike = forwards[0] - forwards[1] + draw.uniform(-6.0, 6.0, count) * deviation
    options = (*forwards, strike, *vols, correlation)
    exact, found = exact_digits(normal_call, options), bachelier.value(*options, 1.0)
    size = np.abs(forwards[0]) + np.abs(forwards[1]) + np.abs(strike) + deviation
    print(f"Bachelier, prices and deviations of either size, {count} options against 40 digits")
    print("  |error| / (forwards + strike + deviation) ", quantiles(np.abs(found - exact) / size))
    print("  |error| / value                           ", quantiles(np.abs(found - exact) / exact))


def bachelier_model_gap(options: Options) -> None:
    """No error: Bachelier's legs are normal, and this is what that is worth where absolute volatilities agree."""
    exact = yardstick.value(*options, 1.0)
    absolute = (options.vol_long * options.forward_long, options.vol_short * options.forward_short)
    gap = bachelier.value(*options[:3], *absolute, options.correlation, 1.0) - exact
    print(f"Bachelier with absolute volatilities vol x forward, ordinary box, {gap.size} options, less the Yardstick")
    widest = np.maximum(options.vol_long, options.vol_short)
    for label, chosen in (("all", widest > 0.0), ("deviations to 0.15", widest <= 0.15), ("above 0.5", widest > 0.5)):
        some = np.abs(gap[chosen])
        print(f"  |difference| / short forward, {label:20}", quantiles(some / options.forward_short[chosen]))
        money = chosen & (exact > 0.01 * options.forward_short)
        print(f"  |difference| / value above 1 %, {label:18}", quantiles(np.abs(gap[money]) / exact[money]))
    print(f"  Bachelier above the Yardstick in {np.mean(gap > 0.0):.0%} of all")


def main() -> None:
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 10_000
    draw = np.random.default_rng(20_260_101)
    print(f"Conditional integration against integrated.csv: worst {error_of_the_integration():.1e} of the tolerance")
    yardstick_figures("hard box", hard_box(draw, count))
    yardstick_figures("ordinary box", ordinary_box(draw, count // 4))
    closed_form_figures(ordinary_box(draw, 200_000))
    # Each with draws of its own, so that a change to one leaves the others' figures as they are quoted.
    yardstick_figures("next to full correlation", corner_box(np.random.default_rng(1), count // 2))
    yardstick_figures("there with deviations 0.02..10", corner_box(np.random.default_rng(7), count // 2, 4.0))
    shifted_figures(np.random.default_rng(2), 100_000)
    margrabe_figures(hard_box(np.random.default_rng(3), count // 4))
    black_figures(np.random.default_rng(4), count // 2)
    bachelier_figures(np.random.default_rng(5), count // 2)
    bachelier_model_gap(ordinary_box(np.random.default_rng(6), 200_000))


if __name__ == "__main__":
    main()
