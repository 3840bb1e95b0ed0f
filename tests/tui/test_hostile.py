"""Foreign text, terminals without colour, a first start, and leaving in a hurry."""

from __future__ import annotations

import threading
from dataclasses import replace

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import MarginSheet
from stagebook.storage import Note, Store
from stagebook.tui.messages import SolverPreparing
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import Gates, corners, document, seen, settled, shown, until

SIZE = (80, 24)
MARKUP = "[b]x[/b] [@click=app.quit]go[/]"


@pytest.fixture
def hostile(store: Store, gates: Gates) -> Store:
    """A design whose texts look like markup, a sheet and a note that would steer the terminal."""
    made = document()
    made["stages"][0]["parts"].append(
        {"ref": "Q1", "kind": "npn", "class": MARKUP, "pins": {"collector": "a", "base": "b", "emitter": "0V"}}
    )
    design = Design.load(made)
    store.create("flood", design)
    sheet = corners(gates, design)
    first = replace(sheet.checks[0], corner="\x1b[2J\x1b]0;owned\x07", reason="a\nb\r\u202ec", title="[red]arrival")
    store.save("flood", Note(f"{MARKUP}"), replace(sheet, checks=(first, *sheet.checks[1:])))
    return store


async def test_foreign_text_is_neither_markup_nor_a_command(hostile: Store, solver: Solver) -> None:
    app = StagebookApp(hostile, solver)
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        assert "[b]x[/b]" in seen(pilot)
        await pilot.press("h")
        await pilot.pause()
        assert "[b]x[/b] [@click=app.quit]go[/]" in seen(pilot)
        await pilot.press("enter")
        await pilot.pause()
        text = seen(pilot)
        assert "[red]arrival" in text
        assert not any(ord(c) < 0x20 and c != "\n" for c in text)
        assert "\u202e" not in text


async def test_without_colour_marks_and_reverse_video_remain(
    monkeypatch: pytest.MonkeyPatch, shelf: Store, solver: Solver
) -> None:
    # The NO_COLOR convention: when the variable is set, no colour is added to the output.
    monkeypatch.setenv("NO_COLOR", "1")
    app = StagebookApp(shelf, solver)
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        segments = [segment for strip in app.screen._compositor.render_strips() for segment in strip]
        colours = {(s.style.color, s.style.bgcolor) for s in segments if s.style is not None}
        assert all(colour is None or colour.is_default for pair in colours for colour in pair)
        assert any(s.style is not None and s.style.reverse and "R1" in s.text for s in segments)
        assert "= +15" in seen(pilot)


class _Child:
    """A preparing process that ends when it is told."""

    def __init__(self) -> None:
        self.done = threading.Event()

    def poll(self) -> int | None:
        return 0 if self.done.is_set() else None


async def test_a_first_start_is_usable_while_the_solver_is_prepared(shelf: Store, gates: Gates) -> None:
    gates.studied.clear()
    child = _Child()
    started: list[int] = []

    def prepare() -> _Child:
        started.append(1)
        return child

    app = StagebookApp(shelf, Solver(gates.study, gates.causes_of, lambda: False, prepare, lanes=40))
    async with app.run_test(size=SIZE) as pilot:
        await until(pilot, lambda: "preparing the solver" in seen(pilot))
        await pilot.press("enter")
        await until(pilot, lambda: "preparing the solver" in shown(pilot)[0])
        await pilot.press("right", "right", "right", "4", "7", "0", "k", "enter")
        assert shelf.draft("flood").design.part("R7").value == "470k"
        assert "+15~" in seen(pilot)
        assert gates.studied == []
        child.done.set()
        await settled(pilot)
        assert gates.studied == [shelf.draft("flood").design.content]
        assert started == [1]
        assert "+29 " in seen(pilot)


async def test_a_solver_that_cannot_be_prepared_says_so(shelf: Store, gates: Gates) -> None:
    def prepare() -> _Child:
        raise OSError("no such interpreter")

    app = StagebookApp(shelf, Solver(gates.study, gates.causes_of, lambda: False, prepare, lanes=40))
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        assert "could not be prepared" in seen(pilot)


async def test_an_edit_in_another_sitting_is_not_written_over(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        with Store.open(shelf.path) as other:
            other.take_over("flood")
            other.edit("flood", "R1 100k", Design.load(document(R1="100k")))
            await pilot.press("1", "k", "enter")
            await until(pilot, lambda: "other sitting" in seen(pilot))
            assert other.draft("flood").design.part("R1").value == "100k"
            await pilot.press("y")
            await settled(pilot)
            assert "100k" in seen(pilot)


async def test_progress_comes_at_most_ten_times_a_second(shelf: Store, gates: Gates) -> None:
    def study(design: Design, **how: object) -> MarginSheet:
        for done in range(5000):
            how["progress"](done, 5001)  # type: ignore[operator]
        return gates.study(design, **how)  # type: ignore[arg-type]

    app = StagebookApp(shelf, Solver(study, gates.causes_of, lambda: True, _Child, lanes=40))
    posted: list[object] = []
    async with app.run_test(size=SIZE) as pilot:
        app.computing.study(shelf.draft("flood").design, posted.append)
        await settled(pilot)
    assert 1 <= len([message for message in posted if not isinstance(message, SolverPreparing)]) <= 20


async def test_a_long_refusal_is_shown_to_its_end(app: StagebookApp, shelf: Store, gates: Gates) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        gates.refusal = "stage timer, part R7, field value: " + "nothing fits here " * 6 + "write it like 4k7"
        await pilot.press("full_stop")
        await settled(pilot)
        assert "write it like 4k7" in seen(pilot)
