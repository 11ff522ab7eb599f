"""What a method hands back."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from spreadgui.pricing.inputs import Array, SpreadColumns


class Sensitivities(NamedTuple):
    """Value and plain derivatives of a spread option, each an array of the broadcast shape.

    Every derivative is per 1.0 of its own argument with all other arguments held, the discount factor among them.
    `theta` is minus the derivative in the expiry, discount held as well: the carry of the premium belongs to whoever
    knows the rate. `gamma_cross` is the mixed second derivative in the two forwards.
    """

    value: Array
    delta_long: Array
    delta_short: Array
    gamma_long: Array
    gamma_short: Array
    gamma_cross: Array
    vega_long: Array
    vega_short: Array
    correlation_sensitivity: Array
    theta: Array


def named(results: Array) -> Sensitivities:
    """The ten layers of a block run as named arrays; zero-dimensional results stay arrays."""
    return Sensitivities(*(results[layer, ...] for layer in range(len(Sensitivities._fields))))


def forward_value(columns: SpreadColumns, shape: tuple[int, ...]) -> Array:
    """The discounted forward F_long - F_short - K, the same under every method."""
    long, short = columns.forward_long, columns.forward_short
    with np.errstate(all="ignore"):
        value = columns.discount * (long - short - columns.strike) + 0.0
    return np.array(np.broadcast_to(value, shape))


def forward_sensitivities(columns: SpreadColumns, shape: tuple[int, ...]) -> Sensitivities:
    """Value and derivatives of the forward: the discount factor on either leg, nothing else."""
    results = np.zeros((len(Sensitivities._fields), *shape))
    results[0] = forward_value(columns, shape)
    results[1] = columns.discount
    results[2] = 0.0 - columns.discount
    return named(results)
