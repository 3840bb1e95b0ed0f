"""The line in which a value for the part under the hand is written."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType
from textual.containers import Horizontal
from textual.message import Message
from textual.widgets import Input

from ..actions import bindings
from ..shown import Span, line, visible
from .lines import Lines


class TextLine(Input):
    """A line of text to write in, whose cursor does not blink."""

    def __init__(self, value: str = "", placeholder: str = "", id: str | None = None) -> None:
        super().__init__(visible(value), placeholder=visible(placeholder), id=id, compact=True)
        self.cursor_blink = False

    def replace(self, text: str, start: int, end: int) -> None:
        """Put text in: what is typed and what is pasted. A paste may hold characters that steer the terminal."""
        super().replace(visible(text), start, end)


class ValueEntry(Horizontal):
    """A label and a line to write in. The owner shows it, and is told what was written or that it was left."""

    BINDINGS: ClassVar[list[BindingType]] = bindings("entry")

    @dataclass
    class Committed(Message):
        """Enter was pressed: this was written."""

        text: str

    class Left(Message):
        """Nothing is to change."""

    _began = ""

    def compose(self) -> ComposeResult:
        """Label and line."""
        yield Lines(classes="label")
        yield TextLine()

    def begin(self, label: str, text: str, *, typed: bool) -> None:
        """Takes the keyboard. ``typed`` texts are continued; others are replaced by the first key."""
        self._began = "" if typed else visible(text)
        shown = self.query_one(Lines)
        shown.show(line(Span(f" {label} ", "strong")))
        shown.refresh()  # hidden until now, it has no cells that could be told apart
        entry = self.query_one(TextLine)
        entry.select_on_focus = not typed
        entry.value = visible(text)
        entry.cursor_position = len(entry.value)
        entry.focus()

    @property
    def is_begun(self) -> bool:
        """Whether it has the keyboard and something else is written than it began with."""
        entry = self.query_one(TextLine)
        return entry.has_focus and entry.value != self._began

    def on_input_submitted(self, event: Input.Submitted) -> None:
        """Enter."""
        event.stop()
        self.post_message(self.Committed(event.value))

    def action_commit(self) -> None:
        """Takes what is written."""
        self.post_message(self.Committed(self.query_one(TextLine).value))

    def action_cancel(self) -> None:
        """Leaves the old value."""
        self.post_message(self.Left())
