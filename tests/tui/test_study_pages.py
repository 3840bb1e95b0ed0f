"""What every screen does that a study fills while it runs: this project's own description, on made-up studies."""

from __future__ import annotations

from dataclasses import dataclass, replace

import pytest

from stagebook.storage import Store
from stagebook.tui.messages import SolverPreparing
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.study_page import StudyPage
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import seen, settled, shown, until
from .study_pages import SIZE, MadeUpStudy, faults, immunity, open_study


@dataclass(frozen=True)
class Each:
    """The program with one study made up, and the key that opens its screen."""

    app: StagebookApp
    study: MadeUpStudy
    key: str


@pytest.fixture(params=["F", "I"])
def each(request: pytest.FixtureRequest, shelf: Store, solver: Solver) -> Each:
    if request.param == "F":
        study = faults()
        return Each(StagebookApp(shelf, replace(solver, faults=study)), study, "F")
    study = immunity()
    return Each(StagebookApp(shelf, replace(solver, immunity=study)), study, "I")


async def test_leaving_gives_the_study_up(each: Each) -> None:
    async with each.app.run_test(size=SIZE) as pilot:
        await open_study(pilot, each.key)
        await pilot.press("b")
        await until(pilot, lambda: each.study.cancelled)
        assert isinstance(pilot.app.screen, BenchScreen)


async def test_a_refusal_is_said(each: Each) -> None:
    async with each.app.run_test(size=SIZE) as pilot:
        each.study.refusal = "no part tells when there is an alarm; give a sounder its operating_minimum"
        await open_study(pilot, each.key)
        await settled(pilot)
        assert "operating_minimum" in seen(pilot)
        assert "not computed" in shown(pilot)[0]


async def test_it_says_what_it_waits_for(each: Each) -> None:
    """Until there are rows: the solver that is prepared, or the study; both end by themselves."""
    async with each.app.run_test(size=SIZE) as pilot:
        await open_study(pilot, each.key)
        page = pilot.app.screen
        assert isinstance(page, StudyPage)
        await until(pilot, lambda: bool(page.found.rows))
        for busy, words in (
            (True, "preparing the solver, once on this machine (30 s or so); this fills by itself"),
            (False, "being computed; this fills by itself"),
        ):

            def asked(busy: bool = busy, words: str = words) -> bool:
                # Again and again: what the study itself reports may come between.
                page.found.show([])
                page.post_message(SolverPreparing(busy))
                return words in seen(pilot)

            await until(pilot, asked)
        each.study.gate.set()
        await until(pilot, lambda: bool(page.found.rows))
