"""The exercise boundary in the plane of the two normal factors.

Write a = sigma1 sqrt(T), b = sigma2 sqrt(T), rho the correlation, and let the short leg end at S2 = F2 e^tau. The
option is on the edge of exercise when the long leg ends at S1 = F2 e^tau + K, so that one parameter, tau, walks the
whole boundary and no root is ever searched. With lg = ln(S1/F1) the two standard normals are there

    Z1 = lg/a + a/2,      Z2 = tau/b + b/2,

and two independent ones follow by half angles, c = sqrt((1 + rho)/2) and s = sqrt((1 - rho)/2), both free of
cancellation as rho nears either end:

    p = (Z1 + Z2)/(2c),   q = (Z1 - Z2)/(2s).

lg is convex in tau, so the exercise region is a convex set. The frame is laid at tau0, near the boundary's closest
point to the middle of the weight: y runs along the boundary's tangent there, towards growing tau, and x across it
into exercise. Valuing in a leg as numeraire moves the weight by that leg's deviation along its axis, so the three
weights of the value F1 P1 - F2 P2 - K P0 are standard normals about (A1, B1), (A2, B2) and the origin.

Every other point is reached from tau0 by its distance d in tau alone: lg - lg0 = ln(1 - L0 + L0 e^d) with L0 the
short leg's share of S1 at tau0. The share at a point is the slope of lg, and since the frame lies on the tangent, x -
x0 is lg less its tangent, never negative.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from spreadgui.pricing.inputs import Array

Rows = NDArray[np.intp]

NEWTON_STEPS = 3
FARTHEST_STEP = 5.0
# A foot is good enough when it is within half a standard deviation, measured along the boundary.
NEAR_ENOUGH = 0.25
# From this correlation on a boundary may run through the weight twice as a pair of arms, steep enough for the frame on
# the farther one to cost digits on the nearer.
TWO_ARMS = 1.0 - 1e-5
HALVINGS = 60


class Plane(NamedTuple):
    """The options of one block, each field of shape (n,): strikes and deviations above zero, |correlation| below one.

    `short` and `strike` are in units of the first forward.
    """

    short: Array
    strike: Array
    deviation_first: Array
    deviation_second: Array
    correlation: Array


class Boundary(NamedTuple):
    """Frames of n boundaries, each field of shape (n,)."""

    tau: Array  # where the frame is laid
    log_first: Array  # ln(S1/F1) there
    share: Array  # L0, the short leg's share of S1 there
    remainder: Array  # 1 - L0, without cancellation
    x: Array
    y: Array
    x_first: Array  # d x / d lg
    x_second: Array  # d x / d tau, lg held
    y_first: Array
    y_second: Array
    across_first: Array  # A1
    across_second: Array  # A2
    along_first: Array  # B1
    along_second: Array  # B2
    speed_low: Array  # speed of the boundary in tau as tau falls without end
    speed_high: Array  # and as it grows without end

    def only(self, rows: Rows | slice) -> Boundary:
        """The frames of some rows."""
        return Boundary(*(field[rows] for field in self))


def _level(options: Plane, tau: Array) -> tuple[Array, Array, Array]:
    """lg, the short leg's share of S1 and what is left of it."""
    short = options.short * np.exp(tau)
    total = short + options.strike
    return np.log(total), short / total, options.strike / total


def _pull(options: Plane, tau: Array) -> tuple[Array, Array]:
    """Half the slope in tau of the squared distance to the middle of the weight, and its Gauss-Newton curvature."""
    _, _, a, b, rho = options
    log_first, share, _ = _level(options, tau)
    gap_first, gap_second = log_first / a - 0.5 * rho * b, tau / b - 0.5 * rho * a
    first, second = share / a, 1.0 / b
    scale_sum, scale_gap = 0.5 / (1.0 + rho), 0.5 / (1.0 - rho)
    tangent_sum, tangent_gap = (first + second) * scale_sum, (first - second) * scale_gap
    force = (gap_first + gap_second) * tangent_sum + (gap_first - gap_second) * tangent_gap
    return force, (first + second) * tangent_sum + (first - second) * tangent_gap


def _foot(options: Plane) -> Array:
    """tau near the boundary's closest point to the middle of the two legs' weights: Gauss-Newton, then bisection."""
    tau = np.zeros_like(options.short)
    for _ in range(NEWTON_STEPS):
        force, curvature = _pull(options, tau)
        tau -= np.clip(force / curvature, -FARTHEST_STEP, FARTHEST_STEP)
    force, curvature = _pull(options, tau)
    lost = np.flatnonzero(~(force * force <= NEAR_ENOUGH * curvature))
    if lost.size:
        tau[lost] = _bisected_foot(Plane(*(field[lost] for field in options)))
    paired = np.flatnonzero((options.correlation > TWO_ARMS) & (options.deviation_first < options.deviation_second))
    if paired.size:
        tau[paired] = _nearest_foot(Plane(*(field[paired] for field in options)), tau[paired])
    return tau


def _far(options: Plane, tau: Array) -> Array:
    """The squared distance to the middle of the weight that `_pull` differentiates."""
    _, _, a, b, rho = options
    gap_first, gap_second = _level(options, tau)[0] / a - 0.5 * rho * b, tau / b - 0.5 * rho * a
    return np.asarray(0.5 * ((gap_first + gap_second) ** 2 / (1.0 + rho) + (gap_first - gap_second) ** 2 / (1.0 - rho)))


def _nearest_foot(options: Plane, tau: Array) -> Array:
    """The nearest of the foot found and those of the two arms, which part where the short leg's share of S1 is a/b."""
    share = options.deviation_first / options.deviation_second
    turn = np.log(share / (1.0 - share)) + np.log(options.strike / options.short)
    nearest, least = tau, _far(options, tau)
    for toward in (-1.0, 1.0):
        inner, outer = turn, turn + toward
        for _ in range(9):
            outer = np.where(toward * _pull(options, outer)[0] < 0.0, turn + 2.0 * (outer - turn), outer)
        for _ in range(HALVINGS):
            middle = 0.5 * (inner + outer)
            beyond = toward * _pull(options, middle)[0] > 0.0
            inner, outer = np.where(beyond, inner, middle), np.where(beyond, middle, outer)
        found = 0.5 * (inner + outer)
        far = _far(options, found)
        nearest, least = np.where(far < least, found, nearest), np.minimum(far, least)
    return nearest


def _bisected_foot(options: Plane) -> Array:
    low, high = np.full_like(options.short, -1.0), np.full_like(options.short, 1.0)
    for _ in range(9):
        low = np.where(_pull(options, low)[0] > 0.0, 2.0 * low, low)
        high = np.where(_pull(options, high)[0] < 0.0, 2.0 * high, high)
    for _ in range(30):
        middle = 0.5 * (low + high)
        beyond = _pull(options, middle)[0] > 0.0
        low, high = np.where(beyond, low, middle), np.where(beyond, middle, high)
    return 0.5 * (low + high)


def lay(options: Plane) -> Boundary:
    """The frame of every option."""
    _, _, a, b, rho = options
    tau = _foot(options)
    log_first, share, remainder = _level(options, tau)
    two_c, two_s = np.sqrt(2.0 * (1.0 + rho)), np.sqrt(2.0 * (1.0 - rho))
    step_p, step_q = (share / a + 1.0 / b) / two_c, (share / a - 1.0 / b) / two_s
    speed = np.hypot(step_p, step_q)
    tangent_p, tangent_q = step_p / speed, step_q / speed
    z_first, z_second = log_first / a + 0.5 * a, tau / b + 0.5 * b
    p, q = (z_first + z_second) / two_c, (z_first - z_second) / two_s
    return Boundary(
        tau=tau,
        log_first=log_first,
        share=share,
        remainder=remainder,
        x=tangent_p * q - tangent_q * p,
        y=tangent_p * p + tangent_q * q,
        x_first=(tangent_p / two_s - tangent_q / two_c) / a,
        x_second=-(tangent_p / two_s + tangent_q / two_c) / b,
        y_first=(tangent_p / two_c + tangent_q / two_s) / a,
        y_second=(tangent_p / two_c - tangent_q / two_s) / b,
        across_first=0.5 * a * (tangent_p * two_s - tangent_q * two_c),
        across_second=-0.5 * b * (tangent_p * two_s + tangent_q * two_c),
        along_first=0.5 * a * (tangent_p * two_c + tangent_q * two_s),
        along_second=0.5 * b * (tangent_p * two_c - tangent_q * two_s),
        speed_low=2.0 / (b * two_c * two_s),
        speed_high=np.hypot((1.0 / a + 1.0 / b) / two_c, (1.0 / a - 1.0 / b) / two_s),
    )


class Window(NamedTuple):
    """Where the weight lies in each frame: outside these bounds all three normals are spent."""

    low: Array
    high: Array
    deep: Array


def window(line: Boundary, reach: float) -> Window:
    """Bounds `reach` standard deviations beyond the outermost of the three weights."""
    return Window(
        np.minimum(0.0, np.minimum(line.along_first, line.along_second)) - reach,
        np.maximum(0.0, np.maximum(line.along_first, line.along_second)) + reach,
        np.maximum(0.0, np.maximum(line.across_first, line.across_second)) + reach,
    )


def point(line: Boundary, distance: Array) -> tuple[Array, Array]:
    """x and y at a distance in tau from each frame."""
    rise = np.log(line.remainder + line.share * np.exp(distance))
    x = line.x + (line.x_first * rise + line.x_second * distance)
    y = line.y + (line.y_first * rise + line.y_second * distance)
    return x, y
