"""Where a margin comes from, on its screen: stored figures at once, the explanation as soon as it is computed."""

from __future__ import annotations

from dataclasses import replace

from stagebook.storage import Store
from stagebook.tui.figures import FigureRow
from stagebook.tui.margin_text import check_lines
from stagebook.tui.origin_text import explanation_rows, origin_rows, together
from stagebook.tui.screens.origin import OriginPage
from stagebook.tui.shown import plain
from stagebook.tui.stagebook_app import StagebookApp
from stagebook.tui.widgets.row_list import RowList
from stagebook.tui.widgets.status import Notice

from .conftest import Gates, seen, settled, until
from .sheets import check, explanation

SIZE = (80, 24)


def texts(app: StagebookApp) -> str:
    return "\n".join("".join(span.text for span in row.spans) for row in app.screen.query_one(RowList).rows)


async def test_values_sources_and_instants_follow_the_stored_figures(app: StagebookApp, gates: Gates) -> None:
    gates.shut("explained")
    async with app.run_test(size=SIZE) as pilot:
        await pilot.press("enter")
        await until(pilot, lambda: app.computing.idle)
        await pilot.press("tab", "w")
        await until(pilot, lambda: isinstance(app.screen, OriginPage))
        assert "1 - demand / capability" in seen(pilot)
        assert "being computed" in texts(app)
        gates.open()
        await settled(pilot)
        found = texts(app)
        for words in (
            "m = 1 - D/C = 1 - 1 V / 2 V = +50.0%",
            "+10 %, the design's table: a siren is near",
            "voltage of tc at 9 s: 1.5 V (sequence alarm, at 9 s)",
            "time of LS1 on: never seen (sequence alarm)",
            "R7 value 470k, limits 446k5 .. 493k5",
            "Q1 gain 200 (class small npn, from memory)",
        ):
            assert words in found
        assert "being computed" not in found
        await pilot.press("end")
        assert "from memory" in seen(pilot)
        await pilot.press("escape")
        await until(pilot, lambda: not isinstance(app.screen, OriginPage))


async def test_leaving_stops_the_computation(app: StagebookApp, gates: Gates) -> None:
    gates.shut("explained")
    async with app.run_test(size=SIZE) as pilot:
        await pilot.press("enter")
        await until(pilot, lambda: app.computing.idle)
        await pilot.press("tab", "w")
        await until(pilot, lambda: not app.computing.idle)
        await pilot.press("escape")
        await settled(pilot)
        assert gates.cancelled


async def test_a_design_that_cannot_be_computed_says_why(app: StagebookApp, gates: Gates) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await pilot.press("enter")
        await settled(pilot)
        gates.refusal = "net base leads nowhere; connect it"
        await pilot.press("tab", "w")
        await settled(pilot)
        assert "net base leads nowhere; connect it" in texts(app)


async def test_a_stored_revision_is_explained_too(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await pilot.press("enter")
        await settled(pilot)
        await pilot.press("h", "enter", "end", "w")
        await settled(pilot)
        assert isinstance(app.screen, OriginPage)
        assert "Q1 gain 200 (class small npn, from memory)" in texts(app)


async def test_a_factor_of_the_design_is_set_with_its_reason(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await pilot.press("enter")
        await settled(pilot)
        bench = app.screen
        await pilot.press("t")
        choices = [row.key for row in app.screen.query_one(RowList).rows]
        assert choices[0] == "derating v_ceo"
        assert "required latch_hold" in choices
        await pilot.press(*["down"] * choices.index("derating v_rrm"), "enter")
        await pilot.press(*["backspace"] * 4, *"0.7", "down", *"surges", "enter")
        await until(pilot, lambda: app.screen is bench)
        design = shelf.draft("flood").design
        assert (dict(design.derating), dict(design.reasons)) == ({"v_rrm": "0.7"}, {"v_rrm": "surges"})
        await pilot.press("u")
        assert dict(shelf.draft("flood").design.derating) == {}


def test_a_hand_formula_that_disagrees_is_not_hidden() -> None:
    apart = replace(check("arrival:timer:R7", 0.5), hand=0.1, accuracy=0.2, by_hand="R C ln 2")
    rows = {name: text for name, text, _ in origin_rows(apart, True) if name}
    assert rows["by hand"] == "+10 %: DISAGREES with the simulation beyond its stated accuracy 20 %"
    told = [text for name, text, _ in origin_rows(replace(apart, left_out="the load"), True) if not name]
    assert told == ["trust the simulation: the formula leaves out the load", "R C ln 2"]
    near = {name: text for name, text, _ in origin_rows(replace(apart, hand=0.4), True) if name}
    assert near["by hand"] == "+40 % (cross-check, not the verdict; stated accuracy 20 %)"
    bound = {name: text for name, text, _ in origin_rows(replace(apart, accuracy=None), True) if name}
    assert bound["by hand"] == "+10 % (a bound, not the verdict)"
    worst = {name: text for name, text, _ in origin_rows(replace(apart, bound=True), True) if name}
    assert worst["by hand"] == "+10 % (at worst: a bound, not the verdict; stated accuracy 20 %)"


def test_why_there_is_no_hand_value_is_told() -> None:
    none = replace(check("arrival:timer:R7", 0.5), accuracy=0.2, by_hand="R C ln 2", apart="no role is filled")
    for hand, said in ((None, "no value: no role is filled"), (0.1, "+10 %, not to be compared: no role is filled")):
        rows = {name: text for name, text, _ in origin_rows(replace(none, hand=hand), True) if name}
        assert rows["by hand"] == said
    silent = replace(none, apart=None, hand=0.1, margin=-1.0, outcome="never came on")
    rows = {name: text for name, text, _ in origin_rows(silent, True) if name}
    assert rows["by hand"] == "+10 %, not to be compared: never came on"


def test_the_bench_says_that_a_hand_formula_disagrees() -> None:
    apart = replace(check("arrival:timer:R7", 0.5), hand=0.1, accuracy=0.2)
    for found, said in ((apart, True), (replace(apart, accuracy=0.6), False)):
        row = FigureRow(found, True, 0.6, False, False, None)
        assert (
            "by hand +10 is off: trust the simulation, left out: what else there is" in plain(check_lines(row, 80)[1])
        ) is said


def test_values_put_in_stand_under_their_formula() -> None:
    old = check("arrival:timer:R7", 0.5)
    names = [name for name, *_ in together(origin_rows(old, True), explanation_rows(old, explanation(old.id, 0.5)))]
    assert names[names.index("formula") + 1] == "put in"
    assert names.count("put in") == 1


def test_a_margin_that_moved_since_is_told() -> None:
    old = check("arrival:timer:R7", 0.5)
    assert not [name for name, *_ in explanation_rows(old, explanation(old.id, 0.5)) if name == "here and now"]
    (moved,) = [text for name, text, _ in explanation_rows(old, explanation(old.id, 0.3)) if name == "here and now"]
    assert moved.startswith("+30 %, computed just now")


async def test_what_is_wanted_is_written_changed_and_taken_out(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await pilot.press("enter")
        await settled(pilot)
        bench = app.screen
        await pilot.press("R")
        names = [row.key for row in app.screen.query_one(RowList).rows]
        assert names[0] == "new latch_hold" or names[0].startswith("new ")
        await pilot.press(*["down"] * names.index("new sound_level"), "enter")
        await pilot.press(*"R7", "down", *"80 dB", "down", *"2 m", "enter")
        await until(pilot, lambda: app.screen is bench)
        (wanted,) = shelf.draft("flood").design.requirements
        assert (wanted.check, wanted.of, wanted.min, dict(wanted.extras)) == (
            "sound_level",
            "R7",
            "80 dB",
            {"distance": "2 m"},
        )
        told = bench.query_one(Notice)
        assert told.text.startswith("wanted: sound_level")
        await pilot.press("right")
        assert "wanted" not in told.text  # it is not news any more
        await pilot.press("R", "enter", "down", *["backspace"] * 5, *"85 dB", "enter")
        await until(pilot, lambda: app.screen is bench)
        (changed,) = shelf.draft("flood").design.requirements
        assert (changed.min, dict(changed.extras)) == ("85 dB", {"distance": "2 m"})
        await pilot.press(
            "R", "enter", *["backspace"] * 2, "down", *["backspace"] * 5, "down", *["backspace"] * 3, "enter"
        )
        await until(pilot, lambda: app.screen is bench)
        assert shelf.draft("flood").design.requirements == ()
