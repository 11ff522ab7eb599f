"""The pricing thread: the latest job wins, nothing is lost, nothing is delivered after the end."""

from __future__ import annotations

import threading
from collections.abc import Iterator

import numpy as np
import pytest
from pytestqt.qtbot import QtBot

from spreadgui.desk.jobs import Failure, Finished, Job, PricingThread
from spreadgui.valuation import price
from spreadgui.valuation.price import CHUNK_ROWS
from spreadgui.valuation.reading import Reading
from spreadgui.valuation.results import Part
from spreadgui.valuation.slate import build_slate
from spreadgui.valuation.surface import Surface, SurfaceRequest
from tests.books import book_of, cap, season, spark

NO_ROWS = np.empty(0, dtype=np.intp)


@pytest.fixture
def thread(qtbot: QtBot) -> Iterator[PricingThread]:
    made = PricingThread()
    yield made
    made.close()


@pytest.fixture
def results(thread: PricingThread) -> list[object]:
    got: list[object] = []
    thread.arrived.connect(got.append)
    return got


def test_a_job_delivers_sight_reading_surface_rest_in_this_order(thread: PricingThread, results: list[object]) -> None:
    slate = build_slate(book_of(spark(), season(), cap()), 5)
    thread.submit(Job(slate, np.array([1]), np.array([0, 2]), 1, SurfaceRequest(1, nodes=11)))
    assert thread.wait_until_idle()
    assert [type(result) for result in results] == [Part, Reading, Surface, Part, Finished]
    assert [part.rows.tolist() for part in results if isinstance(part, Part)] == [[1], [0, 2]]
    assert {result.revision for result in results} == {5}


def test_results_arrive_on_the_thread_that_asked(thread: PricingThread) -> None:
    arrived_on: list[str] = []
    thread.arrived.connect(lambda _result: arrived_on.append(threading.current_thread().name))
    thread.submit(Job(build_slate(book_of(spark()), 1), np.array([0]), NO_ROWS))
    assert thread.wait_until_idle()
    assert set(arrived_on) == {threading.current_thread().name}


def test_a_newer_job_takes_the_place_of_the_one_under_way(thread: PricingThread, results: list[object]) -> None:
    rows = 4 * CHUNK_ROWS
    long_slate = build_slate(book_of(*[spark()] * rows), 1)
    thread.submit(Job(long_slate, NO_ROWS, np.arange(rows)))
    thread.submit(Job(build_slate(book_of(cap()), 2), np.array([0]), NO_ROWS))
    assert thread.wait_until_idle(120)
    first = [result for result in results if isinstance(result, Part) and result.revision == 1]
    assert sum(len(part.rows) for part in first) < rows
    assert isinstance(results[-1], Finished)
    assert results[-1].revision == 2
    assert not results[-1].left


def test_a_job_that_breaks_is_told_and_the_next_one_runs(
    thread: PricingThread, results: list[object], monkeypatch: pytest.MonkeyPatch
) -> None:
    def breaks(*_arguments: object) -> None:
        raise ZeroDivisionError("no ground to stand on")

    job = Job(build_slate(book_of(spark()), 3), np.array([0]), NO_ROWS)
    with monkeypatch.context() as broken:
        broken.setattr(price, "price_rows", breaks)
        thread.submit(job)
        assert thread.wait_until_idle()
    failure = results[0]
    assert isinstance(failure, Failure)
    assert "no ground to stand on" in failure.sentence
    assert "ZeroDivisionError" in failure.details
    thread.submit(job)
    assert thread.wait_until_idle()
    assert isinstance(results[-2], Part)


def test_after_the_end_nothing_is_delivered_and_no_job_is_taken(thread: PricingThread, results: list[object]) -> None:
    job = Job(build_slate(book_of(spark()), 1), np.array([0]), NO_ROWS)
    thread.submit(job)
    thread.close()
    thread.submit(job)
    assert thread.wait_until_idle(5)
    assert results == []
