"""Actions found by their name: fed from the same registry as the keys."""

from __future__ import annotations

from textual.command import CommandPalette

from stagebook.storage import Store
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import settled, until

SIZE = (80, 24)


async def test_an_action_is_found_by_its_name_and_done(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        await pilot.press("full_stop")
        assert shelf.draft("flood").edits == 1
        await pilot.press("ctrl+p", *"last edit")
        await until(pilot, lambda: isinstance(pilot.app.screen, CommandPalette))
        await pilot.app.workers.wait_for_complete()
        await pilot.press("enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, BenchScreen))
        await settled(pilot)
        assert shelf.draft("flood").edits == 0
