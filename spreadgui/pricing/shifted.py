"""Shifted lognormal legs: every lognormal method on forwards that may be near zero or below.

Each leg has its own shift, in the price units of the leg as the caller has folded the ratio in (a leg b F with shift
h on F has shift b h), and it is F + shift that is lognormal: dF = vol (F + shift) dW. (D. Brigo and F. Mercurio,
"Interest Rate Models - Theory and Practice", Springer, treat the displaced lognormal at length; M. Rubinstein,
"Displaced diffusion option pricing", Journal of Finance 38, 1983, 213-217, is the usual source.) Since

    F_long - F_short - K = (F_long + h_long) - (F_short + h_short) - (K + h_long - h_short),

the option is a spread option on the two shifted forwards with a moved strike, and any method for lognormal legs
values it, with its own accuracy. d(F + h) = dF, so every sensitivity is the method's own, unchanged: deltas and
gammas are per unit of the unshifted forward, vegas per 1.0 of the **shifted** forward's volatility. Shifts may be
negative (a price that cannot fall to zero) as long as the shifted forward stays above zero.

A volatility belongs to its shift: to keep a leg's absolute moves when the shift changes, hold vol (F + shift) (common
practice, no source). As the shifts grow with that product held, the legs become normal and the values Bachelier's.

Measured against the Yardstick on the shifted legs for forwards of -20..100, shifts that leave 20..150 of them, strikes
-30..30, volatilities 10..60 % over 0.1..3 years, correlation -0.9..0.95, in shifted short forwards (median, 99th
percentile, worst): Kirk 5.6e-4, 2.4e-2, 6.9e-2; modified Kirk 1.9e-4, 1.3e-2, 5.6e-2; Bjerksund-Stensland 6.9e-5,
6.2e-3, 4.0e-2; the Yardstick itself against an independent integration 5.8e-17, 4.2e-14, 1.6e-13
(tests/benchmarks/pricing_accuracy.py). They are somewhat worse than over the ordinary box of the plain methods because
legs and strike stand in looser proportion here.

`arguments` is all there is to it; whatever takes forwards and a strike, `implied.correlation` among it, can be given
its result. `value` and `sensitivities` (and their outright fellows for Black-76) call a method that way.
"""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import Executor
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from spreadgui.pricing import black76
from spreadgui.pricing.black76 import OutrightSensitivities
from spreadgui.pricing.inputs import Array, as_floats, check_positive, check_strike, common_shape
from spreadgui.pricing.results import Sensitivities


class ShiftedSpread(NamedTuple):
    """What a lognormal method is given in place of the forwards and the strike."""

    forward_long: Array
    forward_short: Array
    strike: Array


class ShiftedOutright(NamedTuple):
    """What Black-76 is given in place of the forward and the strike."""

    forward: Array
    strike: Array


def _checked(**given: ArrayLike) -> dict[str, Array]:
    columns = {name: as_floats(name, one) for name, one in given.items()}
    for name, column in columns.items():
        check_strike(name, column)
    common_shape(columns)
    return columns


def _lifted(columns: dict[str, Array], forward: str, shift: str) -> Array:
    """The forward plus its shift, refused under both names where that is not above zero."""
    lifted = np.asarray(columns[forward] + columns[shift])
    check_positive(f"{forward} + {shift}", lifted)
    return lifted


def arguments(
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    shift_long: ArrayLike,
    shift_short: ArrayLike,
) -> ShiftedSpread:
    """The shifted forwards and the moved strike, each of the shape its own parts broadcast to.

    All in price units, of either sign, with forward + shift above zero; `ValueError` naming the argument otherwise.
    Equal shifts leave the strike exactly as it was, and K given as shift_short - shift_long comes out as exactly
    zero.

    >>> [float(one) for one in arguments(-4.0, 20.0, 1.5, 10.0, 5.0)]
    [6.0, 25.0, 6.5]
    >>> arguments(-12.0, 20.0, 1.5, 10.0, 5.0)
    Traceback (most recent call last):
    ValueError: forward_long + shift_long: must be above zero, found -2.0
    """
    columns = _checked(
        forward_long=forward_long,
        forward_short=forward_short,
        strike=strike,
        shift_long=shift_long,
        shift_short=shift_short,
    )
    return ShiftedSpread(
        _lifted(columns, "forward_long", "shift_long"),
        _lifted(columns, "forward_short", "shift_short"),
        np.asarray(columns["strike"] + (columns["shift_long"] - columns["shift_short"])),
    )


def outright_arguments(forward: ArrayLike, strike: ArrayLike, shift: ArrayLike) -> ShiftedOutright:
    """The shifted forward and strike of an option on one forward; refusals as for `arguments`.

    >>> [float(one) for one in outright_arguments(-4.0, -6.0, 10.0)]
    [6.0, 4.0]
    """
    columns = _checked(forward=forward, strike=strike, shift=shift)
    return ShiftedOutright(_lifted(columns, "forward", "shift"), np.asarray(columns["strike"] + columns["shift"]))


def value(
    method_value: Callable[..., Array],
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    correlation: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    shift_long: ArrayLike = 0.0,
    shift_short: ArrayLike = 0.0,
    kind: str = "call",
    executor: Executor | None = None,
) -> Array:
    """Discounted value by the `value` of a lognormal method, of the broadcast shape of all arguments.

    Volatilities are those of the shifted forwards. `ValueError` from `arguments` or from the method, naming the
    argument.

    >>> from spreadgui.pricing import kirk
    >>> float(value(kirk.value, -4.0, 20.0, -30.0, 0.0, 0.0, 0.5, 1.0, shift_long=10.0, shift_short=5.0))
    6.0
    """
    legs = arguments(forward_long, forward_short, strike, shift_long, shift_short)
    return method_value(*legs, vol_long, vol_short, correlation, expiry, discount, kind=kind, executor=executor)


def sensitivities(
    method_sensitivities: Callable[..., Sensitivities],
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    correlation: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    shift_long: ArrayLike = 0.0,
    shift_short: ArrayLike = 0.0,
    kind: str = "call",
    executor: Executor | None = None,
) -> Sensitivities:
    """Discounted value and derivatives by the `sensitivities` of a lognormal method; arguments as for `value`.

    The shifts are held; vegas are per 1.0 of the shifted forwards' volatilities.
    """
    legs = arguments(forward_long, forward_short, strike, shift_long, shift_short)
    return method_sensitivities(*legs, vol_long, vol_short, correlation, expiry, discount, kind=kind, executor=executor)


def outright_value(
    forward: ArrayLike,
    strike: ArrayLike,
    vol: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    shift: ArrayLike = 0.0,
    kind: str = "call",
    executor: Executor | None = None,
) -> Array:
    """Discounted Black-76 value on a shifted forward."""
    return black76.value(
        *outright_arguments(forward, strike, shift), vol, expiry, discount, kind=kind, executor=executor
    )


def outright_sensitivities(
    forward: ArrayLike,
    strike: ArrayLike,
    vol: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    shift: ArrayLike = 0.0,
    kind: str = "call",
    executor: Executor | None = None,
) -> OutrightSensitivities:
    """Discounted Black-76 value and derivatives on a shifted forward."""
    return black76.sensitivities(
        *outright_arguments(forward, strike, shift), vol, expiry, discount, kind=kind, executor=executor
    )
