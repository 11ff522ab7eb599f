"""Many positions at once say exactly what each says for itself, or leave it to that."""

from __future__ import annotations

import datetime
from typing import Any

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.book.reading import read_book
from spreadgui.book.records import Correlation, Mark, Market, Position
from spreadgui.market.contracts import Readiness, resolve
from spreadgui.market.many import resolve_many
from spreadgui.market.quotes import Quotes
from spreadgui.shipped import sample_book
from tests.books import DAY, book_of, cap, season, spark

MARKETS = (
    Market("A", "CRN/MWh", 0.4, marks=(Mark("2027-01", 80.0, 0.5), Mark("2027-07", 60.0, 0.4))),
    Market("B", "CRN/GJ", marks=(Mark("2027-01", 9.0, 0.6), Mark("2027-07", -2.0, 0.3))),
    Market("S", "CRN/MWh", dynamics="shifted lognormal", shift=20.0, marks=(Mark("2027-01", -4.0, 0.7),)),
    Market("N", "CRN/MWh", dynamics="normal", marks=(Mark("2027-01", -3.0, 18.0),)),
    Market("M", "CRN/MWh", dynamics="normal", marks=(Mark("2027-01", 3.0, -1.0),)),
    Market("Twice", "CRN/t", marks=(Mark("2027-01", 9.0, 0.6), Mark("2027-01", 9.0, 0.6))),
)
CORRELATIONS = (
    Correlation("A", "B", 0.6), Correlation("A", "S", 0.5), Correlation("N", "M", 0.4), Correlation("A", "N", 0.2),
    Correlation("B", "S", 1.5),
)  # fmt: skip
BOOK = book_of(markets=MARKETS, correlations=CORRELATIONS)

legs = st.sampled_from(["", "A", "B", "S", "N", "M", "Twice", "Nowhere"])
months = st.sampled_from(["", "2027-01", "2027-01", "2027-07", "2031-01", "soon"])
amounts = st.none() | st.sampled_from([-30.0, 0.0, 0.4, 55.0])
positions = st.builds(
    Position,
    side=st.sampled_from(["long", "short"]),
    kind=st.sampled_from(["call", "put", "forward"]),
    quantity=st.sampled_from([None, -1.0, 0.0, 5.0, 5.0]),
    long_leg=legs, long_delivery=months, long_ratio=st.sampled_from([1.0, 1.0, 2.0, 0.0, -1.0]),
    short_leg=legs, short_delivery=months, short_ratio=st.sampled_from([1.0, 1.0, 7.1]),
    strike=st.sampled_from([0.0, -3.0, 12.0]),
    expiry=st.sampled_from([None, DAY, DAY - datetime.timedelta(1), datetime.date(2026, 12, 28)]),
    exercise=st.sampled_from(["once", "once", "once", "all days"]),
    own_forward_long=amounts, own_forward_short=amounts, own_vol_long=amounts, own_vol_short=amounts,
    own_correlation=st.sampled_from([None, None, 0.3, -1.0, 1.2]),
)  # fmt: skip


def differences(some: list[Position], quotes: Quotes, day: datetime.date, rate: float) -> list[str]:
    many = resolve_many(some, quotes, day, rate)
    wrong = []
    for row, position in enumerate(some):
        if not many.plain[row]:
            continue
        alone = resolve(position, quotes, day, rate)
        said: dict[str, Any] = {key: float(column[row]) for key, column in many.numbers.items()}
        same = all(np.array_equal(number, getattr(alone, key), equal_nan=True) for key, number in said.items())
        codes = (many.shape[row], many.law[row], many.units[row]) == (alone.shape, alone.law, alone.unit)
        if alone.troubles or alone.strip or not (same and codes):
            wrong.append(f"{position}: {said} {many.units[row]!r}, alone {alone}")
    return wrong


@settings(max_examples=300, deadline=None)
@given(st.lists(positions, min_size=1, max_size=6))
def test_whatever_is_said_at_once_is_said_alone(some: list[Position]) -> None:
    assert differences(some, Quotes.of(BOOK), BOOK.valuation_date, BOOK.zero_rate) == []


def test_the_demo_book_is_resolved_at_once_but_for_its_strips_and_blends() -> None:
    book = read_book(sample_book("ardenmoor_winter"))
    quotes = Quotes.of(book)
    assert differences(list(book.positions), quotes, book.valuation_date, book.zero_rate) == []
    plain = resolve_many(book.positions, quotes, book.valuation_date, book.zero_rate).plain
    blends = {blend.name for blend in book.blends}
    once = [one.exercise == "once" and not {one.long_leg, one.short_leg} & blends for one in book.positions]
    assert plain.tolist() == once


def test_ordinary_rows_are_all_plain_and_rows_with_a_trouble_are_not() -> None:
    some = [spark(), season(), cap(), spark(quantity=None), spark(expiry=None), spark(long_leg="Nowhere")]
    book = book_of(*some)
    quotes = Quotes.of(book)
    assert resolve_many(some, quotes, DAY, 0.03).plain.tolist() == [True, True, True, False, False, False]
    troubles = [max((t.readiness for t in resolve(one, quotes, DAY, 0.03).troubles), default=0) for one in some]
    assert troubles[:3] == [Readiness.READY] * 3
    assert all(readiness > Readiness.READY for readiness in troubles[3:])


def test_no_positions_are_resolved_to_nothing() -> None:
    assert resolve_many([], Quotes.of(BOOK), DAY, 0.0).plain.size == 0
