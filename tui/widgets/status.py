"""The two lowest lines of every screen: the newest notice, and the keys."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from textwrap import wrap

from rich.cells import cell_len

from ..actions import Action, with_help
from ..shown import Line, Span, visible
from .lines import Lines

_MOST_LINES = 4


class Notice(Lines):
    """The newest notice, one line, or as many as a long one needs.

    It stays until something newer is said; one that is ``passing``, as refusals are, until the next key.
    """

    def __init__(self, id: str | None = None) -> None:
        super().__init__(id=id)
        self._said = ""
        self._mark = Span("")
        self._passing = False

    def say(self, text: str, *, passing: bool = False) -> None:
        """Something to know."""
        self._passing = passing
        self._tell(text, Span(" "))

    def refuse(self, text: str, *, passing: bool = True) -> None:
        """Something that was not done, with its reason."""
        self._passing = passing
        self._tell(text, Span(" X ", "fail"))

    def put_away(self) -> None:
        """The next key: what was to be seen until then goes."""
        if self._passing:
            self.say("")

    @property
    def text(self) -> str:
        """What is said, with its mark."""
        return f"{self._mark.text}{self._said}".strip()

    def on_resize(self) -> None:
        """Another width: other lines."""
        self._draw()

    def _tell(self, text: str, mark: Span) -> None:
        self._said, self._mark = text, mark
        self._draw()

    def _draw(self) -> None:
        width = max(10, self.screen.size.width - cell_len(self._mark.text) - 1)
        pieces = wrap(visible(self._said), width)[:_MOST_LINES] or [""]
        indent = Span(" " * cell_len(self._mark.text))
        self.styles.height = len(pieces)
        self.show(*((self._mark if at == 0 else indent, Span(piece)) for at, piece in enumerate(pieces)))


class KeyLine(Lines):
    """The keys of a screen, as many as fit, from the registry of actions."""

    def __init__(self, where: str, id: str | None = None) -> None:
        super().__init__(id=id)
        self._where = where
        self._labels: Mapping[str, str] = {}

    def of(self, where: str, labels: Mapping[str, str] | None = None) -> None:
        """Shows the keys of another place; ``labels`` say what an action does just now, by its name."""
        if (where, labels or {}) != (self._where, self._labels):
            self._where, self._labels = where, labels or {}
            self._draw()

    def on_resize(self) -> None:
        """Another width shows more or fewer keys."""
        self._draw()

    def _draw(self) -> None:
        if self.size.width:
            actions = [replace(each, label=self._labels.get(each.name, each.label)) for each in with_help(self._where)]
            self.show(key_line(actions, self.size.width))


def key_line(actions: Sequence[Action], width: int) -> Line:
    """The keys in the order of the footer; those that do not fit give way from the end, the help key never."""
    ranked = sorted((action for action in actions if action.footer), key=lambda action: action.footer)
    last = [action for action in ranked if action.where == "app"]
    used = sum(_cells(action) for action in last)
    spans: list[Span] = []
    for action in (action for action in ranked if action.where != "app"):
        if used + _cells(action) > width:
            break
        used += _cells(action)
        spans += _spans(action)
    for action in last:
        spans += _spans(action)
    return tuple(spans)


def _spans(action: Action) -> tuple[Span, Span]:
    return Span(f" {action.shown}", "strong"), Span(f" {action.label} ")


def _cells(action: Action) -> int:
    return sum(cell_len(span.text) for span in _spans(action))
