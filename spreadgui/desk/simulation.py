"""A simulation in the background: one at a time, with progress, and stopped when it is no longer wanted."""

from __future__ import annotations

import threading
from concurrent.futures import ThreadPoolExecutor

from PySide6.QtCore import QObject, Qt, Signal, Slot

from spreadgui.valuation.slate import Slate


class SimulationThread(QObject):
    """`progressed(done, of)` and `done(SimulatedReading)` or `failed(sentence)` come on the thread this lives on."""

    progressed = Signal(int, int)
    done = Signal(object)
    failed = Signal(str)
    _from_worker = Signal(object)

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._pool = ThreadPoolExecutor(1, thread_name_prefix="simulation")
        self._stop = threading.Event()
        self._running = False
        self._from_worker.connect(self._deliver, Qt.ConnectionType.QueuedConnection)

    @property
    def running(self) -> bool:
        """Whether a simulation is under way."""
        return self._running

    def start(self, slate: Slate, row: int) -> None:
        """Simulate a position; what is under way is cancelled first."""
        self.cancel()
        self._stop = threading.Event()
        self._running = True
        self._pool.submit(self._run, slate, row, self._stop)

    def cancel(self) -> None:
        """Stop what is under way; it delivers what it has, marked as incomplete."""
        self._stop.set()

    def close(self) -> None:
        """Stop and join the worker."""
        self.cancel()
        self._pool.shutdown(wait=True, cancel_futures=True)

    def _run(self, slate: Slate, row: int, stop: threading.Event) -> None:
        # Imported on the worker: SciPy's generators take half a second to load.
        from spreadgui.valuation.simulated import simulate

        try:
            found: object = simulate(slate, row, lambda done, of: self._from_worker.emit((done, of)), stop.is_set)
        except Exception as error:  # what breaks must reach the user as a sentence, not vanish in a future
            found = str(error) or type(error).__name__
        self._from_worker.emit(found)

    @Slot(object)
    def _deliver(self, found: object) -> None:
        if isinstance(found, tuple):
            self.progressed.emit(*found)
            return
        self._running = False
        if isinstance(found, str):
            self.failed.emit(f"The simulation stopped: {found}.")
        else:
            self.done.emit(found)
