"""Lines of hyphens and bars that part a screen."""

from __future__ import annotations

from ..shown import Span, fit
from .lines import Lines


class Rule(Lines):
    """A line of hyphens across the screen, with a word in it where there is something to say."""

    def __init__(self, id: str | None = None) -> None:
        super().__init__(id=id)
        self._word = ""
        self._tone = ""

    @property
    def word(self) -> str:
        """What stands in the line."""
        return self._word

    def say(self, word: str, tone: str = "") -> None:
        """Puts a word into the line; an empty one takes it out."""
        self._word, self._tone = word, tone
        self._draw()

    def on_resize(self) -> None:
        """As long as the screen is wide."""
        self._draw()

    def _draw(self) -> None:
        width = self.size.width
        if not self._word:
            self.show((Span("-" * width, "dim"),))
            return
        word = fit(self._word, min(len(self._word), max(0, width - 4)))
        self.show((Span("- ", "dim"), Span(word, self._tone), Span(" " + "-" * width, "dim")))


class Divider(Lines):
    """A column of bars."""

    def on_resize(self) -> None:
        """As long as the screen is high."""
        self.show(*(((Span("|", "dim"),),) * self.size.height))
