"""Forms refuse what would keep the design from being computed, and stay open (own description of the forms; common
practice, no source)."""

from __future__ import annotations

import pytest
from textual.pilot import Pilot

from stagebook.engine import edit
from stagebook.storage import Store
from stagebook.tui.refusal_text import for_bench, for_form
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.dialog import Form
from stagebook.tui.screens.part_data import PartDataScreen
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import seen, until
from .test_bench import SIZE, notice, open_bench
from .test_prompts import choose, write

LAMP = {"ref": "E1", "kind": "lamp", "current": "150 mA", "pins": {"a": "supply", "b": "0V"}}
LAMP |= {"data": {"cold_ratio": "12", "inrush_time": "20 ms"}}


def draft(store: Store) -> object:
    return store.draft("flood").design


async def fill(pilot: Pilot[None], **texts: str) -> None:
    """Writes lines of the form that is shown, then takes it."""
    for name, text in texts.items():
        pilot.app.screen.query_one(f"#field-{name}").focus()
        await pilot.press("ctrl+u", *text)
    await pilot.press("enter")


async def test_a_requirement_that_cannot_be_met_keeps_the_form_open(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        before = draft(shelf)
        await pilot.press("R")
        await choose(pilot, "new duration")
        await fill(pilot, of="R1", min="72 s", max="60 s")
        assert isinstance(pilot.app.screen, Form)
        assert "min 72 s is above max 60 s; write the lower one as min" in notice(pilot)
        assert draft(shelf) == before
        await pilot.press("4", "7")  # digits go into the form, and into no value
        await fill(pilot, min="60 s", max="2min 6s")
        assert isinstance(pilot.app.screen, Form)
        assert "2min 6s" in notice(pilot)
        await pilot.press("escape")
        assert draft(shelf) == before


async def test_a_tolerance_below_zero_keeps_the_form_open(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        before = draft(shelf)
        await pilot.press("e")
        await choose(pilot, "tolerance")
        await write(pilot, "-5%")
        assert isinstance(pilot.app.screen, Form)
        assert "part R1, tolerance: -5% cannot be; write it like" in notice(pilot)
        assert draft(shelf) == before
        await write(pilot, "2%")
        assert isinstance(pilot.app.screen, BenchScreen)
        assert shelf.draft("flood").design.part("R1").tolerance == "2%"


async def test_a_needed_figure_is_not_taken_out(app: StagebookApp, shelf: Store) -> None:
    shelf.edit("flood", "with E1", edit.with_part(shelf.draft("flood").design, "probe", LAMP))
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        await pilot.press("end", "i")
        await until(pilot, lambda: isinstance(pilot.app.screen, PartDataScreen))
        before = draft(shelf)
        await pilot.press("home", "enter")
        await write(pilot, "")
        assert isinstance(pilot.app.screen, Form)
        assert "field current: 'current' is needed; write it like " in notice(pilot)
        assert '"' not in notice(pilot)
        assert draft(shelf) == before
        await pilot.press("escape")
        assert "150 mA" in seen(pilot)


@pytest.mark.parametrize(
    ("words", "form", "key"),
    [
        ("part E1, field current: 'current' is missing; write \"current\": \"1 A\"", "write it like 1 A", "(e on E1)"),
        ("part Q1, gain: missing; write it like \"gain\": \"300\" or name a class", "like 300 or name", "(e on Q1)"),
        ("stage a, part R7, field value: 'value' is missing; write \"value\": \"4k7\"", "like 4k7", "(Enter on R7)"),
        ("requirement 2 (duration): no", "no", "(R)"),
        ("net 'x' leads nowhere", "net 'x' leads nowhere", "nowhere"),
    ],
)  # fmt: skip
def test_a_refusal_names_keys_and_no_document(words: str, form: str, key: str) -> None:
    assert form in for_form(words)
    assert for_bench(words).endswith(key)
    assert '": "' not in for_bench(words)
