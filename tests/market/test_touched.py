"""An edit of the marks resolves the positions that read them, and leaves all others alone."""

from __future__ import annotations

from typing import Any

import msgspec
import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.book.reading import read_book
from spreadgui.book.records import Book
from spreadgui.market.touched import all_alike, touches
from spreadgui.shipped import sample_book
from spreadgui.valuation.slate import build_slate, follow
from tests.books import POWER, book_of, cap, season, spark
from tests.valuation.test_slate import same

DEMO = read_book(sample_book("ardenmoor_winter"))
MARKET_CHANGES: dict[str, Any] = {
    "forward": lambda market, at: _marked(market, at, forward=market.marks[at].forward + 1.5),
    "volatility": lambda market, at: _marked(market, at, volatility=market.marks[at].volatility + 0.05),
    "daily": lambda market, at: _marked(market, at, daily_volatility=2.5),
    "shift": lambda market, _at: msgspec.structs.replace(market, shift=market.shift + 1.0),
    "tie": lambda market, _at: msgspec.structs.replace(market, tie_strength=market.tie_strength + 0.1),
    "holidays": lambda market, _at: msgspec.structs.replace(market, holidays=()),
    "name": lambda market, _at: msgspec.structs.replace(market, name=market.name + " new"),
    "dynamics": lambda market, _at: msgspec.structs.replace(market, dynamics="normal"),
    "gone": lambda market, at: msgspec.structs.replace(market, marks=market.marks[:at]),
}


def _marked(market: Any, at: int, **changed: float) -> Any:
    marks = list(market.marks)
    marks[at] = msgspec.structs.replace(marks[at], **changed)
    return msgspec.structs.replace(market, marks=tuple(marks))


def _with_market(book: Book, place: int, market: Any) -> Book:
    markets = list(book.markets)
    markets[place] = market
    return msgspec.structs.replace(book, markets=tuple(markets))


@settings(max_examples=60, deadline=None)
@given(st.sampled_from(sorted(MARKET_CHANGES)), st.integers(0, len(DEMO.markets) - 1), st.integers(0, 5), st.booleans())
def test_following_a_change_of_a_market_gives_the_slate_that_building_anew_gives(
    change: str, place: int, at: int, also_a_row: bool
) -> None:
    book = _with_market(DEMO, place, MARKET_CHANGES[change](DEMO.markets[place], at))
    if also_a_row:
        row = msgspec.structs.replace(book.positions[3], strike=1.25)
        book = msgspec.structs.replace(book, positions=(*book.positions[:3], row, *book.positions[4:]))
    followed = follow(build_slate(DEMO, 1), book, 2).slate
    assert same(followed, build_slate(book, 2))
    assert set(followed.strips) == set(build_slate(book, 2).strips)


@settings(max_examples=30, deadline=None)
@given(st.integers(0, len(DEMO.correlations) - 1), st.floats(-1.0, 1.0))
def test_following_a_change_of_a_correlation_gives_the_slate_that_building_anew_gives(place: int, value: float) -> None:
    pairs = list(DEMO.correlations)
    pairs[place] = msgspec.structs.replace(pairs[place], correlation=value)
    book = msgspec.structs.replace(DEMO, correlations=tuple(pairs))
    assert same(follow(build_slate(DEMO, 1), book, 2).slate, build_slate(book, 2))


def test_a_mark_moves_only_the_positions_that_name_its_contract() -> None:
    old = book_of(spark(), season(), cap(), spark(long_delivery="2027-07"))
    new = _with_market(old, 0, _marked(POWER, 1, forward=81.0))
    test = touches(old, new)
    assert [test(position) for position in new.positions] == [False, True, False, True]
    assert follow(build_slate(old, 1), new, 2).old_rows.tolist() == [0, -1, 2, -1]


def test_a_correlation_moves_only_its_pair() -> None:
    old = book_of(spark(), season(), cap())
    pair = msgspec.structs.replace(old.correlations[0], correlation=0.1)
    test = touches(old, msgspec.structs.replace(old, correlations=(pair,)))
    assert [test(position) for position in old.positions] == [True, False, False]


def test_what_holds_for_every_position_is_no_matter_of_marks() -> None:
    old = book_of(spark(), cap())
    assert all_alike(old, _with_market(old, 0, _marked(POWER, 0, forward=1.0)))
    for change in ({"zero_rate": 0.1}, {"method": "kirk"}, {"valuation_date": old.valuation_date.replace(day=2)}):
        new = msgspec.structs.replace(old, **change)
        assert not all_alike(old, new)
        assert np.all(follow(build_slate(old, 1), new, 2).old_rows == -1)
