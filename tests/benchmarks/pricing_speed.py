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


def nanoseconds(call: Callable[[], object], rows: int, repeats: int = 5) -> float:
    best = np.inf
    for _ in range(repeats):
        start = time.perf_counter()
        call()
        best = min(best, time.perf_counter() - start)
    return float(best / rows * 1e9)


def peak_megabytes(call: Callable[[], object]) -> float:
    tracemalloc.start()
    call()
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    return peak / 1e6


def main() -> None:
    rows = int(sys.argv[1]) if len(sys.argv) > 1 else 1_000_000
    columns, some = book(rows), min(rows, 100_000)
    few = [column[:some] for column in columns]
    with ThreadPoolExecutor(2) as pool:
        plain = nanoseconds(lambda: plain_kirk(columns), rows)
        blocked = nanoseconds(lambda: kirk.value(*columns), rows)
        threaded = nanoseconds(lambda: kirk.value(*columns, executor=pool), rows)
        all_kirk = nanoseconds(lambda: kirk.sensitivities(*columns), rows, 3)
        whole = nanoseconds(lambda: whole_bjerksund_stensland(columns), rows, 3)
        all_blocked = nanoseconds(lambda: bjerksund_stensland.sensitivities(*columns), rows, 3)
        all_threaded = nanoseconds(lambda: bjerksund_stensland.sensitivities(*columns, executor=pool), rows, 3)
    true = nanoseconds(lambda: yardstick.value(*few), some, 3)
    true_all = nanoseconds(lambda: yardstick.sensitivities(*few), some, 3)
    quad_one = nanoseconds(lambda: [by_quad(columns, row) for row in range(30)], 30, 2)
    table = (
        ("Kirk value, plain whole arrays", plain, 1.0, "of plain"),
        ("Kirk value, blocks, one thread", blocked, plain / blocked, "x faster than plain"),
        ("Kirk value, blocks, two threads", threaded, plain / threaded, "x faster than plain"),
        ("Kirk, all sensitivities", all_kirk, all_kirk / blocked, "Kirk values"),
        ("Bjerksund-Stensland, all sensitivities, whole arrays", whole, whole / blocked, "Kirk values"),
        ("  blocks, one thread", all_blocked, whole / all_blocked, "x faster than whole"),
        ("  blocks, two threads", all_threaded, whole / all_threaded, "x faster than whole"),
        (f"Yardstick value, {some} rows", true, true / blocked, "Kirk values"),
        (f"Yardstick, all sensitivities, {some} rows", true_all, true_all / blocked, "Kirk values"),
        ("scipy.integrate.quad, one value", quad_one, quad_one / true, "Yardstick values"),
    )
    print(f"{rows} rows{'':46}ns per option")
    for words, cost, ratio, unit in table:
        print(f"{words:54}{cost:12.0f}{ratio:12.2f} {unit}")
    print("growth, ns per option")
    for size in (1_000, 10_000, 100_000, rows):
        part = [column[:size] for column in columns]
        cost = nanoseconds(partial(kirk.value, *part), size)
        dear = nanoseconds(partial(yardstick.value, *part), size, 2) if size <= 100_000 else float("nan")
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
