"""What an implied correlation costs and how far it can be trusted. Prints figures quoted in spreadgui.pricing.implied.

    python tests/benchmarks/implied_cost.py [quotes]

Quotes are values of the Yardstick for known correlations over two boxes, given back to `implied.correlation_with_error`
exactly and rounded to ticks of 0.01. Evaluations are counted twice: as the module reports them, and by a Yardstick
wrapped here that counts the rows it is given. Then the implied spread volatility against 60 digits.
"""

from __future__ import annotations

import sys
from typing import Any, NamedTuple

import mpmath as mp
import numpy as np
from numpy.typing import NDArray

from spreadgui.pricing import bachelier, implied, yardstick
from spreadgui.pricing.implied import ImpliedCorrelation, Status
from spreadgui.pricing.results import Sensitivities

Array = NDArray[np.float64]
TICK = 0.01


class Box(NamedTuple):
    """Quotes whose correlation is known."""

    market: dict[str, Array]
    true: Array


class Counting:
    """The Yardstick's sensitivities, and how many rows they have been asked for."""

    def __init__(self) -> None:
        self.rows = 0

    def __call__(self, *arguments: Any, **named: Any) -> Sensitivities:
        found = yardstick.sensitivities(*arguments, **named)
        self.rows += found.value.size
        return found


def hard_box(draw: np.random.Generator, count: int) -> Box:
    """Correlation within 0.9999 (crowded to the ends), deviations 0.005..2.5, strikes -2..2 short forwards."""
    expiry = draw.uniform(0.02, 3.0, count)
    first, second = np.exp(draw.uniform(np.log(0.005), np.log(2.5), (2, count)))
    short = draw.uniform(20.0, 200.0, count)
    market = {
        "forward_long": short * np.exp(draw.normal(0.0, 0.4, count)),
        "forward_short": short,
        "strike": short * draw.uniform(-2.0, 2.0, count),
        "vol_long": first / np.sqrt(expiry),
        "vol_short": second / np.sqrt(expiry),
        "expiry": expiry,
        "discount": draw.uniform(0.8, 1.0, count),
    }
    return Box(market, np.tanh(draw.uniform(-4.95, 4.95, count)))


def ordinary_box(draw: np.random.Generator, count: int) -> Box:
    """Strikes -0.5..0.5 short forwards of 20..200, long forwards within two deviations of the money, volatilities
    10..60 % over 0.1..3 years, correlation -0.9..0.95."""
    expiry, short = draw.uniform(0.1, 3.0, count), draw.uniform(20.0, 200.0, count)
    strike, true = short * draw.uniform(-0.5, 0.5, count), draw.uniform(-0.9, 0.95, count)
    one, other = draw.uniform(0.1, 0.6, (2, count))
    spread = np.sqrt(((one - other) ** 2 + 2.0 * one * other * (1.0 - true)) * expiry)
    market = {
        "forward_long": (short + strike) * np.exp(draw.uniform(-2.0, 2.0, count) * spread),
        "forward_short": short,
        "strike": strike,
        "vol_long": one,
        "vol_short": other,
        "expiry": expiry,
        "discount": draw.uniform(0.8, 1.0, count),
    }
    return Box(market, true)


def quantiles(numbers: Array) -> str:
    if not numbers.size:
        return "none"
    median, high, worst = np.quantile(numbers, (0.5, 0.99, 1.0))
    return f"median {median:8.1e}   99th percentile {high:8.1e}   worst {worst:8.1e}"


def words(found: ImpliedCorrelation) -> str:
    counted = zip(*np.unique(found.status, return_counts=True), strict=True)
    return ", ".join(f"{count:,} {word}" for word, count in counted)


def cost(box: Box, kind: str) -> None:
    """Exact quotes: evaluations and the error of the correlation handed back."""
    premium = yardstick.value(**box.market, correlation=box.true, kind=kind)
    counting = Counting()
    kept = implied.METHODS["yardstick"]
    implied.METHODS["yardstick"] = counting
    try:
        found = implied.correlation_with_error(premium, **box.market, kind=kind)
    finally:
        implied.METHODS["yardstick"] = kept
    spent, solved = found.evaluations, found.status == Status.SOLVED
    print(f"  exact quotes, {kind}s: {words(found)}")
    print(
        f"    Yardstick evaluations a quote: mean {spent.mean():.2f} (counted {counting.rows / spent.size:.2f}), "
        f"99th percentile {np.quantile(spent, 0.99):.0f}, most {spent.max()}"
    )
    print(f"    solved alone: mean {spent[solved].mean():.2f}, 99th percentile {np.quantile(spent[solved], 0.99):.0f}")
    error = np.abs(found.correlation - box.true)[solved]
    print("    |error of the correlation|          ", quantiles(error))
    print("    |error| / error bar                 ", quantiles(error / found.error_bar[solved]))
    again = yardstick.value(**box.market, correlation=np.nan_to_num(found.correlation), kind=kind)
    larger = np.maximum(box.market["forward_long"], box.market["forward_short"])
    known = np.isfinite(found.correlation)
    print("    |premium missed| / larger forward   ", quantiles((np.abs(again - premium) / larger)[known]))


def rounded(box: Box, kind: str) -> None:
    """Quotes rounded to ticks: how wide the bar is and how often the truth lies outside it."""
    premium = yardstick.value(**box.market, correlation=box.true, kind=kind)
    found = implied.correlation_with_error(
        np.round(premium / TICK) * TICK, **box.market, kind=kind, tolerance=0.5 * TICK
    )
    solved = found.status == Status.SOLVED
    error, bar = np.abs(found.correlation - box.true)[solved], found.error_bar[solved]
    outside = error > bar * (1.0 + 1e-6) + 1e-12
    print(f"  rounded to {TICK}, {kind}s: {words(found)}")
    print(
        f"    evaluations a quote: mean {found.evaluations.mean():.2f}, "
        f"99th percentile {np.quantile(found.evaluations, 0.99):.0f}, most {found.evaluations.max()}"
    )
    print("    |error of the correlation|          ", quantiles(error))
    print("    error bar                           ", quantiles(bar))
    print(f"    truth outside the bar in {outside.sum()} of {outside.size} solved ({outside.mean():.2%})")
    if outside.any():
        print(f"    by at most {(error / bar)[outside].max():.2f} bars; the shortest such bar {bar[outside].min():.1e}")


def exact_volatility(time_value: mp.mpf, moneyness: mp.mpf, near: float) -> mp.mpf:
    """The deviation of the normal option out of the money with this time value, by mpmath's secant search."""

    def gap(log_deviation: mp.mpf) -> mp.mpf:
        deviation = mp.exp(log_deviation)
        z = moneyness / deviation
        return mp.log(deviation * (mp.npdf(z) - z * mp.ncdf(-z))) - mp.log(time_value)

    return mp.exp(mp.findroot(gap, (mp.log(near), mp.log(near) + mp.mpf("1e-6"))))


def spread_volatility_figures(draw: np.random.Generator, count: int) -> None:
    """Premiums out of the money by up to six deviations, so that the quote itself has digits to give."""
    vol, expiry = np.exp(draw.uniform(np.log(0.1), np.log(100.0), count)), draw.uniform(0.02, 3.0, count)
    long, short = draw.uniform(-100.0, 200.0, (2, count))
    strike = long - short + draw.uniform(0.01, 6.0, count) * vol * np.sqrt(expiry)
    premium = bachelier.value(long, short, strike, vol, 0.0, 0.0, expiry)
    found, status = implied.spread_volatility(premium, long, short, strike, expiry)
    solved = np.flatnonzero(status == Status.SOLVED)
    worst = np.zeros(solved.size)
    with mp.workdps(60):
        for place, row in enumerate(solved):
            # The moneyness as doubles have it: what its own rounding costs belongs to the quote.
            moneyness = mp.mpf(float(strike[row] - (long[row] - short[row])))
            root_time = mp.sqrt(mp.mpf(float(expiry[row])))
            exact = exact_volatility(mp.mpf(float(premium[row])), moneyness, float(vol[row]) * float(root_time))
            worst[place] = abs(float(mp.mpf(float(found[row])) * root_time / exact - 1))
    print(f"Implied spread volatility, {count} premiums up to six deviations out of the money, {solved.size} solved")
    print("    relative error against 60 digits    ", quantiles(worst))
    print("    relative distance from the truth    ", quantiles(np.abs(found[solved] / vol[solved] - 1.0)))
    priced = bachelier.value(long, short, strike, vol, 0.0, 0.0, expiry)
    ticked = np.round(priced / TICK) * TICK
    quote = implied.spread_volatility_with_error(ticked, long, short, strike, expiry, tolerance=0.5 * TICK)
    sure = quote.status == Status.SOLVED
    outside = np.abs(quote.volatility - vol)[sure] > quote.error_bar[sure] * (1.0 + 1e-9) + 1e-12
    print(f"    rounded to {TICK}: truth outside the bar in {outside.sum()} of {sure.sum()} solved")


def main() -> None:
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 20_000
    draw = np.random.default_rng(20_260_102)
    for name, box in (("hard box", hard_box(draw, count)), ("ordinary box", ordinary_box(draw, count))):
        print(f"Implied correlation, {name}, {count:,} quotes")
        for kind in ("call", "put"):
            cost(box, kind)
            rounded(box, kind)
    spread_volatility_figures(draw, min(count, 2000))


if __name__ == "__main__":
    main()
