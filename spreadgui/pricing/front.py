"""The way into every spread method: checks, the forward payoff, the block run."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import Executor

from numpy.typing import ArrayLike

from spreadgui.pricing.blocks import BLOCK_ROWS, VALUE_BLOCK_ROWS, Kernel, run
from spreadgui.pricing.inputs import Array, SpreadColumns, check_kind, spread_columns
from spreadgui.pricing.results import Sensitivities, forward_sensitivities, forward_value, named

Check = Callable[[SpreadColumns], None]
Arguments = tuple[ArrayLike, ArrayLike, ArrayLike, ArrayLike, ArrayLike, ArrayLike, ArrayLike, ArrayLike]


def price(
    kernel: Kernel,
    given: Arguments,
    kind: str,
    executor: Executor | None,
    *,
    check: Check | None = None,
    scratch: int = 0,
    block_rows: int = VALUE_BLOCK_ROWS,
) -> Array:
    """The method's value of shape given by the arguments; the forward needs no method."""
    check_kind(kind)
    columns, shape = spread_columns(*given)
    if check is not None:
        check(columns)
    if kind == "forward":
        return forward_value(columns, shape)
    return run(kernel, columns, shape, 1, scratch=scratch, executor=executor, block_rows=block_rows)[0, ...]


def differentiate(
    kernel: Kernel,
    given: Arguments,
    kind: str,
    executor: Executor | None,
    *,
    check: Check | None = None,
    scratch: int = 0,
    block_rows: int = BLOCK_ROWS,
) -> Sensitivities:
    """The method's value and derivatives of shape given by the arguments; the forward needs no method."""
    check_kind(kind)
    columns, shape = spread_columns(*given)
    if check is not None:
        check(columns)
    if kind == "forward":
        return forward_sensitivities(columns, shape)
    layers = len(Sensitivities._fields)
    return named(run(kernel, columns, shape, layers, scratch=scratch, executor=executor, block_rows=block_rows))
