"""Lines of a slate that one call of a formula can take, with ratios and shifts folded in."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import product

import numpy as np

from spreadgui.market.contracts import Law, Shape
from spreadgui.pricing.methods import LOGNORMAL_METHODS, NORMAL_METHODS, Method
from spreadgui.valuation.exercises import Exercises
from spreadgui.valuation.reach import within_reach
from spreadgui.valuation.slate import INPUTS, KINDS, FloatArray, RowArray


@dataclass(frozen=True)
class Group:
    """Lines that one call of a formula can take: of one kind, shape and law. All arrays are cut to these lines."""

    kind: str
    shape: Shape
    law: Law
    inputs: dict[str, FloatArray]

    def __getitem__(self, key: str) -> FloatArray:
        return self.inputs[key]

    @property
    def methods(self) -> tuple[Method, ...]:
        """Those that speak of forwards that move like these."""
        return LOGNORMAL_METHODS if self.law is Law.LOGNORMAL else NORMAL_METHODS

    def forward(self, side: str) -> FloatArray:
        """A leg's forward with its shift, the ratio folded in."""
        return self[f"ratio_{side}"] * (self[f"forward_{side}"] + self[f"shift_{side}"])

    def vol(self, side: str) -> FloatArray:
        """A leg's volatility; an absolute one grows with the ratio."""
        vol = self[f"vol_{side}"]
        return vol if self.law is Law.LOGNORMAL else self[f"ratio_{side}"] * vol

    @property
    def spread_arguments(self) -> tuple[FloatArray, ...]:
        """What every two-leg method takes: ratios and shifts folded into forwards, strike and absolute volatilities."""
        return (
            self.forward("long"),
            self.forward("short"),
            formula_strike(self.inputs),
            self.vol("long"),
            self.vol("short"),
            *(self[key] for key in ("correlation", "years", "discount")),
        )


STRIKE_INPUTS = ("strike", "ratio_long", "shift_long", "ratio_short", "shift_short")


def formula_strike(columns: Mapping[str, FloatArray]) -> FloatArray:
    """The strike that a two-leg method is given beside shifted forwards: by as much higher as their difference is.

    `columns` has STRIKE_INPUTS, arrays of one shape. Without shifts it is the strike, to the last digit.
    """
    lifted = columns["ratio_long"] * columns["shift_long"] - columns["ratio_short"] * columns["shift_short"]
    return columns["strike"] + lifted


def groups(lines: Exercises) -> Iterator[tuple[RowArray, Group]]:
    """The lines within the formulas' reach, by kind, shape and law: where they stand, and what they hold."""
    columns = dict(zip(INPUTS, lines.inputs, strict=True))
    reachable = within_reach(columns, lines.kind == KINDS.index("forward"), lines.law == Law.NORMAL)
    for (code, kind), shape, law in product(enumerate(KINDS), Shape, Law):
        members = np.flatnonzero((lines.kind == code) & (lines.shape == shape) & (lines.law == law) & reachable)
        if members.size:
            yield members, Group(kind, shape, law, {key: column[members] for key, column in columns.items()})
