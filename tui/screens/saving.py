"""Saving: the note is asked for, the worst corners are waited for, and the revision is kept or stamped incomplete."""

from __future__ import annotations

from collections.abc import Callable
from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType
from textual.containers import Vertical
from textual.screen import ModalScreen

from ...engine.results import Depth, MarginSheet
from ...storage.values import Note, Revision
from ..actions import bindings
from ..drafting import Drafting, changes_words, incomplete
from ..note_keeping import NoteKeeping
from ..shown import Span, line
from ..widgets.lines import Lines
from ..widgets.rule import Rule
from ..widgets.status import KeyLine
from .dialog import Answers, Field, Form
from .page import Page

_PLACES = (
    ("line", "why", "one line is enough"),
    ("symptom", "symptom", "what was seen (may stay empty)"),
    ("hypothesis", "hypothesis", "what is thought to be behind it (may stay empty)"),
    ("change", "change", "what was changed"),
    ("prediction", "prediction", "what the change should do (may stay empty)"),
    ("next", "next", "what comes after (may stay empty)"),
)


_MOST_CHANGES = 12
_NOT_SAVED = "not saved; s asks again and still knows the note, after a restart too"
_NOT_KEPT = "not saved; s asks again and still knows the note until you leave"


class Waiting(ModalScreen[str]):
    """The note is written, the corners are not known yet: wait, save incomplete, or leave it.

    Ends with ``ready``, ``now`` or ``cancel``.
    """

    BINDINGS: ClassVar[list[BindingType]] = bindings("waiting")

    def __init__(self, no_corners: str = "") -> None:
        super().__init__()
        self._words = Lines(line(Span(" waiting for the worst corners, then it is saved", "strong")), classes="one")
        if no_corners:
            self.explain(no_corners)

    def compose(self) -> ComposeResult:
        """Two lines at the foot of the screen."""
        with Vertical(classes="dialog"):
            yield Rule()
            yield self._words
            yield KeyLine("waiting")

    def explain(self, reason: str) -> None:
        """There will be no corners, for this reason."""
        self._words.show(line(Span(" no corners: ", "fail"), reason))

    def action_now(self) -> None:
        """Without corners."""
        self.dismiss("now")

    def action_cancel(self) -> None:
        """Not at all."""
        self.dismiss("cancel")


class Saving:
    """The questions between ``s`` and a revision. What was written is kept until a revision has it.

    Args:
        page: Where the questions appear.
        drafting: The draft to save.
        newest: The deepest sheet of the draft as it stands.
        saved: Told the revision.
        written: What was written for the next revision already, by place; it outlives the bench.
        keeping: Keeps it on the disk, so that it outlives the program too.
    """

    def __init__(
        self,
        page: Page[None],
        drafting: Drafting,
        newest: Callable[[], MarginSheet | None],
        saved: Callable[[Revision], None],
        written: dict[str, str],
        keeping: NoteKeeping,
    ) -> None:
        self.written = written
        self._keeping = keeping
        self._page = page
        self._drafting = drafting
        self._newest = newest
        self._saved = saved
        self._waiting: Waiting | None = None
        self._no_corners = ""
        self._note = Note("")

    @property
    def prediction(self) -> str:
        """What was predicted of the next revision."""
        return self.written.get("prediction", "")

    def predict(self, text: str) -> None:
        """What is predicted of the next revision."""
        self.written["prediction"] = text
        self._kept()

    def ask(self) -> None:
        """Asks for the note; where the revision would be the same as the one before it, for Enter twice."""
        known = {"change": noted_words(self._drafting), **self.written}
        fields = [Field(name, label, known.get(name, ""), example) for name, label, example in _PLACES]
        base = self._drafting.base
        same = base is not None and base.content == self._drafting.design.content and not incomplete(base.sheet)
        unchanged = f"nothing has changed since r{base.number}" if base is not None and same else ""
        told: list[str] = []

        def refusal(answers: Answers) -> str | None:
            refused = _refusal(answers)
            if refused is None and unchanged and not told:
                told.append(unchanged)
                return f"{unchanged}; Enter again keeps the same once more, Esc leaves it"
            return refused

        title = "Why does this revision exist?" + (f" {unchanged.capitalize()}" if unchanged else "")
        self._page.app.push_screen(Form(title, fields, refusal, kept=self._keep), self._noted)

    def _keep(self, answers: Answers) -> None:
        """Remembers what was written, but for the changes that are filled in anew each time."""
        filled = noted_words(self._drafting)
        self.written |= {name: text.strip() for name, text in answers.items() if text.strip() or name in self.written}
        if self.written.get("change") == filled:
            del self.written["change"]
        self._kept()

    def _kept(self) -> None:
        # Where another sitting edits the design, the note on the disk is that one's.
        if not self._drafting.looking:
            self._keeping.soon(self._drafting.name, self.written)

    def _not_saved(self) -> None:
        self._keeping.now()
        trouble = self._keeping.trouble.get(self._drafting.name)
        if trouble:
            self._page.refuse(f"{_NOT_KEPT}. {trouble}")
        else:
            self._page.say(_NOT_KEPT if self._drafting.looking else _NOT_SAVED, passing=True)

    def begun(self) -> None:
        """A new study runs: corners are to be expected again."""
        self._no_corners = ""

    def arrived(self, sheet: MarginSheet) -> None:
        """A sheet of the draft has come; it may be what was waited for."""
        if self._waiting is not None and sheet.depth is not Depth.NOMINAL:
            waiting, self._waiting = self._waiting, None
            waiting.dismiss("ready")

    def refused(self, reason: str) -> None:
        """The draft cannot be studied as it stands."""
        self._no_corners = reason
        if self._waiting is not None:
            self._waiting.explain(reason)

    def _noted(self, answers: Answers | None) -> None:
        if answers is None:
            self._not_saved()
            return
        self._keep(answers)
        self._note = Note(**{name: text.strip() for name, text in answers.items()})
        sheet = self._newest()
        if sheet is not None and sheet.depth is not Depth.NOMINAL:
            self._waited("ready")
            return
        self._waiting = Waiting(self._no_corners)
        self._page.app.push_screen(self._waiting, self._waited)

    def _waited(self, how: str | None) -> None:
        self._waiting = None
        if how not in {"ready", "now"}:
            self._not_saved()
            return
        kept: list[Revision] = []
        if self._page.attempt(lambda: kept.append(self._drafting.save(self._note, self._newest()))):
            self.written.clear()
            self._kept()
            self._keeping.now()
            self._saved(kept[0])


def noted_words(drafting: Drafting) -> str:
    """What was changed, as the note is filled in; of a first revision that has all its parts from edits, not all."""
    changes = drafting.noted_changes()
    most = len(changes) if drafting.base is not None else _MOST_CHANGES
    more = f", and {len(changes) - most} more" if len(changes) > most else ""
    return changes_words(changes[:most]) + more


def _refusal(answers: Answers) -> str | None:
    if answers["line"].strip():
        return None
    return "write one line first: why does this revision exist?"
