"""Data of a part and the drawer on the screen: who says a figure, replacing it, keeping it, using it elsewhere.

What is expected is this project's own description of the screens.
"""

from __future__ import annotations

import pytest
from textual.pilot import Pilot

from stagebook.engine import edit
from stagebook.storage import Store
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.drawer import DrawerScreen
from stagebook.tui.screens.part_data import PartDataScreen
from stagebook.tui.stagebook_app import StagebookApp
from stagebook.tui.widgets.row_list import RowList
from stagebook.tui.widgets.status import Notice

from .conftest import flood, seen, settled, shown, until

SIZE = (80, 24)
NPN = {
    "kind": "npn",
    "pins": {"collector": "supply", "base": "0V", "emitter": "0V"},
    "class": "small npn",
}


@pytest.fixture
def with_transistors(shelf: Store, app: StagebookApp) -> StagebookApp:
    """Q1 and Q2 in the first stage."""
    design = flood(R7="390k")
    for ref in ("Q1", "Q2"):
        design = edit.with_part(design, design.stages[0].name, {"ref": ref, **NPN})
    shelf.edit("flood", "Q1 and Q2", design)
    return app


async def to_q1(pilot: Pilot[None]) -> None:
    await settled(pilot)
    await pilot.press("enter")
    await settled(pilot)
    await pilot.press("end", "up")
    bench = pilot.app.screen
    assert isinstance(bench, BenchScreen)
    assert bench.ref == "Q1"


async def answer(pilot: Pilot[None], text: str) -> None:
    """Writes a text over what the only line of a form begins with."""
    await pilot.pause()
    await pilot.press("ctrl+u", *["space" if c == " " else "full_stop" if c == "." else c for c in text], "enter")
    await pilot.pause()


def notice(pilot: Pilot[None]) -> str:
    return pilot.app.screen.query_one(Notice).text


async def test_memory_is_said_until_a_figure_is_replaced(with_transistors: StagebookApp, shelf: Store) -> None:
    async with with_transistors.run_test(size=SIZE) as pilot:
        await to_q1(pilot)
        assert "15 figures from memory (i)" in seen(pilot)
        await pilot.press("i")
        await until(pilot, lambda: isinstance(pilot.app.screen, PartDataScreen))
        gain = next(line for line in shown(pilot) if " gain " in line)
        assert gain.split()[1:] == ["gain", "200", "300", "450", "2", "mA,", "5", "V", "memory"]
        await pilot.press("home", "enter")
        await answer(pilot, "110 .. 180 .. 300 at 2 mA")
        gain = next(line for line in shown(pilot) if " gain " in line)
        assert gain.split()[1:] == ["gain", "110", "180", "300", "2", "mA", "not", "said"]
        assert "14 figures from memory, 1 of source not said" in shown(pilot)[0]
        assert shelf.draft("flood").design.part("Q1").datum("gain").source is None  # type: ignore[union-attr]
        await pilot.press("enter")
        await answer(pilot, "110 .. 180 .. 300 at 2 mA (datasheet)")
        gain = next(line for line in shown(pilot) if " gain " in line)
        assert gain.split()[1:] == ["gain", "110", "180", "300", "2", "mA", "datasheet"]
        assert shown(pilot)[0].rstrip().endswith("14 figures from memory")
        datum = shelf.draft("flood").design.part("Q1").datum("gain")
        assert datum is not None
        assert (datum.max, datum.source) == ("300", "datasheet")
        await pilot.press("b", "u", "u")
        await settled(pilot)
        assert "15 figures from memory (i)" in seen(pilot)


async def test_a_wrong_figure_stays_to_be_corrected(with_transistors: StagebookApp, shelf: Store) -> None:
    async with with_transistors.run_test(size=SIZE) as pilot:
        await to_q1(pilot)
        await pilot.press("i", "home", "enter")
        await answer(pilot, "many")
        assert "X " in notice(pilot)
        assert "gain" in notice(pilot)
        await pilot.press("escape")
        assert shelf.draft("flood").design.part("Q1").entry("gain") is None


async def test_what_is_kept_of_one_part_is_used_in_another(with_transistors: StagebookApp, shelf: Store) -> None:
    async with with_transistors.run_test(size=SIZE) as pilot:
        await to_q1(pilot)
        await pilot.press("i", "home", "enter")
        await answer(pilot, "180")
        await pilot.press("k")
        await answer(pilot, "low-leak")
        assert "kept as low-leak, version 1" in notice(pilot)
        await pilot.press("b", "end", "p")
        await until(pilot, lambda: isinstance(pilot.app.screen, DrawerScreen))
        assert "class small npn, gain 180" in seen(pilot)
        await pilot.press("enter")
        await settled(pilot)
        used = shelf.draft("flood").design.part("Q2")
        assert used.drawer == "low-leak, version 1"
        assert used.datum("gain").typical == "180"  # type: ignore[union-attr]
        assert used.datum("c_ob").source == "memory"  # type: ignore[union-attr]
        assert "drawer: low-leak, version 1" in seen(pilot)


async def test_a_part_is_made_and_edited_as_a_new_version(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        await pilot.press("p", "n")
        await pilot.pause()
        await pilot.press(*["down"] * 7, "enter")  # battery capacitor clamp coil contact two Darlingtons diode
        await pilot.pause()
        await pilot.press("enter")  # signal diode
        await pilot.pause()
        assert "a new diode: diode, class signal diode" in seen(pilot)
        await pilot.press("k")
        await answer(pilot, "quick")
        await pilot.press("b")
        assert "quick" in seen(pilot)
        await pilot.press("e", "home", "enter")
        await answer(pilot, "0.55 V at 1 mA")
        await pilot.press("k", "enter")
        await pilot.pause()
        assert "kept as quick, version 2" in notice(pilot)
        await pilot.press("b")
        assert [made.version for made in shelf.drawer()] == [2]
        await pilot.press("v")
        assert sum("quick" in line and "class signal diode" in line for line in shown(pilot)[2:-5]) == 2


async def test_a_part_of_another_kind_is_not_used(app: StagebookApp, shelf: Store) -> None:
    shelf.keep_part("low-leak", {"kind": "npn", "class": "small npn"})
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        await pilot.press("p", "enter")
        assert "it is a resistor and no npn" in notice(pilot)


async def test_a_new_part_takes_its_data_from_the_drawer_by_name(app: StagebookApp, shelf: Store) -> None:
    shelf.keep_part("stout", {"kind": "resistor", "rating": "2 W", "tolerance": "1 %"})
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        await pilot.press("a")
        await pilot.pause()
        await pilot.press(*["down"] * next(at for at, line in enumerate(_choices(pilot)) if line == "resistor a b"))
        await pilot.press("enter")
        await pilot.pause()
        assert "stout (drawer)" in seen(pilot)
        await pilot.press("down", *"1k", "down", "down", *"stout", "down", *"supply", "down", *"0V", "enter")
        await settled(pilot)
        stage = shelf.draft("flood").design.stages[0]
        part = stage.parts[-1]
        assert (part.value, part.rating, part.tolerance, part.drawer) == ("1k", "2 W", "1 %", "stout, version 1")


def _choices(pilot: Pilot[None]) -> list[str]:
    return [row.key for row in pilot.app.screen.query_one("#choices", RowList).rows]
