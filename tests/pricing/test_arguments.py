"""What a method takes and refuses: shapes, scalars, bad numbers, executors, block cuts."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from functools import partial
from typing import Any

import numpy as np
import pytest

from spreadgui.pricing import bachelier, black76, blocks, implied, kirk, methods, shifted, yardstick

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


OUTRIGHT = {"forward": 100.0, "strike": 90.0, "vol": 0.3, "expiry": 1.0, "discount": 0.95}
QUOTED = {name: GOOD[name] for name in GOOD if name != "correlation"}
WIDTH = {name: QUOTED[name] for name in QUOTED if not name.startswith("vol")}
SHIFTS = {"shift_long": 40.0, "shift_short": 0.0}
# Every way into the room beside the methods of the table: what is called, and arguments that are good for it.
ENTRANCES: dict[str, tuple[Callable[..., Any], dict[str, float]]] = {
    "yardstick.estimate": (yardstick.estimate, GOOD),
    "bachelier.value": (bachelier.value, GOOD),
    "bachelier.sensitivities": (bachelier.sensitivities, GOOD),
    "bachelier.outright_value": (bachelier.outright_value, OUTRIGHT),
    "bachelier.outright_sensitivities": (bachelier.outright_sensitivities, OUTRIGHT),
    "black76.value": (black76.value, OUTRIGHT),
    "black76.sensitivities": (black76.sensitivities, OUTRIGHT),
    "shifted.value": (partial(shifted.value, kirk.value), {**GOOD, **SHIFTS}),
    "shifted.sensitivities": (partial(shifted.sensitivities, kirk.sensitivities), {**GOOD, **SHIFTS}),
    "shifted.outright_value": (shifted.outright_value, {**OUTRIGHT, "shift": 5.0}),
    "shifted.outright_sensitivities": (shifted.outright_sensitivities, {**OUTRIGHT, "shift": 5.0}),
    "implied.correlation": (implied.correlation, {"premium": 20.0, **QUOTED}),
    "implied.correlation by bachelier": (
        partial(implied.correlation, method="bachelier"),
        {"premium": 20.0, **QUOTED, "vol_long": 30.0, "vol_short": 40.0},
    ),
    "implied.correlation_with_error": (
        implied.correlation_with_error,
        {"premium": 20.0, **QUOTED, "tolerance": 0.005},
    ),
    "implied.spread_volatility": (implied.spread_volatility, {"premium": 20.0, **WIDTH}),
    "implied.spread_volatility_with_error": (
        implied.spread_volatility_with_error,
        {"premium": 20.0, **WIDTH, "tolerance": 0.005},
    ),
}
NEVER_NEGATIVE = ("vol", "vol_long", "vol_short", "expiry", "discount", "tolerance")
UNFIT = [np.nan, np.inf, -np.inf, 1e300, -1e300, "wide", 1j, None, [1.0, np.nan], [[np.inf]], {}, object()]


@pytest.mark.parametrize(
    ("entrance", "name"), [(entrance, name) for entrance, (_, good) in ENTRANCES.items() for name in good]
)
def test_every_entrance_refuses_what_is_no_number_for_it_by_the_name_of_the_argument(entrance: str, name: str) -> None:
    call, good = ENTRANCES[entrance]
    lognormal = "bachelier" not in entrance and "spread_volatility" not in entrance
    unfit = list(UNFIT)
    if name == "tolerance":
        unfit.remove(None)
    if name in NEVER_NEGATIVE:
        unfit += [-1e-9, [0.3, -5.0]]
    if name == "correlation":
        unfit += [1.0000001, -2.0, [0.5, 1.5]]
    if name.startswith("forward") and lognormal and not entrance.startswith("shifted"):
        unfit += [0.0, -3.0, [100.0, -100.0]]
    for kind in ("call", "put", "forward"):
        for bad in unfit:
            with pytest.raises(ValueError, match=rf"^{name}\b"):
                call(**{**good, name: bad}, kind=kind)
        call(**good, kind=kind)


@pytest.mark.parametrize("entrance", ENTRANCES)
def test_every_entrance_names_the_argument_whose_shape_does_not_fit(entrance: str) -> None:
    call, good = ENTRANCES[entrance]
    first, *_, last = good
    wide = {**good, first: [good[first]] * 3, last: [good[last]] * 2}
    with pytest.raises(ValueError, match=rf"^({first}|{last})\b.*broadcast"):
        call(**wide)


@pytest.mark.parametrize("entrance", ENTRANCES)
def test_the_largest_amounts_any_entrance_takes_give_numbers_and_no_warning(entrance: str) -> None:
    """Numpy's warnings are errors in this suite."""
    call, good = ENTRANCES[entrance]
    vast = {name: 1e60 if name.startswith(("forward", "strike")) else one for name, one in good.items()}
    for kind in ("call", "put", "forward"):
        for some in (vast, {**good, "expiry": 1e6}, {**good, "expiry": 0.0, "discount": 0.0}):
            with np.errstate(all="raise"):
                found = call(**some, kind=kind)
            for column in found if isinstance(found, tuple) else (found,):
                known = column[()] if column.dtype.kind == "f" else 0.0
                assert np.isfinite(known) or entrance.startswith("implied"), (entrance, kind)


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
