"""The screen of single faults: it fills while the study runs, and n walks the outcomes.

What is expected is this project's own description of the screen; the faults are those of a made-up study.
"""

from __future__ import annotations

from dataclasses import replace

import pytest

from stagebook.engine.studies.fault_outcomes import FaultSheet, Outcome
from stagebook.storage import Store
from stagebook.tui.fault_text import MARKS, TONES, counts_words
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import seen, settled, shown, until
from .study_pages import SIZE, MadeUpStudy, fault, open_study
from .study_pages import faults as made_up


@pytest.fixture
def faults() -> MadeUpStudy:
    return made_up()


@pytest.fixture
def with_faults(shelf: Store, solver: Solver, faults: MadeUpStudy) -> StagebookApp:
    return StagebookApp(shelf, replace(solver, faults=faults))


async def test_it_fills_while_the_study_runs_and_puts_silent_ones_first(
    with_faults: StagebookApp, faults: MadeUpStudy
) -> None:
    async with with_faults.run_test(size=SIZE) as pilot:
        await open_study(pilot, "F")
        await until(pilot, lambda: "~ 1 of 3" in seen(pilot) and "R3" in seen(pilot))
        faults.gate.set()
        await settled(pilot)
        lines = shown(pilot)
        assert "2 no alarm, 1 still alarm" in lines[1]
        assert "C4" in next(line for line in lines if " open " in line)
        assert "never called for" in seen(pilot)


async def test_n_goes_to_the_next_outcome_and_round(with_faults: StagebookApp, faults: MadeUpStudy) -> None:
    faults.gate.set()
    async with with_faults.run_test(size=SIZE) as pilot:
        await open_study(pilot, "F")
        await settled(pilot)
        await pilot.press("home", "n")
        assert "R3 open: still alarms" in seen(pilot)
        # It alarms otherwise than before: no plain pass.
        assert next(line for line in shown(pilot) if " R3 " in line).startswith("> !")
        assert "for 12 s instead of 86 s" in shown(pilot)[-3]
        await pilot.press("n")
        assert "C4 open: no alarm when due" in seen(pilot)


def test_every_outcome_has_a_mark_and_words() -> None:
    assert len(MARKS) == len(TONES) == len(Outcome)
    for outcome in Outcome:
        sheet = FaultSheet("d", "", "1", 0.0, (), None, (fault("R1", outcome),))
        assert counts_words(sheet).startswith("1 ")
