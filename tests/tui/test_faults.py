"""The screen of single faults: it fills while the study runs, keys are never held up, leaving gives it up.

What is expected is this project's own description of the screen; the faults are those of a made-up study.
"""

from __future__ import annotations

from collections.abc import Awaitable, Callable
from dataclasses import replace

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.studies.fault_outcomes import SAID, FaultResult, FaultSheet, Outcome
from stagebook.storage import Store
from stagebook.tui.fault_text import MARKS, TONES, counts_words
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import seen, settled, shown, until
from .study_pages import (
    SIZE,
    MadeUpStudy,
    a_refusal_is_said,
    it_says_what_it_waits_for,
    leaving_gives_it_up,
    open_study,
)


def result(part: str, outcome: Outcome, detail: str = "") -> FaultResult:
    return FaultResult(
        "latch", part, "open", outcome, SAID.get(outcome, "overheats R7"), detail, "LS1", "alarm", (), None, None, None
    )  # fmt: skip


def first(design: Design) -> FaultSheet:
    alarms = (result("R3", Outcome.STILL_ALARMS, "for 12 s instead of 86 s"),)
    return FaultSheet(design.name, design.content, "1", 0.1, (), None, alarms, ("LS1 is never called for",))


def whole(sheet: FaultSheet) -> FaultSheet:
    return replace(sheet, faults=(result("C4", Outcome.SILENT), result("R9", Outcome.SILENT), *sheet.faults))


@pytest.fixture
def faults() -> MadeUpStudy:
    return MadeUpStudy(first, whole)


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


@pytest.mark.parametrize("holds", [leaving_gives_it_up, a_refusal_is_said, it_says_what_it_waits_for])
async def test_what_every_study_page_does(
    with_faults: StagebookApp, faults: MadeUpStudy, holds: Callable[..., Awaitable[None]]
) -> None:
    async with with_faults.run_test(size=SIZE) as pilot:
        await holds(pilot, "F", faults)


def test_every_outcome_has_a_mark_and_words() -> None:
    assert len(MARKS) == len(TONES) == len(Outcome)
    for outcome in Outcome:
        sheet = FaultSheet("d", "", "1", 0.0, (), None, (result("R1", outcome),))
        assert counts_words(sheet).startswith("1 ")
