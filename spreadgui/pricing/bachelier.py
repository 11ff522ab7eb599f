"""Bachelier's formula for the spread of two normal forwards (L. Bachelier, "Theorie de la speculation", Annales
scientifiques de l'Ecole normale superieure 17, 1900, 21-86; for two legs the difference of jointly normal prices is
normal).

Each forward moves by dF = s dW in units of its price, the two Brownian motions correlated, so the spread is normal with

    s^2 = s_long^2 - 2 rho s_long s_short + s_short^2

a year. The call is D ((F_long - F_short - K) N(d) + s sqrt(T) n(d)), d = (F_long - F_short - K)/(s sqrt(T)). It is
exact for the model at every strike, there is no approximation and no role exchange to speak of; prices below zero are
as good as any other, and forwards may be any number within the room's limits for amounts. Volatilities are
**absolute**: units of price per square root of a year, of the legs as the caller has folded the ratios in (a leg b F
has volatility b s).

Measured against 40 digits for forwards of -200..200, volatilities of 0.5..250, correlation within 0.9999, strikes
within six deviations of the money: the error is at most 1.9e-16 of the forwards, strike and deviation added up, 99th
percentile 1.0e-16; in values median 1.7e-16, 99th percentile 1.7e-14, worst 4.4e-13, which is what the rounding of the
moneyness forces. Time values keep 13 digits however far from the money.

The model is another one than lognormal legs, and by how much it differs is no error of either. With each absolute
volatility taken as volatility x forward the value less the Yardstick's is over the ordinary box (strikes of -0.5..0.5
short forwards, volatilities 10..60 %, 0.1..3 years, correlation -0.9..0.95, long forward within two deviations of the
money), in short forwards, median 1.1e-2, 99th percentile 3.6e-1, worst 6.0; where neither leg's deviation to expiry is
above 0.15, 4.8e-4, 2.5e-3 and 4.3e-3; in 68 % of all it is the dearer one (tests/benchmarks/pricing_accuracy.py).
"""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from functools import partial

import numpy as np
from numpy.typing import ArrayLike

from spreadgui.pricing import normal_option
from spreadgui.pricing.black76 import OutrightSensitivities
from spreadgui.pricing.blocks import run
from spreadgui.pricing.inputs import (
    Array,
    OutrightColumns,
    SpreadColumns,
    as_floats,
    check_correlation,
    check_kind,
    check_not_negative,
    check_strike,
    common_shape,
)
from spreadgui.pricing.results import Sensitivities, forward_sensitivities, forward_value, named

_ONE_LEG = normal_option.LAYERS


def _check_vol(name: str, column: Array) -> None:
    """Refuse negative volatilities, and those that double precision would not carry through: being prices, they have
    the limits of prices."""
    check_strike(name, column)
    check_not_negative(name, np.minimum(column, 1.0))


def normal_columns(
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    correlation: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike,
) -> tuple[SpreadColumns, tuple[int, ...]]:
    """The checked columns of a spread option under normal legs, and their common shape. Forwards may have either
    sign."""
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    columns = SpreadColumns(*(as_floats(name, one) for name, one in zip(SpreadColumns._fields, given, strict=True)))
    for name in ("forward_long", "forward_short", "strike"):
        check_strike(name, getattr(columns, name))
    _check_vol("vol_long", columns.vol_long)
    _check_vol("vol_short", columns.vol_short)
    check_correlation("correlation", columns.correlation)
    check_not_negative("expiry", columns.expiry)
    check_not_negative("discount", columns.discount)
    return columns, common_shape(columns._asdict())


def _outright_columns(
    forward: ArrayLike, strike: ArrayLike, vol: ArrayLike, expiry: ArrayLike, discount: ArrayLike
) -> tuple[OutrightColumns, tuple[int, ...]]:
    given = (forward, strike, vol, expiry, discount)
    columns = OutrightColumns(*(as_floats(name, one) for name, one in zip(OutrightColumns._fields, given, strict=True)))
    check_strike("forward", columns.forward)
    check_strike("strike", columns.strike)
    _check_vol("vol", columns.vol)
    check_not_negative("expiry", columns.expiry)
    check_not_negative("discount", columns.discount)
    return columns, common_shape(columns._asdict())


def spread_vol(vol_long: Array, vol_short: Array, correlation: Array) -> Array:
    """The spread's absolute volatility, from checked arrays. The root of two squares that do not cancel, drawn so
    that neither can over- nor underflow."""
    free = np.sqrt(vol_long) * np.sqrt(vol_short) * np.sqrt(2.0 * (1.0 - correlation))
    return np.asarray(np.hypot(vol_long - vol_short, free))


def _sign(kind: str) -> float:
    return 1.0 if kind == "call" else -1.0


def _kernel(kind: str, block: Sequence[Array], out: Array, work: Array) -> None:
    long, short, strike, vol_long, vol_short, correlation, expiry, discount = block
    vol, root_time = spread_vol(vol_long, vol_short, correlation), np.sqrt(expiry)
    inner = out if len(out) == 1 else work
    normal_option.fill(_sign(kind), long - short - strike, vol, root_time, inner)
    if len(out) > 1:
        value, delta, gamma, vega, theta = inner
        gap, free, floored = vol_long - vol_short, 1.0 - correlation, np.maximum(vol, normal_option.LEAST)
        out[0], out[1], out[9] = value, delta, theta
        np.negative(delta, out=out[2])
        out[3], out[4] = gamma, gamma
        np.negative(gamma, out=out[5])
        out[6] = vega * ((gap + free * vol_short) / floored)
        out[7] = vega * ((free * vol_long - gap) / floored)
        out[8] = np.where(vega > 0.0, -vega * (vol_long * (vol_short / floored)), 0.0)
    out *= discount
    out += 0.0


def _outright_kernel(kind: str, block: Sequence[Array], out: Array, work: Array) -> None:
    forward, strike, vol, expiry, discount = block
    if kind == "forward":
        out[...] = 0.0
        out[0] = forward - strike
        out[1:2] = 1.0
    else:
        normal_option.fill(_sign(kind), forward - strike, vol, np.sqrt(expiry), out)
    out *= discount
    out += 0.0


def value(
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    correlation: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
    executor: Executor | None = None,
) -> Array:
    """Discounted value of the spread option under two normal forwards, of the broadcast shape of the arguments.

    Forwards and strike are prices of either sign; volatilities absolute (price per square root of a year), expiry in
    years, all three at zero or above as is the discount factor; correlation within -1..1; kind call, put or forward.
    `ValueError` naming the argument otherwise. Exact; see the module for its measured rounding.

    At the money it is worth the deviation over sqrt(2 pi), here 10:

    >>> round(float(value(-3.0, 5.0, -8.0, 6.0, 8.0, 0.0, 1.0)), 12) == round(10.0 / (2.0 * np.pi) ** 0.5, 12)
    True
    """
    check_kind(kind)
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    columns, shape = normal_columns(*given)
    if kind == "forward":
        return forward_value(columns, shape)
    return run(partial(_kernel, kind), columns, shape, 1, executor=executor)[0, ...]


def sensitivities(
    forward_long: ArrayLike,
    forward_short: ArrayLike,
    strike: ArrayLike,
    vol_long: ArrayLike,
    vol_short: ArrayLike,
    correlation: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
    executor: Executor | None = None,
) -> Sensitivities:
    """Discounted value and derivatives; arguments and refusals as for `value`.

    Vegas are per 1.0 of **absolute** volatility. Without deviation to expiry the deltas are those of the intrinsic
    value, one half of each at the kink, and every other derivative is given as zero, at the kink by convention.

    >>> greeks = sensitivities(40.0, 30.0, 10.0, 3.0, 4.0, 0.0, 1.0, kind="put")
    >>> float(greeks.delta_long), float(greeks.delta_short)
    (-0.5, 0.5)
    """
    check_kind(kind)
    given = (forward_long, forward_short, strike, vol_long, vol_short, correlation, expiry, discount)
    columns, shape = normal_columns(*given)
    if kind == "forward":
        return forward_sensitivities(columns, shape)
    layers = len(Sensitivities._fields)
    return named(run(partial(_kernel, kind), columns, shape, layers, scratch=_ONE_LEG, executor=executor))


def outright_value(
    forward: ArrayLike,
    strike: ArrayLike,
    vol: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
    executor: Executor | None = None,
) -> Array:
    """Discounted value of an option on one normal forward, of the broadcast shape of the arguments.

    Forward and strike are prices of either sign, volatility absolute, the rest as for `value`.

    >>> float(outright_value(-5.0, -5.0, 0.0, 1.0)), float(outright_value(-5.0, -12.0, 3.0, 0.0, 0.5))
    (0.0, 3.5)
    """
    check_kind(kind)
    columns, shape = _outright_columns(forward, strike, vol, expiry, discount)
    return run(partial(_outright_kernel, kind), columns, shape, 1, executor=executor)[0, ...]


def outright_sensitivities(
    forward: ArrayLike,
    strike: ArrayLike,
    vol: ArrayLike,
    expiry: ArrayLike,
    discount: ArrayLike = 1.0,
    *,
    kind: str = "call",
    executor: Executor | None = None,
) -> OutrightSensitivities:
    """Discounted value and derivatives of an option on one normal forward; arguments as for `outright_value`, vega
    per 1.0 of absolute volatility, limits as for `sensitivities`."""
    check_kind(kind)
    columns, shape = _outright_columns(forward, strike, vol, expiry, discount)
    layers = len(OutrightSensitivities._fields)
    results = run(partial(_outright_kernel, kind), columns, shape, layers, executor=executor)
    return OutrightSensitivities(*(results[layer, ...] for layer in range(layers)))
