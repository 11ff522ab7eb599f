"""The line under a blend's markets: the match held against a simulation, on request."""

from __future__ import annotations

from typing import TYPE_CHECKING

from PySide6.QtCore import Signal, Slot
from PySide6.QtWidgets import QHBoxLayout, QToolButton, QWidget

from spreadgui.desk.look.pane import ElidedLabel
from spreadgui.desk.look.theme import set_rank
from spreadgui.desk.panels.sheets import signed_text
from spreadgui.valuation.shown import number_text

if TYPE_CHECKING:  # its module loads the formulas, which must not hold up the first paint of the window
    from spreadgui.valuation.simulated import SimulatedReading

ASK, CANCEL = "Hold the match against a simulation", "Cancel"


class SimulationLine(QWidget):
    """A button and what came of it. `asked` and `cancelled` tell what the user wants."""

    asked = Signal()
    cancelled = Signal()

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.button = QToolButton()
        self.said = ElidedLabel()
        set_rank(self.said, "small")
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.addWidget(self.button)
        row.addWidget(self.said, 1)
        self._running = False
        self.button.clicked.connect(self._on_clicked)
        self.rest()

    def rest(self) -> None:
        """Nothing is under way and nothing has been found."""
        self._set_running(False)
        self.said.set_text("")

    def show_progress(self, done: int, of: int) -> None:
        """A simulation is under way."""
        if self._running:
            self.said.set_text(f"Simulating: {done} of {of} replicates")

    def show_result(self, found: SimulatedReading, unit: str) -> None:
        """A simulation has ended, or was cancelled."""
        self._set_running(False)
        self.said.set_text(simulation_words(found, unit))

    def say(self, sentence: str) -> None:
        """A simulation could not be done."""
        self._set_running(False)
        self.said.set_text(sentence)

    @Slot()
    def _on_clicked(self) -> None:
        if self._running:
            self.cancelled.emit()
            return
        self._set_running(True)
        self.said.set_text("Simulating…")
        self.asked.emit()

    def _set_running(self, running: bool) -> None:
        self._running = running
        self.button.setText(CANCEL if running else ASK)
        self.button.setToolTip(
            "The true payoff over all the markets of the blend, by scrambled Sobol points in independent replicates."
        )


def simulation_words(found: SimulatedReading, unit: str) -> str:
    """What a simulation says of the match, in one sentence."""
    one = found.simulated
    if one.replicates < 2:
        return "Cancelled before anything could be said."
    value = f"{number_text(one.value, 5)} ± {number_text(one.standard_error, 5)} {unit}".rstrip()
    share = f"{signed_text(100.0 * found.gap / one.value, 3)} %" if one.value > 0.0 else "no share"
    stopped = "" if one.complete else f", cancelled after {one.replicates} replicates"
    return (
        f"Simulated {value} ({one.replicates} × {number_text(one.points, 0)} points{stopped}); "
        f"the match is {signed_text(found.gap, 5)}, {share} of premium, off."
    )
