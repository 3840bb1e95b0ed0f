"""The screen of single faults: it fills while the study runs, keys are never held up, leaving gives it up.

What is expected is this project's own description of the screen; the faults are those of a made-up study.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import replace

import pytest
from textual.pilot import Pilot

from stagebook.engine.design.document import Design
from stagebook.engine.errors import Cancelled, CircuitError
from stagebook.engine.studies.fault_outcomes import WORDS, FaultResult, FaultSheet, Outcome
from stagebook.storage import Store
from stagebook.tui.fault_text import MARKS, TONES, counts_words
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.faults import FaultsScreen
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import seen, settled, shown, until

SIZE = (80, 24)


def result(part: str, outcome: Outcome, detail: str = "") -> FaultResult:
    return FaultResult(
        "latch", part, "open", outcome, WORDS[outcome], detail, "LS1", "alarm", (), None, None, None
    )  # fmt: skip


class Faults:
    """A study of two parts: the first is reported at once, the second when the gate opens."""

    def __init__(self) -> None:
        self.gate = threading.Event()
        self.cancelled = False
        self.refusal = ""

    def __call__(
        self,
        design: Design,
        *,
        report: Callable[[FaultSheet], None],
        progress: Callable[[int, int], None],
        cancelled: Callable[[], bool],
    ) -> FaultSheet:
        if self.refusal:
            raise CircuitError(self.refusal)
        first = (result("R3", Outcome.STILL_ALARMS, "for 12 s instead of 86 s"),)
        sheet = FaultSheet(design.name, design.content, "1", 0.1, (), None, first, ("LS1 is never called for",))
        report(sheet)
        progress(1, 3)
        while not self.gate.wait(0.005):
            if cancelled():
                self.cancelled = True
                raise Cancelled("stopped")
        return replace(sheet, faults=(result("C4", Outcome.SILENT), result("R9", Outcome.SILENT), *first))


@pytest.fixture
def faults() -> Faults:
    return Faults()


@pytest.fixture
def with_faults(shelf: Store, solver: Solver, faults: Faults) -> StagebookApp:
    return StagebookApp(shelf, replace(solver, faults=faults))


async def open_faults(pilot: Pilot[None]) -> None:
    await settled(pilot)
    await pilot.press("enter")
    await settled(pilot)
    await pilot.press("F")
    await until(pilot, lambda: isinstance(pilot.app.screen, FaultsScreen))


async def test_it_fills_while_the_study_runs_and_puts_silent_ones_first(
    with_faults: StagebookApp, faults: Faults
) -> None:
    async with with_faults.run_test(size=SIZE) as pilot:
        await open_faults(pilot)
        await until(pilot, lambda: "~ 1 of 3" in seen(pilot) and "R3" in seen(pilot))
        faults.gate.set()
        await settled(pilot)
        lines = shown(pilot)
        assert "2 silent, 1 still alarm" in lines[1]
        assert "C4" in next(line for line in lines if " open " in line)
        assert "never called for" in seen(pilot)


async def test_n_goes_to_the_next_outcome_and_round(with_faults: StagebookApp, faults: Faults) -> None:
    faults.gate.set()
    async with with_faults.run_test(size=SIZE) as pilot:
        await open_faults(pilot)
        await settled(pilot)
        await pilot.press("home", "n")
        assert "R3 open: still alarms" in seen(pilot)
        # It alarms otherwise than before: no plain pass.
        assert next(line for line in shown(pilot) if " R3 " in line).startswith("> !")
        assert "for 12 s instead of 86 s" in shown(pilot)[-3]
        await pilot.press("n")
        assert "C4 open: silent" in seen(pilot)


async def test_leaving_gives_the_study_up(with_faults: StagebookApp, faults: Faults) -> None:
    async with with_faults.run_test(size=SIZE) as pilot:
        await open_faults(pilot)
        await pilot.press("b")
        await until(pilot, lambda: faults.cancelled)
        assert isinstance(pilot.app.screen, BenchScreen)


async def test_what_cannot_be_computed_is_said(with_faults: StagebookApp, faults: Faults) -> None:
    faults.refusal = "no part tells when there is an alarm; give a sounder its operating_minimum"
    async with with_faults.run_test(size=SIZE) as pilot:
        await open_faults(pilot)
        await settled(pilot)
        assert "operating_minimum" in seen(pilot)
        assert "not computed" in shown(pilot)[0]


def test_every_outcome_has_a_mark_and_words() -> None:
    assert len(MARKS) == len(TONES) == len(Outcome)
    for outcome in Outcome:
        sheet = FaultSheet("d", "", "1", 0.0, (), None, (result("R1", outcome),))
        assert counts_words(sheet).startswith("1 ")
