"""Which formula can be trusted for which position: its gap to the Yardstick against the book's tolerance.

A formula is beyond the tolerance for a position when its gap is a larger part of the Yardstick's premium than the book
allows. A premium below what the Yardstick itself can tell is judged for none. Positions that no closed form has to
approximate - forwards, outrights, normal legs - are never beyond.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from spreadgui.pricing.methods import LOGNORMAL_METHODS, Method
from spreadgui.pricing.methods import method as method_of
from spreadgui.valuation.results import LiveResults, State
from spreadgui.valuation.shown import trimmed_text
from spreadgui.valuation.slate import FloatArray, RowArray, Slate

# Below this share of the larger leg the Yardstick's own error (1e-10 of it) would be more than a per cent of a premium.
LEAST_PREMIUM = 1e-8
CLOSED_FORMS: tuple[Method, ...] = tuple(method for method in LOGNORMAL_METHODS if not method.reference)

Rows = slice | RowArray


@dataclass(frozen=True)
class Trust:
    """How much of a book a closed form is beyond the tolerance for.

    `rows` counts those positions; `value` is the sum of their position values without their signs, in the book's
    currency, so that long and short do not cancel, and `of_all` the same sum over every priced position.
    """

    method: Method
    rows: int
    value: float
    of_all: float

    @property
    def share(self) -> float:
        """The part of the book's value, a decimal; zero for a book worth nothing."""
        return self.value / self.of_all if self.of_all > 0.0 else 0.0


def gap_shares(key: str, slate: Slate, results: LiveResults, rows: Rows) -> FloatArray:
    """A method's gap as a decimal of the Yardstick's premium; NaN where there is none or the premium is too small."""
    premium = results.values("yardstick")[rows]
    with np.errstate(all="ignore"):
        enough = premium > LEAST_PREMIUM * _larger_leg(slate, rows)
        found: FloatArray = np.where(enough, (results.values(key)[rows] - premium) / premium, np.nan)
    return found


def _larger_leg(slate: Slate, rows: Rows) -> FloatArray:
    legs = [
        np.nan_to_num(slate.values(f"ratio_{side}")[rows] * slate.values(f"forward_{side}")[rows])
        for side in ("long", "short")
    ]
    return np.maximum(np.abs(legs[0]), np.abs(legs[1]))


def beyond(key: str, slate: Slate, results: LiveResults, rows: Rows) -> NDArray[np.bool_]:
    """Where a closed form's gap is larger than the book allows."""
    with np.errstate(invalid="ignore"):
        found: NDArray[np.bool_] = np.abs(gap_shares(key, slate, results, rows)) > slate.book.gap_tolerance
    return found


def trust_of(method: Method, slate: Slate, results: LiveResults) -> Trust:
    """The book's total for one closed form."""
    every = slice(None)
    current = results.state == State.CURRENT
    values = np.where(current, np.abs(slate.values("quantity") * results.values("value")), 0.0)
    off = beyond(method.key, slate, results, every) & current
    return Trust(method, int(np.count_nonzero(off)), float(values[off].sum()), float(values.sum()))


def row_words(slate: Slate, results: LiveResults, row: int) -> str:
    """What a position's row says of the closed forms: which are beyond the tolerance, and whether its value is one."""
    if results.state[row] != State.CURRENT:
        return ""
    here = slice(row, row + 1)
    if not np.isfinite(results.values("yardstick_error")[here]).all():
        return "exact"
    off = [method for method in CLOSED_FORMS if beyond(method.key, slate, results, here)[0]]
    if not off:
        return f"within {tolerance_words(slate)}"
    # What the value rests on comes first.
    off.sort(key=lambda method: method.key != slate.book.method)
    lead = "value beyond: " if off[0].key == slate.book.method else "beyond: "
    return lead + ", ".join(
        f"{method.name} {trimmed_text(100.0 * float(gap_shares(method.key, slate, results, here)[0]), 2)} %"
        for method in off
    )


def tolerance_words(slate: Slate) -> str:
    """The book's tolerance as screens write it."""
    return f"{trimmed_text(100.0 * slate.book.gap_tolerance, 4)} %"


def book_words(slate: Slate, results: LiveResults) -> str:
    """The book's total in one line: for the formula its values rest on, or, where that is the Yardstick, for the
    closed form that is beyond for most of it."""
    chosen = method_of(slate.book.method)
    if not chosen.reference:
        trust = trust_of(chosen, slate, results)
        return f"{_share_words(trust)} on {chosen.name} beyond {tolerance_words(slate)}"
    worst = max((trust_of(method, slate, results) for method in CLOSED_FORMS), key=lambda trust: trust.share)
    if not worst.rows:
        return f"every formula within {tolerance_words(slate)}"
    return f"{worst.method.name} beyond {tolerance_words(slate)} for {_share_words(worst)}"


def _share_words(trust: Trust) -> str:
    return f"{100.0 * trust.share:.0f} % of the book’s value"
