"""Cutting a call into cache-sized blocks and mapping them, inline or over the caller's executor.

A formula of forty array passes over a million rows is bound by memory: every pass fetches from and stores to main
memory what the pass before it had just made. Cut into blocks of some thousand rows the intermediate results stay in
the cache, and the buffers they live in are reused from block to block instead of being handed back to the operating
system and faulted in again. The block kernel never sees where its rows came from; its results depend on each row
alone, so that neither the cut nor the executor can change a digit.

With an executor the blocks are gathered into tasks. A pool of threads of this process writes into the results in
place; a task for any other executor returns its results, so that one of processes or of another machine serves as
well.

Long columns are looked over block by block too: a check of the whole column beforehand would fetch it from main
memory once more than the formula does.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from math import prod

import numpy as np

from spreadgui.pricing.inputs import Array

# Called with the columns of one block (each of shape (rows,) or (1,)), the results to fill (results, rows) and scratch
# space (scratch, rows).
Kernel = Callable[[Sequence[Array], Array, Array], None]
# Called with the columns of one block before the kernel is; raises `OutsideError` to end the run.
Guard = Callable[[Sequence[Array]], None]
Piece = tuple[int | slice, ...]

# Measured on a machine with half a megabyte of second-level cache: a value with its four buffers runs best at 32,768
# rows (16,384 cost 4 % more, 8,192 a fifth), sensitivities with their twenty-odd at 16,384; threads, which pass the
# interpreter's lock at every call, lose a third at 8,192.
BLOCK_ROWS = 8192
VALUE_BLOCK_ROWS = 32768
SENSITIVITY_BLOCK_ROWS = 16384
TASK_ROWS = 131072


class OutsideError(Exception):
    """A block holds a number its guard does not let pass."""


def pieces(shape: tuple[int, ...], rows: int) -> Iterator[Piece]:
    """Index tuples that cut an array of this shape into contiguous pieces of at most `rows` elements, in order.

    >>> list(pieces((5,), 2))
    [(slice(0, 2, None),), (slice(2, 4, None),), (slice(4, 5, None),)]
    >>> len(list(pieces((100, 3, 4), 24)))
    50
    """
    if not shape:
        yield ()
        return
    axis, inner = 0, prod(shape[1:])
    while inner > rows and axis < len(shape) - 1:
        axis += 1
        inner //= shape[axis]
    step = max(1, rows // max(inner, 1))
    for outer in np.ndindex(*shape[:axis]):
        for start in range(0, shape[axis], step):
            yield (*outer, slice(start, min(start + step, shape[axis])))


def _take(column: Array, shape: tuple[int, ...], piece: Piece) -> Array:
    """The rows of one piece as a flat array; a scalar column stays one number and is broadcast inside the kernel."""
    if column.size == 1:
        return column.reshape(1)
    return np.broadcast_to(column, shape)[piece].reshape(-1)


def _fill(
    kernel: Kernel, guard: Guard | None, columns: Sequence[Array], out: Array, work: Array, block_rows: int
) -> None:
    """Run the kernel over flat columns block by block, every block in the same scratch space."""
    total = out.shape[1]
    with np.errstate(all="ignore"):
        for start in range(0, total, block_rows):
            stop = min(start + block_rows, total)
            block = [column if column.size == 1 else column[start:stop] for column in columns]
            if guard is not None:
                guard(block)
            kernel(block, out[:, start:stop], work[:, : stop - start])


def _fill_beside(
    kernel: Kernel,
    guard: Guard | None,
    columns: Sequence[Array],
    out: Array,
    spaces: deque[Array],
    scratch: int,
    block_rows: int,
) -> None:
    """A task for a thread: scratch space is handed from task to task, as fresh memory is dear."""
    try:
        work = spaces.pop()
    except IndexError:
        work = np.empty((scratch, block_rows))
    _fill(kernel, guard, columns, out, work, block_rows)
    spaces.append(work)


def _filled(
    kernel: Kernel,
    guard: Guard | None,
    columns: Sequence[Array],
    size: int,
    results: int,
    scratch: int,
    block_rows: int,
) -> Array:
    """A task for executors that share no memory with the caller."""
    out = np.empty((results, size))
    _fill(kernel, guard, columns, out, np.empty((scratch, min(block_rows, size))), block_rows)
    return out


def collect(pending: Sequence[tuple[Array, Future[Array]] | Future[None]]) -> None:
    """Wait for every task in order and store what it returns; after a failure the rest is not begun."""
    try:
        for task in pending:
            if isinstance(task, tuple):
                task[0][...] = task[1].result()
            else:
                task.result()
    except BaseException:
        for task in pending:
            (task[1] if isinstance(task, tuple) else task).cancel()
        raise


def run(
    kernel: Kernel,
    columns: Sequence[Array],
    shape: tuple[int, ...],
    results: int,
    *,
    scratch: int = 0,
    executor: Executor | None = None,
    guard: Guard | None = None,
    block_rows: int = BLOCK_ROWS,
    task_rows: int = TASK_ROWS,
) -> Array:
    """Results of shape (results, *shape) of a row-wise kernel over columns that broadcast to `shape`.

    With an executor tasks hold about `task_rows` rows; kernel and guard must be picklable where the executor needs
    that. `OutsideError` where the guard raises it.
    """
    out = np.empty((results, *shape))
    if not out.size:
        return out
    flat, start = out.reshape(results, -1), 0
    block_rows = min(block_rows, flat.shape[1])
    work = np.empty((scratch if executor is None else 0, block_rows))
    spaces: deque[Array] = deque()
    pending: list[tuple[Array, Future[Array]] | Future[None]] = []
    for piece in pieces(shape, block_rows if executor is None else task_rows):
        taken = [_take(column, shape, piece) for column in columns]
        stop = start + out[(0, *piece)].size
        part, start = flat[:, start:stop], stop
        if executor is None:
            _fill(kernel, guard, taken, part, work, block_rows)
        elif isinstance(executor, ThreadPoolExecutor):
            pending.append(executor.submit(_fill_beside, kernel, guard, taken, part, spaces, scratch, block_rows))
        else:
            size = part.shape[1]
            task = executor.submit(_filled, kernel, guard, taken, size, results, scratch, block_rows)
            pending.append((part, task))
    collect(pending)
    return out
