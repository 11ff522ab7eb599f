"""The column register: every column of the grid and of the value table, each declared once.

A column says how it is read from the slate and the live results (`numbers` or `words`), what its screen heading, unit
and scaling are, and which field of the position typing into it sets. Input columns take their reading rules from
`book.fields`; a new computed column is one more entry in COLUMNS.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from spreadgui.book.fields import BY_KEY, Field
from spreadgui.pricing.methods import METHODS, Method
from spreadgui.pricing.methods import method as method_of
from spreadgui.valuation.results import LiveResults, State
from spreadgui.valuation.shown import trimmed_text
from spreadgui.valuation.slate import FloatArray, RowArray, Slate

Rows = slice | RowArray
Numbers = Callable[[Slate, LiveResults, Rows], FloatArray]
Words = Callable[[Slate, LiveResults, int], str]
ALL_ROWS = slice(None)


@dataclass(frozen=True)
class Column:
    """One column. Exactly one of `numbers` (some rows at once, code units) and `words` (one cell) reads it.

    On screens a number is multiplied by `scale` and shown with `decimals` (at least `least_decimals` where those
    differ). `computed` columns show the state of their row when it is not current. `own` columns show what the row
    uses and, typed into, set the row's own mark.
    """

    key: str
    heading: str
    help: str
    unit: str = ""
    field: Field | None = None
    numbers: Numbers | None = None
    words: Words | None = None
    scale: float = 1.0
    decimals: int = 2
    least_decimals: int | None = None
    computed: bool = False
    pinned: bool = False
    on_screen: bool = True

    @property
    def numeric(self) -> bool:
        return self.numbers is not None

    @property
    def own(self) -> bool:
        """Whether typing into the column sets an own mark that wins over the book's."""
        return self.field is not None and self.field.key.startswith("own_")

    def shown(self, value: float) -> str:
        """A number of this column as the screen writes it."""
        least = self.decimals if self.least_decimals is None else self.least_decimals
        return trimmed_text(value * self.scale, self.decimals, least)


def _field_words(key: str) -> Words:
    entry = BY_KEY[key].entry
    return lambda slate, _results, row: entry.text(getattr(slate.book.positions[row], key))


def _input(key: str) -> Numbers:
    return lambda slate, _results, rows: slate.values(key)[rows]


def _output(key: str) -> Numbers:
    return lambda _slate, results, rows: results.values(key)[rows]


def _for_position(key: str) -> Numbers:
    return lambda slate, results, rows: slate.values("quantity")[rows] * results.values(key)[rows]


def _gap(key: str) -> Numbers:
    return lambda _slate, results, rows: results.values(key)[rows] - results.values("yardstick")[rows]


def _gap_share(key: str) -> Numbers:
    def share(slate: Slate, results: LiveResults, rows: Rows) -> FloatArray:
        premium = results.values("yardstick")[rows]
        with np.errstate(divide="ignore", invalid="ignore"):
            found: FloatArray = np.where(premium > 0, _gap(key)(slate, results, rows) / premium, np.nan)
        return found

    return share


def _rate_sensitivity(slate: Slate, results: LiveResults, rows: Rows) -> FloatArray:
    """Forwards stand still as the rate moves, so only discounting tells: minus the time, as a share of the value."""
    found: FloatArray = -slate.values("years")[rows] * slate.values("quantity")[rows] * results.values("value")[rows]
    return found


def _worded(key: str, *, unit: str = "", pinned: bool = False) -> Column:
    field = BY_KEY[key]
    return Column(key, field.heading, field.help, unit, field, words=_field_words(key), pinned=pinned)


def _entered(key: str, unit: str, decimals: int, least: int, numbers: Numbers) -> Column:
    field = BY_KEY[key]
    return Column(key, field.heading, field.help, unit, field, numbers=numbers, decimals=decimals, least_decimals=least)


def _own_mark(key: str, field_key: str, unit: str, scale: float, decimals: int, least: int) -> Column:
    field = BY_KEY[field_key]
    return Column(
        key, field.heading, field.help, unit, field,
        numbers=_input(key), scale=scale, decimals=decimals, least_decimals=least,
    )  # fmt: skip


def _computed(
    key: str, heading: str, help: str, numbers: Numbers, unit: str = "", *, scale: float = 1.0, decimals: int = 4,
    pinned: bool = False, on_screen: bool = True,
) -> Column:  # fmt: skip
    return Column(
        key, heading, help, unit, numbers=numbers, scale=scale, decimals=decimals,
        computed=True, pinned=pinned, on_screen=on_screen,
    )  # fmt: skip


def _by_method() -> list[Column]:
    return [
        _computed(
            method.key, method.name, f"Unit value by {method.name}. {method.applies}", _output(method.key), "unit value"
        )
        for method in METHODS
    ]


def _gaps() -> list[Column]:
    return [column for method in METHODS if not method.reference for column in _gaps_of(method)]


def _gaps_of(method: Method) -> list[Column]:
    """In money and in per cent of premium; the screen has the two methods that a desk is most likely to quote."""
    shown = method.key in ("kirk", "bjerksund_stensland")
    about = f"Formula gap: the unit value by {method.name} minus the Yardstick's"
    gap, share = f"{method.key}_gap", f"{method.key}_gap_share"
    heading = f"{method.name} gap"
    return [
        _computed(gap, heading, f"{about}.", _gap(method.key), "unit value", decimals=5, on_screen=shown),
        _computed(
            share, heading, f"{about}, in per cent of the Yardstick's.", _gap_share(method.key), "% of premium",
            scale=100.0, decimals=3, on_screen=shown,
        ),
    ]  # fmt: skip


# key, heading, position's heading on screens, screen scaling, words for the scaling, help
_SENSITIVITIES = (
    ("delta_long", "Delta long", 1.0, "units", "Change of value per 1.00 of the long market's forward."),
    ("delta_short", "Delta short", 1.0, "units", "Change of value per 1.00 of the short market's forward."),
    ("gamma_long", "Gamma long", 1.0, "units per 1.00", "Change of the long delta per 1.00 of the long forward."),
    ("gamma_short", "Gamma short", 1.0, "units per 1.00", "Change of the short delta per 1.00 of the short forward."),
    ("gamma_cross", "Cross-gamma", 1.0, "units per 1.00", "Change of the long delta per 1.00 of the short forward."),
    ("vega_long", "Vega long", 0.01, "per 1 vol point", "Change of value per point of the long leg's volatility."),
    ("vega_short", "Vega short", 0.01, "per 1 vol point", "Change of value per point of the short leg's volatility."),
    ("correlation_sensitivity", "Correlation sensitivity", 0.01, "per 0.01", "Change of value per 0.01 of it."),
    ("theta", "Theta", 1 / 365, "per calendar day",
     "Change of value as one calendar day passes, forwards, volatilities and zero rate standing still."),
)  # fmt: skip


def _position_sensitivities() -> list[Column]:
    return [
        _computed(
            f"position_{key}",
            heading,
            f"{about} For the whole position, by the book's method.",
            _for_position(key),
            unit,
            scale=scale,
            decimals=2 if key.startswith("gamma") else 0,
        )
        for key, heading, scale, unit, about in _SENSITIVITIES
    ]


def _unit_sensitivities() -> list[Column]:
    return [
        _computed(
            key,
            heading,
            f"{about} Per unit of payoff, by the book's method.",
            _output(key),
            unit,
            scale=scale,
            decimals=5,
            on_screen=False,
        )
        for key, heading, scale, unit, about in _SENSITIVITIES
    ]


def _state_word(_slate: Slate, results: LiveResults, row: int) -> str:
    state = State(int(results.state[row]))
    return state.word


def _reason(_slate: Slate, results: LiveResults, row: int) -> str:
    return results.reason(row)


def _book_method(slate: Slate, _results: LiveResults, _row: int) -> str:
    return method_of(slate.book.method).name


COLUMNS: tuple[Column, ...] = (
    _worded("name", pinned=True),
    _computed("position_value", "Value", "Quantity times unit value; below zero for what the desk owes.",
              _for_position("value"), "{currency}", decimals=0, pinned=True),
    _worded("side"),
    _worded("kind"),
    _entered("quantity", "payoff units", 3, 0, lambda slate, _results, rows: np.abs(slate.values("quantity")[rows])),
    Column("unit", "Unit", "What the payoff is quoted in: the unit of the long leg's market.",
           words=lambda slate, _results, row: slate.units[row]),
    _worded("long_leg"),
    _worded("long_delivery"),
    _entered("long_ratio", "×", 6, 2, _input("ratio_long")),
    _worded("short_leg"),
    _worded("short_delivery"),
    _entered("short_ratio", "×", 6, 2, _input("ratio_short")),
    _entered("strike", "payoff unit", 6, 2, _input("strike")),
    _worded("expiry"),
    _own_mark("forward_long", "own_forward_long", "market unit", 1.0, 6, 2),
    _own_mark("forward_short", "own_forward_short", "market unit", 1.0, 6, 2),
    _own_mark("vol_long", "own_vol_long", "% a year", 100.0, 6, 1),
    _own_mark("vol_short", "own_vol_short", "% a year", 100.0, 6, 1),
    _own_mark("correlation", "own_correlation", "%", 100.0, 6, 1),
    Column("years", "Years", "Time from the valuation date to the expiry, actual days over 365.", "ACT/365F",
           numbers=_input("years"), decimals=3),
    Column("discount", "Discount factor", "Value today of one unit of money at the expiry.", "",
           numbers=_input("discount"), decimals=5),
    *_by_method(),
    *_gaps(),
    *_position_sensitivities(),
    _computed("position_rate_sensitivity", "Rate sensitivity",
              "Change of value per 0.01 of the zero rate, for the whole position; the forwards stand still.",
              _rate_sensitivity, "per 0.01", scale=0.01, decimals=0),
    *_unit_sensitivities(),
    _worded("note"),
    Column("state", "State", "Current, pricing, incomplete or refused.", words=_state_word),
    Column("reason", "Reason", "Why the row is incomplete or refused.", words=_reason),
    Column("method", "Method", "The method of the value and the sensitivities.", words=_book_method, on_screen=False),
)  # fmt: skip

BY_COLUMN_KEY: dict[str, Column] = {column.key: column for column in COLUMNS}
SCREEN_COLUMNS: tuple[Column, ...] = tuple(column for column in COLUMNS if column.on_screen)
VALUE_TABLE: tuple[str, ...] = (
    "name", "side", "kind", "quantity", "unit", "long_leg", "long_delivery", "long_ratio",
    "short_leg", "short_delivery", "short_ratio", "strike", "expiry",
    "forward_long", "forward_short", "vol_long", "vol_short", "correlation", "years", "discount",
    *(method.key for method in METHODS),
    "method", "position_value",
    *(key for key, *_ in _SENSITIVITIES),
    *(f"position_{key}" for key, *_ in _SENSITIVITIES), "position_rate_sensitivity",
    *(f"{method.key}_gap{kind}" for method in METHODS if not method.reference for kind in ("", "_share")),
    "state", "reason",
)  # fmt: skip


def exact_texts(column: Column, slate: Slate, results: LiveResults, rows: range) -> list[str]:
    """The cells of `rows` for files: numbers in code units to the last digit, empty where there is none."""
    if column.numbers is None:
        return _words_of(column, slate, results, rows)
    numbers = column.numbers(slate, results, slice(rows.start, rows.stop)).tolist()
    return [repr(number) if math.isfinite(number) else "" for number in numbers]


def screen_texts(column: Column, slate: Slate, results: LiveResults, rows: range) -> list[str]:
    """The cells of `rows` for screens; one without a number is empty, its state being told beside it."""
    if column.numbers is None:
        return _words_of(column, slate, results, rows)
    return [column.shown(number) for number in column.numbers(slate, results, slice(rows.start, rows.stop)).tolist()]


def _words_of(column: Column, slate: Slate, results: LiveResults, rows: range) -> list[str]:
    assert column.words is not None
    return [column.words(slate, results, row) for row in rows]
