"""Keys typed ahead of a slow machine reach the screen that the key before them opened (own description of the screens).

The machine is made slow by screens that take 0.3 s to be composed, longer than any key once waited.
"""

from __future__ import annotations

import asyncio

import pytest
from textual import events
from textual.app import App
from textual.keys import _character_to_key
from textual.pilot import Pilot
from textual.screen import Screen

from stagebook.storage import Store
from stagebook.tui.screens.dialog import Form
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import settled, until
from .test_bench import SIZE, open_bench


@pytest.fixture
def slow(monkeypatch: pytest.MonkeyPatch) -> None:
    compose = Screen._compose

    async def late(self: Screen[object]) -> None:
        await asyncio.sleep(0.3)
        await compose(self)

    monkeypatch.setattr(Screen, "_compose", late)


def typed(app: App[None], *keys: str) -> None:
    """All keys at once: names of keys, or texts of several letters after a ':'."""
    for key in keys:
        for one in key[1:] if key[:1] == ":" else [key]:
            named = _character_to_key(one) if len(one) == 1 else one
            event = events.Key(named, one if len(one) == 1 else None)
            event.set_sender(app)
            app.post_message(event)


async def handled(pilot: Pilot[None], app: StagebookApp) -> None:
    await pilot.pause()
    await until(pilot, lambda: not app.keys_wait)
    await settled(pilot)


async def test_a_field_written_in_one_go(app: StagebookApp, shelf: Store, slow: None) -> None:
    async with app.run_test(size=SIZE) as pilot:
        bench = await open_bench(pilot)
        # The third of the fields: which one it is does not matter here.
        typed(app, "e", "down", "down", "enter", "ctrl+u", ":12k", "enter")
        await handled(pilot, app)
        assert pilot.app.screen is bench
        part = shelf.draft("flood").design.part("R1")
        assert "12k" in (part.value, *part.pins.values())
        assert len(shelf.revisions("flood")) == 2


async def test_two_lines_of_a_form_written_in_one_go(app: StagebookApp, shelf: Store, slow: None) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_bench(pilot)
        typed(app, "s", ":why then", "down", ":silent", "down", ":supply", "escape")
        await handled(pilot, app)
        typed(app, "s")
        await handled(pilot, app)
        form = pilot.app.screen
        assert isinstance(form, Form)
        answers = form._answers()
        assert (answers["line"], answers["symptom"], answers["hypothesis"]) == ("why then", "silent", "supply")
