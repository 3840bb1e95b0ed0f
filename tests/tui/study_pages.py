"""What the tests of screens that a study fills have in common: a study that waits, and the way to its screen."""

from __future__ import annotations

import threading
from collections.abc import Callable
from typing import Any

from textual.pilot import Pilot

from stagebook.engine.design.document import Design
from stagebook.engine.errors import Cancelled, CircuitError
from stagebook.tui.messages import SolverPreparing
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.study_page import StudyPage

from .conftest import seen, settled, shown, until

SIZE = (80, 24)


class MadeUpStudy:
    """Reports one sheet at once and returns another when the gate opens; a ``refusal`` is raised instead."""

    def __init__(self, first: Callable[[Design], Any], whole: Callable[[Any], Any]) -> None:
        self.gate = threading.Event()
        self.cancelled = False
        self.refusal = ""
        self._first, self._whole = first, whole

    def __call__(
        self,
        design: Design,
        *,
        report: Callable[[Any], None],
        progress: Callable[[int, int], None],
        cancelled: Callable[[], bool],
    ) -> Any:
        if self.refusal:
            raise CircuitError(self.refusal)
        sheet = self._first(design)
        report(sheet)
        progress(1, 3)
        while not self.gate.wait(0.005):
            if cancelled():
                self.cancelled = True
                raise Cancelled("stopped")
        return self._whole(sheet)


async def open_study(pilot: Pilot[None], key: str) -> None:
    await settled(pilot)
    await pilot.press("enter")
    await settled(pilot)
    await pilot.press(key)
    await until(pilot, lambda: isinstance(pilot.app.screen, StudyPage))


async def leaving_gives_it_up(pilot: Pilot[None], key: str, study: MadeUpStudy) -> None:
    await open_study(pilot, key)
    await pilot.press("b")
    await until(pilot, lambda: study.cancelled)
    assert isinstance(pilot.app.screen, BenchScreen)


async def a_refusal_is_said(pilot: Pilot[None], key: str, study: MadeUpStudy) -> None:
    study.refusal = "no part tells when there is an alarm; give a sounder its operating_minimum"
    await open_study(pilot, key)
    await settled(pilot)
    assert "operating_minimum" in seen(pilot)
    assert "not computed" in shown(pilot)[0]


async def it_says_what_it_waits_for(pilot: Pilot[None], key: str, study: MadeUpStudy) -> None:
    """Until there are rows: the solver that is prepared, or the study; both end by themselves."""
    await open_study(pilot, key)
    page = pilot.app.screen
    assert isinstance(page, StudyPage)
    await until(pilot, lambda: bool(page.found.rows))
    page.found.show([])
    page.post_message(SolverPreparing(True))
    await until(pilot, lambda: "the solver is being prepared, once on this machine" in seen(pilot))
    page.post_message(SolverPreparing(False))
    await until(pilot, lambda: "being computed; this fills by itself" in seen(pilot))
    study.gate.set()
    await until(pilot, lambda: bool(page.found.rows))
