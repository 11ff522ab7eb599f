"""A surface: one quantity of one position over a rectangle of its two forwards."""

from __future__ import annotations

from concurrent.futures import Executor
from dataclasses import dataclass

import numpy as np

from spreadgui.market.contracts import Law, Readiness, Shape
from spreadgui.pricing.methods import NORMAL_METHODS, Method
from spreadgui.pricing.methods import method as method_of
from spreadgui.pricing.results import Sensitivities
from spreadgui.valuation.exercises import Exercises, expand
from spreadgui.valuation.group import STRIKE_INPUTS, Group, formula_strike
from spreadgui.valuation.reach import within_reach
from spreadgui.valuation.slate import INPUTS, KINDS, FloatArray, Slate


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
    where there is no surface to draw. `method` is the name of what it was drawn by, which under normal forwards is
    Bachelier whatever was asked for.
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
    method: str = ""

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
    subject = _Subject.of(slate, request, executor)
    long, short = subject.axis("long", request.nodes), subject.axis("short", request.nodes)
    if not subject.takes(long, short):
        return _blank(slate, request, _OUT_OF_REACH)
    values = subject.nodes(long[np.newaxis, :], short[:, np.newaxis])
    here = (subject.cell["forward_long"], subject.cell["forward_short"])
    at = float(subject.nodes(np.array([[here[0]]]), np.array([[here[1]]]))[0, 0])
    if not (np.abs(values).max() < _REACH and abs(at) < _REACH):
        return _blank(slate, request, _OUT_OF_REACH)
    boundary, rings = _boundary(subject.cell, long, short), _rings(subject.cell, subject.law)
    for array in (long, short, values, boundary, *rings):
        array.setflags(write=False)
    return Surface(
        slate.revision, request, *_names(slate, request), long, short, values, (*here, at), boundary, rings,
        kind=subject.kind, axis_units=_axis_units(slate, request.row), method=_method_of(slate, request).name,
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
    position = slate.book.positions[row]
    units = {one.name: one.unit for one in slate.book.blends} | {one.name: one.unit for one in slate.book.markets}
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


def _rings(cell: dict[str, float], law: Law) -> tuple[FloatArray, ...]:
    """One and two standard deviations; none where a forward cannot move so, stands still or is not known enough."""
    deviations = [cell[key] * np.sqrt(cell["years"]) for key in ("vol_long", "vol_short")]
    known = np.isfinite([*deviations, cell["correlation"]]).all()
    lifted = [cell[f"forward_{side}"] + cell[f"shift_{side}"] for side in ("long", "short")]
    if not known or max(deviations) <= 0 or (law is Law.LOGNORMAL and min(lifted) <= 0):
        return ()
    return tuple(_ring(cell, law, deviations[0] * count, deviations[1] * count) for count in (1.0, 2.0))


def _ring(cell: dict[str, float], law: Law, deviation_long: float, deviation_short: float) -> FloatArray:
    """The ellipse of these deviations, of the two forwards or of their logarithms, around where they stand now."""
    rho, angle = cell["correlation"], np.linspace(0.0, 2.0 * np.pi, _RING_POINTS)
    along = np.cos(angle)
    across = rho * along + np.sqrt((1.0 - rho) * (1.0 + rho)) * np.sin(angle)
    with np.errstate(over="ignore", under="ignore"):
        ring = [
            _moved(cell, side, law, deviation * step)
            for side, deviation, step in (("long", deviation_long, along), ("short", deviation_short, across))
        ]
    return np.asarray(np.nan_to_num(np.array(ring)))


def _moved(cell: dict[str, float], side: str, law: Law, move: FloatArray) -> FloatArray:
    forward, shift = cell[f"forward_{side}"], cell[f"shift_{side}"]
    return np.asarray(forward + move if law is Law.NORMAL else (forward + shift) * np.exp(move) - shift)


_NEEDED = (
    "forward_long", "forward_short", "ratio_long", "ratio_short", "strike",
    "vol_long", "vol_short", "correlation", "years", "discount", "shift_long", "shift_short",
)  # fmt: skip


def _obstacle(slate: Slate, request: SurfaceRequest) -> str:
    row = request.row
    if slate.readiness[row] != Readiness.READY:
        sentence = "; ".join(trouble.sentence for trouble in slate.troubles[row])
        return f"{sentence[:1].upper()}{sentence[1:]}."
    if slate.shape[row] != Shape.SPREAD:
        return "This position has one leg; a Landscape is drawn over two."
    method, forward = _method_of(slate, request), KINDS[slate.kind[row]] == "forward"
    if not forward and Law[method.law.upper()] != slate.law[row]:
        return f"{method.name} does not cover this position. {method.applies}"
    strike = formula_strike({key: slate.values(key)[row : row + 1] for key in STRIKE_INPUTS})
    if not forward and not method.accepts(strike).all():
        return f"{method.name} does not cover this position. {method.applies}"
    return ""


def _method_of(slate: Slate, request: SurfaceRequest) -> Method:
    """What draws the surface: the method asked for, or the one that normal forwards have."""
    return NORMAL_METHODS[0] if slate.law[request.row] == Law.NORMAL else method_of(request.method)


@dataclass(frozen=True)
class _Subject:
    """The position that is drawn: its exercises, and what it stands on. `lines` are one for each day of a strip."""

    cell: dict[str, float]
    kind: str
    law: Law
    method: Method
    quantity: Quantity
    lines: Exercises
    executor: Executor | None

    @staticmethod
    def of(slate: Slate, request: SurfaceRequest, executor: Executor | None) -> _Subject:
        row = request.row
        return _Subject(
            {key: float(slate.values(key)[row]) for key in _NEEDED},
            KINDS[slate.kind[row]],
            Law(slate.law[row]),
            _method_of(slate, request),
            quantity_of(request.quantity),
            expand(slate, np.array([row])),
            executor,
        )

    def axis(self, side: str, nodes: int) -> FloatArray:
        """Nodes around a forward, evenly spaced; a lognormal one on its side of zero once shifted."""
        forward, shift, vol = (self.cell[f"{part}_{side}"] for part in ("forward", "shift", "vol"))
        deviation = 0.0 if np.isnan(vol) else vol * np.sqrt(self.cell["years"])
        if self.law is Law.NORMAL:
            reach = max(_DEVIATIONS * deviation, _LEAST_REACH * abs(forward)) or 1.0
            with np.errstate(over="ignore", invalid="ignore"):
                return np.linspace(forward - reach, forward + reach, nodes)
        return _axis(forward + shift, deviation, nodes) - shift

    def takes(self, long: FloatArray, short: FloatArray) -> bool:
        """Whether the formulas take all of the rectangle, and its nodes are apart."""
        ends = {"forward_long": long[[0, -1]], "forward_short": short[[0, -1]]}
        in_reach = within_reach({**self.cell, **ends}, self.kind == "forward", self.law is Law.NORMAL).all()
        either_sign = self.kind == "forward" or self.law is Law.NORMAL
        return bool(in_reach) and all(
            _usable(axis, self.cell[f"ratio_{side}"], self.cell[f"shift_{side}"], either_sign)
            for side, axis in (("long", long), ("short", short))
        )

    def nodes(self, long: FloatArray, short: FloatArray) -> FloatArray:
        """The quantity at every pair of forwards, in screen scaling: the sum over the exercises."""
        ratio = self.cell.get(_RATIO.get(self.quantity.key, ""), 1.0)
        with np.errstate(over="ignore", invalid="ignore"):
            parts = [share * self._line(line, long, short) for line, share in enumerate(self.lines.share.tolist())]
            return np.asarray(sum(parts[1:], parts[0]) * self.quantity.scale * ratio)

    def _line(self, line: int, long: FloatArray, short: FloatArray) -> FloatArray:
        """One exercise, in code units, to the forwards with their ratios folded in."""
        cell = dict(zip(INPUTS, self.lines.inputs[:, line].tolist(), strict=True))
        on = {**cell, "forward_long": long, "forward_short": short}
        arguments = Group(self.kind, Shape.SPREAD, self.law, on).spread_arguments
        if self.kind == "forward":
            legs = (cell["ratio_long"] * long, cell["ratio_short"] * short)
            return _forward_nodes(cell, self.quantity.key, *legs)
        if self.quantity.key == "value":
            return self.method.value(*arguments, kind=self.kind, executor=self.executor)
        found = self.method.sensitivities(*arguments, kind=self.kind, executor=self.executor)
        return self._sensitivity(line, cell, found)

    def _sensitivity(self, line: int, cell: dict[str, float], found: Sensitivities) -> FloatArray:
        """One of them to the marks: an absolute volatility's through its ratio, a strip's by its chain."""
        normal = self.law is Law.NORMAL
        for key, ratio in (("vega_long", cell["ratio_long"]), ("vega_short", cell["ratio_short"])):
            found = found._replace(**{key: getattr(found, key) * ratio}) if normal else found
        chain, key = self.lines.chain, self.quantity.key
        answer = getattr(found, key) if chain is None else chain.at(line, key, found)
        # A method holds the discount factor; the carry of the premium is the rate's.
        return np.asarray(answer + (cell["rate"] * found.value if key == "theta" else 0.0))


def _axis(forward: float, deviation: float, nodes: int) -> FloatArray:
    """Nodes around `forward`, evenly spaced, on its side of zero; around one of zero, as far as 1 either way."""
    reach = float(np.clip(np.expm1(min(_DEVIATIONS * deviation, 10.0)), _LEAST_REACH, _MOST_REACH))
    if forward == 0:
        return np.linspace(-1.0, 1.0, nodes)
    low, high = sorted((forward / (1.0 + reach), forward * (1.0 + reach)))
    with np.errstate(over="ignore", invalid="ignore"):
        return np.linspace(low, high, nodes)


def _usable(axis: FloatArray, ratio: float, shift: float, either_sign: bool) -> bool:
    """Whether the nodes are numbers that rise, and stay numbers (above zero, where they must) once ratio and shift are
    in."""
    with np.errstate(all="ignore"):
        folded = ratio * (axis + shift)
        rising = np.isfinite(axis).all() and (np.diff(axis) > 0).all() and np.isfinite(axis[-1] - axis[0])
    return bool(rising and np.isfinite(folded).all() and (either_sign or (folded > 0).all()))


def _forward_nodes(cell: dict[str, float], key: str, long: FloatArray, short: FloatArray) -> FloatArray:
    """The difference itself: no method, no volatility, forwards of either sign."""
    value = cell["discount"] * (long - short - cell["strike"])
    slopes = {"delta_long": cell["discount"], "delta_short": -cell["discount"]}
    if key == "value":
        return np.asarray(value)
    if key == "theta":
        return np.asarray(cell["rate"] * value)
    return np.full(np.shape(value), slopes.get(key, 0.0))


def _blank(slate: Slate, request: SurfaceRequest, reason: str) -> Surface:
    none, line, nan = np.empty(0), np.empty((2, 0)), float("nan")
    names = _names(slate, request)
    kind = KINDS[slate.kind[request.row]]
    return Surface(
        slate.revision, request, *names, none, none, np.empty((0, 0)), (nan, nan, nan), line, (), reason, kind,
        _axis_units(slate, request.row),
    )  # fmt: skip
