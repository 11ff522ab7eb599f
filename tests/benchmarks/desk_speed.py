"""How quickly the window answers: process start to first paint, and edit to painted. Run by hand:

    QT_QPA_PLATFORM=offscreen python tests/benchmarks/desk_speed.py

Prints figures of this machine; only the ratios and the count of screen frames (16.7 ms each) travel.
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import time

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

import msgspec
from PySide6.QtCore import QEvent, QEventLoop, QObject, QTimer
from PySide6.QtWidgets import QApplication

from spreadgui import shipped
from spreadgui.book.reading import read_book
from spreadgui.book.records import Book
from spreadgui.desk.look.theme import apply, theme_for
from spreadgui.desk.window import Window
from spreadgui.valuation.results import State

FRAME_MILLISECONDS = 1000 / 60
_FILTER = """
import os, sys, time
from PySide6.QtCore import QEvent, QObject
class FirstPaint(QObject):
    def eventFilter(self, watched, event):
        if event.type() == QEvent.Type.Paint and watched.isWidgetType() and watched.window().isVisible():
            print(time.time(), flush=True)
            os._exit(0)
        return False
"""
_BARE = (
    _FILTER
    + """
from PySide6.QtWidgets import QApplication, QMainWindow
app = QApplication([]); watch = FirstPaint(); app.installEventFilter(watch)
window = QMainWindow(); window.resize(1600, 1000); window.show(); app.exec()
"""
)
_OURS = (
    _FILTER
    + """
from pathlib import Path
from spreadgui.desk import program
start = program.start_application
def watched():
    global watch
    app = start(); watch = FirstPaint(); app.installEventFilter(watch); return app
program.start_application = watched
program.run_window(Path(sys.argv[1]), demo=True)
"""
)


def first_paint(code: str) -> float:
    """Milliseconds from starting the process to its first paint."""
    demo = str(shipped.sample_book("ardenmoor_winter"))
    begun = time.time()
    done = subprocess.run([sys.executable, "-c", code, demo], capture_output=True, text=True, check=True)
    return 1000 * (float(done.stdout.split()[0]) - begun)


def first_paints(runs: int = 9) -> tuple[float, float, float]:
    """Medians of the bare window, of ours, and of the ratio; started in turn, so that both meet the same load."""
    pairs = [(first_paint(_BARE), first_paint(_OURS)) for _ in range(runs + 1)][1:]
    bare, ours = zip(*pairs, strict=True)
    return statistics.median(bare), statistics.median(ours), statistics.median(two / one for one, two in pairs)


def book_of_size(rows: int) -> Book:
    """The demo book's positions over and over."""
    demo = read_book(shipped.sample_book("ardenmoor_winter"))
    repeated = (msgspec.structs.replace(demo.positions[row % len(demo.positions)]) for row in range(rows))
    return msgspec.structs.replace(demo, positions=tuple(repeated))


class Paints(QObject):
    """Notes when the grid is painted for the first time after its row has become current."""

    def __init__(self, window: Window, row: int) -> None:
        super().__init__()
        self._state, self._row = window.workbench.results, row
        self.painted_at = 0.0
        # A loop that sleeps between events, as the program's does; a spinning one would fight the worker for Python.
        self._loop = QEventLoop()

    def wait(self) -> None:
        if not self.painted_at:
            self._loop.exec()

    def eventFilter(self, _watched: QObject, event: QEvent) -> bool:
        current = self._state.state[self._row] == State.CURRENT
        if event.type() == QEvent.Type.Paint and current and not self.painted_at:
            self.painted_at = time.perf_counter()
            self._loop.quit()
        return False


def _pause(milliseconds: int = 100) -> None:
    """Let the window paint all it has to and come to rest, as between two entries of a person."""
    loop = QEventLoop()
    QTimer.singleShot(milliseconds, loop.quit)
    loop.exec()


def edit_to_painted(rows: int, *, settled: bool, edits: int = 60) -> list[float]:
    """Milliseconds from an edit in sight to its new value painted, for each of many edits, ascending.

    `settled`: each edit finds the window at rest. Otherwise it comes while the Landscape of the one before is painted.
    """
    window = Window(theme_for(QApplication.instance(), dark=False))
    window.assemble(book_of_size(rows), None)
    window.resize(1600, 1000)
    window.show()
    window.complete()
    window.workbench.wait_until_idle(120)
    model, viewport = window.positions.model, window.positions.view.pinned.viewport()
    place, found = model.column("vol_long"), []
    for edit in range(edits):
        row = edit % 20
        paints = Paints(window, row)
        begun = time.perf_counter()
        model.setData(model.index(row, place), f"{40 + edit / 10}")
        viewport.installEventFilter(paints)
        paints.wait()
        found.append(1000 * (paints.painted_at - begun))
        viewport.removeEventFilter(paints)
        window.workbench.wait_until_idle()
        if settled:
            _pause()
    window.shut()
    window.deleteLater()
    return sorted(found)


def main() -> None:
    app = QApplication([])
    apply(app, theme_for(app, dark=False))
    bare, ours, ratio = first_paints()
    print(f"start to first paint: bare window {bare:.0f} ms, spreadgui {ours:.0f} ms, ratio {ratio:.2f}")
    for rows in (50, 1000, 10_000):
        for settled in (True, False):
            found = edit_to_painted(rows, settled=settled)
            frames = [milliseconds / FRAME_MILLISECONDS for milliseconds in found]
            print(
                f"edit to painted, {rows} positions, {'at rest' if settled else 'in a burst'}: median "
                f"{statistics.median(found):.1f} ms = {statistics.median(frames):.2f} frames, "
                f"95th percentile {frames[int(0.95 * len(frames))]:.2f} frames"
            )


if __name__ == "__main__":
    main()
