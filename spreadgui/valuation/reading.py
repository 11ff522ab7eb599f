"""The Reading: one position by every method, side by side."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from spreadgui.market.contracts import Readiness
from spreadgui.market.quotes import quantity_unit
from spreadgui.pricing.methods import METHODS
from spreadgui.pricing.methods import method as method_of
from spreadgui.valuation.price import price_rows
from spreadgui.valuation.results import SENSITIVITIES, output_row
from spreadgui.valuation.shown import trimmed_text
from spreadgui.valuation.slate import KINDS, Slate


@dataclass(frozen=True)
class MethodReading:
    """One method's word on a position. NaN where the method does not cover it; `gap` is against the Yardstick."""

    key: str
    name: str
    unit_value: float
    gap: float
    gap_share: float
    remark: str


@dataclass(frozen=True)
class Reading:
    """All that the panel shows of one position, stamped with the revision it was read from.

    Unit values are per unit of payoff, `quantity` is signed. `sensitivities` are plain derivatives of the unit value by
    the book's method, in the order of results.SENSITIVITIES. `reason` is set, and nothing else to be relied upon, where
    the position could not be priced. `subject` is the position in words, `unit` what a unit value is counted in,
    `method` the name of the book's method, which `unit_value` and the sensitivities come from.
    """

    revision: int
    row: int
    subject: str
    unit: str
    currency: str
    method: str
    quantity: float
    unit_value: float
    intrinsic: float
    methods: tuple[MethodReading, ...]
    sensitivities: tuple[float, ...]
    reason: str = ""

    @property
    def time_value(self) -> float:
        """Unit value less intrinsic value."""
        return self.unit_value - self.intrinsic

    @property
    def position_value(self) -> float:
        return self.quantity * self.unit_value


def read_position(slate: Slate, row: int) -> Reading:
    """The Reading of the position at `row`; one that is not ready says why."""
    if slate.readiness[row] != Readiness.READY:
        return _unreadable(slate, row, "; ".join(trouble.sentence for trouble in slate.troubles[row]))
    part = price_rows(slate, np.array([row]))
    if row in part.refused:
        return _unreadable(slate, row, part.refused[row])
    outputs = part.outputs[:, 0]
    reference = float(outputs[output_row("yardstick")])
    return Reading(
        slate.revision,
        row,
        *_words(slate, row),
        float(slate.values("quantity")[row]),
        float(outputs[output_row("value")]),
        intrinsic_value(slate, row),
        tuple(_method_reading(method.key, float(outputs[output_row(method.key)]), reference) for method in METHODS),
        tuple(float(outputs[output_row(key)]) for key in SENSITIVITIES),
    )


def intrinsic_value(slate: Slate, row: int) -> float:
    """What the payoff would be worth if both forwards stood still to the expiry: its discounted payoff today."""
    cell = {key: float(slate.values(key)[row]) for key in ("forward_long", "forward_short", "strike", "discount")}
    long = np.nan_to_num(cell["forward_long"]) * float(slate.values("ratio_long")[row])
    short = np.nan_to_num(cell["forward_short"]) * float(slate.values("ratio_short")[row])
    above = float(long - short - cell["strike"])
    kind = KINDS[slate.kind[row]]
    payoff = {"call": max(above, 0.0), "put": max(-above, 0.0), "forward": above}[kind]
    return cell["discount"] * payoff


def _words(slate: Slate, row: int) -> tuple[str, str, str, str]:
    """Subject, unit, currency and the book's method in words."""
    position, unit = slate.book.positions[row], slate.units[row]
    quantity = trimmed_text(abs(float(slate.values("quantity")[row])), 3)
    held = " ".join(filter(None, (position.side, position.kind, "·", quantity, quantity_unit(unit))))
    subject = f"{position.name or f'Position {row + 1}'} · {held}"
    return subject, unit, slate.book.currency, method_of(slate.book.method).name


def _method_reading(key: str, value: float, reference: float) -> MethodReading:
    method = method_of(key)
    gap = np.nan if method.reference else value - reference
    share = gap / reference if reference > 0 else np.nan
    remark = "reference" if method.reference else ("" if np.isfinite(value) else method.applies)
    return MethodReading(key, method.name, value, float(gap), float(share), remark)


def _unreadable(slate: Slate, row: int, reason: str) -> Reading:
    nan = float("nan")
    quantity = float(slate.values("quantity")[row])
    return Reading(
        slate.revision, row, *_words(slate, row), quantity, nan, nan, (), (nan,) * len(SENSITIVITIES), reason
    )
