"""How columns are read from slate and results, and the few kinds of column that the register is made of."""

from __future__ import annotations

import math

import numpy as np

from spreadgui.book.fields import BY_KEY
from spreadgui.valuation.column import Column, Numbers, Rows, Words
from spreadgui.valuation.naming import value_method
from spreadgui.valuation.results import IMPLIED_WORDS, LiveResults, State
from spreadgui.valuation.slate import FloatArray, Slate
from spreadgui.valuation.trust import gap_shares


def field_words(key: str) -> Words:
    """A field of the position as its entry writes it."""
    entry = BY_KEY[key].entry
    return lambda slate, _results, row: entry.text(getattr(slate.book.positions[row], key))


def of_input(key: str) -> Numbers:
    """One of slate.INPUTS."""
    return lambda slate, _results, rows: slate.values(key)[rows]


def of_output(key: str) -> Numbers:
    """One of results.OUTPUTS, per unit of payoff."""
    return lambda _slate, results, rows: results.values(key)[rows]


def for_position(key: str) -> Numbers:
    """One of results.OUTPUTS times the signed quantity."""
    return lambda slate, results, rows: slate.values("quantity")[rows] * results.values(key)[rows]


def gap(key: str) -> Numbers:
    """A method's unit value minus the Yardstick's."""
    return lambda _slate, results, rows: results.values(key)[rows] - results.values("yardstick")[rows]


def gap_share(key: str) -> Numbers:
    """The same as a decimal of the Yardstick's."""
    return lambda slate, results, rows: gap_shares(key, slate, results, rows)


def premium_gap(slate: Slate, results: LiveResults, rows: Rows) -> FloatArray:
    """The quoted premium less the unit value."""
    found: FloatArray = slate.values("quoted_premium")[rows] - results.values("value")[rows]
    return found


def position_premium_gap(slate: Slate, results: LiveResults, rows: Rows) -> FloatArray:
    """The same for the signed quantity."""
    found: FloatArray = slate.values("quantity")[rows] * premium_gap(slate, results, rows)
    return found


def implied_distance(slate: Slate, results: LiveResults, rows: Rows) -> FloatArray:
    """The implied correlation less the one in use."""
    found: FloatArray = results.values("implied_correlation")[rows] - slate.values("correlation")[rows]
    return found


def guess_band(slate: Slate, results: LiveResults, rows: Rows) -> FloatArray:
    """How far the position's value is apart between the two ends of an estimated correlation."""
    apart = results.values("guess_high")[rows] - results.values("guess_low")[rows]
    found: FloatArray = np.abs(slate.values("quantity")[rows] * apart)
    return found


def guess_share(_slate: Slate, results: LiveResults, rows: Rows) -> FloatArray:
    """The same as a part of the premium."""
    value = results.values("value")[rows]
    apart = results.values("guess_high")[rows] - results.values("guess_low")[rows]
    with np.errstate(divide="ignore", invalid="ignore"):
        found: FloatArray = np.where(value > 0.0, np.abs(apart) / value, np.nan)
    return found


def implied_word(_slate: Slate, results: LiveResults, row: int) -> str:
    """What became of a quoted premium; empty without one."""
    code = float(results.values("implied_status")[row])
    return IMPLIED_WORDS[int(code)] if math.isfinite(code) else ""


def expiry_words(slate: Slate, _results: LiveResults, row: int) -> str:
    """The day, or of a strip the first and the last of those still to come."""
    strip = slate.strips.get(row)
    if strip is None:
        return field_words("expiry")(slate, _results, row)
    return f"{strip.expiries[0]} to {strip.expiries[-1]}"


def worded(key: str, *, unit: str = "", pinned: bool = False) -> Column:
    """The column of a field that is words."""
    field = BY_KEY[key]
    return Column(key, field.heading, field.help, unit, field, words=field_words(key), pinned=pinned)


def entered(key: str, unit: str, decimals: int, least: int, numbers: Numbers) -> Column:
    """The column of a field that is a number."""
    field = BY_KEY[key]
    return Column(key, field.heading, field.help, unit, field, numbers=numbers, decimals=decimals, least_decimals=least)


def own_mark(key: str, field_key: str, unit: str, scale: float, decimals: int, least: int) -> Column:
    """The column of a mark: what the row uses, the book's or its own."""
    field = BY_KEY[field_key]
    return Column(
        key, field.heading, field.help, unit, field,
        numbers=of_input(key), scale=scale, decimals=decimals, least_decimals=least,
        vol_of=key.removeprefix("vol_") if key.startswith("vol_") else "",
    )  # fmt: skip


def computed(
    key: str, heading: str, help: str, numbers: Numbers, unit: str = "", *, scale: float = 1.0, decimals: int = 4,
    pinned: bool = False, on_screen: bool = True, gap_of: str = "",
) -> Column:  # fmt: skip
    """A column of numbers that follow from pricing."""
    return Column(
        key, heading, help, unit, numbers=numbers, scale=scale, decimals=decimals,
        computed=True, pinned=pinned, on_screen=on_screen, vol_of=key.rpartition("vega_")[2] if "vega_" in key else "",
        gap_of=gap_of,
    )  # fmt: skip


def state_word(_slate: Slate, results: LiveResults, row: int) -> str:
    """The state of a row."""
    state = State(int(results.state[row]))
    return state.word


def reason(_slate: Slate, results: LiveResults, row: int) -> str:
    """Why a row has no price."""
    return results.reason(row)


def row_method(slate: Slate, _results: LiveResults, row: int) -> str:
    """What the value of a row comes from."""
    return value_method(slate, row)
