"""What the Reading pane shows, as plain values: the headline figures and the two tables of a reading. No Qt."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from spreadgui.desk.panels.days_sheet import copied_days
from spreadgui.desk.panels.parts_sheet import parts_sheet
from spreadgui.desk.panels.sheets import (
    DASH,
    Cell,
    Heading,
    Sheet,
    number_or_dash,
    plain_number,
    shared_decimals,
    signed_text,
    tabbed,
)
from spreadgui.valuation.shown import MINUS, number_text, trimmed_text

if TYPE_CHECKING:  # its module loads the formulas, which must not hold up the first paint of the window
    from spreadgui.valuation.reading import MethodReading, QuoteReading, Reading, SensitivityReading

CAUTION = "A model value is no quote."
# The rows of the paired arrangement: the sensitivity to the long leg, or to both, and the one to the short leg.
_PAIRS = (
    ("delta_long", "delta_short"),
    ("gamma_long", "gamma_short"),
    ("gamma_cross", ""),
    ("vega_long", "vega_short"),
    ("correlation_sensitivity", ""),
    ("theta", ""),
)
_LEGS = {"gamma_cross": "both", "correlation_sensitivity": "both", "theta": ""}
# Where the name of the column register is too long for a row; the tooltip and the copy keep the whole of it.
_SHORT_NAMES = {"correlation_sensitivity": "Correlation"}
# From this size on, money is shown without decimals.
_WHOLE_MONEY = 10_000.0
# From this size on, it may be shown by its power of ten.
_LONG_MONEY = 1e9


@dataclass(frozen=True)
class Headline:
    """One figure: the number ready made, its caption, its tooltip, and short forms of both for want of room."""

    text: str
    caption: str
    tip: str
    short: str
    short_caption: str


def headlines(reading: Reading) -> tuple[Headline, ...]:
    """Position value, unit value, intrinsic and time value; dashes with a word for a forward, which is no option."""
    option = reading.kind != "forward"
    decimals = shared_decimals([reading.unit_value], 6, 2, 6)
    unit_tip = f"By {reading.method}, for {_one(reading)}: {plain_number(reading.unit_value)} {reading.unit}"

    def figure(value: float, name: str, addition: str, tip: str) -> Headline:
        text = number_or_dash(value, decimals)
        return Headline(text, f"{name}{addition}", tip, text, name)

    return (
        _money_figure(reading),
        figure(reading.unit_value, "unit value", f", {reading.unit}" if reading.unit else "", unit_tip),
        figure(reading.intrinsic, "intrinsic", "" if option else ": none", _INTRINSIC if option else _NO_OPTION),
        figure(reading.time_value, "time value", "" if option else ": none", _TIME_VALUE if option else _NO_OPTION),
    )


def _money_figure(reading: Reading) -> Headline:
    value, currency = reading.position_value, reading.currency
    text = number_text(value, money_decimals(value))
    short = f"{value:.3e}".replace("-", MINUS) if abs(value) >= _LONG_MONEY else text
    tip = f"Quantity times unit value: {plain_number(value)} {currency}. {_owed(value)}".strip()
    return Headline(f"{text} {currency}".strip(), "position value", tip, short, f"value, {currency}")


_INTRINSIC = "The discounted payoff if both forwards stood still to the expiry."
_TIME_VALUE = "Unit value less intrinsic."
_NO_OPTION = "A forward is no option: it has neither intrinsic nor time value."


def money_decimals(value: float) -> int:
    """Decimals of an amount of money: none for large ones, as many as tell something for very small ones."""
    return 0 if abs(value) >= _WHOLE_MONEY else shared_decimals([value], 2, 2, 6)


def methods_sheet(reading: Reading, *, remarks: bool) -> Sheet:
    """One row a method: unit value, formula gap per unit, for the position and in per cent of the premium.

    A column of remarks is there if asked for; a remark in place of numbers that do not exist is always there.
    """
    methods, unit = reading.methods, reading.unit
    decimals = (
        shared_decimals([method.unit_value for method in methods], 6, 4, 7),
        shared_decimals([method.gap for method in methods], 2, 4, 7),
        shared_decimals([method.position_gap for method in methods], 2, 0, 2),
        shared_decimals([100 * method.gap_share for method in methods], 2, 3, 5),
    )
    headings = (
        Heading("Method"),
        Heading(f"Unit value\n{unit}".strip(), number=True, tip="Value of one unit of payoff, held long."),
        Heading(f"Formula gap\n{unit}".strip(), number=True, tip="The method’s unit value minus the Yardstick’s."),
        Heading(f"Position gap\n{reading.currency}".strip(), number=True, tip="Quantity times formula gap."),
        Heading("Gap in %\nof premium", number=True, tip="Formula gap in per cent of the Yardstick’s unit value."),
        Heading("Remark"),
    )
    return Sheet(
        "Methods",
        headings if remarks else headings[:-1],
        tuple(_method_row(method, decimals, remarks) for method in methods),
        (tuple(_one_line(heading) for heading in headings), *(_method_copy(method) for method in methods)),
        frozenset(row for row, method in enumerate(methods) if method.reference),
    )


def _method_row(method: MethodReading, decimals: Sequence[int], remarks: bool) -> tuple[Cell, ...]:
    strong = method.reference or method.chosen
    start = (
        Cell(_capital(method.name), strong=strong, tip=method.about),
        _number(method.unit_value, number_or_dash(method.unit_value, decimals[0]), strong=strong),
    )
    remark = _remark(method)
    if not math.isfinite(method.gap):
        return (*start, replace(remark, span=4 if remarks else 3), *[Cell()] * (3 if remarks else 2))
    share = 100 * method.gap_share
    numbers = (
        _number(method.gap, signed_text(method.gap, decimals[1])),
        _number(method.position_gap, signed_text(method.position_gap, decimals[2])),
        _number(share, signed_text(share, decimals[3]), none=_capital(method.remark)),
    )
    return (*start, *numbers, remark) if remarks else (*start, *numbers)


def _remark(method: MethodReading) -> Cell:
    # A payoff that no method has a say in has one row only, which needs no telling apart.
    chosen = method.chosen and (method.reference or math.isfinite(method.gap))
    words = _capital("; ".join(filter(None, (method.remark, "the book’s value" if chosen else ""))))
    return Cell(words, tone="accent" if chosen else "muted", small=True, tip=words)


def _method_copy(method: MethodReading) -> tuple[str, ...]:
    numbers = (method.unit_value, method.gap, method.position_gap, 100 * method.gap_share)
    return (_capital(method.name), *(plain_number(number) for number in numbers), _remark(method).text)


def sensitivities_sheet(reading: Reading, *, paired: bool) -> Sheet:
    """The sensitivities for one unit and for the position, by the book's method: the legs side by side, or a list."""
    rows = reading.sensitivity_rows
    per = f"Per {reading.quantity_unit or 'unit'}"
    numbers = (
        Heading(per, number=True, tip="For one unit of payoff, held long, by the book’s method."),
        Heading("Position", number=True, tip="Times the quantity; with the opposite sign for a position sold."),
    )
    cells = {row.key: pair for row, pair in zip(rows, _sensitivity_numbers(reading), strict=True)}
    headings: tuple[Heading, ...] = (Heading("Sensitivity"), *numbers)
    lines: tuple[tuple[Cell, ...], ...]
    lines = tuple((_sensitivity_name(row, row.name), *cells[row.key]) for row in rows)
    if paired:
        leg = Heading("Leg", number=True, apart=True)
        headings = (Heading("Sensitivity"), leg, *numbers, leg, *numbers)
        names = {row.key: _sensitivity_name(row, row.name.removesuffix(" long")) for row in rows}
        lines = tuple((names[left], *_half(left, cells), *_half(right, cells)) for left, right in _PAIRS)
    first = ("Sensitivity", "Scaling", per, "Position", "Unit of position", "Remark")
    return Sheet("Sensitivities", headings, lines, (first, *(_sensitivity_copy(row) for row in rows)))


def _half(key: str, cells: Mapping[str, tuple[Cell, Cell]]) -> tuple[Cell, ...]:
    """One leg's part of a row: which leg, for one unit, for the position."""
    if not key:
        return Cell(), Cell(), Cell()
    leg = _LEGS.get(key, key.rpartition("_")[2])
    return Cell(leg, number=True, tone="muted", small=True), *cells[key]


def _sensitivity_name(row: SensitivityReading, name: str) -> Cell:
    tip = f"{row.name} {row.scaling}. {row.about}"
    return Cell(_SHORT_NAMES.get(row.key, name), row.scaling, tip=tip, spoken=f"{row.name} {row.scaling}")


def _sensitivity_numbers(reading: Reading) -> Iterator[tuple[Cell, Cell]]:
    rows = reading.sensitivity_rows
    unit_decimals = shared_decimals([row.unit_value for row in rows], 2, 4, 6)
    decimals = shared_decimals([row.position_value for row in rows], 2, 0, 4, reach=1e-4)
    for row in rows:
        if row.absence:
            yield _absent(row.absence), Cell()
            continue
        lead = f"{row.name} {row.scaling}, for"
        tip = f"{lead} the position: {plain_number(row.position_value)} {row.unit}"
        yield (
            _number(row.unit_value, number_or_dash(row.unit_value, unit_decimals), tip=f"{lead} {_one(reading)}: "),
            Cell(number_or_dash(row.position_value, decimals), row.unit, number=True, tip=tip),
        )


def _absent(words: str) -> Cell:
    return Cell(f"{DASH} {words}", number=True, tone="muted", small=True, span=2, spoken=words)


def _sensitivity_copy(row: SensitivityReading) -> tuple[str, ...]:
    numbers = plain_number(row.unit_value), plain_number(row.position_value)
    return (row.name, row.scaling, *numbers, row.unit, row.absence)


def quote_line(reading: Reading) -> str:
    """What the quoted premium says, as one sentence; empty without one."""
    quote = reading.quote
    if quote is None:
        return ""
    unit = f" {reading.unit}".rstrip()
    against = f"{signed_text(quote.gap, shared_decimals([quote.gap], 3, 2, 6))}{unit}"
    money = f"{signed_text(quote.position_gap, money_decimals(quote.position_gap))} {reading.currency}".rstrip()
    return f"Quoted {trimmed_text(quote.premium, 6, 2)}: {_implied_words(quote)}; {against}, {money} against the value."


def _implied_words(quote: QuoteReading) -> str:
    """The correlation behind a premium, or why there is none."""
    if not math.isfinite(quote.implied):
        return f"implied correlation {quote.status}"
    bar = f" ± {number_text(100 * quote.error, 2)}" if math.isfinite(quote.error) else ""
    doubt = "" if quote.status == "solved" else f", {quote.status}"
    implied, marked = number_text(100 * quote.implied, 2), trimmed_text(100 * quote.marked, 2)
    return f"implied correlation {implied}{bar} %{doubt} (marked {marked})"


def copied_reading(reading: Reading) -> str:
    """The whole reading as tab-separated text: the subject, the figures, all tables, the days of a strip as well."""
    if reading.reason:
        return tabbed([(reading.subject,), (reason_text(reading),)])
    figures = (
        ("Position value", plain_number(reading.position_value), reading.currency),
        ("Unit value", plain_number(reading.unit_value), reading.unit),
        ("Intrinsic", plain_number(reading.intrinsic), reading.unit),
        ("Time value", plain_number(reading.time_value), reading.unit),
    )
    tables = (methods_sheet(reading, remarks=True).copied, sensitivities_sheet(reading, paired=False).copied)
    more = [parts_sheet(reading).copied] if reading.parts else []
    more += [copied_days(reading)] if reading.days else []
    quote = [(quote_line(reading),)] if reading.quote else []
    return "\n".join([tabbed([(reading.subject,), *figures, *quote]), *(tabbed(table) for table in (*tables, *more))])


def reason_text(reading: Reading) -> str:
    """Why there is nothing to read, as the pane says it: the state, then the reason."""
    return f"{_capital(reading.state.word)}: {reading.reason}."


def closing_line(reading: Reading) -> str:
    """The line under the tables: where the book's value comes from, and the caution."""
    return f"The book’s value: {reading.method}. {CAUTION}"


def _number(value: float, text: str, *, strong: bool = False, tip: str = "", none: str = "") -> Cell:
    """A number's cell, its tooltip telling all digits; for a dash the tooltip says why, in the words of `none`."""
    exact = plain_number(value)
    if not exact:
        return Cell(text, number=True, tone="muted", tip=none, spoken=none or "none")
    return Cell(text, number=True, strong=strong, tip=f"{tip}{exact}")


def _one_line(heading: Heading) -> str:
    return heading.text.replace("\n", ", ")


def _one(reading: Reading) -> str:
    return f"one {reading.quantity_unit or 'unit'}"


def _owed(value: float) -> str:
    return "Below zero: the desk owes it." if value < 0 else ""


def _capital(words: str) -> str:
    return words[:1].upper() + words[1:]
