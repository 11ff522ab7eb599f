"""What a large book costs, from its records to its numbers. One run, one table.

    python tests/benchmarks/book_speed.py [positions, 100,000 unless told]

The book is the demo's positions that are exercised once and carry no quote, over and over with other strikes.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from statistics import median

import msgspec
import numpy as np

from spreadgui.book.reading import read_book
from spreadgui.book.records import Book
from spreadgui.market.contracts import Law, Shape
from spreadgui.pricing import bjerksund_stensland, kirk, yardstick
from spreadgui.shipped import sample_book
from spreadgui.valuation.exercises import expand
from spreadgui.valuation.group import groups
from spreadgui.valuation.price import price_parts, price_rows
from spreadgui.valuation.results import LiveResults
from spreadgui.valuation.slate import Slate, build_slate, follow

IN_SIGHT = 40


def large_book(count: int) -> Book:
    demo = read_book(sample_book("ardenmoor_winter"))
    plain = [one for one in demo.positions if one.exercise == "once" and one.quoted_premium is None]
    positions = (
        msgspec.structs.replace(plain[row % len(plain)], strike=plain[row % len(plain)].strike + row % 7)
        for row in range(count)
    )
    return msgspec.structs.replace(demo, positions=tuple(positions))


def milliseconds(call: Callable[[], object], rounds: int = 7) -> float:
    call()
    taken = []
    for _ in range(rounds):
        start = time.perf_counter()
        call()
        taken.append(1e3 * (time.perf_counter() - start))
    return median(taken)


def three_formulas(slate: Slate, pool: ThreadPoolExecutor) -> None:
    """Value and sensitivities of every lognormal spread option by both closed forms and by the Yardstick."""
    spreads = np.flatnonzero((slate.shape == Shape.SPREAD) & (slate.law == Law.LOGNORMAL))

    def block(rows: np.ndarray) -> None:
        for _, group in groups(expand(slate, rows)):
            if group.kind != "forward":
                for method in (kirk, bjerksund_stensland, yardstick):
                    method.sensitivities(*group.spread_arguments, kind=group.kind)

    list(pool.map(block, np.array_split(spreads, max(2, len(spreads) // 8192))))


def edit_to_first_rows(slate: Slate, results: LiveResults, pool: ThreadPoolExecutor) -> float:
    """One strike is typed over: the slate and the results follow, and the row in sight is priced."""
    positions = list(slate.book.positions)
    positions[7] = msgspec.structs.replace(positions[7], strike=positions[7].strike + 1.0)
    start = time.perf_counter()
    succession = follow(slate, msgspec.structs.replace(slate.book, positions=tuple(positions)), slate.revision + 1)
    results.follow(succession)
    pending = results.pending()
    results.accept(price_rows(succession.slate, pending))
    return 1e3 * (time.perf_counter() - start)


def marks_to_first_rows(book: Book, results: LiveResults) -> float:
    """A volatility is marked anew: every row is to be priced again, those in sight first."""
    market = book.markets[0]
    mark = msgspec.structs.replace(market.marks[0], volatility=market.marks[0].volatility + 0.01)
    marked = msgspec.structs.replace(market, marks=(mark, *market.marks[1:]))
    slate = results.slate
    start = time.perf_counter()
    succession = follow(slate, msgspec.structs.replace(book, markets=(marked, *book.markets[1:])), 99)
    results.follow(succession)
    results.accept(price_rows(succession.slate, np.arange(IN_SIGHT)))
    return 1e3 * (time.perf_counter() - start)


def main() -> None:
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 100_000
    book = large_book(count)
    slate, results = build_slate(book, 1), LiveResults()
    results.follow(follow(None, book, 1))
    rows = results.pending()
    with ThreadPoolExecutor(2) as pool:
        print(f"{count} positions, milliseconds, medians")
        print(f"  slate from nothing                          {milliseconds(lambda: build_slate(book, 1)):8.0f}")
        print(f"  Kirk, B-S, Yardstick with sensitivities     {milliseconds(lambda: three_formulas(slate, pool)):8.0f}")
        print(
            f"  every column of every row, one thread       {milliseconds(lambda: list(price_parts(slate, rows))):8.0f}"
        )
        both = milliseconds(lambda: list(price_parts(slate, rows, pool)))
        print(f"  every column of every row, two threads      {both:8.0f}")
        for part in price_parts(slate, rows, pool):
            results.accept(part)
        edits = median(edit_to_first_rows(slate, results, pool) for _ in range(15))
        print(f"  one cell typed, to its numbers              {edits:8.1f}")
        marks = median(marks_to_first_rows(book, results) for _ in range(7))
        print(f"  one mark typed, to the rows in sight        {marks:8.1f}")


if __name__ == "__main__":
    main()
