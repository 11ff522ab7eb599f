"""How far moment-matched blends are off, for the demo book's positions on them. Prints figures quoted in DEVELOPERS.md.

python tests/benchmarks/blend_gap.py
"""

from __future__ import annotations

from spreadgui.book.reading import read_book
from spreadgui.shipped import sample_book
from spreadgui.valuation.simulated import can_simulate, simulate
from spreadgui.valuation.slate import build_slate


def main() -> None:
    book = read_book(sample_book("ardenmoor_winter"))
    slate = build_slate(book, 1)
    print("matched, simulated, standard error, gap in standard errors, in per cent of premium")
    for row, position in enumerate(book.positions):
        if can_simulate(slate, row):
            found = simulate(slate, row, lambda _done, _of: None, lambda: False)
            one = found.simulated
            share = 100.0 * found.gap / one.value
            print(
                f"{position.name:24}{found.matched:9.4f}{one.value:9.4f}{one.standard_error:9.5f}"
                f"{found.gap_in_errors:7.1f}{share:8.3f} %"
            )


if __name__ == "__main__":
    main()
