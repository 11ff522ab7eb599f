"""What a position on a blend owes to each of the blend's markets."""

from __future__ import annotations

from collections.abc import Callable

import msgspec
import numpy as np
import pytest

from spreadgui.book.records import Blend, Book, Part
from spreadgui.valuation.parts import PartReading, part_readings
from spreadgui.valuation.price import price_rows
from spreadgui.valuation.results import output_row
from spreadgui.valuation.slate import build_slate
from tests.market.test_blends import book, position

PRODUCTS = Blend("Clean power", "CRN/MWh", (Part("Power", 1.0), Part("Carbon", 0.1)))


def readings(some: Book) -> dict[tuple[str, str], PartReading]:
    slate = build_slate(some, 1)
    outputs = price_rows(slate, np.array([0])).outputs[:, 0]
    return {(one.side, one.market): one for one in part_readings(slate, 0, outputs)}


def value(some: Book) -> float:
    return float(price_rows(build_slate(some, 1), np.array([0])).outputs[output_row("value"), 0])


def moved(some: Book, market: str, field: str) -> Callable[[float], float]:
    def at(step: float) -> float:
        markets = tuple(
            msgspec.structs.replace(
                one,
                marks=tuple(
                    msgspec.structs.replace(mark, **{field: getattr(mark, field) + step})
                    if mark.delivery == "2028-01" else mark
                    for mark in one.marks
                ),
            )
            if one.name == market else one
            for one in some.markets
        )  # fmt: skip
        return value(msgspec.structs.replace(some, markets=markets))

    return at


def slope(of: Callable[[float], float], step: float) -> float:
    return (8.0 * (of(step) - of(-step)) - (of(2 * step) - of(-2 * step))) / (12.0 * step)


@pytest.mark.parametrize("kind", ["call", "put"])
@pytest.mark.parametrize("ratio", [1.0, 0.9])
def test_the_parts_deltas_and_vegas_are_the_slopes_of_the_value_in_their_marks(kind: str, ratio: float) -> None:
    some = book(position(kind=kind, short_ratio=ratio))
    found = readings(some)
    assert set(found) == {("short", "Gas"), ("short", "Carbon")}
    for (_, market), part in found.items():
        assert part.delta == pytest.approx(slope(moved(some, market, "forward"), 0.01), rel=1e-7)
        assert part.vega == pytest.approx(slope(moved(some, market, "volatility"), 1e-3), rel=1e-6, abs=1e-9)


def test_a_market_that_is_in_both_legs_has_a_part_in_each_and_they_add_up_to_its_slope() -> None:
    some = book(position(long_leg="Clean power"), blends=(PRODUCTS, *book().blends))
    found = readings(some)
    assert set(found) == {("long", "Power"), ("long", "Carbon"), ("short", "Gas"), ("short", "Carbon")}
    both = found["long", "Carbon"].delta + found["short", "Carbon"].delta
    assert both == pytest.approx(slope(moved(some, "Carbon", "forward"), 0.01), rel=1e-6)
    vegas = found["long", "Carbon"].vega + found["short", "Carbon"].vega
    assert vegas == pytest.approx(slope(moved(some, "Carbon", "volatility"), 1e-3), rel=1e-5)


def test_a_position_without_a_blend_has_no_parts() -> None:
    assert readings(book(position(short_leg="Gas", short_ratio=7.1))) == {}
