"""Made-up studies that fill a screen of their own and wait to be let go on, and the way to these screens."""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import replace
from typing import Any

from textual.pilot import Pilot

from stagebook.engine.design.document import Design
from stagebook.engine.errors import Cancelled, CircuitError
from stagebook.engine.studies.fault_outcomes import SAID, FaultResult, FaultSheet, Outcome
from stagebook.engine.studies.immunity_sheet import NOT_YET, ImmunitySheet, NetImmunity
from stagebook.tui.screens.study_page import StudyPage

from .conftest import settled, until

SIZE = (80, 24)
BASE, RAIL = NetImmunity("nb", 2.2e-11, 1, "hot"), NetImmunity("rail", 2.4e-7, -1, "hot, low supply")
NONE = NetImmunity("sense", None, None, "any")


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


def fault(part: str, outcome: Outcome, detail: str = "") -> FaultResult:
    return FaultResult(
        "latch", part, "open", outcome, SAID.get(outcome, "overheats R7"), detail, "LS1", "alarm", (), None, None, None
    )  # fmt: skip


def faults() -> MadeUpStudy:
    """One part alarms otherwise, which is known first; two are silent."""

    def first(design: Design) -> FaultSheet:
        alarms = (fault("R3", Outcome.STILL_ALARMS, "for 12 s instead of 86 s"),)
        return FaultSheet(design.name, design.content, "1", 0.1, (), None, alarms, ("LS1 is never called for",))

    def whole(sheet: FaultSheet) -> FaultSheet:
        return replace(sheet, faults=(fault("C4", Outcome.SILENT), fault("R9", Outcome.SILENT), *sheet.faults))

    return MadeUpStudy(first, whole)


def immunity() -> MadeUpStudy:
    """A second corner shows a weaker net."""

    def first(design: Design) -> ImmunitySheet:
        return ImmunitySheet(design.name, design.content, 0.1, (RAIL, NONE), None, NOT_YET)

    def whole(sheet: ImmunitySheet) -> ImmunitySheet:
        return replace(sheet, nets=(BASE, RAIL, NONE), slew=97_089.0, slew_condition="hot, high supply")

    return MadeUpStudy(first, whole)
