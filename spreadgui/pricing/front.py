"""The way into every spread method: checks, the forward payoff, the block run."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from concurrent.futures import Executor
from functools import partial

from numpy.typing import ArrayLike

from spreadgui.pricing.blocks import SENSITIVITY_BLOCK_ROWS, VALUE_BLOCK_ROWS, Kernel, OutsideError, run
from spreadgui.pricing.inputs import (
    Array,
    SpreadColumns,
    check_kind,
    check_spread,
    common_shape,
    spread_floats,
    within_bounds,
)
from spreadgui.pricing.results import Sensitivities, forward_sensitivities, forward_value, named

Check = Callable[[SpreadColumns], None]
Arguments = tuple[ArrayLike, ArrayLike, ArrayLike, ArrayLike, ArrayLike, ArrayLike, ArrayLike, ArrayLike]

# Columns shorter than this lie in the cache, and are checked whole before the run.
LONG = 32768


def _guard(places: Sequence[int], block: Sequence[Array]) -> None:
    if not within_bounds(places, block):
        raise OutsideError


def _admit(given: Arguments, kind: str, check: Check | None) -> tuple[SpreadColumns, tuple[int, ...], tuple[int, ...]]:
    """Columns, their common shape, and the places of the long ones, which the run has to look over by the block."""
    check_kind(kind)
    columns = spread_floats(given)
    long = tuple(place for place, column in enumerate(columns) if column.size >= LONG)
    if kind == "forward" or any(columns[place].shape != columns[long[0]].shape for place in long):
        long = ()
    check_spread(columns, long)
    shape = common_shape(columns._asdict())
    if long and columns[long[0]].shape != shape:
        check_spread(columns)
        long = ()
    if check is not None:
        check(columns)
    return columns, shape, long


def _run(
    kernel: Kernel,
    columns: SpreadColumns,
    shape: tuple[int, ...],
    long: tuple[int, ...],
    results: int,
    executor: Executor | None,
    scratch: int,
    block_rows: int,
) -> Array:
    """The block run; where it meets a bad number the whole check follows and names the argument."""
    call = partial(run, kernel, columns, shape, results, scratch=scratch, executor=executor, block_rows=block_rows)
    try:
        return call(guard=partial(_guard, long) if long else None)
    except OutsideError:
        check_spread(columns)
        raise


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
    columns, shape, long = _admit(given, kind, check)
    if kind == "forward":
        return forward_value(columns, shape)
    return _run(kernel, columns, shape, long, 1, executor, scratch, block_rows)[0, ...]


def differentiate(
    kernel: Kernel,
    given: Arguments,
    kind: str,
    executor: Executor | None,
    *,
    check: Check | None = None,
    scratch: int = 0,
    block_rows: int = SENSITIVITY_BLOCK_ROWS,
) -> Sensitivities:
    """The method's value and derivatives of shape given by the arguments; the forward needs no method."""
    columns, shape, long = _admit(given, kind, check)
    if kind == "forward":
        return forward_sensitivities(columns, shape)
    layers = len(Sensitivities._fields)
    return named(_run(kernel, columns, shape, long, layers, executor, scratch, block_rows))
