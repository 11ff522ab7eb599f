"""What the methods cost. One run, one table; the ratios travel, the nanoseconds do not.

    python tests/benchmarks/pricing_speed.py [rows, a million unless told]

"Plain" is the formula written as ordinary NumPy expressions over whole arrays, what they share named once. Peak memory
is what a call allocates beyond its arguments, by tracemalloc; "beside" is what remains of it without the results.
"""

from __future__ import annotations

import os
import sys
import time
import tracemalloc
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from functools import partial
from statistics import median

import numpy as np
from numpy.typing import NDArray
from scipy.integrate import quad
from scipy.special import ndtr

from spreadgui.pricing import bjerksund_stensland, blocks, kirk, scenarios, yardstick
from spreadgui.pricing.inputs import spread_columns
from spreadgui.pricing.methods import method

Array = NDArray[np.float64]
Columns = Sequence[Array]


def book(rows: int) -> list[Array]:
    """An ordinary book: volatilities 10-60 %, a tenth of a year to three, correlation -0.9..0.95."""
    draw = np.random.default_rng(11)
    bounds = ((50, 150), (50, 150), (0, 60), (0.1, 0.6), (0.1, 0.6), (-0.9, 0.95), (0.1, 3.0))
    columns = [draw.uniform(low, high, rows) for low, high in bounds]
    return [*columns, np.exp(-0.03 * columns[-1])]


def plain_kirk(columns: Columns) -> Array:
    f1, f2, k, s1, s2, r, t, d = columns
    q = f2 / (f2 + k)
    v = np.sqrt((s1**2 - 2.0 * r * s1 * s2 * q + (s2 * q) ** 2) * t)
    upper = np.log(f1 / (f2 + k)) / v + 0.5 * v
    return np.asarray(d * (f1 * ndtr(upper) - (f2 + k) * ndtr(upper - v)))


def plain_bjerksund_stensland(columns: Columns) -> tuple[Array, ...]:
    """Value and all nine sensitivities, in the order of `Sensitivities`."""
    f1, f2, k, s1, s2, r, t, discount = columns
    root = np.sqrt(t)
    a, b = s1 * root, s2 * root
    lump = f2 + k
    q = f2 / lump
    p = q * b
    v = np.sqrt(a * a - 2.0 * r * a * p + p * p)
    ahead, behind = (a - r * p) / v, (r * a - p) / v
    d1 = np.log(f1 / lump) / v + 0.5 * v
    d3 = d1 - a * ahead
    d2 = d3 + b * behind
    n1, n2, n3 = discount * ndtr(d1), discount * ndtr(d2), discount * ndtr(d3)
    scale = discount / np.sqrt(2.0 * np.pi)
    density = scale * np.exp(-0.5 * d2 * d2)
    w1, w2, w3 = f1 * scale * np.exp(-0.5 * d1 * d1), -f2 * density, -k * scale * np.exp(-0.5 * d3 * d3)
    bend = (1.0 - behind * behind) / v
    c1, c3 = (d1 / v - 1.0) * behind, (p + behind * d3) / v
    c2 = c3 - b * bend
    wd1, wd2, wd3 = w1 * d1, w2 * d2, w3 * d3
    paid = w2 + w3
    every, turned = w1 + paid, wd1 + wd2 + wd3
    pull = w1 - turned / v
    by_l, own = every / v, w1 * c1
    by_p = own + w2 * c2 + w3 * c3
    wdc1, wdc2, wdc3 = wd1 * c1, wd2 * c2, wd3 * c3
    by_l_p = (by_l * behind - (wdc1 + wdc2 + wdc3)) / v
    by_p_p = (every - turned * bend + 2.0 * behind * by_p) / v - (wdc1 * c1 + wdc2 * c2 + wdc3 * c3)
    slope = b * k / (lump * lump)
    by_first = pull * ahead + (w2 * r * b - paid * a) / v
    by_second = q * by_p + w2 * behind
    return (
        np.maximum(f1 * n1 - f2 * n2 - k * n3, discount * np.maximum(f1 - lump, 0.0)),
        n1 + by_l / f1,
        slope * by_p - n2 - by_l / lump,
        (pull - paid) / (v * f1 * f1),
        (pull + paid) / (v * lump * lump)
        - 2.0 * slope / lump * (by_l_p + by_p)
        + slope * slope * by_p_p
        - 2.0 * density * (c2 * slope - 1.0 / (v * lump)),
        (slope * (by_l_p + own) - (density + pull / lump) / v) / f1,
        root * by_first,
        root * by_second,
        a * (w2 * b - p * pull) / v,
        -0.5 * (s1 * by_first + s2 * by_second) / root,
    )


def many(rows: int, count: int, contracts: int = 24) -> tuple[Array, scenarios.Positions]:
    """Scenarios of moves of 5 %, and a book of positions on any two contracts."""
    draw = np.random.default_rng(5)
    forwards = draw.uniform(60.0, 140.0, contracts) * np.exp(0.05 * draw.standard_normal((rows, contracts)))
    long = draw.integers(0, contracts, count)
    short = (long + draw.integers(1, contracts, count)) % contracts
    bounds = ((0, 40), (0.1, 0.6), (0.1, 0.6), (-0.9, 0.95), (0.1, 3.0), (0.9, 1.0), (-10, 10), (0.8, 1.2), (0.8, 1.2))
    return forwards, scenarios.Positions(long, short, *(draw.uniform(low, high, count) for low, high in bounds))


def plain_totals(forwards: Array, book: scenarios.Positions, parts: int = 1) -> Array:
    """Bjerksund-Stensland over the whole matrix of scenarios by positions, or over so many parts of it."""
    if parts > 1:
        return np.concatenate([plain_totals(part, book) for part in np.array_split(forwards, parts)])
    long, short, k, s1, s2, r, t, discount, weight, long_ratio, short_ratio = book
    root = np.sqrt(t)
    a, b = s1 * root, s2 * root
    f1, f2 = forwards[:, long] * long_ratio, forwards[:, short] * short_ratio
    lump = f2 + k
    p = f2 / lump * b
    v = np.sqrt(a * a - 2.0 * r * a * p + p * p)
    d1 = np.log(f1 / lump) / v + 0.5 * v
    d3 = d1 - a * (a - r * p) / v
    d2 = d3 + b * (r * a - p) / v
    value = np.maximum(f1 * ndtr(d1) - f2 * ndtr(d2) - k * ndtr(d3), np.maximum(f1 - lump, 0.0))
    return np.asarray(value @ (weight * discount))


def check_plain(columns: Columns) -> None:
    """The plain expressions and the room's functions must agree, or their times mean nothing."""
    assert np.allclose(plain_kirk(columns), kirk.value(*columns), rtol=0.0, atol=1e-9)
    found = bjerksund_stensland.sensitivities(*columns)
    for name, plain, ours in zip(found._fields, plain_bjerksund_stensland(columns), found, strict=True):
        assert np.allclose(plain, ours, rtol=0.0, atol=1e-9), name


def whole_bjerksund_stensland(columns: Columns) -> Array:
    """The same kernel over whole arrays: one block as long as the book."""
    checked, shape = spread_columns(*columns)
    kernel = partial(bjerksund_stensland._sensitivities, "call", True)
    return blocks.run(kernel, checked, shape, 10, scratch=bjerksund_stensland.SCRATCH, block_rows=columns[0].size)


def by_quad(columns: Columns, row: int) -> float:
    f1, f2, k, s1, s2, r, t, d = (float(column[row]) for column in columns)
    a, b = s1 * t**0.5, s2 * t**0.5
    own = a * (1.0 - r * r) ** 0.5

    def conditional(z: float) -> float:
        paid, received = k + f2 * np.exp(b * z - 0.5 * b * b), f1 * np.exp(r * a * z - 0.5 * (r * a) ** 2)
        upper = np.log(received / paid) / own + 0.5 * own
        return float(np.exp(-0.5 * z * z) / np.sqrt(2.0 * np.pi) * (received * ndtr(upper) - paid * ndtr(upper - own)))

    return float(d * quad(conditional, -9.0, 9.0 + b + a, epsabs=1e-10, epsrel=1e-10, limit=200)[0])


def nanoseconds(call: Callable[[], object], rows: int) -> float:
    start = time.perf_counter()
    call()
    return (time.perf_counter() - start) / rows * 1e9


def in_turn(calls: Sequence[tuple[Callable[[], object], int]], rounds: int = 9) -> list[list[float]]:
    """Nanoseconds a row of each call, all of them once a round: this machine's speed drifts within seconds, so only
    figures of one round may be divided by each other."""
    for call, _ in calls:
        call()
    return [[nanoseconds(call, rows) for call, rows in calls] for _ in range(rounds)]


def compare(words: str, rounds: list[list[float]], first: int, second: int, unit: str) -> None:
    """Print the median cost of call `first`, and the median of its ratio to call `second` round by round."""
    cost = median(one[first] for one in rounds)
    ratio = median(one[first] / one[second] for one in rounds)
    print(f"{words:58}{cost:10.0f} ns an option{ratio:10.2f} {unit}")


def peak_megabytes(call: Callable[[], object]) -> tuple[float, float]:
    """Peak of the call, and the peak less what it hands back."""
    tracemalloc.start()
    results = call()
    kept, peak = tracemalloc.get_traced_memory()
    del results
    left, _ = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    return peak / 1e6, (peak - (kept - left)) / 1e6


def closed_forms(columns: Columns, pool: ThreadPoolExecutor) -> None:
    rows = len(columns[0])
    kirks = in_turn([
        (lambda: plain_kirk(columns), rows),
        (lambda: kirk.value(*columns), rows),
        (lambda: kirk.value(*columns, executor=pool), rows),
    ], 15)  # fmt: skip
    compare("Kirk value, plain whole arrays", kirks, 0, 0, "of itself")
    compare("  blocks, one thread", kirks, 1, 0, "of plain")
    compare("  blocks, two threads", kirks, 2, 0, "of plain")
    closed = in_turn([
        (lambda: plain_bjerksund_stensland(columns), rows),
        (lambda: whole_bjerksund_stensland(columns), rows),
        (lambda: bjerksund_stensland.sensitivities(*columns), rows),
        (lambda: bjerksund_stensland.sensitivities(*columns, executor=pool), rows),
    ])  # fmt: skip
    compare("Bjerksund-Stensland, all sensitivities, plain arrays", closed, 0, 0, "of itself")
    compare("  kernel in one block", closed, 1, 0, "of plain")
    compare("  blocks, one thread", closed, 2, 0, "of plain")
    compare("  blocks, two threads", closed, 3, 0, "of plain")
    compare("  blocks, one thread", closed, 2, 1, "of one block")
    compare("  blocks, two threads", closed, 3, 1, "of one block")


def under_scenarios(rows: int, count: int, pool: ThreadPoolExecutor) -> None:
    forwards, positions = many(rows, count)
    formula = method("bjerksund_stensland")
    # The plain expression holds some ten matrices at a time.
    parts = 1 if os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_AVPHYS_PAGES") > 20 * 8 * rows * count else 4
    plain, ours = plain_totals(forwards, positions, parts), scenarios.totals(formula, forwards, positions)
    assert np.allclose(plain, ours, rtol=0.0, atol=1e-9 * count)
    turns = in_turn([
        (lambda: plain_totals(forwards, positions, parts), rows * count),
        (lambda: scenarios.totals(formula, forwards, positions), rows * count),
        (lambda: scenarios.totals(formula, forwards, positions, executor=pool), rows * count),
    ], 5)  # fmt: skip
    how = "plain whole matrix" if parts == 1 else f"plain in {parts} parts"
    compare(f"{rows} scenarios x {count} positions, {how}", turns, 0, 0, "of itself")
    compare("  scenarios.totals, one thread", turns, 1, 0, "of plain")
    compare("  scenarios.totals, two threads", turns, 2, 0, "of plain")
    print("peak memory of the scenarios, MB" + " " * 36 + "in all      beside")
    report_peak("plain", lambda: plain_totals(forwards, positions, parts))
    report_peak("one thread", lambda: scenarios.totals(formula, forwards, positions))
    report_peak("two threads", lambda: scenarios.totals(formula, forwards, positions, executor=pool))


def report_peak(words: str, call: Callable[[], object]) -> None:
    peak, beside = peak_megabytes(call)
    print(f"  {words:60}{peak:12.1f}{beside:12.1f}")


def main() -> None:
    rows = int(sys.argv[1]) if len(sys.argv) > 1 else 1_000_000
    columns, some = book(rows), min(rows, 50_000)
    few = [column[:some] for column in columns]
    check_plain(columns)
    with ThreadPoolExecutor(2) as pool:
        closed_forms(columns, pool)
        under_scenarios(10_000, 1_000, pool)
        print("peak memory, MB" + " " * 53 + "in all      beside")
        report_peak("Kirk value, plain", lambda: plain_kirk(columns))
        report_peak("Kirk value, blocks", lambda: kirk.value(*columns))
        report_peak("  two threads", lambda: kirk.value(*columns, executor=pool))
        report_peak("Bjerksund-Stensland sensitivities, plain", lambda: plain_bjerksund_stensland(columns))
        report_peak("  kernel in one block", lambda: whole_bjerksund_stensland(columns))
        report_peak("  blocks", lambda: bjerksund_stensland.sensitivities(*columns))
        report_peak("  two threads", lambda: bjerksund_stensland.sensitivities(*columns, executor=pool))
        report_peak(f"Yardstick sensitivities, {some} rows", lambda: yardstick.sensitivities(*few))
    true = in_turn([
        (lambda: kirk.value(*columns), rows),
        (lambda: yardstick.value(*few), some),
        (lambda: yardstick.sensitivities(*few), some),
        (lambda: [by_quad(columns, row) for row in range(30)], 30),
    ])  # fmt: skip
    compare(f"Yardstick value, {some} rows", true, 1, 0, "Kirk values")
    compare(f"Yardstick, all sensitivities, {some} rows", true, 2, 0, "Kirk values")
    compare("scipy.integrate.quad, one value", true, 3, 1, "Yardstick values")
    print("growth, ns an option")
    for size in (1_000, 10_000, 100_000, rows):
        part = [column[:size] for column in columns]
        ((cost, dear),) = in_turn([(partial(kirk.value, *part), size), (partial(yardstick.value, *part), size)], 1)
        print(f"  {size:9d} rows   Kirk {cost:8.0f}   Yardstick {dear:8.0f}")


if __name__ == "__main__":
    main()
