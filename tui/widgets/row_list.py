"""A list of one-line rows with a hand on one of them: the selected row is reversed and carries a mark."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import ClassVar

from textual import events
from textual.binding import BindingType
from textual.geometry import Region
from textual.message import Message
from textual.strip import Strip

from ..actions import bindings
from ..shown import Line, Span, plain
from .lines import TonedWidget

_GAP = re.compile(r"(?<=\S) +(?=\S)")


@dataclass(frozen=True, slots=True)
class Row:
    """One row: ``key`` names it for its owner and survives reordering."""

    key: str
    spans: Line


class RowList(TonedWidget, can_focus=True):
    """Rows under an optional heading. Moving the hand repaints two rows; rows out of sight are counted."""

    BINDINGS: ClassVar[list[BindingType]] = bindings("rows")

    class Moved(Message):
        """The hand stands on another row."""

        def __init__(self, rows: RowList, key: str) -> None:
            super().__init__()
            self.rows = rows
            self.key = key

        @property
        def control(self) -> RowList:
            """The list whose hand moved."""
            return self.rows

    def __init__(self, *, empty: str = "", id: str | None = None, classes: str | None = None) -> None:
        super().__init__(id=id, classes=classes)
        self._rows: tuple[Row, ...] = ()
        self._heading: Line = ()
        self._hand = 0
        self._top = 0
        self._empty = empty

    @property
    def rows(self) -> tuple[Row, ...]:
        """The rows, all of them."""
        return self._rows

    @property
    def heading(self) -> Line:
        """The line above the rows."""
        return self._heading

    @property
    def key(self) -> str | None:
        """The key of the row under the hand; None when there are no rows."""
        return self._rows[self._hand].key if self._rows else None

    def show(self, rows: Sequence[Row], heading: Line | None = None, key: str | None = None) -> None:
        """Shows these rows. The hand goes to ``key``, else stays with its row, else at its place."""
        wanted = key if key is not None else self.key
        before = self._picture()
        self._rows = tuple(rows)
        self._heading = self._heading if heading is None else heading
        keys = [row.key for row in self._rows]
        self._hand = keys.index(wanted) if wanted in keys else max(0, min(self._hand, len(keys) - 1))
        self._keep_in_sight()
        self._repaint(before)

    def say_empty(self, words: str) -> None:
        """What stands there while there are no rows."""
        before = self._picture()
        self._empty = words
        self._repaint(before)

    def move_to(self, index: int) -> None:
        """Puts the hand on a row, as near as there is one, and says so."""
        index = max(0, min(index, len(self._rows) - 1))
        if not self._rows or index == self._hand:
            return
        before = self._picture()
        self._hand = index
        self._keep_in_sight()
        self._repaint(before)
        self.post_message(self.Moved(self, self._rows[index].key))

    def render_line(self, y: int) -> Strip:
        """One line, as Textual's compositor asks for it."""
        return self._strip(self._line(y))

    def on_focus(self, event: events.Focus) -> None:
        """The selected row turns reversed. Instead of Textual's handler, which repaints the whole widget."""
        event.prevent_default()
        self.has_focus = True
        self._refresh_hand()
        if self.parent is not None:
            self.parent.post_message(events.DescendantFocus(self))

    def on_blur(self, event: events.Blur) -> None:
        """The selected row keeps its mark only."""
        event.prevent_default()
        self.has_focus = False
        self._refresh_hand()
        if self.parent is not None:
            self.parent.post_message(events.DescendantBlur(self))

    def on_resize(self) -> None:
        """Another height: the hand stays in sight."""
        self._keep_in_sight()
        self.refresh()

    def on_click(self, event: events.Click) -> None:
        """The hand goes where the mouse points."""
        self.move_to(self._top + event.y - self._head)

    def on_mouse_scroll_down(self) -> None:
        """The wheel moves the hand."""
        self.move_to(self._hand + 1)

    def on_mouse_scroll_up(self) -> None:
        """The wheel moves the hand."""
        self.move_to(self._hand - 1)

    def action_up(self) -> None:
        """One row up."""
        self.move_to(self._hand - 1)

    def action_down(self) -> None:
        """One row down."""
        self.move_to(self._hand + 1)

    def action_page_up(self) -> None:
        """A screenful up."""
        self.move_to(self._hand - max(1, self._body - 1))

    def action_page_down(self) -> None:
        """A screenful down."""
        self.move_to(self._hand + max(1, self._body - 1))

    def action_first(self) -> None:
        """To the first row."""
        self.move_to(0)

    def action_last(self) -> None:
        """To the last row."""
        self.move_to(len(self._rows) - 1)

    @property
    def _head(self) -> int:
        return 1 if self._heading and self.size.height > 1 else 0

    @property
    def _body(self) -> int:
        return max(1, self.size.height - self._head)

    def _keep_in_sight(self) -> None:
        lowest = max(0, len(self._rows) - self._body)
        self._top = max(0, min(self._top, self._hand, lowest))
        self._top = max(self._top, self._hand - self._body + 1)

    def _line(self, y: int) -> tuple[Line, bool]:
        """The spans of one screen line and whether it is the selected row."""
        if y < self._head:
            return (Span("  "), *self._heading_with_count()), False
        index = self._top + y - self._head
        if index < len(self._rows):
            here = index == self._hand
            # Another list's hand stays in sight by a weaker mark: only one of them has the keyboard.
            mark = "  " if not here else "> " if self.has_focus else "- "
            return (Span(mark), *self._rows[index].spans), here
        return ((Span("  " + self._empty, "dim"),) if not self._rows and index == 0 else ()), False

    def _heading_with_count(self) -> Line:
        """The heading with the number of rows out of sight, where it covers no column head."""
        above, below = self._top, max(0, len(self._rows) - self._top - self._body)
        counted = [f"{n} {where}" for n, where in ((above, "above"), (below, "below")) if n]
        if not counted:
            return self._heading
        short = f"({self._top + 1}..{self._top + self._body} of {len(self._rows)})"
        heads = plain(self._heading)
        end = len(heads.rstrip())
        for note in (f"({', '.join(counted)})", short):
            start = self.size.width - 2 - len(note)
            if start > end:
                return (*_split(self._heading, end)[0], Span(" " * (start - end) + note, "dim"))
            gap = next((found for found in _GAP.finditer(heads) if len(found[0]) >= len(note) + 2), None)
            if gap is not None:
                at = gap.start() + 1
                before, after = _split(self._heading, at)
                return (*before, Span(note, "dim"), *_split(after, len(note))[1])
        return self._heading

    def _strip(self, drawn: tuple[Line, bool]) -> Strip:
        spans, here = drawn
        return self.strip(spans, reverse=here and self.has_focus)

    def _picture(self) -> list[tuple[Line, bool]]:
        return [self._line(y) for y in range(self.size.height)]

    def _repaint(self, before: list[tuple[Line, bool]]) -> None:
        for y, old in enumerate(before):
            if self._line(y) != old:
                self.refresh(Region(0, y, self.size.width, 1))

    def _refresh_hand(self) -> None:
        y = self._hand - self._top + self._head
        if self._rows and 0 <= y < self.size.height:
            self.refresh(Region(0, y, self.size.width, 1))


def _split(spans: Line, at: int) -> tuple[Line, Line]:
    """The line before and behind this character."""
    before: list[Span] = []
    after: list[Span] = []
    for span in spans:
        cut = max(0, min(at, len(span.text)))
        before += [Span(span.text[:cut], span.tone)] if cut else []
        after += [Span(span.text[cut:], span.tone)] if cut < len(span.text) else []
        at -= len(span.text)
    return tuple(before), tuple(after)
