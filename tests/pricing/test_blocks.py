"""The block run: what a guard stops, what threads share, what a failure leaves behind."""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor, Future, ProcessPoolExecutor, ThreadPoolExecutor
from multiprocessing import get_context
from typing import Any

import numpy as np
import pytest

from spreadgui.pricing import blocks, front, kirk, methods
from spreadgui.pricing.inputs import Array

ROWS = 3 * front.LONG
KEYS = ["kirk", "modified_kirk", "bjerksund_stensland"]
BAD = [
    ("forward_long", float("nan"), "finite, found nan"),
    ("forward_short", 0.0, "above zero, found 0.0"),
    ("forward_short", 1e-70, "between 1e-60"),
    ("strike", float("inf"), "finite, found inf"),
    ("strike", -1e70, "within 1e"),
    ("vol_long", -0.1, "zero or above, found -0.1"),
    ("vol_short", 1e7, "at most 1e"),
    ("correlation", -1.0000001, "between -1 and 1, found -1.0000001"),
    ("expiry", -1e-300, "zero or above"),
    ("discount", float("-inf"), "finite, found -inf"),
]


def book(rows: int = ROWS) -> dict[str, Array]:
    draw = np.random.default_rng(23)
    bounds = ((40, 160), (40, 160), (-60, 60), (0, 0.9), (0, 0.9), (-1, 1), (0, 3), (0.8, 1))
    names = ("forward_long", "forward_short", "strike", "vol_long", "vol_short", "correlation", "expiry", "discount")
    return {name: draw.uniform(*bound, rows) for name, bound in zip(names, bounds, strict=True)}


@pytest.mark.parametrize("threads", [False, True])
@pytest.mark.parametrize(("name", "bad", "words"), BAD)
def test_a_bad_number_in_long_columns_is_named_with_its_place(name: str, bad: float, words: str, threads: bool) -> None:
    columns = book()
    place = 2 * front.LONG + 77
    columns[name][place] = bad
    message = f"^{name}: must be .*{words}.* at index {place}$"
    with ThreadPoolExecutor(2) as pool, pytest.raises(ValueError, match=message):
        kirk.value(**columns, executor=pool if threads else None)
    with pytest.raises(ValueError, match=message):
        kirk.value(**columns, kind="forward")


def test_a_bad_number_in_a_long_row_beside_a_long_column_is_named() -> None:
    down, across = np.full((front.LONG, 1), 100.0), np.full((1, front.LONG), 0.3)
    across[0, 5] = -0.3
    with pytest.raises(ValueError, match=r"^vol_short: must be zero or above, found -0.3 at index \(0, 5\)"):
        kirk.value(down, 100.0, 5.0, 0.3, across, 0.5, 1.0)


def test_a_bad_number_in_a_long_row_that_is_repeated_is_named() -> None:
    long, vols = np.full((2, front.LONG), 100.0), np.full(front.LONG, 0.3)
    vols[9] = np.nan
    with pytest.raises(ValueError, match=r"^vol_long: must be finite, found nan at index 9"):
        kirk.value(long, 100.0, 5.0, vols, 0.3, 0.5, 1.0)


def test_the_ends_of_the_bounds_and_a_negative_zero_pass() -> None:
    columns = book()
    columns["correlation"][:2] = 1.0, -1.0
    for name in ("vol_long", "vol_short", "expiry", "discount"):
        columns[name][:] = np.where(np.arange(ROWS) % 3 == 0, -0.0, columns[name])
    value = kirk.value(**columns)
    assert np.all(value >= 0.0)
    assert not np.any(np.signbit(value))


@pytest.mark.parametrize("key", KEYS)
def test_long_columns_give_the_digits_of_short_ones_on_every_executor(key: str) -> None:
    method, columns = methods.method(key), book()
    whole = np.array(method.sensitivities(**columns))
    values = method.value(**columns)
    with ThreadPoolExecutor(2) as threads:
        assert np.array_equal(whole, np.array(method.sensitivities(**columns, executor=threads)))
        assert np.array_equal(values, method.value(**columns, executor=threads))
    for start in range(0, ROWS, 20_011):
        part = {name: column[start : start + 20_011] for name, column in columns.items()}
        assert np.array_equal(whole[:, start : start + 20_011], np.array(method.sensitivities(**part)))
        assert np.array_equal(values[start : start + 20_011], method.value(**part))


def test_other_processes_give_the_same_digits_and_name_the_same_faults() -> None:
    columns = book()
    with ProcessPoolExecutor(1, mp_context=get_context("spawn")) as processes:
        assert np.array_equal(kirk.value(**columns), kirk.value(**columns, executor=processes))
        columns["expiry"][-1] = -1.0
        with pytest.raises(ValueError, match=f"^expiry: must be zero or above, found -1.0 at index {ROWS - 1}$"):
            kirk.value(**columns, executor=processes)


def _double(block: Sequence[Array], out: Array, work: Array) -> None:
    work[0] = block[0]
    np.add(block[0], work[0], out=out[0])


@pytest.mark.parametrize("kind", ["call", "put"])
@pytest.mark.parametrize("key", KEYS)
def test_one_number_for_all_rows_gives_the_digits_of_a_full_column(key: str, kind: str) -> None:
    method, columns = methods.method(key), book(500)
    for kept in ("forward_long", "strike", "vol_long", "vol_short", "correlation", "expiry", "discount"):
        few = {name: column if name == kept else column[7] for name, column in columns.items()}
        full = {name: np.full(500, column) if np.ndim(column) == 0 else column for name, column in few.items()}
        short, long = method.sensitivities(**few, kind=kind), method.sensitivities(**full, kind=kind)
        assert np.array_equal(np.array(short), np.array(long)), kept
        assert np.array_equal(method.value(**few, kind=kind), method.value(**full, kind=kind)), kept


class Failing(Executor):
    """Fails at the first task and never comes to the others."""

    def __init__(self) -> None:
        self.given: list[Future[Any]] = []

    def submit(self, task: Any, /, *arguments: Any, **named: Any) -> Future[Any]:
        future: Future[Any] = Future()
        if not self.given:
            future.set_exception(OSError("gone"))
        self.given.append(future)
        return future


def test_after_a_failure_the_rest_is_not_begun() -> None:
    executor = Failing()
    with pytest.raises(OSError, match="gone"):
        blocks.run(_double, [np.arange(100.0)], (100,), 1, scratch=1, executor=executor, block_rows=10, task_rows=20)
    assert len(executor.given) == 5
    assert all(future.cancelled() for future in executor.given[1:])


def test_a_task_longer_than_a_block_and_a_block_longer_than_the_rows_are_filled() -> None:
    numbers = np.arange(1003.0)
    with ThreadPoolExecutor(2) as pool:
        for block_rows, task_rows in ((7, 100), (100, 7), (5000, 5000)):
            for executor in (None, pool):
                found = blocks.run(
                    _double,
                    [numbers],
                    (1003,),
                    1,
                    scratch=1,
                    executor=executor,
                    block_rows=block_rows,
                    task_rows=task_rows,
                )
                assert np.array_equal(found[0], 2.0 * numbers)
