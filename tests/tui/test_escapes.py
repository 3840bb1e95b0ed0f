"""Foreign text on every screen: nothing that a terminal would obey, nothing hidden (control functions: ECMA-48)."""

from __future__ import annotations

import sqlite3
import unicodedata
from collections.abc import Iterator
from contextlib import closing
from dataclasses import replace
from pathlib import Path

import pytest
from textual import events
from textual.pilot import Pilot

from stagebook.engine.design.document import Design
from stagebook.storage import Note, Store
from stagebook.tui.screens.dialog import Ask
from stagebook.tui.screens.shelf import ShelfScreen
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import Gates, corners, document, seen, settled

STEERS = "\x1b[2J\x1b]0;owned\x07\x9b31m\x7f\x08\u202e\u2028\u200b"
HIDDEN = {"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"}
TURNED = "\u202e[b]x[/b]"


@pytest.fixture
def poisoned(tmp_path: Path, gates: Gates) -> Iterator[Store]:
    """A shelf whose every text is hostile: what a document may hold, and in sheets, notes and labels more."""
    path = tmp_path / "hostile.sqlite3"
    made = document()
    made["purpose"] = TURNED
    first, second = made["stages"][:2]
    first["name"], first["kind"] = f"pro{TURNED.replace('/', '')}be", TURNED
    first["parts"][0]["class"] = TURNED
    for part in second["parts"]:
        part["pins"] = {"a": f"+{TURNED}", "b": "0V"}
    made["sequences"][TURNED] = {"ends": "1 s", "moments": {TURNED: "0.5 s"}}
    design = Design.load(made)
    with Store.open(path) as store:
        store.create("flood", design)
        sheet = corners(gates, design)
        checks = tuple(replace(c, corner=STEERS, reason=STEERS, outcome=STEERS, title=STEERS) for c in sheet.checks)
        sheet = replace(sheet, checks=checks)
        store.save("flood", Note("one", symptom="two"), sheet)
        made["stages"][2]["parts"][0]["value"] = "390k"
        other = Design.load(made)
        store.edit("flood", STEERS, other)
        store.save("flood", Note("one"), replace(sheet, content=other.content))
        store.add_note("flood", 2, "result", "three")
        store.edit("flood", STEERS, design)
    with closing(sqlite3.connect(path)) as raw:
        for table in ("revision", "note_entry"):
            raw.execute(f"DROP TRIGGER {table}_no_update")
        for place in ("line", "symptom", "hypothesis", "next"):
            raw.execute(f"UPDATE revision SET note = json_set(note, '$.{place}', ?)", (STEERS,))
        raw.execute("UPDATE note_entry SET text = ?", (STEERS,))
        raw.execute("UPDATE sitting SET who = ?, closed = 0", (STEERS,))
        raw.commit()
    with Store.open(path) as store:
        yield store


def obeyed(pilot: Pilot[None]) -> set[str]:
    """The characters of the screen that a terminal would obey or hide, and control sequences among its segments."""
    segments = [s for strip in pilot.app.screen._compositor.render_strips() for s in strip]
    hidden = {c for segment in segments for c in segment.text if unicodedata.category(c) in HIDDEN}
    return hidden | {str(segment.control) for segment in segments if segment.control}


WALKS = (
    "?",
    "n",
    "i",
    "enter right right m tab down left e",  # the bench, and the required margin of a check
    "enter tab w",  # where a margin comes from
    "enter enter",  # another value
    "enter e",  # another field
    "enter d",  # conditions
    "enter u r c right w",  # the draft beside its revision
    "enter x",
    "enter X",
    "enter A",
    "enter k",
    "enter s",
    "enter v n",  # waves, and which nets
    "enter v s",
    "enter F",
    "enter I",
    "enter h right down enter",  # one revision
    "enter h down o",
    "enter h t",
    "enter h space down space c w",
    "enter ctrl+p",
)
"""Keys from the shelf on; the screen is looked at after every one of them."""


async def walk(pilot: Pilot[None], keys: str) -> set[str]:
    """Presses the keys; the names of the screens that came in front."""
    came = set()
    for key in keys.split():
        await pilot.press(key)
        await settled(pilot)
        assert obeyed(pilot) == set(), keys
        came.add(type(pilot.app.screen).__name__)
    return came


async def home(pilot: Pilot[None]) -> None:
    """Back to the shelf, whatever stands over it."""
    for _ in range(8):
        if isinstance(pilot.app.screen, ShelfScreen):
            return
        await pilot.press("escape")
        await settled(pilot)
        if isinstance(pilot.app.screen, Ask):
            await pilot.press("y")
            await settled(pilot)
    raise AssertionError(f"there is no way back from {pilot.app.screen}")


ALL = {
    *("BenchScreen", "HistoryScreen", "CompareScreen", "RevisionPage", "OriginPage", "WavesScreen", "FaultsScreen"),
    *("ImmunityScreen", "HelpScreen", "Form", "Pick", "Ask", "CommandPalette"),
}


@pytest.mark.parametrize(
    ("size", "walks", "screens"),
    [((80, 24), WALKS, ALL), ((120, 40), WALKS[3::5], {"BenchScreen"})],
    ids=["80x24", "120x40"],
)
async def test_no_screen_shows_what_a_terminal_obeys(
    poisoned: Store, solver: Solver, size: tuple[int, int], walks: tuple[str, ...], screens: set[str]
) -> None:
    app = StagebookApp(poisoned, solver)
    async with app.run_test(size=size) as pilot:
        await settled(pilot)
        came: set[str] = set()
        for keys in walks:
            came |= await walk(pilot, keys)
            await home(pilot)
    assert came >= screens


async def test_the_hostile_text_is_there_to_be_seen(poisoned: Store, solver: Solver) -> None:
    app = StagebookApp(poisoned, solver)
    async with app.run_test(size=(120, 40)) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        assert "<U+202E>[b]x[" in seen(pilot)
        await pilot.press("h")
        await settled(pilot)
        assert "\u241b[2J" in seen(pilot)


@pytest.mark.parametrize("keys", ["enter enter", "enter s", "n", "i"])
async def test_what_is_pasted_steers_nothing(poisoned: Store, solver: Solver, keys: str) -> None:
    app = StagebookApp(poisoned, solver)
    async with app.run_test(size=(80, 24)) as pilot:
        await settled(pilot)
        await pilot.press(*keys.split())
        await settled(pilot)
        assert app.focused is not None
        app.focused.post_message(events.Paste(STEERS + "4k7"))
        await settled(pilot)
        assert obeyed(pilot) == set()
        await pilot.press("enter")
        await settled(pilot)
        assert obeyed(pilot) == set()
