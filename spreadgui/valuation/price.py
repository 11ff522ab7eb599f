"""Prices rows of a slate: the one place where the book's numbers meet the formulas."""

from __future__ import annotations

from collections.abc import Iterator
from concurrent.futures import Executor
from dataclasses import dataclass

import numpy as np

from spreadgui.market.contracts import Shape
from spreadgui.pricing import black76
from spreadgui.pricing.methods import METHODS, Method
from spreadgui.pricing.methods import method as method_of
from spreadgui.valuation.reach import within_reach
from spreadgui.valuation.results import OUTPUTS, SENSITIVITIES, Part, output_row
from spreadgui.valuation.slate import INPUTS, KINDS, FloatArray, RowArray, Slate

CHUNK_ROWS = 8192
_OUT_OF_REACH = "the value is out of the machine's reach; look for a slip in the forwards, volatilities or ratios"


@dataclass(frozen=True)
class _Group:
    """Rows that one call of a formula can take: of one kind and one shape. All arrays are cut to these rows."""

    kind: str
    shape: Shape
    inputs: dict[str, FloatArray]

    def __getitem__(self, key: str) -> FloatArray:
        return self.inputs[key]

    @property
    def spread_arguments(self) -> tuple[FloatArray, ...]:
        """What every two-leg method takes, the ratios folded into the forwards."""
        return (
            self["ratio_long"] * self["forward_long"],
            self["ratio_short"] * self["forward_short"],
            *(self[key] for key in ("strike", "vol_long", "vol_short", "correlation", "years", "discount")),
        )


def chunks(rows: RowArray, size: int = CHUNK_ROWS) -> Iterator[RowArray]:
    """`rows` cut into runs of at most `size`, in order."""
    return (rows[start : start + size] for start in range(0, len(rows), size))


def price_rows(slate: Slate, rows: RowArray, executor: Executor | None = None) -> Part:
    """Values by every method and the sensitivities of the book's method for `rows`, which must be ready.

    With an `executor` the formulas map their blocks over it. Rows whose value overflows are refused with a sentence,
    never shown as infinity.
    """
    outputs = np.full((len(OUTPUTS), len(rows)), np.nan)
    inputs = slate.inputs[:, rows]
    kinds, shapes = slate.kind[rows], slate.shape[rows]
    reachable = within_reach(dict(zip(INPUTS, inputs, strict=True)), kinds == KINDS.index("forward"))
    for code, kind in enumerate(KINDS):
        for shape in Shape:
            members = np.flatnonzero((kinds == code) & (shapes == shape) & reachable)
            if members.size:
                group = _Group(kind, shape, dict(zip(INPUTS, inputs[:, members], strict=True)))
                outputs[:, members] = _price_group(group, method_of(slate.book.method), executor)
    outputs[output_row("theta")] += slate.book.zero_rate * outputs[output_row("value")]
    refused = _refuse_unreachable(rows, outputs)
    for array in (outputs, rows):
        array.setflags(write=False)
    return Part(slate.revision, rows, outputs, refused)


def _price_group(group: _Group, chosen: Method, executor: Executor | None) -> FloatArray:
    outputs = np.full((len(OUTPUTS), len(group["strike"])), np.nan)
    with np.errstate(over="ignore", invalid="ignore"):
        if group.kind == "forward":
            _price_forwards(group, outputs)
        elif group.shape is Shape.SPREAD:
            _price_spreads(group, chosen, outputs, executor)
        else:
            _price_outrights(group, outputs)
    return outputs


def _price_spreads(group: _Group, chosen: Method, outputs: FloatArray, executor: Executor | None) -> None:
    arguments = group.spread_arguments
    for method in METHODS:
        if method is chosen:
            continue
        covered = method.accepts(group["strike"])
        if covered.any():
            cut = arguments if covered.all() else tuple(argument[covered] for argument in arguments)
            outputs[output_row(method.key), covered] = method.value(*cut, kind=group.kind, executor=executor)
    sensitivities = chosen.sensitivities(*arguments, kind=group.kind, executor=executor)
    outputs[output_row(chosen.key)] = outputs[output_row("value")] = sensitivities.value
    for key, factor in zip(SENSITIVITIES, _ratio_factors(group["ratio_long"], group["ratio_short"]), strict=True):
        outputs[output_row(key)] = factor * getattr(sensitivities, key)


def _ratio_factors(long: FloatArray, short: FloatArray) -> tuple[FloatArray | float, ...]:
    """By the chain rule, from the folded forwards to the markets' own, in the order of SENSITIVITIES."""
    return long, short, long**2, short**2, long * short, 1.0, 1.0, 1.0, 1.0


def _price_outrights(group: _Group, outputs: FloatArray) -> None:
    """One leg: Black-76. A short leg alone, paying max(-F - K, 0), is a put on it struck at -K, and the other way."""
    side, kind, strike = ("long", group.kind, group["strike"])
    if group.shape is Shape.SHORT_LEG_ONLY:
        side, kind, strike = ("short", "put" if kind == "call" else "call", -strike)
    ratio = group[f"ratio_{side}"]
    found = black76.sensitivities(
        ratio * group[f"forward_{side}"], strike, group[f"vol_{side}"], group["years"], group["discount"], kind=kind
    )
    _every_method(outputs, group["strike"], found.value)
    for key in SENSITIVITIES:
        outputs[output_row(key)] = 0.0
    outputs[output_row(f"delta_{side}")] = ratio * found.delta
    outputs[output_row(f"gamma_{side}")] = ratio**2 * found.gamma
    outputs[output_row(f"vega_{side}")] = found.vega
    outputs[output_row("theta")] = found.theta


def _price_forwards(group: _Group, outputs: FloatArray) -> None:
    """The difference itself needs no volatility; a leg that is not there counts nothing."""
    signs = {"long": 1.0, "short": -1.0}
    if group.shape is not Shape.SPREAD:
        del signs["short" if group.shape is Shape.LONG_LEG_ONLY else "long"]
    difference = -group["strike"]
    outputs[[output_row(key) for key in SENSITIVITIES]] = 0.0
    for side, sign in signs.items():
        difference = difference + sign * group[f"ratio_{side}"] * group[f"forward_{side}"]
        outputs[output_row(f"delta_{side}")] = sign * group[f"ratio_{side}"] * group["discount"]
    _every_method(outputs, group["strike"], group["discount"] * difference)


def _every_method(outputs: FloatArray, strike: FloatArray, value: FloatArray) -> None:
    """One value that all methods agree on by construction; a method still speaks only for the strikes it accepts."""
    outputs[output_row("value")] = value
    for method in METHODS:
        outputs[output_row(method.key)] = np.where(method.accepts(strike), value, np.nan)


def _refuse_unreachable(rows: RowArray, outputs: FloatArray) -> dict[int, str]:
    needed = outputs[output_row("value") :]
    unreachable = ~np.isfinite(needed).all(axis=0)
    outputs[:, unreachable] = np.nan
    return {int(row): _OUT_OF_REACH for row in rows[unreachable]}
