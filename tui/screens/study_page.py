"""A screen that a study fills while it runs: its frame, whatever the study. Leaving it gives the study up."""

from __future__ import annotations

from abc import abstractmethod
from collections.abc import Sequence
from typing import Generic, TypeVar, cast

from textual.app import ComposeResult

from ...engine.design.document import Design
from ..computing import Computing
from ..messages import Answered, AnswerProgress, AnswerRefused, SolverPreparing
from ..shown import Line, Span, line
from ..widgets.lines import Lines
from ..widgets.row_list import Row, RowList
from ..widgets.rule import Rule
from .page import Page

Sheet = TypeVar("Sheet")

PREPARING = "preparing the solver, once on this machine (30 s or so)"
COMPUTING = "being computed"
BY_ITSELF = "this fills by itself"


class StudyPage(Page[None], Generic[Sheet]):
    """A title with the progress, a line about the whole, rows, and the words about the one under the hand."""

    TITLE_WORDS: str

    def __init__(self, name: str, design: Design, computing: Computing) -> None:
        super().__init__()
        self._whose = name
        self._design = design
        self._computing = computing
        self._sheet: Sheet | None = None
        self._request = 0
        self._progress = COMPUTING

    @abstractmethod
    def begin(self) -> int:
        """Begins the study; returns the number that its messages will carry."""

    @abstractmethod
    def whole(self, sheet: Sheet) -> str:
        """One line about all rows together."""

    @abstractmethod
    def heading(self, width: int) -> Line:
        """The column heads."""

    @abstractmethod
    def rows(self, sheet: Sheet, width: int) -> Sequence[Row]:
        """A row for everything that is known."""

    @abstractmethod
    def words(self, sheet: Sheet, key: str) -> Sequence[Line]:
        """Two lines about the row of this key."""

    def last_words(self, sheet: Sheet) -> str:
        """What is said once all is known; nothing where there is nothing to say."""
        return ""

    def compose_body(self) -> ComposeResult:
        """Title, the whole, the rows, the one under the hand."""
        yield Lines(id="title")
        yield Lines(id="whole")
        yield Rule()
        yield RowList(id="found")
        yield Rule()
        yield Lines(id="hand")

    @property
    def found(self) -> RowList:
        """The rows."""
        return self.query_one(RowList)

    def on_mount(self) -> None:
        """Begins the study."""
        self._request = self.begin()
        self.found.focus()
        self._show()

    def on_unmount(self) -> None:
        """Nobody looks any more."""
        self._computing.cancel_aside()

    def on_resize(self) -> None:
        """Another width: more or fewer words."""
        self.call_after_refresh(self._show)

    def _show(self) -> None:
        self._show_title()
        if self._sheet is not None:
            self.query_one("#whole", Lines).show(line(f" {self.whole(self._sheet)}"))
            width = self.found.size.width
            self.found.show(list(self.rows(self._sheet, width)), self.heading(width))
            self._show_hand()

    def _show_title(self) -> None:
        title = Span(f" {self._whose}: {self.TITLE_WORDS}", "strong")
        self.query_one("#title", Lines).show(line(title, f"   {self._progress}"))

    def _say(self, progress: str, nothing_yet: str) -> None:
        """How far it is, in the title, and what to expect where there would be rows."""
        self._progress = progress
        self._show_title()
        self.found.say_empty(nothing_yet)

    def _show_hand(self) -> None:
        key = self.found.key
        known = self._sheet is not None and key is not None
        self.query_one("#hand", Lines).show(
            *(self.words(cast("Sheet", self._sheet), cast("str", key)) if known else ())
        )

    def on_row_list_moved(self) -> None:
        """The words about another row."""
        self._show_hand()

    def on_answered(self, event: Answered) -> None:
        """More is known, or all."""
        if event.request == self._request:
            rows = self.found
            at_top = not rows.rows or rows.key == rows.rows[0].key
            self._sheet = sheet = cast("Sheet", event.found)
            if event.whole:
                self._say("", "there is nothing to list")
            self._show()
            if at_top:
                rows.action_first()
                self._show_hand()
            if event.whole and self.last_words(sheet):
                self.say(self.last_words(sheet))

    def on_answer_progress(self, event: AnswerProgress) -> None:
        """How much is done."""
        if event.request == self._request and event.done < event.total:
            self._say(f"~ {event.done} of {event.total}", f"{COMPUTING}; {BY_ITSELF}")

    def on_answer_refused(self, event: AnswerRefused) -> None:
        """The circuit cannot be computed as it stands."""
        if event.request == self._request:
            self._say("not computed", "nothing is known; the reason stands below")
            self.refuse(event.reason, passing=False)

    def on_solver_preparing(self, event: SolverPreparing) -> None:
        """The first start on this machine."""
        words = PREPARING if event.busy else COMPUTING
        self._say("preparing the solver" if event.busy else COMPUTING, f"{words}; {BY_ITSELF}")
