"""The screen of immunity: it fills corner by corner, the weakest net first, and leaving gives it up.

What is expected is this project's own description of the screen; the charges are those of a made-up study.
"""

from __future__ import annotations

from collections.abc import Awaitable, Callable
from dataclasses import replace

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.studies.immunity_sheet import NOT_YET, ImmunitySheet, NetImmunity
from stagebook.storage import Store
from stagebook.tui.immunity_text import charge_words, immunity_rows, slew_words
from stagebook.tui.shown import plain
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

BASE, RAIL = NetImmunity("nb", 2.2e-11, 1, "hot"), NetImmunity("rail", 2.4e-7, -1, "hot, low supply")
NONE, AT_ONCE = NetImmunity("sense", None, None, "any"), NetImmunity("nc", 0.0, 1, "hot")


def first(design: Design) -> ImmunitySheet:
    return ImmunitySheet(design.name, design.content, 0.1, (RAIL, NONE), None, NOT_YET)


def whole(sheet: ImmunitySheet) -> ImmunitySheet:
    return replace(sheet, nets=(BASE, RAIL, NONE), slew=97_089.0, slew_condition="hot, high supply")


@pytest.fixture
def immunity() -> MadeUpStudy:
    return MadeUpStudy(first, whole)


@pytest.fixture
def with_study(shelf: Store, solver: Solver, immunity: MadeUpStudy) -> StagebookApp:
    return StagebookApp(shelf, replace(solver, immunity=immunity))


async def test_it_fills_corner_by_corner_and_puts_the_weakest_first(
    with_study: StagebookApp, immunity: MadeUpStudy
) -> None:
    async with with_study.run_test(size=SIZE) as pilot:
        await open_study(pilot, "I")
        await until(pilot, lambda: "~ 1 of 3" in seen(pilot) and "rail" in seen(pilot))
        assert f"steepest supply: {NOT_YET}" in seen(pilot)
        # Corners are still to come: no figure stands as if it were the last word.
        assert "-240 nC~" in seen(pilot)
        assert "no corner yet" in seen(pilot)
        immunity.gate.set()
        await settled(pilot)
        assert "steepest supply: 97 V/ms (hot, high supply)" in seen(pilot)
        assert "nb: 22 pC put into it within 100 ns raise an alarm" in seen(pilot)
        assert "~" not in seen(pilot)
        await pilot.press("down")
        assert "rail: 240 nC drawn from it within 100 ns raise an alarm" in seen(pilot)
        assert "worst at: hot, low supply" in shown(pilot)[-3]
        await pilot.press("down")
        assert "sense: no charge up to 1 uC raises an alarm" in seen(pilot)


@pytest.mark.parametrize("holds", [leaving_gives_it_up, a_refusal_is_said, it_says_what_it_waits_for])
async def test_what_every_study_page_does(
    with_study: StagebookApp, immunity: MadeUpStudy, holds: Callable[..., Awaitable[None]]
) -> None:
    async with with_study.run_test(size=SIZE) as pilot:
        await holds(pilot, "I", immunity)


def test_charges_and_bars() -> None:
    assert [charge_words(found) for found in (BASE, RAIL, NONE, AT_ONCE)] == ["+22 pC", "-240 nC", "over 1 uC", "0 C"]
    sheet = ImmunitySheet("d", "", 0.0, (AT_ONCE, BASE, RAIL, NONE), None, "immune at any slew, in every corner")
    assert slew_words(sheet) == "immune at any slew, in every corner"
    bars = [plain(row.spans).count("#") for row in immunity_rows(sheet, 78)]
    assert bars == [12, 11, 1, 0]
    assert all(len(plain(row.spans)) <= 40 for row in immunity_rows(sheet, 40))
