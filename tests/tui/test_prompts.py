"""What the prompts of the bench name, take and refuse (own description of the bench; common practice, no source)."""

from __future__ import annotations

import pytest
from textual.pilot import Pilot

from stagebook.engine import edit
from stagebook.storage import Store, StoreFull, half_notes
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.dialog import Ask, Form, Pick
from stagebook.tui.screens.new_design import NewDesignPage
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp
from stagebook.tui.widgets.row_list import RowList

from .conftest import Gates, seen, settled, until
from .test_bench import SIZE, notice, open_bench, value

DIODE = {"ref": "D9", "kind": "diode", "class": "1 A rectifier", "pins": {"anode": "supply", "cathode": "0V"}}


@pytest.fixture
def with_diode(shelf: Store) -> Store:
    design = shelf.draft("flood").design
    shelf.edit("flood", "with D9", edit.with_part(design, "probe", DIODE))
    return shelf


def words(pilot: Pilot[None], text: str) -> bool:
    """Whether words stand in a row on the screen."""
    return text in " ".join(seen(pilot).split())


async def on_diode(pilot: Pilot[None]) -> BenchScreen:
    bench = await open_bench(pilot)
    await pilot.press("end")
    assert bench.ref == "D9"
    return bench


async def write(pilot: Pilot[None], text: str) -> None:
    await pilot.press("ctrl+u", *text, "enter")


async def choose(pilot: Pilot[None], key: str) -> None:
    assert isinstance(pilot.app.screen, Pick)
    rows = pilot.app.screen.query_one(RowList)
    rows.move_to([row.key for row in rows.rows].index(key))
    await pilot.press("enter")
    assert isinstance(pilot.app.screen, Form)


async def test_the_prompt_names_the_part_under_the_hand(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        await pilot.press("4")
        assert words(pilot, "R1, value: 4")
        await pilot.press("escape", "down", "4")
        assert words(pilot, "R2, value: 4")


async def test_a_value_for_a_part_that_has_none_is_refused_and_stays(app: StagebookApp, with_diode: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await on_diode(pilot)
        await pilot.press(*"150u", "enter")
        assert "a part of kind diode has no value; Esc, then e" in notice(pilot)
        assert words(pilot, "D9, value: 150u")
        assert value(with_diode, "D9") is None


async def test_enter_on_a_part_without_a_value_asks_for_its_fields(app: StagebookApp, with_diode: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await on_diode(pilot)
        await pilot.press("enter")
        await choose(pilot, "class")
        assert "such as signal diode, 1 A rectifier; empty takes it out" in notice(pilot)


async def test_an_unknown_class_is_refused_and_names_the_kind_that_has_it(app: StagebookApp, with_diode: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await on_diode(pilot)
        await pilot.press("e")
        await choose(pilot, "class")
        await write(pilot, "Schottky")
        assert "'1 A Schottky' is one of kind schottky, which e changes under kind" in " ".join(notice(pilot).split())
        await pilot.press("escape", "e")
        await choose(pilot, "kind")
        await write(pilot, "schottky")
        part = with_diode.draft("flood").design.part("D9")
        assert (part.kind, part.class_) == ("schottky", "1 A Schottky")


async def test_a_hint_stands_in_brackets(app: StagebookApp, with_diode: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await on_diode(pilot)
        await pilot.press("a")
        rows = pilot.app.screen.query_one(RowList)
        rows.move_to(next(n for n, row in enumerate(rows.rows) if row.key.startswith("schottky ")))
        await pilot.press("enter")
        assert words(pilot, "class (such as 1 A Schottky)")


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("150u", "R1 150u: that is 0.00015 ohm, and a resistor is made with 1m .. 100G: is it meant?"),
        ("0", "R1 0: that is 0 ohm: a link"),
        ("150k", "R1 150k"),
    ],
)
async def test_a_value_that_no_part_has_is_taken_with_a_word(
    app: StagebookApp, shelf: Store, text: str, said: str
) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        await pilot.press("enter")
        await write(pilot, text)
        assert " ".join(notice(pilot).split()) == said
        assert value(shelf, "R1") == text


async def test_what_cannot_be_computed_says_so_and_why(app: StagebookApp, gates: Gates) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await open_bench(pilot)
        gates.refusal = "stage probe, part R1: it leads nowhere"
        await pilot.press(".")
        await until(pilot, lambda: bool(bench.trouble))
        assert "- cannot be computed: w says why -" in seen(pilot)
        assert "being computed" not in seen(pilot)
        await pilot.press("up", "c")
        assert "nothing to compare: cannot be computed: stage probe, part R1" in notice(pilot)
        await pilot.press("w")
        assert notice(pilot) == "X cannot be computed: stage probe, part R1: it leads nowhere"
        gates.refusal = ""
        await pilot.press("u")
        await settled(pilot)
        assert "cannot be computed" not in seen(pilot)


async def test_undo_stops_at_the_revision_and_goes_on_when_asked_again(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        await pilot.press("u")
        assert "this is r2 as it was saved; o in the history (h) goes on" in " ".join(notice(pilot).split())
        assert value(shelf, "R7") == "390k"
        await pilot.press("u")
        assert notice(pilot) == "taken back: R7 390k, made before r2"
        assert value(shelf, "R7") == "470k"


async def test_a_revision_like_the_one_before_is_saved_only_when_asked_again(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await open_bench(pilot)
        await pilot.press("s")
        assert words(pilot, "Why does this revision exist? Nothing has changed since r2")
        await pilot.press(*"why", "enter")
        assert isinstance(pilot.app.screen, Form)
        assert "nothing has changed since r2; Enter again keeps the same" in notice(pilot)
        await pilot.press("escape", "s", "enter")
        assert isinstance(pilot.app.screen, Form)
        assert len(shelf.revisions("flood")) == 2
        await pilot.press("enter")
        await until(pilot, lambda: pilot.app.screen is bench)
        assert len(shelf.revisions("flood")) == 3
        await pilot.press("full_stop", "s")
        assert not words(pilot, "Nothing has changed since")
        await pilot.press(*"a larger one", "enter")
        await until(pilot, lambda: len(shelf.revisions("flood")) == 4)


@pytest.mark.parametrize(
    ("keys", "what"),
    [
        ("e down down enter 9", "what is written here"),
        ("3", "the value that is begun"),
        ("enter backspace", "the value that is begun"),
    ],
)
async def test_leaving_asks_once_where_something_begun_would_be_lost(app: StagebookApp, keys: str, what: str) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        await pilot.press(*keys.split())
        # Escape and Ctrl+Q that arrive in one packet are read as Ctrl+Q alone (Alt+Ctrl+Q in xterm's sequences).
        await pilot.press("ctrl+q")
        assert f"{what} is kept nowhere yet" in " ".join(notice(pilot).split())
        await pilot.press("left", "ctrl+q")
        assert not app._exit
        await pilot.press("ctrl+q")
        assert app._exit


async def test_a_row_of_stages_is_not_left_unasked(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await pilot.press("n", "enter", *"siren", "enter")
        await until(pilot, lambda: isinstance(app.screen, NewDesignPage))
        await pilot.press("a", "enter", "enter")
        await until(pilot, lambda: isinstance(app.screen, NewDesignPage))
        await pilot.press("a", "ctrl+q")
        # A list of kinds has no line to say it in: a question does.
        assert isinstance(app.screen, Ask)
        assert words(pilot, "the row of stages is kept nowhere yet")
        await pilot.press("n", "escape")
        assert isinstance(app.screen, NewDesignPage)
        assert not app._exit
        await pilot.press("ctrl+q", "ctrl+q")
        assert app._exit


async def test_a_note_that_is_begun_is_kept_and_offered_after_a_restart(
    app: StagebookApp, shelf: Store, solver: Solver
) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        await pilot.press("s", *"whw", "backspace", "y", "down", *"silent")
        await until(pilot, lambda: shelf.half_note("flood") == {"line": "why", "symptom": "silent"})
        await pilot.press("ctrl+q")  # loses nothing, so nothing is asked
        assert app._exit
    again = StagebookApp(shelf, solver)
    async with again.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        assert "the note for the next revision is begun already" in notice(pilot)
        await pilot.press("s")
        assert words(pilot, "why why")
        assert words(pilot, "symptom silent")
        await pilot.press("enter", "enter")  # nothing has changed: asked twice
        await settled(pilot)
        assert shelf.revisions("flood")[-1].note.symptom == "silent"
        assert shelf.half_note("flood") == {}


async def test_leaving_asks_for_a_note_that_cannot_be_kept(
    app: StagebookApp, shelf: Store, monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(*_: object) -> None:
        raise StoreFull("A note that is being written cannot be kept: make room.")

    monkeypatch.setattr(half_notes, "keep_half_note", full)
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        await pilot.press("s", *"why", "escape")
        assert "still knows the note until you leave. A note that is being" in " ".join(notice(pilot).split())
        await pilot.press("ctrl+q")
        assert "the note written for the next revision of flood is kept nowhere" in " ".join(notice(pilot).split())
        assert not app._exit
        monkeypatch.undo()  # there is room again
        await pilot.press("left", "ctrl+q")
        assert app._exit
    assert shelf.half_note("flood") == {"line": "why"}


async def test_escape_leaves_the_margins_of_all_stages_first(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await open_bench(pilot)
        await pilot.press("m", "escape")
        assert app.screen is bench
        assert "probe: parts" in seen(pilot)
        await pilot.press("escape")
        assert app.screen is not bench


async def test_a_required_margin_left_as_it_was_is_no_edit(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        await pilot.press("tab", "e")
        assert words(pilot, "required margin ")
        assert not words(pilot, "margin0")
        await pilot.press("enter")
        assert "stays" in notice(pilot)
        assert shelf.draft("flood").edits == 0


async def test_only_the_list_with_the_keyboard_has_the_full_mark(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        row = next(each for each in seen(pilot).splitlines() if " R1 " in each)
        assert (row.count(">"), row[0], "| - " in row) == (1, ">", True)
        await pilot.press("tab")
        row = next(each for each in seen(pilot).splitlines() if " R1 " in each)
        assert (row.count(">"), row[0], "| > " in row) == (1, "-", True)
