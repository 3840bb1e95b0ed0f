"""The keys of a screen and what its marks mean."""

from __future__ import annotations

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType
from textual.containers import Vertical
from textual.screen import ModalScreen

from ..actions import bindings, of
from ..shown import Span, line, plain
from ..widgets.lines import Lines
from ..widgets.row_list import Row, RowList
from ..widgets.rule import Rule
from ..widgets.status import KeyLine
from .dialog import in_full_lines

_MARKS = (
    ("X", "fail: worst corner below zero, or what should happen does not"),
    ("!", "thin: above zero, below the margin that is required"),
    ("=", "pass: the required margin holds in the worst corner"),
    ("?", "unknown: a datum is missing; never counted as a pass"),
    ("~", "old: of the design before the edits, or corners are still to come"),
    ("<", "the margin got worse than in the revision the draft began from"),
    ("*", "the part differs from the revision the draft began from"),
    (">", "the row under the hand"),
)
_SIGNS = (
    "A margin is 1 - demand/capability in percent: 0 is the limit, + is unused, - is overrun.",
    "Worst is the least over all corners; nominal is one case and never stands for the worst.",
)


class HelpScreen(ModalScreen[None]):
    """All actions of one place, from the registry."""

    BINDINGS: ClassVar[list[BindingType]] = bindings("help")

    def __init__(self, where: str) -> None:
        super().__init__()
        self._where = where

    def compose(self) -> ComposeResult:
        """Rows over the whole screen."""
        with Vertical(classes="dialog full"):
            yield Rule()
            yield RowList(id="help")
            yield Lines(id="in-full")
            yield KeyLine("help")

    def on_mount(self) -> None:
        """Lists keys and marks."""
        rows = [
            Row(action.id, line(Span(f"{action.shown:<11}", "strong"), Span(f"{action.label:<16}"), action.help))
            for action in (*of(self._where), *of("rows"), *of("app"))
        ]
        rows.append(Row("gap", ()))
        rows += [Row(f"mark {mark}", line(Span(f"{mark:<11}", "strong"), words)) for mark, words in _MARKS]
        rows += [Row(f"sign {at}", line(words)) for at, words in enumerate(_SIGNS)]
        shown = self.query_one(RowList)
        shown.show(rows, heading=line(Span(f"keys: {self._where}", "strong")))
        shown.focus()
        self._in_full()

    def on_resize(self) -> None:
        """Another width: other rows are cut."""
        self._in_full()

    def on_row_list_moved(self) -> None:
        """Another row."""
        self._in_full()

    def _in_full(self) -> None:
        """What is cut of the row under the hand."""
        rows = self.query_one(RowList)
        text = next((plain(row.spans) for row in rows.rows if row.key == rows.key), "")
        self.query_one("#in-full", Lines).show(*in_full_lines(text, self.size.width - 2, 2))

    def action_back(self) -> None:
        """Back to the screen below."""
        self.dismiss(None)
