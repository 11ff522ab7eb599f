"""Prices rows of a slate: the one place where the book's numbers meet the formulas."""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator
from concurrent.futures import Executor, Future

import numpy as np

from spreadgui.market.contracts import Law, Shape
from spreadgui.pricing import bachelier, black76, yardstick
from spreadgui.pricing.methods import LOGNORMAL_METHODS, Method
from spreadgui.pricing.methods import method as method_of
from spreadgui.pricing.results import Sensitivities
from spreadgui.valuation.exercises import Exercises, expand
from spreadgui.valuation.group import Group, groups
from spreadgui.valuation.guesses import guess
from spreadgui.valuation.quoted import imply
from spreadgui.valuation.results import NEEDED, OUTPUTS, SENSITIVITIES, Part, output_row
from spreadgui.valuation.slate import FloatArray, RowArray, Slate

CHUNK_ROWS = 8192
# So many chunks are handed to an executor at once: enough to keep a few workers busy, few enough to stop soon.
CHUNKS_AHEAD = 4
_OUT_OF_REACH = "the value is out of the machine's reach; look for a slip in the forwards, volatilities or ratios"


def chunks(rows: RowArray, size: int = CHUNK_ROWS) -> Iterator[RowArray]:
    """`rows` cut into runs of at most `size`, in order."""
    return (rows[start : start + size] for start in range(0, len(rows), size))


def price_parts(slate: Slate, rows: RowArray, executor: Executor | None = None) -> Iterator[Part]:
    """`rows` in parts, in order, each as soon as it is there; with an `executor` the chunks are mapped over it.

    Whoever stops iterating stops the pricing: what has not been begun by then is dropped.
    """
    waiting: deque[Future[Part]] = deque()
    cut = chunks(rows)
    try:
        for some in cut:
            if executor is None:
                yield price_rows(slate, some)
                continue
            waiting.append(executor.submit(price_rows, slate, some))
            if len(waiting) == CHUNKS_AHEAD:
                yield waiting.popleft().result()
        while waiting:
            yield waiting.popleft().result()
    finally:
        for future in waiting:
            future.cancel()


def price_rows(slate: Slate, rows: RowArray, executor: Executor | None = None) -> Part:
    """Values by every method of each row's law, and the sensitivities, for `rows`, which must be ready.

    The sensitivities are those of the book's method, of Bachelier's where the forwards are normal. With an `executor`
    the formulas map their blocks over it. Rows whose value overflows are refused with a sentence, never shown as
    infinity.
    """
    with np.errstate(all="ignore"):  # what runs over is refused below; a warning would reach nobody but the console
        lines = expand(slate, rows)
        found = lines.gathered(price_lines(slate, lines, executor))
        found[output_row("theta")] += found[output_row("carry")]
        imply(slate, rows, found, executor)
        guess(slate, rows, found, executor)
    refused = _refuse_unreachable(rows, found)
    for array in (found, rows):
        array.setflags(write=False)
    return Part(slate.revision, rows, found, refused)


def price_lines(slate: Slate, lines: Exercises, executor: Executor | None = None) -> FloatArray:
    """Outputs by exercise, (len(OUTPUTS), lines): what the formulas say of each with what it was given."""
    outputs = np.full((len(OUTPUTS), len(lines.owner)), np.nan)
    with np.errstate(over="ignore", invalid="ignore"):
        for members, group in groups(lines):
            outputs[:, members] = _price_group(group, method_of(slate.book.method), executor)
    return outputs


def _price_group(group: Group, chosen: Method, executor: Executor | None) -> FloatArray:
    outputs = np.full((len(OUTPUTS), len(group["strike"])), np.nan)
    if group.kind == "forward":
        _price_forwards(group, outputs)
    elif group.shape is not Shape.SPREAD:
        _price_outrights(group, outputs)
    elif group.law is Law.NORMAL:
        _price_normal_spreads(group, outputs, executor)
    else:
        _price_spreads(group, chosen, outputs, executor)
    value = outputs[output_row("value")]
    outputs[output_row("rate_sensitivity")] = -group["years"] * value
    # The formulas hold the discount factor; as a day passes it moves by the zero rate to the expiry.
    outputs[output_row("carry")] = group["rate"] * value
    return outputs


def _price_spreads(group: Group, chosen: Method, outputs: FloatArray, executor: Executor | None) -> None:
    arguments = group.spread_arguments
    for method in LOGNORMAL_METHODS:
        covered = method.accepts(arguments[2])
        if method is chosen or method.reference or not covered.any():
            continue
        cut = arguments if covered.all() else tuple(argument[covered] for argument in arguments)
        outputs[output_row(method.key), covered] = method.value(*cut, kind=group.kind, executor=executor)
    if chosen.reference:
        sensitivities, error = yardstick.sensitivities_with_error(*arguments, kind=group.kind, executor=executor)
    else:
        sensitivities = chosen.sensitivities(*arguments, kind=group.kind, executor=executor)
        reference, error = yardstick.estimate(*arguments, kind=group.kind, executor=executor)
        outputs[output_row("yardstick")] = reference
    outputs[output_row("yardstick_error")] = error
    outputs[output_row(chosen.key)] = sensitivities.value
    _take_sensitivities(group, outputs, sensitivities, 1.0, 1.0)


def _price_normal_spreads(group: Group, outputs: FloatArray, executor: Executor | None) -> None:
    sensitivities = bachelier.sensitivities(*group.spread_arguments, kind=group.kind, executor=executor)
    outputs[output_row("bachelier")] = sensitivities.value
    _take_sensitivities(group, outputs, sensitivities, group["ratio_long"], group["ratio_short"])


def _take_sensitivities(
    group: Group,
    outputs: FloatArray,
    found: Sensitivities,
    vol_long: FloatArray | float,
    vol_short: FloatArray | float,
) -> None:
    """By the chain rule, from the folded forwards (and absolute volatilities, folded alike) to the markets' own."""
    long, short = group["ratio_long"], group["ratio_short"]
    factors = (long, short, long**2, short**2, long * short, vol_long, vol_short, 1.0, 1.0)
    outputs[output_row("value")] = found.value
    for key, factor in zip(SENSITIVITIES, factors, strict=True):
        outputs[output_row(key)] = factor * getattr(found, key)


def _price_outrights(group: Group, outputs: FloatArray) -> None:
    """One leg: Black-76, under a normal law Bachelier. A short leg alone, paying max(-F - K, 0), is a put on it struck
    at -K, and the other way."""
    side, kind, strike = ("long", group.kind, group["strike"])
    if group.shape is Shape.SHORT_LEG_ONLY:
        side, kind, strike = ("short", "put" if kind == "call" else "call", -strike)
    ratio = group[f"ratio_{side}"]
    formula = black76.sensitivities if group.law is Law.LOGNORMAL else bachelier.outright_sensitivities
    found = formula(
        group.forward(side), strike + ratio * group[f"shift_{side}"], group.vol(side),
        group["years"], group["discount"], kind=kind,
    )  # fmt: skip
    _every_method(group, outputs, found.value)
    for key in SENSITIVITIES:
        outputs[output_row(key)] = 0.0
    outputs[output_row(f"delta_{side}")] = ratio * found.delta
    outputs[output_row(f"gamma_{side}")] = ratio**2 * found.gamma
    outputs[output_row(f"vega_{side}")] = found.vega * (1.0 if group.law is Law.LOGNORMAL else ratio)
    outputs[output_row("theta")] = found.theta


def _price_forwards(group: Group, outputs: FloatArray) -> None:
    """The difference itself needs no volatility; a leg that is not there counts nothing."""
    signs = {"long": 1.0, "short": -1.0}
    if group.shape is not Shape.SPREAD:
        del signs["short" if group.shape is Shape.LONG_LEG_ONLY else "long"]
    difference = -group["strike"]
    outputs[[output_row(key) for key in SENSITIVITIES]] = 0.0
    for side, sign in signs.items():
        difference = difference + sign * group[f"ratio_{side}"] * group[f"forward_{side}"]
        outputs[output_row(f"delta_{side}")] = sign * group[f"ratio_{side}"] * group["discount"]
    _every_method(group, outputs, group["discount"] * difference)


def _every_method(group: Group, outputs: FloatArray, value: FloatArray) -> None:
    """One value that all methods agree on by construction; a method still speaks only for the strikes it accepts."""
    outputs[output_row("value")] = value
    for method in group.methods:
        outputs[output_row(method.key)] = np.where(method.accepts(group["strike"]), value, np.nan)


def _refuse_unreachable(rows: RowArray, outputs: FloatArray) -> dict[int, str]:
    needed = outputs[NEEDED]
    unreachable = ~np.isfinite(needed).all(axis=0)
    outputs[:, unreachable] = np.nan
    return {int(row): _OUT_OF_REACH for row in rows[unreachable]}
