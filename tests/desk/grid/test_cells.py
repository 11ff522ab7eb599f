"""The cell cache: whatever is asked of it, it says what formatting afresh would say."""

from __future__ import annotations

import msgspec
import numpy as np
import pytest

from spreadgui.book.changes import set_fields
from spreadgui.desk.grid.cells import BLOCK_ROWS, CellCache, Look
from spreadgui.valuation.columns import SCREEN_COLUMNS
from spreadgui.valuation.price import price_rows
from spreadgui.valuation.results import LiveResults
from spreadgui.valuation.slate import follow
from tests.books import book_of, season, spark

PLACE = {column.key: place for place, column in enumerate(SCREEN_COLUMNS)}
ROWS = 2 * BLOCK_ROWS + 10


def everything(cache: CellCache) -> list[list[tuple[str, Look]]]:
    return [[cache.cell(row, place) for place in range(len(SCREEN_COLUMNS))] for row in range(ROWS)]


@pytest.mark.parametrize("rows", [(3,), (3, 70), tuple(range(5, 60)), tuple(range(ROWS))], ids=len)
def test_changed_rows_are_told_anew_and_no_others_are_stale(rows: tuple[int, ...]) -> None:
    positions = tuple(msgspec.structs.replace(spark(), strike=float(row % 9)) for row in range(ROWS))
    book, results = book_of(*positions), LiveResults()
    first = follow(None, book, 1)
    results.follow(first)
    results.accept(price_rows(first.slate, results.pending()))
    cache = CellCache(SCREEN_COLUMNS, first.slate, results)
    everything(cache)  # all is cached now

    edited = set_fields(book, {row: {"strike": 40.0, "own_vol_long": 0.9} for row in rows}, "").apply(book)
    second = follow(first.slate, edited, 2)
    results.follow(second)
    cache.stand_on(second.slate)
    cache.renew(np.array(rows))
    assert everything(cache) == everything(CellCache(SCREEN_COLUMNS, second.slate, results))
    assert cache.cell(rows[0], PLACE["position_value"]) == ("pricing", Look.PRICING)

    results.accept(price_rows(second.slate, results.pending()))
    cache.renew(np.array(rows))
    assert everything(cache) == everything(CellCache(SCREEN_COLUMNS, second.slate, results))
    assert cache.cell(rows[0], PLACE["vol_long"]) == ("90.0", Look.OWN)


def test_own_marks_resolved_marks_entries_and_states_are_told_apart() -> None:
    book = book_of(spark(own_forward_long=120.0), season(expiry=None), spark(long_leg="Nowhere"))
    first, results = follow(None, book, 1), LiveResults()
    results.follow(first)
    cache = CellCache(SCREEN_COLUMNS, first.slate, results)
    assert cache.cell(0, PLACE["forward_long"]).look is Look.OWN
    assert cache.cell(0, PLACE["forward_short"]).look is Look.MARKED
    assert cache.cell(0, PLACE["strike"]).look is Look.ENTRY
    assert cache.cell(0, PLACE["years"]).look is Look.COMPUTED
    assert [cache.cell(row, PLACE["position_value"]) for row in range(3)] == [
        ("pricing", Look.PRICING), ("incomplete", Look.INCOMPLETE), ("refused", Look.REFUSED),
    ]  # fmt: skip
    assert cache.cell(1, PLACE["kirk"]) == ("", Look.INCOMPLETE)
