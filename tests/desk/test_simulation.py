"""The match of a blend held against a simulation, asked for in the Reading, in the background."""

from __future__ import annotations

import threading

import pytest
from pytestqt.qtbot import QtBot

from spreadgui.desk.panels.simulation_line import ASK, CANCEL, simulation_words
from spreadgui.desk.simulation import SimulationThread
from spreadgui.pricing import simulation as formulas
from spreadgui.valuation.simulated import SimulatedReading, can_simulate, simulate
from spreadgui.valuation.slate import build_slate
from tests.desk.conftest import Desk
from tests.desk.test_window import go, settle
from tests.market.test_blends import book, position


def test_the_reading_says_how_far_the_match_is_off(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book(position(), position(short_leg="Gas", short_ratio=7.1)))
    line = window.reading.simulation
    assert line.isVisible()
    with qtbot.waitSignal(window.simulations.done, timeout=20_000) as blocker:
        line.button.click()
        assert line.button.text() == CANCEL
    found = blocker.args[0]
    assert line.button.text() == ASK
    assert line.said.full_text() == simulation_words(found, "CRN/MWh")
    assert found.simulated.complete
    assert abs(found.gap) < 0.02 * found.matched
    go(window, 1, "name")
    settle(qtbot, window)
    assert not line.isVisible()
    go(window, 0, "name")
    settle(qtbot, window)
    assert line.said.full_text() == ""  # asked for anew


def test_cancelling_ends_it_with_what_there_is(desk: Desk, qtbot: QtBot, monkeypatch: pytest.MonkeyPatch) -> None:
    window = desk.open(book(position()))
    line, go_on = window.reading.simulation, threading.Event()
    mean = formulas._Payoffs.mean

    def slow(payoffs: formulas._Payoffs, uniform: formulas.Array) -> float:
        go_on.wait(10)
        return mean(payoffs, uniform)

    monkeypatch.setattr(formulas._Payoffs, "mean", slow)
    with qtbot.waitSignal(window.simulations.done, timeout=20_000) as blocker:
        line.button.click()
        line.button.click()  # cancel
        go_on.set()
    assert not blocker.args[0].simulated.complete
    assert line.said.full_text() == "Cancelled before anything could be said."
    assert line.button.text() == ASK


def test_an_edit_meanwhile_makes_the_result_stale_and_unseen(desk: Desk, qtbot: QtBot) -> None:
    window = desk.open(book(position()))
    slate = window.workbench.slate
    old = simulate(slate, 0, lambda _done, _of: None, lambda: False)
    go(window, 0, "strike")
    model = window.positions.model
    assert model.setData(window.positions.view.currentIndex(), "9")
    settle(qtbot, window)
    window.reading.show_simulation(old)
    assert window.reading.simulation.said.full_text() == ""


def test_what_cannot_be_simulated_says_so_in_a_sentence(qtbot: QtBot) -> None:
    slate = build_slate(book(position(own_forward_short=80.0), position(exercise="all days", expiry=None)), 1)
    assert not can_simulate(slate, 0)
    assert not can_simulate(slate, 1)
    thread = SimulationThread()
    try:
        with qtbot.waitSignal(thread.failed, timeout=20_000) as blocker:
            thread.start(slate, 0)
        assert "exercised once and with no marks of its own" in blocker.args[0]
        assert not thread.running
    finally:
        thread.close()


def test_the_words_tell_value_error_points_and_gap() -> None:
    one = SimulatedReading(1, 0, 1.3179, formulas.Simulated(1.2955, 0.0003, 16384, 16, True))
    assert simulation_words(one, "CRN/MWh") == (
        "Simulated 1.29550 ± 0.00030 CRN/MWh (16 × 16\N{NARROW NO-BREAK SPACE}384 points); "
        "the match is +0.02240, +1.729 % of premium, off."
    )
