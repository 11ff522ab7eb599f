"""What a quoted premium implies: the correlation of the legs, or the volatility of their spread.

**Implied correlation.** The true value falls strictly as the correlation grows, so that a premium between V(+1) and
V(-1) belongs to one correlation. A premium is first turned into the undiscounted value of the option out of the money
(put-call parity; where that is the put, the call on the legs swapped round with the strike turned, which is the same
thing), since there no digits hide behind the intrinsic value. Bjerksund-Stensland's formula, cheap and never above
the true value, is inverted first; from there the Yardstick, with its exact derivative, takes over in the same
safeguarded search (`implied_search`).

**What a correlation is worth.** The error bar is the price tolerance over the sensitivity, the smallest sensitivity
within the bar (so that a bar that reaches where the value flattens is as long as that makes it); either way from the
correlation, up to the far end of -1..1 where that says no more. It is a local statement: with premiums rounded to
0.01 the truth lay outside the bar in 120 of 17,136 solved quotes (0.7 %) of a hard box, by up to five bars where the
slope falls by far within a long one, and in 4 of 39,922 of an ordinary box. A quote whose value moves by less than
`LEAST_SLOPE` of the larger forward per 1.0 of correlation, or whose bar is one or longer, does not identify its
correlation: the one found is handed back, but its status says so. Without time or volatility in a leg or a discount
factor, or for a forward, the correlation has no say and is NaN.

**Implied spread volatility** is the volatility of the price difference in price units (normal, as in Bachelier's
formula), not a lognormal one: a spread can be zero or negative, and two options on one pair of legs are compared by
the width of one and the same price difference (common practice, no source). It needs no volatilities and no
correlation of the legs.

For shifted lognormal legs give the forwards and the strike of `shifted.arguments`.
"""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import Executor
from enum import StrEnum
from typing import NamedTuple, TypeVar

import numpy as np
from numpy.typing import ArrayLike, NDArray

from spreadgui.pricing import bachelier, bjerksund_stensland, kirk, margrabe, normal_option, yardstick
from spreadgui.pricing.implied_quotes import Mask, Quotes, Rows, turned
from spreadgui.pricing.implied_search import ADRIFT, HIGH_END, INSIDE, LOW_END, Evaluate, Found, Goal, search
from spreadgui.pricing.inputs import Array, check_kind, spread_columns
from spreadgui.pricing.results import Sensitivities

Words = NDArray[np.str_]
Scalar = TypeVar("Scalar", bound=np.generic)

LEAST_SLOPE = 1e-6
# In units of the larger forward: what the search leaves, and what a value's own rounding may be.
PRECISION = 2e-13
ROUNDING = 2e-15
FIRST_PRECISION = 1e-6
FIRST_ROUNDS = 12
BAR_ROUNDS = 3
# How far within an end the value is looked at to see whether a premium at that end says anything.
INWARD = 1e-4

METHODS: dict[str, Callable[..., Sensitivities]] = {
    "yardstick": yardstick.sensitivities,
    "bjerksund_stensland": bjerksund_stensland.sensitivities,
    "kirk": kirk.sensitivities,
    "margrabe": margrabe.sensitivities,
    "bachelier": bachelier.sensitivities,
}


class Status(StrEnum):
    """What became of a quote. Status arrays hold these words as strings, so that both a member and its words
    compare."""

    SOLVED = "solved"
    BELOW_FLOOR = "below floor"
    ABOVE_CEILING = "above ceiling"
    NOT_IDENTIFIED = "not identified"


_WORDS = f"<U{max(map(len, Status))}"


class ImpliedCorrelation(NamedTuple):
    """Each of the quotes' broadcast shape. `error_bar` is one-sided, infinite where there is nothing to be found and
    NaN where the quote is out of reach; `evaluations` counts the method's own (for the Yardstick without the closed
    form's)."""

    correlation: Array
    status: Words
    error_bar: Array
    evaluations: NDArray[np.intp]


class ImpliedVolatility(NamedTuple):
    """Each of the quotes' broadcast shape; the volatility and its one-sided error bar in price per square root of a
    year."""

    volatility: Array
    status: Words
    error_bar: Array


def _evaluator(quotes: Quotes, sensitivities: Callable[..., Sensitivities], executor: Executor | None) -> Evaluate:
    def evaluate(rows: Rows, correlation: Array) -> tuple[Array, Array]:
        some = quotes.only(rows)
        legs = (some.first, some.second, some.strike, some.vol_first, some.vol_second)
        found = sensitivities(*legs, correlation, some.expiry, executor=executor)
        return found.value, found.correlation_sensitivity

    return evaluate


def _goal(quotes: Quotes, precision: Array) -> Goal:
    moneyness = quotes.moneyness()
    return Goal(quotes.target, moneyness, precision, ROUNDING * quotes.size)


def _start(quotes: Quotes, method: str, executor: Executor | None) -> Array:
    """Where the search for the method begins: at the end for quotes with no time value; for the Yardstick where
    Bjerksund-Stensland's formula has the quote, near enough; for normal legs at the solution."""
    start = np.where(quotes.target > 0.0, 0.0, 1.0)
    if method == "yardstick":
        evaluate = _evaluator(quotes, bjerksund_stensland.sensitivities, executor)
        loose = FIRST_PRECISION * np.minimum(quotes.size, np.abs(quotes.target))
        start = search(evaluate, _goal(quotes, loose), start, FIRST_ROUNDS).correlation
    elif method == "bachelier":
        total = _deviations(quotes.target, quotes.moneyness()) / np.sqrt(quotes.expiry)
        gap = np.abs(quotes.vol_first - quotes.vol_second)
        there = 1.0 - (total - gap) / quotes.vol_first * ((total + gap) / quotes.vol_second) / 2.0
        start = np.where(np.isnan(there), start, np.clip(there, -1.0, 1.0))
    return start


def _bars(quotes: Quotes, found: Found, shape_of: Evaluate) -> Array:
    """Tolerance over the smallest slope within the bar. `shape_of`, a cheap method, says how the slope changes there;
    it is scaled to the slope where the search ended."""
    rows, at, slope = np.arange(found.slope.size), found.correlation, np.abs(found.slope)
    farthest = 1.0 + np.abs(at)
    with np.errstate(all="ignore"):
        linear = np.minimum(np.where(slope > 0.0, quotes.allowed() / slope, np.inf), farthest)
    bar, here = linear, np.abs(shape_of(rows, at)[1])
    for _ in range(BAR_ROUNDS):
        sides = [np.abs(shape_of(rows, np.clip(at + side * bar, -1.0, 1.0))[1]) for side in (-1.0, 1.0)]
        with np.errstate(all="ignore"):
            longer = linear / np.minimum(np.minimum(*sides) / here, 1.0)
        bar = np.minimum(np.maximum(bar, np.where(here > 0.0, longer, bar)), farthest)
    return bar


def _at_an_end(quotes: Quotes, found: Found, evaluate: Evaluate) -> tuple[Mask, Array]:
    """Rows whose target lies within the tolerance of an end of the reachable range while the value hardly moves there;
    and every row's slope, between the end and a little within it for those at an end."""
    outside = (found.outcome == LOW_END) | (found.outcome == HIGH_END)
    ended = np.flatnonzero(outside & (np.abs(found.gap) <= quotes.allowed()))
    slope, vague = found.slope.copy(), np.zeros(found.slope.shape, dtype=np.bool_)
    if ended.size:
        end = found.correlation[ended]
        inner, _ = evaluate(ended, end * (1.0 - INWARD))
        slope[ended] = (inner - (found.gap + quotes.target)[ended]) / (-INWARD * end)
        vague[ended] = np.abs(slope[ended]) < LEAST_SLOPE * quotes.size[ended]
        found.evaluations[ended] += 1
    return vague, slope


def _solve(quotes: Quotes, method: str, executor: Executor | None) -> ImpliedCorrelation:
    evaluate = _evaluator(quotes, METHODS[method], executor)
    cheap = bjerksund_stensland.sensitivities if method == "yardstick" else METHODS[method]
    found = search(evaluate, _goal(quotes, PRECISION * quotes.size), _start(quotes, method, executor))
    vague, slope = _at_an_end(quotes, found, evaluate)
    bar = _bars(quotes, found._replace(slope=slope), _evaluator(quotes, cheap, executor))
    adrift = found.outcome == ADRIFT
    inside = (found.outcome == INSIDE) | adrift
    vague |= adrift & (np.abs(found.gap) > quotes.allowed())
    vague |= inside & ((np.abs(slope) < LEAST_SLOPE * quotes.size) | (bar >= 1.0))
    status = np.select(
        [vague, found.outcome == LOW_END, found.outcome == HIGH_END],
        [Status.NOT_IDENTIFIED, Status.BELOW_FLOOR, Status.ABOVE_CEILING],
        Status.SOLVED,
    ).astype(_WORDS)
    known = inside | vague
    return ImpliedCorrelation(
        np.where(known, found.correlation, np.nan), status, np.where(known, bar, np.nan), found.evaluations
    )


def _placed(part: NDArray[Scalar], rows: Mask, otherwise: float | str, shape: tuple[int, ...]) -> NDArray[Scalar]:
    whole = np.full(rows.shape, otherwise, dtype=part.dtype)
    whole[rows] = part
    return whole.reshape(shape)


def _check_method(method: str) -> None:
    if not isinstance(method, str) or method not in METHODS:
        raise ValueError(f"method: expected one of {', '.join(METHODS)}, found {method!r}")


def correlation_with_error(
    premium: ArrayLike,
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
    method: str = "yardstick",
    tolerance: ArrayLike | None = None,
    executor: Executor | None = None,
) -> ImpliedCorrelation:
    """The implied correlation with its status, its error bar and the evaluations it took; arguments as for
    `correlation`.

    `tolerance` is what the premium may be off by, in its own money (half a tick for a quote that was rounded to ticks),
    zero or above, of a shape that broadcasts into the quotes'; by default 1e-10 of the larger forward, and never taken
    as less than 2e-12 of it, which is what the Yardstick itself may be off by.

    >>> quote = correlation_with_error(8.0, 100.0, 96.0, 2.0, 0.3, 0.25, 1.0, tolerance=0.005)
    >>> round(float(quote.correlation), 3), round(float(quote.error_bar), 4), str(quote.status)
    (0.809, 0.0003, 'solved')
    """
    check_kind(kind)
    _check_method(method)
    checked = bachelier.normal_columns if method == "bachelier" else spread_columns
    columns, _ = checked(forward_long, forward_short, strike, vol_long, vol_short, 0.0, expiry, discount)
    if method == "margrabe":
        margrabe.check_strike(columns)
    quotes, shape = turned(premium, columns, kind, tolerance, method)
    telling = (quotes.expiry > 0.0) & (quotes.discount > 0.0) & (quotes.vol_first > 0.0) & (quotes.vol_second > 0.0)
    telling &= np.isfinite(quotes.target) & (kind != "forward")
    # Amounts at the far ends of what is taken at all run over on the way; the status says what that leaves.
    with np.errstate(all="ignore"):
        found = _solve(quotes.only(telling), method, executor)
    return ImpliedCorrelation(
        _placed(found.correlation, telling, np.nan, shape),
        _placed(found.status, telling, Status.NOT_IDENTIFIED, shape),
        _placed(found.error_bar, telling, np.inf, shape),
        _placed(found.evaluations, telling, 0, shape),
    )


def correlation(
    premium: ArrayLike,
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
    method: str = "yardstick",
    executor: Executor | None = None,
) -> tuple[Array, Words]:
    """The correlation that gives each quoted premium, and a word on each: two arrays of the arguments' broadcast shape.

    `premium` is the discounted unit value as `value` gives it, any finite amount; `method` one whose value moves one
    way with the correlation: yardstick, bjerksund_stensland, kirk, margrabe (strikes of zero), or bachelier (absolute
    volatilities, forwards of either sign). The other arguments are the method's own. `ValueError` naming the argument
    otherwise; a quote that makes no sense is not refused, its status tells.

    Status: `solved`; `below floor` or `above ceiling` (correlation NaN) where the premium is at or beyond the value
    for correlation +1 or -1; `not identified` where the premium does not tell: the correlation is the one found, one
    of many that do, or NaN where correlation has no say at all. See the module.

    Measured on 20,000 calls and as many puts: over an ordinary box (strikes of -0.5..0.5 short forwards, volatilities
    10..60 %, 0.1..3 years, correlation -0.9..0.95, long forward within two deviations of the money) 2.1 Yardstick
    evaluations a quote, 99th percentile 3, most 6, and the correlation recovered to median 1.4e-15, 99th percentile
    1.7e-13, worst 2.5e-11; over a hard one (correlation within 0.9999, deviations to expiry 0.005..2.5, strikes -2..2
    short forwards) 2.1, 6 and 14, and 1.1e-14, 2.7e-11, 1.3e-8 of those it solves, 57 %
    (tests/benchmarks/implied_cost.py).

    >>> found, status = correlation([8.0, 1.0, 40.0], 100.0, 96.0, 2.0, 0.3, 0.25, 1.0)
    >>> found.round(3).tolist(), status.tolist()
    ([0.809, nan, nan], ['solved', 'below floor', 'above ceiling'])
    """
    given = (premium, forward_long, forward_short, strike, vol_long, vol_short, expiry, discount)
    quote = correlation_with_error(*given, kind=kind, method=method, executor=executor)
    return quote.correlation, quote.status


def _deviations(time_value: Array, moneyness: Array) -> Array:
    return normal_option.deviation_of(np.maximum(time_value, 0.0), moneyness)


def spread_volatility_with_error(
    premium: ArrayLike,
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
    tolerance: ArrayLike | None = None,
) -> ImpliedVolatility:
    """The implied spread volatility with its status and error bar; arguments as for `spread_volatility`.

    `tolerance` as for `correlation_with_error`, by default 1e-10 of the larger of forwards and strike in size. The
    bar is exact: the farther of the volatilities that the premium's two ends imply.

    >>> quote = spread_volatility_with_error(8.0, 100.0, 96.0, 2.0, 1.0, tolerance=0.005)
    >>> round(float(quote.volatility), 3), round(float(quote.error_bar), 4), str(quote.status)
    (17.432, 0.0126, 'solved')
    """
    check_kind(kind)
    columns, _ = bachelier.normal_columns(forward_long, forward_short, strike, 0.0, 0.0, 0.0, expiry, discount)
    quotes, shape = turned(premium, columns, kind, tolerance, None)
    telling = (quotes.expiry > 0.0) & (quotes.discount > 0.0) & np.isfinite(quotes.target) & (kind != "forward")
    with np.errstate(all="ignore"):
        allowed, root_time = quotes.tolerance / quotes.discount, np.sqrt(quotes.expiry)
        moneyness = quotes.moneyness()
        middle, low, high = (
            _deviations(quotes.target + move, moneyness) / root_time for move in (0.0, -allowed, allowed)
        )
        bar = np.maximum(high - middle, middle - low)
    telling &= np.isfinite(middle) & np.isfinite(bar)
    below = telling & (quotes.target <= -allowed)
    vague = ~(telling & (bar < middle))
    status = np.select([below, vague], [Status.BELOW_FLOOR, Status.NOT_IDENTIFIED], Status.SOLVED).astype(_WORDS)
    volatility = np.where(telling & ~below, middle, np.nan)
    error_bar = np.where(telling, np.where(below, np.nan, bar), np.inf)
    return ImpliedVolatility(volatility.reshape(shape), status.reshape(shape), error_bar.reshape(shape))


def spread_volatility(
    premium: ArrayLike,
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
) -> tuple[Array, Words]:
    """The absolute (normal) volatility of the spread that gives each quoted premium by Bachelier's formula, in price
    per square root of a year, and a word on each: two arrays of the arguments' broadcast shape.

    Premium, forwards and strike are amounts of either sign, expiry and discount zero or above; `ValueError` naming
    the argument otherwise. Status: `solved`; `below floor` (NaN) where the premium is under the discounted intrinsic
    value by the tolerance or more; `not identified` where the premium is intrinsic to within it, so that any
    volatility small enough will do (the one found is handed back), or where time or discount factor is zero (NaN).
    There is no ceiling. Relative error against 60 digits on premiums up to six deviations out of the money: median
    1.8e-16, 99th percentile 7.6e-16, worst 1.3e-15 (tests/benchmarks/implied_cost.py).

    >>> volatility, status = spread_volatility([8.0, 1.0, 2.0], 100.0, 96.0, 2.0, 1.0)
    >>> volatility.round(3).tolist(), status.tolist()
    ([17.432, nan, 0.0], ['solved', 'below floor', 'not identified'])
    """
    quote = spread_volatility_with_error(premium, forward_long, forward_short, strike, expiry, discount, kind=kind)
    return quote.volatility, quote.status
