"""Work on the bench at 80x24: what a keystroke does to the draft, to the store and to the screen.

What is expected is this project's own description of the bench; the margins are those of the made-up study in conftest.
"""

from __future__ import annotations

import pytest
from textual.pilot import Pilot

from stagebook.engine.design.document import Design
from stagebook.storage import Store
from stagebook.tui.drafting import Drafting
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.compare import CompareScreen
from stagebook.tui.screens.saving import Waiting, noted_words
from stagebook.tui.screens.shelf import ShelfScreen
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp
from stagebook.tui.widgets.row_list import RowList
from stagebook.tui.widgets.status import Notice

from .conftest import Gates, document, flood, seen, settled, shown, until

SIZE = (80, 24)


async def open_bench(pilot: Pilot[None]) -> BenchScreen:
    await settled(pilot)
    await pilot.press("enter")
    await settled(pilot)
    bench = pilot.app.screen
    assert isinstance(bench, BenchScreen)
    return bench


async def to_timer(pilot: Pilot[None]) -> BenchScreen:
    bench = await open_bench(pilot)
    await pilot.press("right", "right", "right")
    return bench


def notice(pilot: Pilot[None]) -> str:
    return pilot.app.screen.query_one(Notice).text


def value(store: Store, ref: str) -> str | None:
    return store.draft("flood").design.part(ref).value


async def test_the_bench_shows_the_chain_with_the_weakest_margin_of_each_stage(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        names, figures = shown(pilot)[1:3]
        assert names.split()[::2] == ["probe", "amplifier", "latch", "[timer]", "driver", "piezo", "lamp"]
        assert figures.split() == ["=", "+29"] * 3 + ["=", "+15"] + ["=", "+29"] * 3
        assert "draft on r2, no edits" in shown(pilot)[0]


async def test_left_and_right_walk_stages_and_come_back_to_the_same_part(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("down")
        assert bench.ref == "R8"
        await pilot.press("right")
        assert bench.ref == "R9"
        await pilot.press("left")
        assert bench.ref == "R8"


async def test_a_digit_begins_a_value_and_enter_keeps_it_in_the_store(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("4", "7", "0", "k")
        assert value(shelf, "R7") == "390k"
        await pilot.press("enter")
        assert value(shelf, "R7") == "470k"
        assert bench.ref == "R7"
        await settled(pilot)
        assert "last was 390k" in seen(pilot)


async def test_a_refused_value_stays_to_be_corrected_and_says_why(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        await pilot.press("4", "7", "x", "enter")
        assert "47x" in seen(pilot)
        assert "47x" in notice(pilot)
        assert value(shelf, "R7") == "390k"
        await pilot.press("backspace", "k", "enter")
        assert value(shelf, "R7") == "47k"


async def test_escape_leaves_the_old_value(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        await pilot.press("1", "x", "enter", "escape")
        assert notice(pilot) == ""
        assert value(shelf, "R7") == "390k"
        assert isinstance(app.focused, RowList)


async def test_comma_and_full_stop_step_through_preferred_values(app: StagebookApp, shelf: Store) -> None:
    # IEC 60063, E24: ... 360 390 430 ...
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        await pilot.press("full_stop")
        assert value(shelf, "R7") == "430k"
        await pilot.press("comma", "comma")
        assert value(shelf, "R7") == "360k"


async def test_undo_and_redo_walk_the_edits(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        await pilot.press("full_stop", "u")
        assert value(shelf, "R7") == "390k"
        await pilot.press("r")
        assert value(shelf, "R7") == "430k"
        await pilot.press("u", "U")
        assert value(shelf, "R7") == "430k"


async def test_undo_at_the_start_is_refused_in_words(app: StagebookApp, store: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        await pilot.press("u", "u", "u")
        assert notice(pilot).startswith("X")
        await pilot.press("down")
        assert notice(pilot) == ""


async def test_figures_being_computed_are_marked_and_stay(app: StagebookApp, gates: Gates) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        gates.shut("nominal", "corners", "spread")
        await pilot.press("1", "0", "0", "k", "enter")
        row = next(row for row in bench.figures.rows("timer") if row.check.part == "R7")
        assert (row.worst_old, row.nominal_old, round(row.check.margin or 0, 2)) == (True, True, 0.15)
        assert "+15~" in seen(pilot)
        assert "~ compared with r2: being computed" in seen(pilot)
        gates.nominal.set()
        await until(pilot, lambda: not bench.figures.nominal_old)
        assert "+15~" in seen(pilot)
        gates.open()
        await settled(pilot)
        first = bench.figures.rows("timer")[0]
        assert (first.check.part, first.against.worse, first.worst_old) == ("R7", True, False)
        assert "worse than r2: arrival R7" in seen(pilot)
        assert "X never" in seen(pilot)


async def test_a_newer_edit_cancels_the_older_study(app: StagebookApp, gates: Gates) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        gates.shut("corners")
        await pilot.press("full_stop")
        older = bench.design.content
        await until(pilot, lambda: older in gates.studied)
        await pilot.press("full_stop")
        await until(pilot, lambda: older in gates.cancelled)
        gates.open()
        await settled(pilot)
        assert bench.figures.worst is not None
        assert bench.figures.worst.content == bench.design.content


async def test_a_circuit_that_cannot_be_computed_says_why_and_keeps_the_edit(
    app: StagebookApp, shelf: Store, gates: Gates
) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        gates.refusal = "net cap: nothing leads to 0V; connect it to a part"
        await pilot.press("full_stop")
        await settled(pilot)
        await pilot.press("down", "up")
        # It holds until the circuit is another one.
        assert notice(pilot) == "X cannot be computed: net cap: nothing leads to 0V; connect it to a part"
        assert value(shelf, "R7") == "430k"
        assert "+15~" in seen(pilot)
        gates.refusal = ""
        await pilot.press("u")
        await settled(pilot)
        assert "nothing leads" not in notice(pilot)


async def test_the_corner_of_the_margin_under_the_hand_stands_below_the_table(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        assert shown(pilot)[-3].startswith(" arrival R7 at hot, low supply")
        assert "corner" not in shown(pilot)[4]


async def test_saving_asks_for_a_line_and_keeps_the_corners(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("full_stop")
        await settled(pilot)
        await pilot.press("s", "enter")
        assert "write one line first" in notice(pilot)
        await pilot.press(*"quieter", "enter")
        await until(pilot, lambda: pilot.app.screen is bench)
        revision = shelf.revision("flood")
        assert (revision.number, revision.parent, revision.note.line) == (3, 2, "quieter")
        assert revision.note.change == "R7 390k > 430k"
        assert revision.sheet.depth != "nominal"
        assert notice(pilot) == "saved as r3"
        assert "draft on r3, no edits" in shown(pilot)[0]


async def test_saving_waits_for_the_corners_and_can_be_left(app: StagebookApp, shelf: Store, gates: Gates) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        gates.shut("corners")
        await pilot.press("full_stop", "s", *"why", "enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, Waiting))
        await pilot.press("b")
        await until(pilot, lambda: pilot.app.screen is bench)
        assert notice(pilot) == "not saved; s asks again and still knows the note, after a restart too"
        assert len(shelf.revisions("flood")) == 2
        await pilot.press("s")
        assert "why" in seen(pilot)
        await pilot.press("enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, Waiting))
        gates.open()
        await until(pilot, lambda: pilot.app.screen is bench)
        assert shelf.revision("flood").sheet.depth != "nominal"


async def test_a_revision_saved_without_corners_is_stamped_incomplete(
    app: StagebookApp, shelf: Store, gates: Gates
) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        gates.shut("corners")
        await pilot.press("full_stop", "s", *"why", "enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, Waiting))
        await pilot.press("i")
        await until(pilot, lambda: pilot.app.screen is bench)
        assert shelf.revision("flood").sheet.depth == "nominal"
        assert "incomplete" in notice(pilot)


async def test_frozen_figures_show_after_the_prediction_which_goes_into_the_note(
    app: StagebookApp, shelf: Store
) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("f", "1", "0", "0", "k", "enter")
        await settled(pilot)
        assert "FROZEN" in seen(pilot)
        assert "+15~" in seen(pilot)
        await pilot.press("w")
        assert "held back" in notice(pilot)
        await pilot.press("f", *"it stops", "enter")
        await until(pilot, lambda: pilot.app.screen is bench)
        assert "X never" in seen(pilot)
        await pilot.press("s", *"tried", "enter")
        await until(pilot, lambda: pilot.app.screen is bench)
        assert shelf.revision("flood").note.prediction == "it stops"


async def test_another_field_of_the_part_is_edited_in_a_line(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("e")
        choices = pilot.app.screen.query_one(RowList)
        await pilot.press(*["down"] * [row.key for row in choices.rows].index("tolerance"))
        await pilot.press("enter", "1", "space", "%", "enter")
        await until(pilot, lambda: pilot.app.screen is bench)
        assert shelf.draft("flood").design.part("R7").tolerance == "1 %"


async def test_removing_a_part_asks_first(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("x", "n")
        assert shelf.draft("flood").design.has_part("R7")
        await pilot.press("x", "y")
        await until(pilot, lambda: pilot.app.screen is bench)
        assert not shelf.draft("flood").design.has_part("R7")
        await pilot.press("u")
        assert shelf.draft("flood").design.has_part("R7")


async def test_where_a_margin_comes_from_is_one_key_away(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        await pilot.press("tab")
        assert " Enter origin " in shown(pilot)[-1]
        await pilot.press("w")
        text = seen(pilot)
        for words in ("demand", "capability", "1 - demand / capability", "hot, low supply", "by hand", "4 V", "50 C"):
            assert words in text


async def test_margins_of_all_stages_fill_the_width(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("m")
        await pilot.pause()
        assert len(bench.query_one("#margins", RowList).rows) == 14
        assert "timer: arrival R7" in seen(pilot)
        await pilot.press("m")
        await pilot.pause()
        assert len(bench.query_one("#margins", RowList).rows) == 2


async def test_the_draft_is_compared_with_the_revision_it_began_from(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        await pilot.press("3", "5", "0", "k", "enter")
        await settled(pilot)
        await pilot.press("c")
        await settled(pilot)
        text = seen(pilot)
        assert "R7 390k > 350k" in text
        first = pilot.app.screen.query_one("#checks", RowList).rows[0]
        assert first.key == "arrival:timer:R7"
        assert "causes: R7 -10" in text
        assert "13 margins did not change: m shows them" in text
        await pilot.press("end", "enter")
        assert len(pilot.app.screen.query_one("#checks", RowList).rows) == 14


async def test_a_comparison_waits_for_the_corners_and_then_shows(app: StagebookApp, gates: Gates) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        gates.shut("corners")
        await pilot.press("full_stop", "c")
        assert "compared with r2 as soon as" in notice(pilot)
        gates.open()
        await until(pilot, lambda: isinstance(pilot.app.screen, CompareScreen))
        await settled(pilot)
        assert "R7 390k > 430k" in seen(pilot)


@pytest.mark.parametrize("key", ["c", "5"])
async def test_a_comparison_waits_no_longer_when_told_and_breaks_into_no_value(
    app: StagebookApp, gates: Gates, key: str
) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        gates.shut("corners")
        await pilot.press("full_stop", "c", key)
        gates.open()
        await settled(pilot)
        assert pilot.app.screen is bench


@pytest.mark.parametrize("most_lanes", [1_000_000, 20])
async def test_a_draft_keeps_its_figures_when_the_bench_is_left(
    app: StagebookApp, gates: Gates, most_lanes: int
) -> None:
    gates.most_lanes = most_lanes  # of a large design the solver draws fewer lanes than it is asked for
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        await pilot.press("3", "5", "0", "k", "enter")
        await settled(pilot)
        studied = list(gates.studied)
        await pilot.press("escape")
        await until(pilot, lambda: isinstance(pilot.app.screen, ShelfScreen))
        # 1 - 330k/350k = 5.7 %; the revision's was 1 - 330k/390k = 15.4 %
        row = next(text for text in shown(pilot) if "flood" in text)
        assert "1 edit" in row
        assert "! +5 thin      draft: arrival R7" in row
        await pilot.press("enter")
        await settled(pilot)
        assert gates.studied == studied
        bench = pilot.app.screen
        assert isinstance(bench, BenchScreen)
        assert bench.ref == "R7"
        assert "worse than r2: arrival R7 -10" in seen(pilot)


async def test_a_note_and_a_prediction_outlive_the_bench(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        await pilot.press("f", "full_stop", "s", *"half a line", "escape", "escape")
        await until(pilot, lambda: isinstance(pilot.app.screen, ShelfScreen))
        assert "draft:" not in seen(pilot)
        await pilot.press("enter")
        await settled(pilot)
        assert "FROZEN" in seen(pilot)
        await pilot.press("s")
        assert "half a line" in seen(pilot)


async def test_a_part_is_added_by_kind_reference_and_nets(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("a")
        kinds = [row.key for row in pilot.app.screen.query_one(RowList).rows]
        await pilot.press(*["down"] * kinds.index("resistor a b"), "enter")
        assert "R15" in seen(pilot)
        await pilot.press("tab", *"10k", "tab", "tab", "tab", *"cap", "tab", *"0V", "enter")
        await until(pilot, lambda: pilot.app.screen is bench)
        part = shelf.draft("flood").design.part("R15")
        assert (part.value, part.pins) == ("10k", {"a": "cap", "b": "0V"})
        assert bench.ref == "R15"


async def test_a_reference_that_is_taken_is_refused(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await to_timer(pilot)
        await pilot.press("a", "end")
        kinds = [row.key for row in pilot.app.screen.query_one(RowList).rows]
        await pilot.press("home", *["down"] * kinds.index("resistor a b"), "enter", *"R7", "enter")
        assert "there is a part R7 already" in notice(pilot)
        assert len(shelf.draft("flood").design.parts) == 21


async def test_the_required_margin_is_edited_on_the_margins(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("tab", "e", "2", "0", "space", "%", "enter")
        await until(pilot, lambda: pilot.app.screen is bench)
        assert shelf.draft("flood").design.required == {"arrival": "20 %"}


async def test_conditions_are_edited(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("d", "enter", "9", "space", "V", "enter")
        assert "not in order" in notice(pilot)
        await pilot.press(*["backspace"] * 3, "3", "space", "V", "enter")
        await until(pilot, lambda: pilot.app.screen is bench)
        await settled(pilot)
        assert "3 V .. 6.4 V" in seen(pilot)


async def test_a_stage_is_added_at_the_end_of_the_chain(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("A", "enter", *"horn", "enter")
        await until(pilot, lambda: pilot.app.screen is bench)
        assert shelf.draft("flood").design.stages[-1].name == "horn"


@pytest.mark.parametrize("size", [(20, 5), (10, 3), (40, 12), (80, 24), (120, 40), (200, 60)])
async def test_every_screen_stands_any_size(app: StagebookApp, size: tuple[int, int]) -> None:
    async with app.run_test(size=size) as pilot:
        await open_bench(pilot)
        for keys in (
            "tab",
            "w",
            "b",
            "m",
            "m",
            "1",
            "escape",
            "h",
            "b",
            "s",
            "escape",
            "a",
            "b",
            "i",
            "b",
            "p",
            "b",
            "question_mark",
            "b",
        ):
            await pilot.press(keys)
            await pilot.pause()
            assert len(shown(pilot)) == size[1]
            assert {len(text) for text in shown(pilot)} == {size[0]}


async def test_comparing_an_unchanged_draft_asks_for_no_causes(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        await pilot.press("c")
        await settled(pilot)
        assert "14 margins did not change: m shows them" in seen(pilot)
        await pilot.press("m")
        assert "nothing was changed" in seen(pilot)


async def test_figures_that_a_revision_holds_are_not_computed_again(app: StagebookApp, gates: Gates) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await to_timer(pilot)
        await pilot.press("full_stop")
        await settled(pilot)
        await pilot.press("s", *"why", "enter")
        await until(pilot, lambda: "saved as r3" in notice(pilot))
        studied = list(gates.studied)
        await pilot.press("full_stop")
        await settled(pilot)
        assert len(gates.studied) == len(studied) + 1
        await pilot.press("u")
        await settled(pilot)
        assert len(gates.studied) == len(studied) + 1
        assert not bench.figures.worst_old
        assert not bench.figures.spread_old


async def test_the_note_of_a_first_revision_says_what_was_edited(store: Store, solver: Solver) -> None:
    store.create("flood", flood())
    store.edit("flood", "R7 390k", flood(R7="390k"))
    async with StagebookApp(store, solver).run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        await pilot.press("s")
        await pilot.pause()
        assert "R7 470k > 390k" in seen(pilot)
        await pilot.press(*"why", "enter")
        await until(pilot, lambda: len(store.revisions("flood")) == 1)
    assert store.revisions("flood")[0].note.change == "R7 470k > 390k"


def test_a_first_revision_made_of_edits_alone_does_not_fill_its_note(store: Store) -> None:
    bare = {**document(), "stages": []}
    store.create("flood", Design.load(bare))
    store.edit("flood", "+stages", flood())
    drafting = Drafting(store, "flood")
    everything = drafting.noted_changes()
    assert len(everything) > 20
    words = noted_words(drafting)
    assert words.endswith(f", and {len(everything) - 12} more")
    assert "+C4" in words
    assert "R9" not in words
