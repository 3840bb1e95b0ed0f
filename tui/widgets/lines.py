"""Plain lines in named tones: the one way text reaches the screen, never read as markup."""

from __future__ import annotations

from collections.abc import Sequence

from rich.cells import cell_len
from rich.segment import Segment
from rich.style import Style
from textual.geometry import Region
from textual.strip import Strip
from textual.widget import Widget

from ..shown import Line, Span, visible

TONES = {
    "dim": Style(dim=True),
    "strong": Style(bold=True),
    "fail": Style(color="red", bold=True),
    "thin": Style(color="yellow"),
    "pass": Style(color="green"),
    "unknown": Style(color="magenta"),
    "here": Style(reverse=True),
}
"""How a tone is drawn, in colours of the terminal's own sixteen. Not in the style sheet: the components of every line
on the screen would be matched with all its rules whenever a screen opens."""


class TonedWidget(Widget):
    """A widget that draws lines of spans."""

    def strip(self, spans: Line, *, reverse: bool = False) -> Strip:
        """One line of the widget's width. Control characters are written out; tones outside the set are plain."""
        base = self.rich_style + Style(reverse=True) if reverse else self.rich_style
        segments = [Segment(visible(span.text), self._style(span, base)) for span in spans if span.text]
        return Strip(segments).adjust_cell_length(self.size.width, base)

    def _style(self, span: Span, base: Style) -> Style:
        tone = TONES.get(span.tone)
        return base if tone is None else base + tone


class Lines(TonedWidget):
    """Lines to read. :meth:`show` repaints only what changed of them."""

    def __init__(self, *lines: Line, id: str | None = None, classes: str | None = None) -> None:
        super().__init__(id=id, classes=classes)
        self._lines: tuple[Line, ...] = lines

    @property
    def lines(self) -> tuple[Line, ...]:
        """What is shown."""
        return self._lines

    def show(self, *lines: Line) -> None:
        """Shows these lines from the top; the rest of the widget is empty."""
        old, self._lines = self._lines, lines
        for y in range(max(len(old), len(lines))):
            if self.is_attached and _at(old, y) != _at(lines, y):
                start, end = _changed(_at(old, y), _at(lines, y))
                if start < self.size.width:
                    self.refresh(Region(start, y, min(end, self.size.width) - start, 1))

    def render_line(self, y: int) -> Strip:
        """One line, as Textual's compositor asks for it."""
        return self.strip(_at(self._lines, y))


def _at(lines: Sequence[Line], y: int) -> Line:
    return lines[y] if y < len(lines) else ()


def _changed(old: Line, new: Line) -> tuple[int, int]:
    """The cells from the first to behind the last in which two lines differ."""
    before, after = ([(c, span.tone) for span in each for c in visible(span.text)] for each in (old, new))
    length = max(len(before), len(after))
    before += [(" ", "")] * (length - len(before))
    after += [(" ", "")] * (length - len(after))
    differ = [at for at in range(length) if before[at] != after[at]] or [0]
    first, last = differ[0], differ[-1] + 1
    start = cell_len("".join(c for c, _ in after[:first]))
    old_end, new_end = (cell_len("".join(c for c, _ in each[:last])) for each in (before, after))
    return start, new_end if old_end == new_end else cell_len("".join(c for c, _ in after)) + length
