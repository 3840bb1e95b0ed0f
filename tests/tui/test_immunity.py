"""The screen of immunity: it fills corner by corner, the weakest net first, and leaving gives it up.

What is expected is this project's own description of the screen; the charges are those of a made-up study.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import replace

import pytest
from textual.pilot import Pilot

from stagebook.engine.design.document import Design
from stagebook.engine.errors import Cancelled, CircuitError
from stagebook.engine.studies.immunity import NOT_YET, ImmunitySheet, NetImmunity
from stagebook.storage import Store
from stagebook.tui.immunity_text import charge_words, immunity_rows, slew_words
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.immunity import ImmunityScreen
from stagebook.tui.shown import plain
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import seen, settled, shown, until

SIZE = (80, 24)
BASE, RAIL = NetImmunity("nb", 2.2e-11, 1, "hot"), NetImmunity("rail", 2.4e-7, -1, "hot, low supply")
NONE, AT_ONCE = NetImmunity("sense", None, None, "any"), NetImmunity("nc", 0.0, 1, "hot")


class Study:
    """Reports the nominal corner at once, the whole sheet when the gate opens."""

    def __init__(self) -> None:
        self.gate = threading.Event()
        self.cancelled = False
        self.refusal = ""

    def __call__(
        self,
        design: Design,
        *,
        report: Callable[[ImmunitySheet], None],
        progress: Callable[[int, int], None],
        cancelled: Callable[[], bool],
    ) -> ImmunitySheet:
        if self.refusal:
            raise CircuitError(self.refusal)
        sheet = ImmunitySheet(design.name, design.content, 0.1, (RAIL, NONE), None, NOT_YET)
        report(sheet)
        progress(1, 3)
        while not self.gate.wait(0.005):
            if cancelled():
                self.cancelled = True
                raise Cancelled("stopped")
        return replace(sheet, nets=(BASE, RAIL, NONE), slew=97_089.0, slew_condition="hot, high supply")


@pytest.fixture
def immunity() -> Study:
    return Study()


@pytest.fixture
def with_study(shelf: Store, solver: Solver, immunity: Study) -> StagebookApp:
    return StagebookApp(shelf, replace(solver, immunity=immunity))


async def open_immunity(pilot: Pilot[None]) -> None:
    await settled(pilot)
    await pilot.press("enter")
    await settled(pilot)
    await pilot.press("I")
    await until(pilot, lambda: isinstance(pilot.app.screen, ImmunityScreen))


async def test_it_fills_corner_by_corner_and_puts_the_weakest_first(with_study: StagebookApp, immunity: Study) -> None:
    async with with_study.run_test(size=SIZE) as pilot:
        await open_immunity(pilot)
        await until(pilot, lambda: "~ 1 of 3" in seen(pilot) and "rail" in seen(pilot))
        assert f"steepest supply: {NOT_YET}" in seen(pilot)
        immunity.gate.set()
        await settled(pilot)
        assert "steepest supply: 97 V/ms (hot, high supply)" in seen(pilot)
        assert "nb: 22 pC put into it within 100 ns raise an alarm" in seen(pilot)
        await pilot.press("down")
        assert "rail: 240 nC drawn from it within 100 ns raise an alarm" in seen(pilot)
        assert "worst at: hot, low supply" in shown(pilot)[-3]
        await pilot.press("down")
        assert "sense: no charge up to 1 uC raises an alarm" in seen(pilot)


async def test_leaving_gives_the_study_up(with_study: StagebookApp, immunity: Study) -> None:
    async with with_study.run_test(size=SIZE) as pilot:
        await open_immunity(pilot)
        await pilot.press("b")
        await until(pilot, lambda: immunity.cancelled)
        assert isinstance(pilot.app.screen, BenchScreen)


async def test_what_cannot_be_computed_is_said(with_study: StagebookApp, immunity: Study) -> None:
    immunity.refusal = "nothing tells of an alarm; give the design a load"
    async with with_study.run_test(size=SIZE) as pilot:
        await open_immunity(pilot)
        await settled(pilot)
        assert "nothing tells of an alarm" in seen(pilot)
        assert "not computed" in shown(pilot)[0]


def test_charges_and_bars() -> None:
    assert [charge_words(found) for found in (BASE, RAIL, NONE, AT_ONCE)] == ["+22 pC", "-240 nC", "none", "0 C"]
    sheet = ImmunitySheet("d", "", 0.0, (AT_ONCE, BASE, RAIL, NONE), None, "immune at any slew, in every corner")
    assert slew_words(sheet) == "immune at any slew, in every corner"
    bars = [plain(row.spans).count("#") for row in immunity_rows(sheet, 78)]
    assert bars == [0, 1, 11, 12]
    assert all(len(plain(row.spans)) <= 40 for row in immunity_rows(sheet, 40))
