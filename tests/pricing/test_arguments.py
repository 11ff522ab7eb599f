"""What a method takes and refuses: shapes, scalars, bad numbers, executors, block cuts."""

from __future__ import annotations

import subprocess
import sys
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from typing import Any

import numpy as np
import pytest

from spreadgui.pricing import black76, blocks, methods, yardstick

KEYS = [method.key for method in methods.LOGNORMAL_METHODS]
GOOD: dict[str, Any] = {
    "forward_long": 112.0,
    "forward_short": 103.0,
    "strike": 0.0,
    "vol_long": 0.3,
    "vol_short": 0.4,
    "correlation": 0.5,
    "expiry": 1.0,
    "discount": 0.95,
}
BAD = [
    ("forward_long", 0.0, "above zero, found 0.0"),
    ("forward_short", -1.0, "above zero, found -1.0"),
    ("strike", float("nan"), "finite, found nan"),
    ("strike", float("inf"), "finite, found inf"),
    ("forward_long", float("inf"), "finite, found inf"),
    ("vol_long", -0.1, "zero or above, found -0.1"),
    ("vol_short", float("nan"), "finite, found nan"),
    ("correlation", 1.0000001, "between -1 and 1, found 1.0000001"),
    ("correlation", -1.5, "between -1 and 1, found -1.5"),
    ("expiry", -1e-9, "zero or above, found -1e-09"),
    ("discount", -0.5, "zero or above, found -0.5"),
    ("discount", float("-inf"), "finite, found -inf"),
    ("forward_long", 1e300, r"between 1e-60 and 1e\+60, found 1e\+300"),
    ("forward_short", 5e-324, r"between 1e-60 and 1e\+60, found 5e-324"),
    ("strike", -1e300, r"within 1e\+60 of zero, found -1e\+300"),
    ("vol_long", 1e7, r"at most 1e\+06, found 10000000.0"),
    ("expiry", 1e300, r"at most 1e\+06"),
    ("vol_short", "wide", "expected real numbers"),
    ("expiry", 1j, "expected real numbers"),
    ("expiry", None, "finite"),
]


@pytest.mark.parametrize("call", ["value", "sensitivities"])
@pytest.mark.parametrize(("name", "bad", "words"), BAD)
@pytest.mark.parametrize("key", KEYS)
def test_a_bad_number_is_refused_by_the_name_of_its_argument(
    key: str, name: str, bad: object, words: str, call: str
) -> None:
    with pytest.raises(ValueError, match=f"^{name}: .*{words}"):
        getattr(methods.method(key), call)(**{**GOOD, name: bad})


@pytest.mark.parametrize("kind", ["call", "put", "forward"])
def test_a_bad_number_in_an_array_is_shown_with_its_place(kind: str) -> None:
    vols = np.full((2, 3), 0.4)
    vols[1, 2] = -0.25
    with pytest.raises(ValueError, match=r"^vol_short: must be zero or above, found -0.25 at index \(1, 2\)"):
        yardstick.value(**{**GOOD, "vol_short": vols}, kind=kind)
    long = np.full(200_000, 100.0)
    long[150_000] = np.nan
    with pytest.raises(ValueError, match=r"^forward_long: must be finite, found nan at index 150000"):
        yardstick.value(**{**GOOD, "forward_long": long}, kind=kind)


@pytest.mark.parametrize("key", KEYS)
def test_shapes_that_do_not_broadcast_are_refused_by_name(key: str) -> None:
    with pytest.raises(ValueError, match=r"^vol_short: shape \(2,\) does not broadcast with \(3,\)"):
        methods.method(key).value(**{**GOOD, "forward_long": [100.0] * 3, "vol_short": [0.1, 0.2]})


@pytest.mark.parametrize("kind", ["straddle", "Call", "", None, 1, ["call"]])
@pytest.mark.parametrize("key", KEYS)
def test_an_unknown_kind_is_refused(key: str, kind: Any) -> None:
    with pytest.raises(ValueError, match=r"^kind: expected one of call, put, forward"):
        methods.method(key).value(**GOOD, kind=kind)
    with pytest.raises(ValueError, match=r"^kind: expected one of call, put, forward"):
        black76.value(100.0, 90.0, 0.3, 1.0, kind=kind)


@pytest.mark.parametrize(
    ("name", "bad"), [("forward", 0.0), ("strike", np.nan), ("vol", -1.0), ("expiry", -1.0), ("discount", -1.0)]
)
def test_black76_refuses_by_name(name: str, bad: float) -> None:
    good = {"forward": 100.0, "strike": 90.0, "vol": 0.3, "expiry": 1.0, "discount": 0.95}
    with pytest.raises(ValueError, match=f"^{name}: "):
        black76.sensitivities(**{**good, name: bad})


@pytest.mark.parametrize("kind", ["call", "put", "forward"])
@pytest.mark.parametrize(
    ("shapes", "expected"),
    [
        (((), ()), ()),
        (((1,), ()), (1,)),
        (((0,), ()), (0,)),
        (((3, 0), (1,)), (3, 0)),
        (((4,), (3, 1)), (3, 4)),
        (((2, 1, 3), (5, 1)), (2, 5, 3)),
    ],
)
@pytest.mark.parametrize("key", KEYS)
def test_results_are_float_arrays_of_the_broadcast_shape(
    key: str, shapes: tuple[tuple[int, ...], tuple[int, ...]], expected: tuple[int, ...], kind: str
) -> None:
    arguments = {**GOOD, "forward_long": np.full(shapes[0], 112), "vol_long": np.full(shapes[1], 0.3)}
    value = methods.method(key).value(**arguments, kind=kind)
    results = methods.method(key).sensitivities(**arguments, kind=kind)
    plain = methods.method(key).value(**GOOD, kind=kind)
    for array in (value, *results):
        assert isinstance(array, np.ndarray)
        assert (array.shape, array.dtype) == (expected, np.dtype(np.float64))
        assert array.flags.writeable
    assert np.all(value == plain)


def book(rows: int) -> dict[str, Any]:
    draw = np.random.default_rng(7)
    return {
        "forward_long": draw.uniform(40.0, 160.0, rows),
        "forward_short": draw.uniform(40.0, 160.0, rows),
        "strike": draw.uniform(-60.0, 60.0, rows) * (draw.random(rows) > 0.1),
        "vol_long": draw.uniform(0.0, 0.9, rows) * (draw.random(rows) > 0.05),
        "vol_short": draw.uniform(0.0, 0.9, rows),
        "correlation": np.clip(draw.uniform(-1.3, 1.3, rows), -1.0, 1.0),
        "expiry": draw.uniform(0.0, 3.0, rows),
        "discount": draw.uniform(0.8, 1.0, rows),
    }


def alone(key: str, columns: dict[str, Any]) -> dict[str, Any]:
    return {**columns, "strike": np.zeros_like(columns["strike"])} if key == "margrabe" else columns


class Returning(Executor):
    """An executor that shares no memory: what a task writes anywhere but into its result is lost."""

    def submit(self, task: Any, /, *arguments: Any, **named: Any) -> Future[Any]:
        future: Future[Any] = Future()
        copies = [np.array(item) if isinstance(item, np.ndarray) else item for item in arguments]
        future.set_result(task(*copies, **named))
        return future


@pytest.mark.parametrize("key", KEYS)
def test_neither_block_cut_nor_executor_changes_a_digit(key: str, monkeypatch: pytest.MonkeyPatch) -> None:
    method, columns = methods.method(key), alone(key, book(3000))
    whole = method.sensitivities(**columns)
    with ThreadPoolExecutor(2) as pool:
        threaded, returned = (method.sensitivities(**columns, executor=executor) for executor in (pool, Returning()))
        monkeypatch.setattr(blocks.run, "__kwdefaults__", {**blocks.run.__kwdefaults__, "task_rows": 700})
        small_tasks = [method.sensitivities(**columns, executor=executor) for executor in (pool, Returning())]
    halves = [
        method.sensitivities(**{name: column[part] for name, column in columns.items()})
        for part in (slice(0, 1111), slice(1111, None))
    ]
    folded = method.sensitivities(**{name: column.reshape(30, 100) for name, column in columns.items()})
    for field in whole._fields:
        expected = getattr(whole, field)
        for other in (threaded, returned, *small_tasks):
            assert np.array_equal(getattr(other, field), expected), field
        assert np.array_equal(np.concatenate([getattr(half, field) for half in halves]), expected), field
        assert np.array_equal(getattr(folded, field).ravel(), expected), field


@pytest.mark.parametrize("key", KEYS)
def test_a_row_alone_is_the_row_in_company(key: str) -> None:
    method, columns = methods.method(key), alone(key, book(60))
    together = method.sensitivities(**columns)
    for row in range(60):
        single = method.sensitivities(**{name: column[row] for name, column in columns.items()})
        for field in together._fields:
            assert float(getattr(single, field)) == pytest.approx(getattr(together, field)[row], rel=1e-14, abs=1e-300)


@pytest.mark.parametrize("key", KEYS)
def test_columns_given_as_rows_and_columns_meet_in_blocks(key: str) -> None:
    """Scenarios down, positions across, more of either than a block holds."""
    method = methods.method(key)
    moves, vols = np.linspace(60.0, 160.0, 130)[:, None], np.linspace(0.1, 0.5, 90)
    grid = method.value(moves, 100.0, 0.0, vols, 0.3, 0.5, 1.0)
    long, vol = np.broadcast_arrays(moves, vols)
    assert np.array_equal(grid, method.value(long.copy(), 100.0, 0.0, vol.copy(), 0.3, 0.5, 1.0))


def test_the_arguments_are_left_as_they_were() -> None:
    columns = book(500)
    kept = {name: column.copy() for name, column in columns.items()}
    for column in columns.values():
        column.flags.writeable = False
    for method in methods.LOGNORMAL_METHODS[1:]:
        method.sensitivities(**columns, kind="put")
    assert all(np.array_equal(columns[name], kept[name]) for name in columns)


@pytest.mark.parametrize("key", KEYS)
def test_value_and_sensitivities_agree_on_the_value(key: str) -> None:
    method, columns = methods.method(key), alone(key, book(2000))
    gap = method.value(**columns) - method.sensitivities(**columns).value
    assert np.max(np.abs(gap)) <= 1e-13 * 160.0


def test_the_pieces_of_a_shape_cover_it_once_and_in_order() -> None:
    for shape in ((7,), (3, 5), (2, 3, 40), (1, 1), (50, 1)):
        numbers = np.arange(np.prod(shape)).reshape(shape)
        parts = [numbers[piece].ravel() for piece in blocks.pieces(shape, 16)]
        assert max(part.size for part in parts) <= 16
        assert np.array_equal(np.concatenate(parts), numbers.ravel())


def test_import_brings_in_no_more_than_numpy_and_special_functions() -> None:
    words = (
        "import sys; from spreadgui.pricing import black76, kirk, margrabe, modified_kirk;"
        "from spreadgui.pricing import bjerksund_stensland, yardstick;"
        "print([m for m in sys.modules if m in ('scipy.stats', 'scipy.optimize', 'PySide6')])"
    )
    answer = subprocess.run([sys.executable, "-c", words], capture_output=True, text=True, check=True)
    assert answer.stdout.strip() == "[]"
