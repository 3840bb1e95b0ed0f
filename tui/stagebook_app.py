"""The application: wires the store, the solver and the screens together."""

from __future__ import annotations

import asyncio
import signal
import sys
from contextlib import suppress
from typing import ClassVar

from textual import events
from textual.app import App
from textual.binding import BindingType
from textual.message_pump import MessagePump
from textual.screen import Screen
from textual.widget import Widget
from textual.widgets import Input

from ..storage.store import Store
from .actions import bindings
from .computing import Computing
from .hanging_up import watch
from .key_order import KeyOrder
from .palette import ActionFinder
from .screens.dialog import Ask, Form
from .screens.help import HelpScreen
from .screens.page import Page
from .screens.shelf import ShelfScreen
from .solver import Solver
from .widgets.status import Notice
from .widgets.value_entry import ValueEntry

_LEAVING = ("ctrl+q", "q")


class StagebookApp(App[None]):
    """The screens over one open store.

    Args:
        store: Used on the event loop only; whoever opened it closes it.
        solver: The studies, run in background threads.
    """

    TITLE = "Stagebook"
    CSS_PATH = "stagebook.tcss"
    BINDINGS: ClassVar[list[BindingType]] = bindings("app")
    COMMANDS: ClassVar = {ActionFinder}

    def __init__(self, store: Store, solver: Solver) -> None:
        # The terminal's own colours: 16 of them at most, none of them under NO_COLOR, light or dark as it is.
        super().__init__(ansi_color=True)
        self.theme = "ansi-dark"
        self.animation_level = "none"
        self.HORIZONTAL_BREAKPOINTS = [(0, "-narrow"), (60, "-wide"), (100, "-broad")]
        self.VERTICAL_BREAKPOINTS = [(0, "-tiny"), (10, "-short"), (18, "-high"), (36, "-tall")]
        self.computing = Computing(solver)
        self._store = store
        self._leaving = False
        self._keys = KeyOrder(self._key, self._pumps, self._stands)

    async def on_event(self, event: events.Event) -> None:
        """Keys go one at a time; everything else as in Textual."""
        if isinstance(event, events.Key) and not event.is_forwarded:
            await self._keys.take(event)
        else:
            await super().on_event(event)

    @property
    def keys_wait(self) -> bool:
        """Whether a key was typed whose consequences are not all there yet."""
        return self._keys.busy

    async def _key(self, event: events.Key) -> None:
        self._leaving = self._leaving and event.key in _LEAVING
        # In the middle of a text the reason why it was refused stays, to be corrected by.
        if not isinstance(self.focused, Input):
            for notice in self.screen.query(Notice):
                notice.put_away()
        await super().on_event(event)

    def _pumps(self) -> list[MessagePump]:
        # Also the screens behind: an answered question is handed to whoever asked it.
        return [self, *(each for screen in self.screen_stack for each in screen.walk_children(with_self=True))]

    def _stands(self) -> bool:
        """Whether the screen in front is composed and the keyboard is where it shall be."""
        if not self.is_running or not self.screen_stack:
            return True
        screen = self.screen
        there = screen.is_mounted and all(each.is_mounted for each in screen.walk_children(Widget))
        return there and (screen.focused is not None or not self.app_focus or not screen.focus_chain)

    def get_default_screen(self) -> Screen[None]:
        """The shelf."""
        return ShelfScreen(self._store, self.computing)

    def on_load(self) -> None:
        """Before the terminal is taken: a polite kill or a dropped line leaves by the front door and restores it."""
        loop = asyncio.get_running_loop()
        for name in ("SIGTERM", "SIGHUP", "SIGINT"):
            number = getattr(signal, name, None)
            if number is not None:
                # Not every event loop takes signals (Windows; a loop outside of the main thread).
                with suppress(NotImplementedError, RuntimeError, ValueError):
                    loop.add_signal_handler(number, self.exit)

    def on_mount(self) -> None:
        """Without the signal too, a terminal that goes away is the end."""
        loop = asyncio.get_running_loop()
        if not self.is_headless and sys.stdin is not None:
            watch(sys.stdin.fileno(), lambda: loop.call_soon_threadsafe(self.exit))

    def on_unmount(self) -> None:
        """Stops what is being computed, without waiting for it."""
        self.computing.close()

    def on_descendant_focus(self, event: events.DescendantFocus) -> None:
        """No cursor blinks: an idle screen sends nothing."""
        if isinstance(event.widget, Input):
            event.widget.cursor_blink = False

    async def action_quit(self) -> None:
        """Leaves; asks once where that would lose what is being written, which is kept nowhere yet."""
        lost = "" if self._leaving else self._written()
        if not lost:
            self.exit()
            return
        self._leaving = True
        words = f"{lost} is kept nowhere yet and goes with leaving"
        notices = list(self.screen.query(Notice))
        if notices:
            notices[0].refuse(f"{words}; the same key again leaves")
        else:
            self.push_screen(Ask("Leave?", f"{words}."), lambda yes: self.exit() if yes else None)

    def _written(self) -> str:
        """What is written and would be lost; '' where nothing is."""
        if any(isinstance(each, Form) and each.is_written and not each.is_kept for each in self.screen_stack):
            return "what is written here"
        if isinstance(self.screen, Page) and any(entry.is_begun for entry in self.screen.query(ValueEntry)):
            return "the value that is begun"
        unmade = [each.unmade for each in self.screen_stack if isinstance(each, Page) and each.unmade]
        if unmade:
            return unmade[0]
        notes = [name for each in self.screen_stack if isinstance(each, ShelfScreen) for name in each.unsaved_notes]
        return f"the note written for the next revision of {', '.join(notes)}" if notes else ""

    def action_help(self) -> None:
        """The keys of the screen in front."""
        if isinstance(self.screen, Page):
            self.push_screen(HelpScreen(self.screen.WHERE))

    def action_help_quit(self) -> None:
        """Ctrl+C does not leave: it is pressed by habit."""
        if isinstance(self.screen, Page):
            self.screen.say("Ctrl+Q leaves; every edit is kept already")
