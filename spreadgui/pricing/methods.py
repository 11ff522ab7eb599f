"""The methods table: every published method of this room, declared once.

Columns, panels, the command line and the tests loop over `METHODS`; a new method is one entry.
"""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import Executor
from dataclasses import dataclass
from importlib import import_module
from types import ModuleType
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from spreadgui.pricing.inputs import Array
from spreadgui.pricing.results import Sensitivities

Accepts = Callable[[ArrayLike], NDArray[np.bool_]]


def any_strike(strike: ArrayLike) -> NDArray[np.bool_]:
    """True everywhere, in the shape of the strikes."""
    return np.ones(np.shape(strike), dtype=np.bool_)


def strike_of_zero(strike: ArrayLike) -> NDArray[np.bool_]:
    """True where the strike is zero, in the shape of the strikes."""
    return np.asarray(np.asarray(strike) == 0.0)


@dataclass(frozen=True)
class Method:
    """One published method; its formulas are in the module of this room that has its key for a name.

    `law` is what it takes the forwards to be: "lognormal", which with `shifted` serves shifted ones as well, or
    "normal". A `reference` is exact for its law, or as good as.
    """

    key: str
    name: str
    source: str
    applies: str
    accepts: Accepts = any_strike
    reference: bool = False
    law: str = "lognormal"

    def value(self, *arguments: ArrayLike, executor: Executor | None = None, **named: Any) -> Array:
        """The discounted value; arguments, by place or by name, are those of the method's own `value`."""
        found: Array = self._module().value(*arguments, executor=executor, **named)
        return found

    def sensitivities(self, *arguments: ArrayLike, executor: Executor | None = None, **named: Any) -> Sensitivities:
        """The discounted value and its derivatives; arguments as for `value`."""
        found: Sensitivities = self._module().sensitivities(*arguments, executor=executor, **named)
        return found

    def _module(self) -> ModuleType:
        # Loaded when first used, so that whoever only needs names and sources does not wait for SciPy.
        return import_module(f"spreadgui.pricing.{self.key}")


METHODS: tuple[Method, ...] = (
    Method(
        key="margrabe",
        name="Margrabe",
        source="W. Margrabe, Journal of Finance 33 (1978) 177-186",
        applies="Exact for a strike of zero, and only there.",
        accepts=strike_of_zero,
    ),
    Method(
        key="kirk",
        name="Kirk",
        source="E. Kirk, in Managing Energy Price Risk (Risk Publications, 1995)",
        applies="Approximate; best for strikes that are small beside the short forward.",
    ),
    Method(
        key="modified_kirk",
        name="modified Kirk",
        source="E. Alòs and J. A. León, Quantitative Finance 16 (2016) 31-42",
        applies="Kirk with the volatility corrected for its slope in moneyness; best near the money.",
    ),
    Method(
        key="bjerksund_stensland",
        name="Bjerksund-Stensland",
        source="P. Bjerksund and G. Stensland, Quantitative Finance 14 (2014) 1785-1794",
        applies="Approximate from below; the closest of the closed forms over most of the range.",
    ),
    Method(
        key="yardstick",
        name="Yardstick",
        source="Numerical integration along the exercise boundary; derived in spreadgui.pricing.boundary",
        applies="The reference value under two lognormal forwards, for every strike.",
        reference=True,
    ),
    Method(
        key="bachelier",
        name="Bachelier",
        source="L. Bachelier, Annales scientifiques de l'Ecole normale superieure 17 (1900) 21-86",
        applies="Exact under two normal forwards, of either sign, with absolute volatilities.",
        reference=True,
        law="normal",
    ),
)

LOGNORMAL_METHODS = tuple(method for method in METHODS if method.law == "lognormal")
NORMAL_METHODS = tuple(method for method in METHODS if method.law == "normal")

_BY_KEY = {method.key: method for method in METHODS}


def method(key: str) -> Method:
    """The method of that key; `ValueError` listing the keys there are.

    >>> method("kirk").name
    'Kirk'
    """
    if key not in _BY_KEY:
        raise ValueError(f"method: expected one of {', '.join(_BY_KEY)}, found {key!r}")
    return _BY_KEY[key]
