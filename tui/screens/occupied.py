"""What is asked when another sitting has the design open."""

from __future__ import annotations

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType
from textual.containers import Vertical
from textual.screen import ModalScreen

from ...storage.errors import DesignOpen
from ..actions import bindings
from ..shown import Span, line
from ..widgets.lines import Lines
from ..widgets.rule import Rule
from ..widgets.status import KeyLine, Notice


class Occupied(ModalScreen[str]):
    """Who has the design open since when: look, take over, or leave it. Ends with ``look``, ``take`` or ``cancel``."""

    BINDINGS: ClassVar[list[BindingType]] = bindings("occupied")

    def __init__(self, refusal: DesignOpen) -> None:
        super().__init__()
        self._refusal = refusal

    def compose(self) -> ComposeResult:
        """Who and what then, at the foot of the screen."""
        with Vertical(classes="dialog"):
            yield Rule()
            yield Notice()
            choice = Lines(
                line(Span(" Look at it, or take it over?", "strong")),
                line(" What was edited there is kept; its next edit is refused, and told why."),
            )
            choice.styles.height = 2
            yield choice
            yield KeyLine("occupied")

    def on_mount(self) -> None:
        """Says who."""
        self.query_one(Notice).say(str(self._refusal))

    def action_look(self) -> None:
        """Without editing."""
        self.dismiss("look")

    def action_take_over(self) -> None:
        """The other sitting is told at its next edit."""
        self.dismiss("take")

    def action_cancel(self) -> None:
        """Back to the shelf."""
        self.dismiss("cancel")
