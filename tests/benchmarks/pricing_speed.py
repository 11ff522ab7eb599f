"""What the methods cost. One run, one table; the ratios travel, the nanoseconds do not.

    python tests/benchmarks/pricing_speed.py [rows, a million unless told]
 "Plain" is the formula written as one NumPy expression over whole arrays. Peak memory is what a call allocates beyond
its arguments, by tracemalloc.
"""

from __future__ import annotations

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

from spreadgui.pricing import bjerksund_stensland, blocks, kirk, yardstick
from spreadgui.pricing.inputs import spread_columns

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


def peak_megabytes(call: Callable[[], object]) -> float:
    tracemalloc.start()
    call()
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    return peak / 1e6


def main() -> None:
    rows = int(sys.argv[1]) if len(sys.argv) > 1 else 1_000_000
    columns, some = book(rows), min(rows, 50_000)
    few = [column[:some] for column in columns]
    with ThreadPoolExecutor(2) as pool:
        kirks = in_turn([
            (lambda: plain_kirk(columns), rows),
            (lambda: kirk.value(*columns), rows),
            (lambda: kirk.value(*columns, executor=pool), rows),
        ])  # fmt: skip
        compare("Kirk value, plain whole arrays", kirks, 0, 0, "of itself")
        compare("  blocks, one thread", kirks, 1, 0, "of plain")
        compare("  blocks, two threads", kirks, 2, 0, "of plain")
        closed = in_turn([
            (lambda: whole_bjerksund_stensland(columns), rows),
            (lambda: bjerksund_stensland.sensitivities(*columns), rows),
            (lambda: bjerksund_stensland.sensitivities(*columns, executor=pool), rows),
        ], 5)  # fmt: skip
        compare("Bjerksund-Stensland, all sensitivities, whole arrays", closed, 0, 0, "of itself")
        compare("  blocks, one thread", closed, 1, 0, "of whole")
        compare("  blocks, two threads", closed, 2, 0, "of whole")
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
    print("peak memory, MB")
    for words, call in (
        ("Kirk value, plain", lambda: plain_kirk(columns)),
        ("Kirk value, blocks", lambda: kirk.value(*columns)),
        ("Bjerksund-Stensland sensitivities, whole arrays", lambda: whole_bjerksund_stensland(columns)),
        ("Bjerksund-Stensland sensitivities, blocks", lambda: bjerksund_stensland.sensitivities(*columns)),
        (f"Yardstick sensitivities, {some} rows", lambda: yardstick.sensitivities(*few)),
    ):
        print(f"  {words:52}{peak_megabytes(call):12.1f}")


if __name__ == "__main__":
    main()
