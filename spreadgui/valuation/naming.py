"""What the value of a position comes from, in words."""

from __future__ import annotations

from spreadgui.market.contracts import Law, Shape
from spreadgui.pricing.methods import NORMAL_METHODS
from spreadgui.pricing.methods import method as method_of
from spreadgui.valuation.slate import KINDS, Slate


def value_method(slate: Slate, row: int) -> str:
    """The name of the formula behind a row's value: the book's method only where there are two lognormal legs."""
    if KINDS[slate.kind[row]] == "forward":
        return "Discounted difference"
    if slate.law[row] == Law.NORMAL:
        return NORMAL_METHODS[0].name
    return method_of(slate.book.method).name if slate.shape[row] == Shape.SPREAD else "Black-76"
