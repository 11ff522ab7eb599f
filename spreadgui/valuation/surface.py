"""A surface: one quantity of one position over a rectangle of its two forwards."""

from __future__ import annotations

from concurrent.futures import Executor
from dataclasses import dataclass

import numpy as np

from spreadgui.market.contracts import Readiness, Shape
from spreadgui.pricing.methods import method as method_of
from spreadgui.valuation.reach import within_reach
from spreadgui.valuation.slate import KINDS, FloatArray, Slate


@dataclass(frozen=True)
class Quantity:
    """What a surface can show: `scale` and `unit` as on screens, `signed` where zero parts two kinds of answer."""

    key: str
    name: str
    unit: str
    scale: float
    signed: bool


QUANTITIES: tuple[Quantity, ...] = (
    Quantity("value", "Value", "{unit}", 1.0, False),
    Quantity("delta_long", "Delta long", "per 1.00 of the long forward", 1.0, True),
    Quantity("delta_short", "Delta short", "per 1.00 of the short forward", 1.0, True),
    Quantity("vega_long", "Vega long", "{unit} per 1 vol point", 0.01, True),
    Quantity("vega_short", "Vega short", "{unit} per 1 vol point", 0.01, True),
    Quantity("correlation_sensitivity", "Correlation sensitivity", "{unit} per 0.01", 0.01, True),
    Quantity("theta", "Theta", "{unit} per calendar day", 1 / 365, True),
)
_QUANTITY = {quantity.key: quantity for quantity in QUANTITIES}
_RATIO = {"delta_long": "ratio_long", "delta_short": "ratio_short"}

NODES = 101
# The rectangle reaches this many standard deviations of each forward, but never less than a fifth of it either way.
_DEVIATIONS = 2.2
_LEAST_REACH = 0.2
_MOST_REACH = 1.6
_RING_POINTS = 181
# Values beyond are as good as infinite: their differences would be.
_REACH = 1e300
_OUT_OF_REACH = "The numbers of this position are out of the machine's reach; look for a slip in its marks or ratios."


@dataclass(frozen=True)
class SurfaceRequest:
    """Which surface: of the position at `row`, a key of QUANTITIES, by a method, with so many nodes a side."""

    row: int
    quantity: str = "value"
    method: str = "bjerksund_stensland"
    nodes: int = NODES


@dataclass(frozen=True)
class Surface:
    """`values[i, j]` in screen scaling at (`long[j]`, `short[i]`), the markets' own forwards before the ratios.

    `axes` name the two underlyings with their units (which stand in `axis_units` alone, empty where there is none),
    `subject` the position, `unit` the values, `kind` the payoff.
    `current` is where the marks stand now, and the value there. `boundary` (2, n) is the piece inside the rectangle of
    the line on which the payoff at expiry is zero; n is 0 where the line passes by. `rings`, each (2, n), hold one and
    two standard deviations of the two forwards at the expiry and may leave the rectangle; there are none where
    nothing moves, or where a volatility or the correlation is not known. `reason` is set, and the arrays are empty,
    where there is no surface to draw.
    """

    revision: int
    request: SurfaceRequest
    subject: str
    axes: tuple[str, str]
    unit: str
    long: FloatArray
    short: FloatArray
    values: FloatArray
    current: tuple[float, float, float]
    boundary: FloatArray
    rings: tuple[FloatArray, ...]
    reason: str = ""
    kind: str = "call"
    axis_units: tuple[str, str] = ("", "")

    def covers(self, long: float, short: float) -> bool:
        """Whether the point lies in the rectangle."""
        if not self.long.size:
            return False
        return bool(self.long[0] <= long <= self.long[-1] and self.short[0] <= short <= self.short[-1])

    def value_at(self, long: float, short: float) -> float:
        """The quantity at a point of the rectangle, bilinear between the four nodes around it; NaN outside."""
        if not self.covers(long, short):
            return float("nan")
        column, along = _place(self.long, long)
        row, across = _place(self.short, short)
        low, high = self.values[row : row + 2, column : column + 2]
        return float(
            (1.0 - across) * ((1.0 - along) * low[0] + along * low[1])
            + across * ((1.0 - along) * high[0] + along * high[1])
        )


def quantity_of(key: str) -> Quantity:
    """The entry of QUANTITIES under `key`; raises KeyError."""
    return _QUANTITY[key]


def draw_surface(slate: Slate, request: SurfaceRequest, executor: Executor | None = None) -> Surface:
    """The surface asked for; one that cannot be drawn says why in a sentence."""
    reason = _obstacle(slate, request)
    if reason:
        return _blank(slate, request, reason)
    cell = {key: float(slate.values(key)[request.row]) for key in _NEEDED}
    kind = KINDS[slate.kind[request.row]]
    long = _axis(cell["forward_long"], cell["vol_long"], cell["years"], request.nodes)
    short = _axis(cell["forward_short"], cell["vol_short"], cell["years"], request.nodes)
    ends = {"forward_long": long[[0, -1]], "forward_short": short[[0, -1]]}
    in_reach = within_reach({**cell, **ends}, kind == "forward").all()
    if not (in_reach and _usable(long, cell["ratio_long"], kind) and _usable(short, cell["ratio_short"], kind)):
        return _blank(slate, request, _OUT_OF_REACH)
    values = _nodes(cell, kind, request, long[np.newaxis, :], short[:, np.newaxis], slate.book.zero_rate, executor)
    here = np.array([[cell["forward_long"]]]), np.array([[cell["forward_short"]]])
    at = float(_nodes(cell, kind, request, *here, slate.book.zero_rate, None)[0, 0])
    if not (np.abs(values).max() < _REACH and abs(at) < _REACH):
        return _blank(slate, request, _OUT_OF_REACH)
    current = (cell["forward_long"], cell["forward_short"], at)
    boundary, rings = _boundary(cell, long, short), _rings(cell)
    for array in (long, short, values, boundary, *rings):
        array.setflags(write=False)
    return Surface(
        slate.revision, request, *_names(slate, request), long, short, values, current, boundary, rings,
        kind=kind, axis_units=_axis_units(slate, request.row),
    )  # fmt: skip


def _place(nodes: FloatArray, point: float) -> tuple[int, float]:
    """The cell of an axis that a point lies in, and how far along it, from 0 to 1."""
    cell = int(np.clip(np.searchsorted(nodes, point, side="right") - 1, 0, len(nodes) - 2))
    return cell, float((point - nodes[cell]) / (nodes[cell + 1] - nodes[cell]))


def _names(slate: Slate, request: SurfaceRequest) -> tuple[str, tuple[str, str], str]:
    """The subject, the two axes and the unit, in words."""
    position, unit = slate.book.positions[request.row], slate.units[request.row]
    axes = []
    for side, axis_unit in zip(("long", "short"), _axis_units(slate, request.row), strict=True):
        leg, delivery = getattr(position, f"{side}_leg"), getattr(position, f"{side}_delivery")
        axes.append(", ".join(filter(None, (f"{leg} {delivery}".strip() or "own mark", axis_unit))))
    quantity = quantity_of(request.quantity).unit.replace("{unit}", unit).strip()
    return position.name or f"Position {request.row + 1}", (axes[0], axes[1]), quantity


def _axis_units(slate: Slate, row: int) -> tuple[str, str]:
    units, position = {market.name: market.unit for market in slate.book.markets}, slate.book.positions[row]
    return units.get(position.long_leg, ""), units.get(position.short_leg, "")


def _boundary(cell: dict[str, float], long: FloatArray, short: FloatArray) -> FloatArray:
    """The two ends, in the rectangle, of the line ratio_long * F_long - ratio_short * F_short = strike."""
    ratio_long, ratio_short, strike = cell["ratio_long"], cell["ratio_short"], cell["strike"]
    with np.errstate(all="ignore"):
        ends = np.array([long[0], long[-1]])
        crossings = (ratio_short * np.array([short[0], short[-1]]) + strike) / ratio_long
        left, right = max(ends[0], crossings[0]), min(ends[1], crossings[1])
        if not left < right:
            return np.empty((2, 0))
        line = np.array([left, right])
        return np.array([line, np.clip((ratio_long * line - strike) / ratio_short, short[0], short[-1])])


def _rings(cell: dict[str, float]) -> tuple[FloatArray, ...]:
    """One and two standard deviations; none where a forward is not lognormal, stands still or is not known enough."""
    deviations = [cell[key] * np.sqrt(cell["years"]) for key in ("vol_long", "vol_short")]
    known = np.isfinite([*deviations, cell["correlation"]]).all()
    if not known or max(deviations) <= 0 or min(cell["forward_long"], cell["forward_short"]) <= 0:
        return ()
    return tuple(_ring(cell, deviations[0] * count, deviations[1] * count) for count in (1.0, 2.0))


def _ring(cell: dict[str, float], deviation_long: float, deviation_short: float) -> FloatArray:
    """The ellipse of these deviations of the two log-forwards around where they stand now, as forwards."""
    rho, angle = cell["correlation"], np.linspace(0.0, 2.0 * np.pi, _RING_POINTS)
    along = np.cos(angle)
    across = rho * along + np.sqrt((1.0 - rho) * (1.0 + rho)) * np.sin(angle)
    with np.errstate(over="ignore", under="ignore"):
        long = cell["forward_long"] * np.exp(deviation_long * along)
        short = cell["forward_short"] * np.exp(deviation_short * across)
    return np.asarray(np.nan_to_num(np.array([long, short])))


_NEEDED = (
    "forward_long", "forward_short", "ratio_long", "ratio_short", "strike",
    "vol_long", "vol_short", "correlation", "years", "discount",
)  # fmt: skip


def _obstacle(slate: Slate, request: SurfaceRequest) -> str:
    row = request.row
    if slate.readiness[row] != Readiness.READY:
        sentence = "; ".join(trouble.sentence for trouble in slate.troubles[row])
        return f"{sentence[:1].upper()}{sentence[1:]}."
    if slate.shape[row] != Shape.SPREAD:
        return "This position has one leg; a Landscape is drawn over two."
    method = method_of(request.method)
    if KINDS[slate.kind[row]] != "forward" and not method.accepts(slate.values("strike")[row]).all():
        return f"{method.name} does not cover this position. {method.applies}"
    return ""


def _axis(forward: float, vol: float, years: float, nodes: int) -> FloatArray:
    """Nodes around `forward`, evenly spaced, on its side of zero; around one of zero, as far as 1 either way."""
    deviation = 0.0 if np.isnan(vol) else vol * np.sqrt(years)
    reach = float(np.clip(np.expm1(min(_DEVIATIONS * deviation, 10.0)), _LEAST_REACH, _MOST_REACH))
    if forward == 0:
        return np.linspace(-1.0, 1.0, nodes)
    low, high = sorted((forward / (1.0 + reach), forward * (1.0 + reach)))
    with np.errstate(over="ignore", invalid="ignore"):
        return np.linspace(low, high, nodes)


def _usable(axis: FloatArray, ratio: float, kind: str) -> bool:
    """Whether the nodes are numbers that rise, and stay numbers (for an option, above zero) once the ratio is in."""
    with np.errstate(all="ignore"):
        folded = ratio * axis
        rising = np.isfinite(axis).all() and (np.diff(axis) > 0).all() and np.isfinite(axis[-1] - axis[0])
    return bool(rising and np.isfinite(folded).all() and (kind == "forward" or (folded > 0).all()))


def _nodes(
    cell: dict[str, float],
    kind: str,
    request: SurfaceRequest,
    long: FloatArray,
    short: FloatArray,
    zero_rate: float,
    executor: Executor | None,
) -> FloatArray:
    """The quantity at every pair of forwards, in screen scaling."""
    quantity = quantity_of(request.quantity)
    legs = (cell["ratio_long"] * long, cell["ratio_short"] * short)
    with np.errstate(over="ignore", invalid="ignore"):
        if kind == "forward":
            values = _forward_nodes(cell, quantity.key, *legs, zero_rate)
        else:
            values = _option_nodes(cell, kind, request, *legs, zero_rate, executor)
        return np.asarray(values * quantity.scale * cell.get(_RATIO.get(quantity.key, ""), 1.0))


def _option_nodes(
    cell: dict[str, float],
    kind: str,
    request: SurfaceRequest,
    long: FloatArray,
    short: FloatArray,
    zero_rate: float,
    executor: Executor | None,
) -> FloatArray:
    """By the method, in code units, to the forwards with their ratios folded in."""
    method, key = method_of(request.method), request.quantity
    rest = (cell[name] for name in ("strike", "vol_long", "vol_short", "correlation", "years", "discount"))
    arguments: tuple[FloatArray | float, ...] = (long, short, *rest)
    if key == "value":
        return np.asarray(method.value(*arguments, kind=kind, executor=executor))
    found = method.sensitivities(*arguments, kind=kind, executor=executor)
    if key == "theta":  # a method holds the discount factor; the carry of the premium is the rate's
        return np.asarray(found.theta + zero_rate * found.value)
    return np.asarray(getattr(found, key))


def _forward_nodes(
    cell: dict[str, float], key: str, long: FloatArray, short: FloatArray, zero_rate: float
) -> FloatArray:
    """The difference itself: no method, no volatility, forwards of either sign."""
    value = cell["discount"] * (long - short - cell["strike"])
    slopes = {"delta_long": cell["discount"], "delta_short": -cell["discount"]}
    if key == "value":
        return np.asarray(value)
    if key == "theta":
        return np.asarray(zero_rate * value)
    return np.full(np.shape(value), slopes.get(key, 0.0))


def _blank(slate: Slate, request: SurfaceRequest, reason: str) -> Surface:
    none, line, nan = np.empty(0), np.empty((2, 0)), float("nan")
    names = _names(slate, request)
    kind = KINDS[slate.kind[request.row]]
    return Surface(
        slate.revision, request, *names, none, none, np.empty((0, 0)), (nan, nan, nan), line, (), reason, kind,
        _axis_units(slate, request.row),
    )  # fmt: skip
