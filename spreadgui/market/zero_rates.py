"""The zero rates of a book: its curve where it has one, else its flat rate."""

from __future__ import annotations

from dataclasses import dataclass

from spreadgui.book.records import Book
from spreadgui.market.zero_curve import ZeroCurve, curve_faults


@dataclass(frozen=True)
class ZeroRates:
    """The rate to any time; `fault` says why the book's curve cannot be used, and is empty where it can."""

    flat: float = 0.0
    curve: ZeroCurve | None = None
    fault: str = ""

    @staticmethod
    def of(book: Book) -> ZeroRates:
        """The rates that the book discounts by."""
        points = tuple((point.date, point.rate) for point in book.zero_curve)
        if not points:
            return ZeroRates(book.zero_rate)
        faults = curve_faults(book.valuation_date, points)
        if faults:
            return ZeroRates(book.zero_rate, None, f"the zero curve cannot be used: {faults[0].partition(': ')[2]}")
        return ZeroRates(book.zero_rate, ZeroCurve(book.valuation_date, points))

    def rate(self, years: float) -> float:
        """The continuous zero rate to a time in years from the valuation date."""
        return self.flat if self.curve is None else float(self.curve.rate(years))
