"""The Reading: one position by every method, side by side, with its sensitivities and the units they are counted in."""

from __future__ import annotations

import datetime
from dataclasses import dataclass

import numpy as np

from spreadgui.market.contracts import Law, Readiness, Shape
from spreadgui.market.quotes import UnknownMarkError, quantity_unit
from spreadgui.pricing.methods import LOGNORMAL_METHODS, NORMAL_METHODS, Method
from spreadgui.valuation.columns import BY_COLUMN_KEY
from spreadgui.valuation.exercises import expand
from spreadgui.valuation.group import STRIKE_INPUTS, formula_strike
from spreadgui.valuation.naming import value_method
from spreadgui.valuation.parts import PartReading, part_readings
from spreadgui.valuation.price import price_lines, price_rows
from spreadgui.valuation.results import IMPLIED_WORDS, SENSITIVITIES, State, output_row
from spreadgui.valuation.shown import trimmed_text
from spreadgui.valuation.slate import INPUTS, KINDS, FloatArray, Slate
from spreadgui.valuation.trust import LEAST_PREMIUM, tolerance_words

# What stands for the currency's units where a market's unit does not say what is counted.
NAMELESS_UNIT = "units"
_NAN = float("nan")


@dataclass(frozen=True)
class MethodReading:
    """One method's word on a position. NaN where the method does not cover it, or where there is no gap to tell.

    `gap` is against the Yardstick, in the unit of a unit value; `position_gap` the same for the signed quantity, in
    currency; `gap_share` a decimal of the Yardstick's unit value. `remark` says why a number is missing. `chosen` is
    the method that the book's value comes from, `reference` the one that the gaps are measured from.
    """

    key: str
    name: str
    unit_value: float
    gap: float
    gap_share: float
    remark: str
    position_gap: float = _NAN
    reference: bool = False
    chosen: bool = False
    about: str = ""


@dataclass(frozen=True)
class SensitivityReading:
    """One sensitivity as screens show it: `unit_value` for one unit of payoff, `position_value` for the quantity.

    Both are for the step that `scaling` names ("per 1.00", "per 1 vol point"). `unit` is what `position_value` counts:
    the quantity of the leg's own market for a delta and, per 1.00 more, for a gamma; the book's money for the others.
    `absence` says in words why there is no such sensitivity; both numbers are NaN then.
    """

    key: str
    name: str
    scaling: str
    unit_value: float
    position_value: float
    unit: str
    about: str
    absence: str = ""


@dataclass(frozen=True)
class DayReading:
    """One day of a strip: its part of the signed quantity, what its formula is given, and what comes of it.

    `unit_value` is for one unit of payoff of this day, `position_value` and the deltas for its part of the quantity.
    """

    day: datetime.date
    expiry: datetime.date
    quantity: float
    years: float
    vol_long: float
    vol_short: float
    correlation: float
    unit_value: float
    position_value: float
    delta_long: float
    delta_short: float


@dataclass(frozen=True)
class QuoteReading:
    """What a quoted premium says: in payoff units, the correlations as decimals, NaN where there is none.

    `gap` is the premium less the unit value, `position_gap` the same for the signed quantity, in the book's money.
    """

    premium: float
    gap: float
    position_gap: float
    implied: float
    error: float
    marked: float
    status: str


@dataclass(frozen=True)
class Reading:
    """All that the panel shows of one position, stamped with the revision it was read from.

    Unit values are per unit of payoff, `quantity` is signed. `subject` is the position in words, `unit` what a unit
    value is counted in, `quantity_unit` what the quantity is counted in ("" where the book does not say). `method` is
    the name of what `unit_value` and the sensitivities come from: the book's method, Black-76 for one leg, the
    discounted difference for a forward. `intrinsic` is NaN for a forward, which has none. `sensitivities` are plain
    derivatives of the unit value in the order of results.SENSITIVITIES, `sensitivity_rows` the same as screens show
    them. A strip has its `days`, a position with a quoted premium its `quote`, one on
    blends their `parts`. Where the position could not be priced
    `reason` is set, `state` says whether it is incomplete or refused, and no number may be relied upon.
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
    state: State = State.CURRENT
    kind: str = "call"
    quantity_unit: str = ""
    sensitivity_rows: tuple[SensitivityReading, ...] = ()
    days: tuple[DayReading, ...] = ()
    quote: QuoteReading | None = None
    parts: tuple[PartReading, ...] = ()
    # Whether the volatilities are absolute, each in its market's unit.
    absolute_vols: bool = False

    @property
    def time_value(self) -> float:
        """Unit value less intrinsic value."""
        return self.unit_value - self.intrinsic

    @property
    def position_value(self) -> float:
        """Quantity times unit value, in currency; below zero for what the desk owes."""
        return self.quantity * self.unit_value


def read_position(slate: Slate, row: int) -> Reading:
    """The Reading of the position at `row`; one that is not ready says why.

    IndexError if there is no such row.
    """
    if slate.readiness[row] != Readiness.READY:
        troubles = slate.troubles[row]
        refused = any(trouble.readiness is Readiness.REFUSED for trouble in troubles)
        state = State.REFUSED if refused else State.INCOMPLETE
        return _unreadable(slate, row, state, "; ".join(trouble.sentence for trouble in troubles))
    part = price_rows(slate, np.array([row]))
    if row in part.refused:
        return _unreadable(slate, row, State.REFUSED, part.refused[row])
    outputs = part.outputs[:, 0]
    position = slate.book.positions[row]
    return Reading(
        revision=slate.revision,
        row=row,
        subject=_subject(slate, row),
        unit=slate.units[row],
        currency=slate.book.currency,
        method=value_method(slate, row),
        quantity=float(slate.values("quantity")[row]),
        unit_value=float(outputs[output_row("value")]),
        intrinsic=intrinsic_value(slate, row),
        methods=_method_readings(slate, row, outputs),
        sensitivities=tuple(float(outputs[output_row(key)]) for key in SENSITIVITIES),
        kind=position.kind,
        quantity_unit=quantity_unit(slate.units[row]),
        sensitivity_rows=tuple(_sensitivity_reading(slate, row, key, outputs) for key in SENSITIVITIES),
        days=_day_readings(slate, row) if row in slate.strips else (),
        quote=_quote_reading(slate, row, outputs),
        parts=part_readings(slate, row, outputs),
        absolute_vols=bool(slate.law[row] == Law.NORMAL),
    )


def _day_readings(slate: Slate, row: int) -> tuple[DayReading, ...]:
    strip, lines = slate.strips[row], expand(slate, np.array([row]))
    outputs = price_lines(slate, lines)
    given = dict(zip(INPUTS, lines.inputs.tolist(), strict=True))
    quantities = (lines.share * slate.values("quantity")[row]).tolist()
    unit_value, delta_long, delta_short = (
        outputs[output_row(key)].tolist() for key in ("value", "delta_long", "delta_short")
    )
    parts = zip(strip.days.tolist(), strip.expiries.tolist(), quantities, strict=True)
    return tuple(
        DayReading(
            day=day,
            expiry=expiry,
            quantity=quantity,
            years=given["years"][line],
            vol_long=given["vol_long"][line],
            vol_short=given["vol_short"][line],
            correlation=given["correlation"][line],
            unit_value=unit_value[line],
            position_value=quantity * unit_value[line],
            delta_long=quantity * delta_long[line],
            delta_short=quantity * delta_short[line],
        )
        for line, (day, expiry, quantity) in enumerate(parts)
    )


def _quote_reading(slate: Slate, row: int, outputs: FloatArray) -> QuoteReading | None:
    premium = float(slate.values("quoted_premium")[row])
    if not np.isfinite(premium):
        return None
    gap, status = premium - float(outputs[output_row("value")]), float(outputs[output_row("implied_status")])
    return QuoteReading(
        premium,
        gap,
        float(slate.values("quantity")[row]) * gap,
        float(outputs[output_row("implied_correlation")]),
        float(outputs[output_row("implied_correlation_error")]),
        float(slate.values("correlation")[row]),
        IMPLIED_WORDS[int(status)] if np.isfinite(status) else "no correlation to imply",
    )


def intrinsic_value(slate: Slate, row: int) -> float:
    """What the payoff would be worth if both forwards stood still to the expiry: its discounted payoff today.

    NaN for a forward: it is no option, and has neither intrinsic nor time value.
    """
    kind = KINDS[slate.kind[row]]
    if kind == "forward":
        return _NAN
    long, short = _folded_forwards(slate, row)
    above = long - short - float(slate.values("strike")[row])
    lines = expand(slate, np.array([row]))  # a strip's days are discounted each for itself
    discount = float(np.sum(lines.share * lines.inputs[INPUTS.index("discount")]))
    return discount * max(above if kind == "call" else -above, 0.0)


def _folded_forwards(slate: Slate, row: int) -> tuple[float, float]:
    """Ratio times forward of either leg, zero for a leg that is not there."""
    long, short = (
        float(np.nan_to_num(slate.values(f"forward_{side}")[row]) * slate.values(f"ratio_{side}")[row])
        for side in ("long", "short")
    )
    return long, short


def _subject(slate: Slate, row: int) -> str:
    position = slate.book.positions[row]
    strip = slate.strips.get(row)
    kind = f"{position.side} {position.kind}" if strip is None else f"{position.side} {position.kind} strip"
    words = [position.name or f"Position {row + 1}", kind]
    if position.quantity is not None:
        quantity = trimmed_text(abs(position.quantity), 3)
        words.append(f"{quantity} {quantity_unit(slate.units[row])}".strip())
    if strip is not None:
        words.append(f"{len(strip)} {'business days' if position.exercise == 'business days' else 'days'} to come")
    return " · ".join(words)


def _method_readings(slate: Slate, row: int, outputs: FloatArray) -> tuple[MethodReading, ...]:
    """Every method in the order of the table; one entry for a payoff that no spread method has a say in."""
    value = float(outputs[output_row("value")])
    if KINDS[slate.kind[row]] == "forward":
        key, remark = "forward", "needs no volatility, so no method"
        about = "The difference of the legs less the strike, discounted."
    elif slate.law[row] == Law.NORMAL:
        bachelier = NORMAL_METHODS[0]
        key, remark = bachelier.key, "exact under normal forwards"
        about = f"{bachelier.applies} {bachelier.source}."
    elif slate.shape[row] != Shape.SPREAD:
        key, remark = "black76", "exact: one leg needs no spread method"
        about = "Black, Journal of Financial Economics 3 (1976)"
    else:
        return tuple(_method_reading(slate, row, method, outputs) for method in LOGNORMAL_METHODS)
    return (MethodReading(key, value_method(slate, row), value, _NAN, _NAN, remark, chosen=True, about=about),)


def _method_reading(slate: Slate, row: int, method: Method, outputs: FloatArray) -> MethodReading:
    value, reference = float(outputs[output_row(method.key)]), float(outputs[output_row("yardstick")])
    gap, share, remark = _NAN, _NAN, ""
    if method.reference:
        error = float(outputs[output_row("yardstick_error")])
        remark = f"reference ±{error:.0e}" if np.isfinite(error) else "reference"
    elif not method.accepts(formula_strike({name: slate.values(name)[row : row + 1] for name in STRIKE_INPUTS})).all():
        remark = method.applies
    elif not np.isfinite([value, reference]).all():
        remark = "out of the machine's reach here"
    else:
        gap = value - reference
        enough = reference > LEAST_PREMIUM * max(map(abs, _folded_forwards(slate, row)))
        share, remark = (gap / reference, "") if enough else (_NAN, "premium too small for a share")
        if abs(share) > slate.book.gap_tolerance:
            remark = f"beyond {tolerance_words(slate)}"
    return MethodReading(
        method.key, method.name, value, gap, share, remark,
        position_gap=float(slate.values("quantity")[row]) * gap,
        reference=method.reference,
        chosen=method.key == slate.book.method,
        about=f"{method.applies} {method.source}.",
    )  # fmt: skip


def _sensitivity_reading(slate: Slate, row: int, key: str, outputs: FloatArray) -> SensitivityReading:
    column = BY_COLUMN_KEY[key]
    absence = _absence(slate, row, key)
    scale = column.scale_at(slate, row)
    value = _NAN if absence else scale * float(outputs[output_row(key)])
    return SensitivityReading(
        key=key,
        name=column.heading,
        scaling=column.unit if column.unit.startswith("per ") and scale == column.scale else "per 1.00",
        unit_value=value,
        position_value=float(slate.values("quantity")[row]) * value,
        unit=_position_unit(slate, row, key),
        about=column.help.partition(" Per unit of payoff")[0],
        absence=absence,
    )


def _absence(slate: Slate, row: int, key: str) -> str:
    """Why the position has no such sensitivity; empty where it has."""
    shape = slate.shape[row]
    lacking = {Shape.LONG_LEG_ONLY: "short", Shape.SHORT_LEG_ONLY: "long"}.get(Shape(shape))
    if lacking is not None and key.endswith(f"_{lacking}"):
        return f"no {lacking} leg"
    if lacking is not None and key in ("gamma_cross", "correlation_sensitivity"):
        return "one leg only"
    if KINDS[slate.kind[row]] == "forward" and not key.startswith(("delta", "theta")):
        return "none in a forward"
    return ""


def _position_unit(slate: Slate, row: int, key: str) -> str:
    """What the position's sensitivity is counted in.

    Money per 1.00 of money a unit is a count of units, so the delta of a leg is a quantity of that leg's own market,
    whatever the payoff is counted in: GJ for the gas leg of a spark spread. A gamma is that quantity per 1.00 more;
    the cross-gamma, as a change of the long delta, is counted as that is.
    """
    if not key.startswith(("delta", "gamma")):
        return slate.book.currency
    return _leg_unit(slate, row, "short" if key.endswith("_short") else "long") or NAMELESS_UNIT


def _leg_unit(slate: Slate, row: int, side: str) -> str:
    """What a leg's market is counted by. A leg without a market is quoted as the payoff is if its ratio is one."""
    position = slate.book.positions[row]
    leg = getattr(position, f"{side}_leg")
    if leg:
        try:
            return quantity_unit(slate.quotes.market(leg).unit)
        except UnknownMarkError:
            return ""  # a name of its own for a leg with own marks
    return quantity_unit(slate.units[row]) if getattr(position, f"{side}_ratio") == 1.0 else ""


def _unreadable(slate: Slate, row: int, state: State, reason: str) -> Reading:
    return Reading(
        revision=slate.revision,
        row=row,
        subject=_subject(slate, row),
        unit=slate.units[row],
        currency=slate.book.currency,
        method=value_method(slate, row),
        quantity=float(slate.values("quantity")[row]),
        unit_value=_NAN,
        intrinsic=_NAN,
        methods=(),
        sensitivities=(_NAN,) * len(SENSITIVITIES),
        reason=reason,
        state=state,
        kind=slate.book.positions[row].kind,
        quantity_unit=quantity_unit(slate.units[row]),
    )
