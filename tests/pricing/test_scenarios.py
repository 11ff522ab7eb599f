"""Totals of a book under many scenarios, held against valuing position by position."""

from __future__ import annotations

import math
from concurrent.futures import Executor, Future, ProcessPoolExecutor, ThreadPoolExecutor
from multiprocessing import get_context
from typing import Any

import numpy as np
import pytest

from spreadgui.pricing import scenarios
from spreadgui.pricing.inputs import Array
from spreadgui.pricing.methods import METHODS, method
from spreadgui.pricing.scenarios import Positions, totals

KEYS = [one.key for one in METHODS]
CONTRACTS = 5


def world(rows: int) -> Array:
    draw = np.random.default_rng(17)
    return draw.uniform(60.0, 140.0, CONTRACTS) * np.exp(0.2 * draw.standard_normal((rows, CONTRACTS)))


def book(count: int, strikes: float = 40.0) -> Positions:
    draw = np.random.default_rng(29)
    long = draw.integers(0, CONTRACTS, count)
    return Positions(
        long_contract=long,
        short_contract=(long + draw.integers(1, CONTRACTS, count)) % CONTRACTS,
        strike=draw.uniform(-strikes, strikes, count),
        vol_long=draw.uniform(0.0, 0.7, count) * (draw.random(count) > 0.1),
        vol_short=draw.uniform(0.0, 0.7, count),
        correlation=draw.uniform(-1.0, 1.0, count),
        expiry=draw.uniform(0.0, 3.0, count) * (draw.random(count) > 0.1),
        discount=draw.uniform(0.85, 1.0, count),
        weight=draw.normal(0.0, 10.0, count),
        long_ratio=draw.uniform(0.5, 2.0, count),
        short_ratio=draw.uniform(0.5, 2.0, count),
    )


def one_by_one(key: str, forwards: Array, positions: Positions, kind: str) -> list[float]:
    """The same by a loop over scenarios and positions, summed without rounding."""
    count = len(np.asarray(positions.weight))
    rows = [Positions(*(np.broadcast_to(np.asarray(field), count)[row] for field in positions)) for row in range(count)]
    return [
        math.fsum(
            float(row.weight)
            * float(
                method(key).value(
                    scenario[row.long_contract] * row.long_ratio,
                    scenario[row.short_contract] * row.short_ratio,
                    *(float(term) for term in row[2:8]),
                    kind=kind,
                )
            )
            for row in rows
        )
        for scenario in forwards
    ]


@pytest.mark.parametrize("kind", ["call", "put", "forward"])
@pytest.mark.parametrize("key", KEYS)
def test_totals_are_the_sums_of_weighted_values(key: str, kind: str) -> None:
    forwards, positions = world(9), book(13, 0.0 if key == "margrabe" else 40.0)
    expected = one_by_one(key, forwards, positions, kind)
    assert totals(method(key), forwards, positions, kind=kind) == pytest.approx(expected, rel=1e-13, abs=1e-10)


@pytest.mark.parametrize("key", ["kirk", "modified_kirk", "bjerksund_stensland"])
def test_long_rows_of_scenarios_give_what_the_method_gives(key: str) -> None:
    forwards, positions = world(4 * scenarios.SHORT_ROW), book(40)
    long = forwards[:, positions.long_contract] * positions.long_ratio
    short = forwards[:, positions.short_contract] * positions.short_ratio
    for kind in ("call", "put", "forward"):
        values = method(key).value(long, short, *positions[2:8], kind=kind)
        found = totals(method(key), forwards, positions, kind=kind)
        assert found == pytest.approx((values * positions.weight).sum(axis=1), rel=1e-12, abs=1e-9)


class Returning(Executor):
    """An executor that shares no memory: what a task writes anywhere but into its result is lost."""

    def submit(self, task: Any, /, *arguments: Any, **named: Any) -> Future[Any]:
        future: Future[Any] = Future()
        copies = [np.array(item) if isinstance(item, np.ndarray) else item for item in arguments]
        future.set_result(task(*copies, **named))
        return future


@pytest.mark.parametrize("kind", ["call", "put", "forward"])
@pytest.mark.parametrize("key", ["kirk", "modified_kirk", "bjerksund_stensland", "yardstick"])
def test_neither_blocks_nor_executor_change_a_digit(key: str, kind: str) -> None:
    rows = 40 if key == "yardstick" else 3 * scenarios.SHORT_ROW + 5
    forwards, positions = world(rows), book(31)
    whole = totals(method(key), forwards, positions, kind=kind)
    with ThreadPoolExecutor(2) as pool:
        for executor in (None, pool, Returning()):
            for block_scenarios, block_values in ((7, 50), (scenarios.SHORT_ROW, 999), (rows - 1, 10**6), (rows, 1)):
                cut = totals(
                    method(key),
                    forwards,
                    positions,
                    kind=kind,
                    executor=executor,
                    block_scenarios=block_scenarios,
                    block_values=block_values,
                )
                assert np.array_equal(cut, whole)
    single = [totals(method(key), forwards[row : row + 1], positions, kind=kind)[0] for row in (0, 1, rows - 1)]
    assert np.array_equal(single, whole[[0, 1, rows - 1]])


def test_other_processes_give_the_same_digits() -> None:
    forwards, positions = world(100), book(10)
    whole = totals(method("bjerksund_stensland"), forwards, positions)
    with ProcessPoolExecutor(1, mp_context=get_context("spawn")) as pool:
        shared = totals(method("bjerksund_stensland"), forwards, positions, executor=pool, block_scenarios=30)
    assert np.array_equal(shared, whole)


def test_one_number_stands_for_all_positions() -> None:
    forwards = world(300)
    short = Positions([0, 1, 2], 3, 5.0, 0.3, 0.4, 0.5, 1.0, 0.9, 2.0, 1.1, 0.8)
    full = Positions(*(np.broadcast_to(np.asarray(field), 3) for field in short))
    assert np.array_equal(totals(method("kirk"), forwards, short), totals(method("kirk"), forwards, full))
    alone = Positions(0, 3, 5.0, 0.3, 0.4, 0.5, 1.0, 0.9)
    expected = method("kirk").value(forwards[:, 0], forwards[:, 3], *alone[2:8])
    assert totals(method("kirk"), forwards, alone) == pytest.approx(expected, rel=1e-15)


def test_nothing_held_is_worth_nothing_and_no_scenario_has_no_total() -> None:
    nothing = Positions(*[np.empty(0, dtype=int)] * 2, *[np.empty(0)] * 9)
    assert np.array_equal(totals(method("kirk"), world(4), nothing), np.zeros(4))
    assert totals(method("kirk"), np.empty((0, CONTRACTS)), book(3)).shape == (0,)


def test_the_arguments_are_left_as_they_were() -> None:
    forwards, positions = world(300), book(20)
    kept = forwards.copy(), [np.array(field) for field in positions]
    for array in (forwards, *positions):
        np.asarray(array).flags.writeable = False
    for one in METHODS[1:4]:
        totals(one, forwards, positions, kind="put")
    assert np.array_equal(forwards, kept[0])
    assert all(np.array_equal(field, old) for field, old in zip(positions, kept[1], strict=True))


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"long_contract": [0, 1, 5]}, "long_contract: must be places among 5 contracts, found 5"),
        ({"short_contract": [0, -1, 2]}, "short_contract: must be places among 5 contracts, found -1"),
        ({"long_contract": [0.0, 1.0, 2.0]}, "long_contract: expected whole numbers, found float64"),
        ({"long_contract": [[0], [1, 2]]}, "long_contract: expected whole numbers"),
        ({"short_contract": [True, False, True]}, "short_contract: expected whole numbers, found bool"),
        ({"strike": [1.0, 2.0]}, "strike: 2 numbers beside 3 positions"),
        ({"vol_long": [[0.1, 0.2, 0.3]]}, r"vol_long: expected one number for each position, found shape \(1, 3\)"),
        ({"vol_short": -0.1}, "vol_short: must be zero or above, found -0.1"),
        ({"correlation": [0.0, 1.5, 0.0]}, "correlation: must be between -1 and 1, found 1.5 at index 1"),
        ({"expiry": [1.0, math.nan, 1.0]}, "expiry: must be finite, found nan at index 1"),
        ({"discount": "low"}, "discount: expected real numbers"),
        ({"weight": math.inf}, "weight: must be finite"),
        ({"long_ratio": 0.0}, "long_ratio: must be above zero"),
        ({"short_ratio": 1e59}, "short_ratio: ratio times forward must be between"),
    ],
)
def test_a_wrong_field_is_refused_by_name(changes: dict[str, Any], message: str) -> None:
    good = Positions([0, 1, 2], [3, 4, 0], 5.0, 0.3, 0.4, 0.5, 1.0)
    totals(method("kirk"), world(4), good)
    with pytest.raises(ValueError, match=f"^{message}"):
        totals(method("kirk"), world(4), good._replace(**changes))


def test_wrong_scenarios_kinds_strikes_and_bounds_are_refused_by_name() -> None:
    good = Positions([0, 1], [1, 0], 5.0, 0.3, 0.4, 0.5, 1.0)
    bad = world(4)
    bad[2, 1] = 0.0
    with pytest.raises(ValueError, match=r"^forwards: must be above zero, found 0.0 at index \(2, 1\)"):
        totals(method("kirk"), bad, good)
    with pytest.raises(ValueError, match=r"^forwards: expected shape \(scenarios, contracts\), found \(5,\)"):
        totals(method("kirk"), bad[0], good)
    with pytest.raises(ValueError, match=r"^kind: expected one of call, put, forward"):
        totals(method("kirk"), world(4), good, kind="straddle")
    with pytest.raises(ValueError, match=r"^strike: not every strike is one that Margrabe accepts"):
        totals(method("margrabe"), world(4), good)
    with pytest.raises(ValueError, match=r"^block_scenarios: must be at least 1, found 0"):
        totals(method("kirk"), world(4), good, block_scenarios=0)
