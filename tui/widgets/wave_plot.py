"""The picture of waves with its cursor. Moving the cursor repaints two columns."""

from __future__ import annotations

from collections.abc import Collection, Sequence

from rich.cells import cell_len
from textual import events
from textual.geometry import Region
from textual.message import Message
from textual.strip import Strip as Drawn

from ..shown import Line, Span, fit, fit_right, visible
from ..wave_picture import LABEL, Scale, Strip, axis_lines, volts
from .lines import TonedWidget


class WavePlot(TonedWidget, can_focus=True):
    """Strips above an axis. The owner says what is shown; the cursor stands on a column of the scale."""

    class Pointed(Message):
        """The mouse points at a column."""

        def __init__(self, column: int) -> None:
            super().__init__()
            self.column = column

    def __init__(self, id: str | None = None) -> None:
        super().__init__(id=id)
        self._lines: list[tuple[str, str]] = []
        self._cursor = 0

    @property
    def room(self) -> tuple[int, int]:
        """Columns of time, and rows for strips."""
        return max(10, self.size.width - LABEL), max(1, self.size.height - 2)

    def show(self, strips: Sequence[Strip], scale: Scale, cursor: int) -> None:
        """Shows these strips over the events of the scale."""
        self._cursor = cursor
        self._lines = [line for strip in strips for line in _labelled(strip, [each.net for each in strips])]
        rows = self.room[1]
        self._lines += [("", "")] * max(0, rows - len(self._lines))
        self._lines += [("", text) for text in axis_lines(scale)]
        self.refresh()

    def move_cursor(self, column: int) -> None:
        """Puts the cursor on another column."""
        old, self._cursor = self._cursor, column
        for each in {old, column}:
            self.refresh(Region(LABEL + each, 0, 1, self.size.height))

    def render_line(self, y: int) -> Drawn:
        """One line, as Textual's compositor asks for it."""
        if y >= len(self._lines):
            return self.strip(())
        label, drawn = self._lines[y]
        at = self._cursor
        line: Line = (Span(fit(label, LABEL)), Span(drawn[:at]), Span(drawn[at : at + 1] or " ", "here"))
        return self.strip((*line, Span(drawn[at + 1 :])))

    def on_click(self, event: events.Click) -> None:
        """The cursor goes where the mouse points."""
        self.post_message(self.Pointed(event.x - LABEL))


def net_cell(net: str, others: Collection[str], width: int) -> str:
    """The name of a net in ``width`` cells. A long one is cut at its front, where its stage stands (``.power``), but
    at its end where that would read as another one of them."""
    cut = _end(net, width)
    return fit(net, width) if any(_end(other, width) == cut for other in others if other != net) else fit(cut, width)


def _end(net: str, width: int) -> str:
    shown = visible(net)
    if cell_len(shown) <= width:
        return shown
    while cell_len(shown) > width - 1:
        shown = shown[1:]
    return "." + shown.removeprefix(".")


def _labelled(strip: Strip, nets: Collection[str]) -> list[tuple[str, str]]:
    """The rows of a strip behind its name and the voltages of its edges."""
    labels = [""] * len(strip.rows)
    high, low = volts(strip.high, 3), volts(strip.low, 3)
    room = LABEL - 1
    labels[0] = net_cell(strip.net, nets, max(3, room - len(high) - 1)) + " " + high
    if len(labels) > 1:
        labels[-1] = fit_right(low, room)
    return [(fit_right(label, room), row) for label, row in zip(labels, strip.rows, strict=True)]
