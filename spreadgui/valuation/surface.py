"""A surface: one quantity of one position over a rectangle of its two forwards."""

from __future__ import annotations

from concurrent.futures import Executor
from dataclasses import dataclass

import numpy as np

from spreadgui.market.contracts import Readiness, Shape
from spreadgui.pricing.methods import method as method_of
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

    `axes` name the two underlyings with their units, `subject` the position, `unit` the values. `current` is where the
    marks stand now, and the value there. `boundary` (2, n) is the line on which the payoff at expiry is zero, `rings`
    each (2, n) hold one and two standard deviations of the two forwards at the expiry; all are (long, short) points
    and may leave the rectangle. `reason` is set, and the arrays are empty, where there is no surface to draw.
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


def quantity_of(key: str) -> Quantity:
    """The entry of QUANTITIES under `key`; raises KeyError."""
    return _QUANTITY[key]


def draw_surface(slate: Slate, request: SurfaceRequest, executor: Executor | None = None) -> Surface:
    """The surface asked for; one that cannot be drawn says why in a sentence."""
    reason = _obstacle(slate, request)
    if reason:
        return _blank(slate, request, reason)
    cell = {key: float(slate.values(key)[request.row]) for key in _NEEDED}
    long = _axis(cell["forward_long"], cell["vol_long"], cell["years"], request.nodes)
    short = _axis(cell["forward_short"], cell["vol_short"], cell["years"], request.nodes)
    if not (np.isfinite(long).all() and np.isfinite(short).all()):
        return _blank(slate, request, "The forwards are out of the machine's reach.")
    kind = KINDS[slate.kind[request.row]]
    values = _nodes(cell, kind, request, long[np.newaxis, :], short[:, np.newaxis], slate.book.zero_rate, executor)
    here = np.array([[cell["forward_long"]]]), np.array([[cell["forward_short"]]])
    at = float(_nodes(cell, kind, request, *here, slate.book.zero_rate, None)[0, 0])
    for array in (long, short, values):
        array.setflags(write=False)
    return Surface(
        slate.revision,
        request,
        *_names(slate, request),
        long,
        short,
        values,
        (cell["forward_long"], cell["forward_short"], at),
        _boundary(cell, long),
        tuple(_ring(cell, deviations) for deviations in (1.0, 2.0)),
    )


def _names(slate: Slate, request: SurfaceRequest) -> tuple[str, tuple[str, str], str]:
    """The subject, the two axes and the unit, in words."""
    position, unit = slate.book.positions[request.row], slate.units[request.row]
    names = {market.name: market.unit for market in slate.book.markets}
    axes = []
    for side in ("long", "short"):
        leg, delivery = getattr(position, f"{side}_leg"), getattr(position, f"{side}_delivery")
        name = f"{leg} {delivery}".strip() or f"{side.capitalize()} forward, own mark"
        axes.append(", ".join(filter(None, (name, names.get(leg, "")))))
    quantity = quantity_of(request.quantity).unit.replace("{unit}", unit).strip()
    return position.name or f"Position {request.row + 1}", (axes[0], axes[1]), quantity


def _boundary(cell: dict[str, float], long: FloatArray) -> FloatArray:
    """Where ratio_long * F_long - ratio_short * F_short = strike."""
    return np.array([long, (cell["ratio_long"] * long - cell["strike"]) / cell["ratio_short"]])


def _ring(cell: dict[str, float], deviations: float) -> FloatArray:
    """The ellipse of so many standard deviations of the two log-forwards at the expiry, around where they stand now."""
    root = np.sqrt(cell["years"])
    first, second = (np.nan_to_num(cell[key]) * root * deviations for key in ("vol_long", "vol_short"))
    rho = np.nan_to_num(cell["correlation"])
    angle = np.linspace(0.0, 2.0 * np.pi, 121)
    long_shift = np.cos(angle)
    short_shift = rho * long_shift + np.sqrt((1.0 - rho) * (1.0 + rho)) * np.sin(angle)
    with np.errstate(over="ignore"):
        return np.array(
            [
                cell["forward_long"] * np.exp(first * long_shift),
                cell["forward_short"] * np.exp(second * short_shift),
            ]
        )


_NEEDED = (
    "forward_long", "forward_short", "ratio_long", "ratio_short", "strike",
    "vol_long", "vol_short", "correlation", "years", "discount",
)  # fmt: skip


def _obstacle(slate: Slate, request: SurfaceRequest) -> str:
    row = request.row
    if slate.readiness[row] != Readiness.READY:
        return "; ".join(trouble.sentence for trouble in slate.troubles[row])
    if slate.shape[row] != Shape.SPREAD:
        return "This position has one leg; a Landscape is drawn over two."
    if KINDS[slate.kind[row]] != "forward" and not method_of(request.method).accepts(slate.values("strike")[row]).all():
        return f"{method_of(request.method).name} does not cover this position: {method_of(request.method).applies}"
    return ""


def _axis(forward: float, vol: float, years: float, nodes: int) -> FloatArray:
    """Nodes around `forward`, evenly spaced, staying above zero."""
    deviation = 0.0 if np.isnan(vol) else vol * np.sqrt(years)
    reach = float(np.clip(np.expm1(min(_DEVIATIONS * deviation, 10.0)), _LEAST_REACH, _MOST_REACH))
    low = forward / (1.0 + reach) if forward > 0 else forward * (1.0 + reach)
    high = forward * (1.0 + reach) if forward > 0 else forward / (1.0 + reach)
    return np.linspace(low, high, nodes)


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
    method, quantity = method_of(request.method), quantity_of(request.quantity)
    vols = (cell["vol_long"], cell["vol_short"], cell["correlation"])
    if kind == "forward":  # its value needs none of them, and a market may well have none
        vols = (0.0, 0.0, 0.0)
    legs = (cell["ratio_long"] * long, cell["ratio_short"] * short)
    arguments = (*legs, cell["strike"], *vols, cell["years"], cell["discount"])
    if quantity.key == "value":
        return np.asarray(method.value(*arguments, kind=kind, executor=executor))
    found = method.sensitivities(*arguments, kind=kind, executor=executor)
    values = getattr(found, quantity.key)
    if quantity.key == "theta":
        values = values + zero_rate * found.value
    return np.asarray(values * quantity.scale * cell.get(_RATIO.get(quantity.key, ""), 1.0))


def _blank(slate: Slate, request: SurfaceRequest, reason: str) -> Surface:
    none, line, nan = np.empty(0), np.empty((2, 0)), float("nan")
    names = _names(slate, request)
    return Surface(slate.revision, request, *names, none, none, np.empty((0, 0)), (nan, nan, nan), line, (), reason)
