"""The column register: every column of the grid and of the value table, each declared once.

A column says how it is read from the slate and the live results, what its screen heading, unit and scaling are, and
which field of the position typing into it sets (`column.Column`). Input columns take their reading rules from
`book.fields`; a new computed column is one more entry in COLUMNS.
"""

from __future__ import annotations

import numpy as np

from spreadgui.book.fields import BY_KEY
from spreadgui.pricing.methods import METHODS, Method
from spreadgui.valuation.column import Column
from spreadgui.valuation.column_making import (
    computed,
    entered,
    expiry_words,
    for_position,
    gap,
    gap_share,
    guess_band,
    guess_share,
    implied_distance,
    implied_word,
    of_input,
    of_output,
    own_mark,
    position_premium_gap,
    premium_gap,
    reason,
    row_method,
    state_word,
    worded,
)
from spreadgui.valuation.trust import row_words


def _by_method() -> list[Column]:
    return [
        computed(
            method.key,
            method.name,
            f"Unit value by {method.name}. {method.applies}",
            of_output(method.key),
            "unit value",
        )
        for method in METHODS
    ]


def _gaps() -> list[Column]:
    return [column for method in METHODS if not method.reference for column in _gaps_of(method)]


def _gaps_of(method: Method) -> list[Column]:
    """In money and in per cent of premium; the screen has the two methods that a desk is most likely to quote."""
    shown = method.key in ("kirk", "bjerksund_stensland")
    about = f"Formula gap: the unit value by {method.name} minus the Yardstick's"
    money, share = f"{method.key}_gap", f"{method.key}_gap_share"
    heading = f"{method.name} gap"
    return [
        computed(money, heading, f"{about}.", gap(method.key), "unit value", decimals=5, on_screen=shown,
                 gap_of=method.key),
        computed(
            share, heading, f"{about}, in per cent of the Yardstick's.", gap_share(method.key), "% of premium",
            scale=100.0, decimals=3, on_screen=shown, gap_of=method.key,
        ),
    ]  # fmt: skip


# key, heading, position's heading on screens, screen scaling, words for the scaling, help
_SENSITIVITIES = (
    ("delta_long", "Delta long", 1.0, "units", "Change of value per 1.00 of the long market's forward."),
    ("delta_short", "Delta short", 1.0, "units", "Change of value per 1.00 of the short market's forward."),
    ("gamma_long", "Gamma long", 1.0, "units per 1.00", "Change of the long delta per 1.00 of the long forward."),
    ("gamma_short", "Gamma short", 1.0, "units per 1.00", "Change of the short delta per 1.00 of the short forward."),
    ("gamma_cross", "Cross-gamma", 1.0, "units per 1.00", "Change of the long delta per 1.00 of the short forward."),
    ("vega_long", "Vega long", 0.01, "per 1 vol point",
     "Change of value per point of the long leg's volatility, per 1.00 of an absolute one."),
    ("vega_short", "Vega short", 0.01, "per 1 vol point",
     "Change of value per point of the short leg's volatility, per 1.00 of an absolute one."),
    ("correlation_sensitivity", "Correlation sensitivity", 0.01, "per 0.01", "Change of value per 0.01 of it."),
    ("theta", "Theta", 1 / 365, "per calendar day",
     "Change of value as one calendar day passes, forwards, volatilities and zero rate standing still."),
)  # fmt: skip


def _position_sensitivities() -> list[Column]:
    return [
        computed(
            f"position_{key}",
            heading,
            f"{about} For the whole position, by the book's method.",
            for_position(key),
            unit,
            scale=scale,
            decimals=2 if key.startswith("gamma") else 0,
        )
        for key, heading, scale, unit, about in _SENSITIVITIES
    ]


def _unit_sensitivities() -> list[Column]:
    return [
        computed(
            key,
            heading,
            f"{about} Per unit of payoff, by the book's method.",
            of_output(key),
            unit,
            scale=scale,
            decimals=5,
            on_screen=False,
        )
        for key, heading, scale, unit, about in _SENSITIVITIES
    ]


def _daily_vegas() -> list[Column]:
    return [
        computed(
            f"{whole}daily_vega_{side}", f"Daily vega {side}",
            f"Change of value per point of the {side} leg's daily volatility, which rules inside the delivery month of "
            f"a strip. {'For the whole position' if whole else 'Per unit of payoff'}.",
            (for_position if whole else of_output)(f"daily_vega_{side}"),
            "per 1 vol point", scale=0.01, decimals=0 if whole else 5, on_screen=False,
        )
        for side in ("long", "short")
        for whole in ("", "position_")
    ]  # fmt: skip


def _implied() -> list[Column]:
    """What the quoted premium says."""
    return [
        computed("premium_gap", "Premium less value", "The quoted premium less the unit value.", premium_gap,
                 "unit value"),
        computed("position_premium_gap", "Premium less value",
                 "Signed quantity times the quoted premium less the unit value.", position_premium_gap, "{currency}",
                 decimals=0),
        computed("implied_correlation", "Implied correlation",
                 "The correlation at which the Yardstick (for normal forwards Bachelier) gives the quoted premium.",
                 of_output("implied_correlation"), "%", scale=100.0, decimals=2),
        computed("implied_distance", "Implied less marked",
                 "The implied correlation less the one the row is valued with.", implied_distance, "points",
                 scale=100.0, decimals=2),
        computed("implied_correlation_error", "Implied, error bar",
                 "How far the implied correlation may be off, either way: the last digit quoted over the sensitivity.",
                 of_output("implied_correlation_error"), "± points", scale=100.0, decimals=2),
        Column("implied_status", "Implied status",
               "Solved; below the floor or above the ceiling of any correlation; or not identified by the premium.",
               words=implied_word, computed=True),
    ]  # fmt: skip


def _guesses() -> list[Column]:
    """What an estimated correlation leaves open."""
    return [
        computed("position_guess_low", "Value, correlation lower",
                 "The position's value with its estimated correlation one standard error lower.",
                 for_position("guess_low"), "{currency}", decimals=0),
        computed("position_guess_high", "Value, correlation higher",
                 "The position's value with its estimated correlation one standard error higher.",
                 for_position("guess_high"), "{currency}", decimals=0),
        computed("guess_band", "Cost of the guess", "How far the two are apart.", guess_band, "{currency}", decimals=0),
        computed("guess_band_share", "Cost of the guess", "How far the two are apart, in per cent of the value.",
                 guess_share, "% of premium", scale=100.0, decimals=2),
    ]  # fmt: skip


COLUMNS: tuple[Column, ...] = (
    worded("name", pinned=True),
    computed("position_value", "Value", "Quantity times unit value; below zero for what the desk owes.",
             for_position("value"), "{currency}", decimals=0, pinned=True),
    worded("side"),
    worded("kind"),
    entered("quantity", "payoff units", 3, 0, lambda slate, _results, rows: np.abs(slate.values("quantity")[rows])),
    Column("unit", "Unit", "What the payoff is quoted in: the unit of the long leg's market.",
           words=lambda slate, _results, row: slate.units[row]),
    worded("long_leg"),
    worded("long_delivery"),
    entered("long_ratio", "×", 6, 2, of_input("ratio_long")),
    worded("short_leg"),
    worded("short_delivery"),
    entered("short_ratio", "×", 6, 2, of_input("ratio_short")),
    entered("strike", "payoff unit", 6, 2, of_input("strike")),
    Column("expiry", BY_KEY["expiry"].heading, BY_KEY["expiry"].help, field=BY_KEY["expiry"], words=expiry_words),
    worded("exercise"),
    own_mark("forward_long", "own_forward_long", "market unit", 1.0, 6, 2),
    own_mark("forward_short", "own_forward_short", "market unit", 1.0, 6, 2),
    own_mark("vol_long", "own_vol_long", "% a year", 100.0, 6, 1),
    own_mark("vol_short", "own_vol_short", "% a year", 100.0, 6, 1),
    own_mark("correlation", "own_correlation", "%", 100.0, 6, 1),
    Column("years", "Years", "Time from the valuation date to the expiry, actual days over 365.", "ACT/365F",
           numbers=of_input("years"), decimals=3),
    Column("discount", "Discount factor", "Value today of one unit of money at the expiry.", "",
           numbers=of_input("discount"), decimals=5),
    Column("rate", "Zero rate", "The zero rate to the expiry, from the book's curve or its flat rate.", "% a year",
           numbers=of_input("rate"), scale=100.0, decimals=4, least_decimals=2),
    *_by_method(),
    computed("yardstick_error", "Yardstick error",
             "What the Yardstick knows of its own error: its unit value is off by no more.",
             of_output("yardstick_error"), "unit value", decimals=14, on_screen=False),
    *_gaps(),
    Column("formula_check", "Formula check",
           "The closed forms whose gap is beyond the book's tolerance, and whether the value rests on one.",
           words=row_words, computed=True),
    entered("quoted_premium", "unit value", 6, 2, of_input("quoted_premium")),
    *_implied(),
    *_guesses(),
    *_position_sensitivities(),
    computed("position_rate_sensitivity", "Rate sensitivity",
             "Change of value per 0.01 of the zero rate, for the whole position; the forwards stand still.",
             for_position("rate_sensitivity"), "per 0.01", scale=0.01, decimals=0),
    *_unit_sensitivities(),
    *_daily_vegas(),
    worded("note"),
    Column("state", "State", "Current, pricing, incomplete or refused.", words=state_word),
    Column("reason", "Reason", "Why the row is incomplete or refused.", words=reason),
    Column("method", "Method", "The method of the value and the sensitivities.", words=row_method, on_screen=False),
)  # fmt: skip

BY_COLUMN_KEY: dict[str, Column] = {column.key: column for column in COLUMNS}
SCREEN_COLUMNS: tuple[Column, ...] = tuple(column for column in COLUMNS if column.on_screen)
VALUE_TABLE: tuple[str, ...] = (
    "name", "side", "kind", "quantity", "unit", "long_leg", "long_delivery", "long_ratio",
    "short_leg", "short_delivery", "short_ratio", "strike", "expiry", "exercise",
    "forward_long", "forward_short", "vol_long", "vol_short", "correlation", "years", "discount", "rate",
    *(method.key for method in METHODS), "yardstick_error",
    "method", "position_value",
    *(key for key, *_ in _SENSITIVITIES),
    *(f"position_{key}" for key, *_ in _SENSITIVITIES), "position_rate_sensitivity",
    *(f"{whole}daily_vega_{side}" for whole in ("", "position_") for side in ("long", "short")),
    *(f"{method.key}_gap{kind}" for method in METHODS if not method.reference for kind in ("", "_share")),
    "formula_check", "quoted_premium", "premium_gap", "position_premium_gap", "implied_correlation",
    "implied_distance", "implied_correlation_error", "implied_status",
    "position_guess_low", "position_guess_high", "guess_band", "guess_band_share",
    "state", "reason",
)  # fmt: skip
