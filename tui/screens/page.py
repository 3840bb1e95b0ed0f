"""What every full screen has: a body, the newest notice, and the line of keys."""

from __future__ import annotations

from collections.abc import Callable
from typing import ClassVar, Generic, TypeVar

from textual.app import ComposeResult
from textual.reactive import Reactive
from textual.screen import Screen
from textual.widget import Widget

from ...engine.errors import EngineError
from ...storage.errors import StorageError, TakenOver
from ..widgets.status import KeyLine, Notice

Result = TypeVar("Result")


class Page(Screen[Result], Generic[Result]):
    """A full screen. ``WHERE`` names its actions in the registry; subclasses give the body."""

    WHERE: ClassVar[str] = "page"

    focused: Reactive[Widget | None] = Reactive(None, repaint=False)
    """As in Textual, without repainting the whole screen: widgets show for themselves whether they have the focus."""

    @property
    def unmade(self) -> str:
        """What has been put together here and is kept nowhere yet, in words; "" where nothing is."""
        return ""

    def compose(self) -> ComposeResult:
        """Body above, notice and keys below."""
        yield from self.compose_body()
        yield Notice(id="notice")
        yield KeyLine(self.WHERE, id="keys")

    def compose_body(self) -> ComposeResult:
        """The widgets above the notice."""
        yield from ()

    def say(self, text: str, *, passing: bool = False) -> None:
        """Puts something to know on the notice line; ``passing``: until the next key."""
        self.query_one(Notice).say(text, passing=passing)

    def refuse(self, text: str, *, passing: bool = True) -> None:
        """Puts a refusal with its reason on the notice line, until the next key or, not ``passing``, until it is
        answered."""
        self.query_one(Notice).refuse(text, passing=passing)

    def attempt(self, deed: Callable[[], object]) -> bool:
        """Does something that the engine or the store may refuse; a refusal goes to the notice line."""
        try:
            deed()
        except TakenOver as refusal:
            self.taken_over(str(refusal))
            return False
        except (EngineError, StorageError) as refusal:
            self.refuse(str(refusal))
            return False
        return True

    def taken_over(self, reason: str) -> None:
        """Another sitting edits the design: nothing was done."""
        self.refuse(reason)

    def action_back(self) -> None:
        """To the screen before."""
        self.dismiss()
