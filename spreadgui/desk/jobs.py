"""The pricing thread: one worker, the latest job wins, results come back by one queued signal.

A job is a frozen value that holds all it needs. The worker looks between steps whether a newer job waits, and if so
leaves the rest of its own: what it has delivered by then stands, what it has not is still pending in the live results
and is part of the newer job. So a long run under a busy hand is never begun again from the start.
"""

from __future__ import annotations

import os
import threading
import time
from collections.abc import Generator
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from dataclasses import dataclass, field

import numpy as np
from PySide6.QtCore import QCoreApplication, QObject, Qt, Signal, Slot

from spreadgui.valuation.slate import RowArray, Slate
from spreadgui.valuation.surface import SurfaceRequest

# The formulas spend most of their time outside the interpreter's lock: a second thread saves a third of a long run, and
# more would only fight over it. One processor is left for the window where there are so many.
HANDS = max(1, min(2, (os.cpu_count() or 1)))


@dataclass(frozen=True)
class Job:
    """What to compute of one slate, in this order: rows in sight, the Reading and the surface, all other rows."""

    slate: Slate
    sight: RowArray
    rest: RowArray
    focus: int | None = None
    surface: SurfaceRequest | None = None


@dataclass(frozen=True)
class Finished:
    """A job came to its end (or was left for a newer one) after `seconds` of work."""

    revision: int
    seconds: float
    rows: int
    left: bool


@dataclass(frozen=True)
class Failure:
    """A job broke; `sentence` is for the user, `details` for whoever mends the program."""

    revision: int
    sentence: str
    details: str


def steps(job: Job, executor: Executor) -> Generator[object, None, None]:
    """The results of `job`, one after another: parts, a Reading, a Surface; the rest mapped over `executor`."""
    # Imported here, on the worker, so that the window is painted before the formulas are loaded.
    from spreadgui.valuation.price import price_parts, price_rows
    from spreadgui.valuation.reading import read_position
    from spreadgui.valuation.surface import draw_surface

    if job.sight.size:
        yield price_rows(job.slate, job.sight)
    if job.focus is not None:
        yield read_position(job.slate, job.focus)
    if job.surface is not None:
        yield draw_surface(job.slate, job.surface)
    yield from price_parts(job.slate, job.rest, executor)


@dataclass
class _Desk:
    """What both threads see, under one lock: the job that waits, and whether the worker is at work."""

    waiting: Job | None = None
    at_work: bool = False
    closed: bool = False
    lock: threading.Lock = field(default_factory=threading.Lock)


class PricingThread(QObject):
    """Runs jobs off the window's thread. `arrived` brings each result on the thread this object lives on."""

    arrived = Signal(object)
    _from_worker = Signal(object)

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._pool = ThreadPoolExecutor(1, thread_name_prefix="pricing")
        self._hands = ThreadPoolExecutor(HANDS, thread_name_prefix="pricing-hand")
        self._desk = _Desk()
        self._last: Future[None] | None = None
        self._undelivered = 0
        self._from_worker.connect(self._deliver, Qt.ConnectionType.QueuedConnection)

    def submit(self, job: Job) -> None:
        """Have `job` done instead of whatever waits or is under way."""
        with self._desk.lock:
            if self._desk.closed:
                return
            self._desk.waiting = job
            if self._desk.at_work:
                return
            self._desk.at_work = True
        self._last = self._pool.submit(self._work)

    @property
    def idle(self) -> bool:
        """Whether nothing waits, nothing is under way, and every result has been delivered."""
        with self._desk.lock:
            return not self._desk.at_work and self._desk.waiting is None and self._undelivered == 0

    def wait_until_idle(self, seconds: float = 30.0) -> bool:
        """Serve the event loop until all is done and delivered; False if that takes longer than `seconds`."""
        deadline = time.monotonic() + seconds
        while not self.idle:
            if time.monotonic() > deadline:
                return False
            QCoreApplication.processEvents()
            time.sleep(0.001)
        return True

    def close(self) -> None:
        """Stop after the step under way and join the worker; nothing is delivered from then on."""
        with self._desk.lock:
            self._desk.closed = True
            self._desk.waiting = None
        self._pool.shutdown(wait=True, cancel_futures=True)
        self._hands.shutdown(wait=True, cancel_futures=True)

    def _work(self) -> None:
        """On the worker: do jobs until none waits."""
        while (job := self._next()) is not None:
            self._run(job)

    def _next(self) -> Job | None:
        with self._desk.lock:
            job, self._desk.waiting = self._desk.waiting, None
            if job is None:
                self._desk.at_work = False
            return job

    def _superseded(self) -> bool:
        with self._desk.lock:
            return self._desk.waiting is not None or self._desk.closed

    def _run(self, job: Job) -> None:
        start, left = time.perf_counter(), False
        try:
            with np.errstate(all="ignore"):
                results = steps(job, self._hands)
                for result in results:
                    self._send(result)
                    if self._superseded():
                        left = True
                        break
                results.close()
        except Exception as error:  # a formula that breaks must reach the user as a message, not vanish in a future
            self._send(_failure(job, error))
        self._send(Finished(job.slate.revision, time.perf_counter() - start, len(job.sight) + len(job.rest), left))

    def _send(self, result: object) -> None:
        with self._desk.lock:
            if self._desk.closed:
                return
            self._undelivered += 1
        self._from_worker.emit(result)

    @Slot(object)
    def _deliver(self, result: object) -> None:
        with self._desk.lock:
            self._undelivered -= 1
            if self._desk.closed:
                return
        self.arrived.emit(result)


def _failure(job: Job, error: Exception) -> Failure:
    import traceback

    what = str(error) or type(error).__name__
    details = "".join(traceback.format_exception(error))
    return Failure(job.slate.revision, f"Pricing stopped: {what}. The next edit prices again.", details)
