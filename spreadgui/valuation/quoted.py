"""What the quoted premiums of a book imply: the correlation that each one's formula would need to give it.

For a strip it is the one correlation that, marked, would make the days add up to the premium.
"""

from __future__ import annotations

from concurrent.futures import Executor
from decimal import Decimal

import numpy as np

from spreadgui.market.contracts import Law, Shape
from spreadgui.pricing import implied
from spreadgui.pricing.methods import method as method_of
from spreadgui.valuation.exercises import Exercises, expand
from spreadgui.valuation.group import Group, groups
from spreadgui.valuation.results import IMPLIED_WORDS, output_row
from spreadgui.valuation.slate import KINDS, FloatArray, RowArray, Slate

# A premium that says no more is taken as rounded to the cent.
MOST_ROUNDED = 0.005
# Of the premium's tolerance over the slope: the bar of a strip, where it exceeds this the correlation says nothing.
WIDEST_BAR = 1.0
_PRECISION = 1e-10


def imply(slate: Slate, rows: RowArray, outputs: FloatArray, executor: Executor | None) -> None:
    """Put what the quoted premiums of `rows` imply into `outputs`, (len(OUTPUTS), rows); NaN where there is none."""
    is_option = (slate.shape[rows] == Shape.SPREAD) & (slate.kind[rows] != KINDS.index("forward"))
    quoted = np.isfinite(slate.values("quoted_premium")[rows]) & np.isfinite(outputs[output_row("value")]) & is_option
    strips = np.array([row in slate.strips for row in rows.tolist()], dtype=np.bool_) if slate.strips else ~is_option
    places = np.flatnonzero(quoted & ~strips)
    if places.size:
        lines = expand(slate, rows[places])
        for members, group in groups(lines):
            _put(outputs, places[members], *_of_group(group, executor))
    for place in np.flatnonzero(quoted & strips).tolist() if slate.strips else ():
        _put(outputs, place, *_of_strip(expand(slate, rows[place : place + 1])))


def tolerance_of(premium: float) -> float:
    """Half a unit of the last decimal that a premium was quoted with, of a cent where it has fewer.

    >>> tolerance_of(8.25), tolerance_of(8.0), tolerance_of(0.1875)
    (0.005, 0.005, 5e-05)
    """
    exponent = Decimal(repr(premium)).normalize().as_tuple().exponent
    return min(MOST_ROUNDED, float(Decimal((0, (5,), int(exponent) - 1))))


def _put(
    outputs: FloatArray, places: RowArray | int, correlation: FloatArray, error: FloatArray, status: FloatArray
) -> None:
    outputs[output_row("implied_correlation"), places] = correlation
    outputs[output_row("implied_correlation_error"), places] = error
    outputs[output_row("implied_status"), places] = status


def _method(law: Law) -> str:
    return "yardstick" if law is Law.LOGNORMAL else "bachelier"


def _of_group(group: Group, executor: Executor | None) -> tuple[FloatArray, FloatArray, FloatArray]:
    premium = group["quoted_premium"]
    long, short, strike, vol_long, vol_short, _, years, discount = group.spread_arguments
    found = implied.correlation_with_error(
        premium, long, short, strike, vol_long, vol_short, years, discount, kind=group.kind, method=_method(group.law),
        tolerance=[tolerance_of(one) for one in premium.tolist()], executor=executor,
    )  # fmt: skip
    status = [IMPLIED_WORDS.index(word) for word in found.status.tolist()]
    return found.correlation, found.error_bar, np.array(status, dtype=np.float64)


def _of_strip(lines: Exercises) -> tuple[FloatArray, FloatArray, FloatArray]:
    """The same for one strip, whose days have one kind and law: by Brent's method between the two ends."""
    from scipy.optimize import brentq

    assert lines.chain is not None
    tied, share, (_, group) = lines.chain.correlation, lines.share, next(groups(lines))
    method, arguments = method_of(_method(group.law)), list(group.spread_arguments)
    premium = float(group["quoted_premium"][0])

    def beyond(correlation: float) -> float:
        arguments[5] = correlation * tied
        return float(np.sum(share * method.value(*arguments, kind=group.kind))) - premium

    allowed = tolerance_of(premium)
    low, high = beyond(1.0), beyond(-1.0)
    if not low < 0.0 < high:
        beyond_all = "below floor" if low > allowed else "above ceiling" if high < -allowed else "not identified"
        return _told(np.nan, np.nan, beyond_all)
    found = float(brentq(beyond, -1.0, 1.0, xtol=_PRECISION))
    arguments[5] = found * tied
    slope = float(np.sum(share * tied * method.sensitivities(*arguments, kind=group.kind).correlation_sensitivity))
    bar = allowed / -slope if slope < 0.0 else np.inf
    return _told(found, bar, "solved" if bar < WIDEST_BAR else "not identified")


def _told(correlation: float, bar: float, word: str) -> tuple[FloatArray, FloatArray, FloatArray]:
    return np.array(correlation), np.array(bar), np.array(float(IMPLIED_WORDS.index(word)))
