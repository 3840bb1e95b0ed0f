"""The screen of immunity: it fills corner by corner, the weakest net first.

What is expected is this project's own description of the screen; the charges are those of a made-up study.
"""

from __future__ import annotations

from dataclasses import replace

import pytest

from stagebook.engine.studies.immunity_sheet import NOT_YET, ImmunitySheet, NetImmunity
from stagebook.storage import Store
from stagebook.tui.immunity_text import charge_words, immunity_rows, slew_words
from stagebook.tui.shown import plain
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import seen, settled, shown, until
from .study_pages import BASE, NONE, RAIL, SIZE, MadeUpStudy, open_study
from .study_pages import immunity as made_up

AT_ONCE = NetImmunity("nc", 0.0, 1, "hot")


@pytest.fixture
def immunity() -> MadeUpStudy:
    return made_up()


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


def test_charges_and_bars() -> None:
    assert [charge_words(found) for found in (BASE, RAIL, NONE, AT_ONCE)] == [
        "+22 pC",
        "-240 nC",
        "over 1 uC",
        "by itself",
    ]
    sheet = ImmunitySheet("d", "", 0.0, (AT_ONCE, BASE, RAIL, NONE), None, "immune at any slew, in every corner")
    assert slew_words(sheet) == "immune at any slew, in every corner"
    bars = [plain(row.spans).count("#") for row in immunity_rows(sheet, 78)]
    assert bars == [12, 11, 1, 0]
    assert all(len(plain(row.spans)) <= 40 for row in immunity_rows(sheet, 40))
