"""The history of a design: its tree of revisions with notes, worst margins and the trend of one margin."""

from __future__ import annotations

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType

from ...engine.results import MarginSheet
from ...engine.studies.comparison import Side
from ...storage.values import Revision
from ..actions import bindings
from ..computing import Computing
from ..drafting import Drafting, incomplete
from ..history_text import check_names, history_heading, history_rows, revision_lines, revision_rows, tree
from ..shown import Span, counted, line, percent
from ..widgets.lines import Lines
from ..widgets.row_list import Row, RowList
from ..widgets.rule import Rule
from .compare import CompareScreen
from .dialog import Answers, Ask, Field, Form
from .origin import OriginPage
from .page import Page

MOST_COLUMNS = 6


class HistoryScreen(Page[bool]):
    """The revisions of the design under the hand. Ends with whether the draft went on from another revision."""

    WHERE = "history"
    BINDINGS: ClassVar[list[BindingType]] = bindings("history")

    def __init__(
        self, drafting: Drafting, computing: Computing, trend: str | None, drafts_own: MarginSheet | None = None
    ) -> None:
        """``trend`` is the check whose margins are drawn; ``drafts_own`` the worst margins of an edited draft."""
        super().__init__()
        self._drafts_own = drafts_own
        self._drafting = drafting
        self._computing = computing
        self._trend = trend
        self._marked: list[int] = []
        self._revisions: dict[int, Revision] = {}
        self._checks: dict[str, str] = {}

    def compose_body(self) -> ComposeResult:
        """Title, tree, the note under the hand."""
        yield Lines(id="title")
        yield Rule()
        yield RowList(id="revisions", empty="no revisions yet: s on the bench saves the first")
        yield Rule()
        yield Lines(id="hand")

    def on_mount(self) -> None:
        """Reads the revisions."""
        self.attempt(self._read)
        if self._trend not in self._checks:
            self._trend = next(iter(self._checks), None)
        head = self._drafting.draft.base_revision
        self._show(str(head) if head is not None else None)

    def on_resize(self) -> None:
        """Another width."""
        self.call_after_refresh(self._show)

    def _read(self) -> None:
        found = self._drafting.revisions()
        self._revisions = {revision.number: revision for revision in found}
        self._checks = check_names(found)

    @property
    def chosen(self) -> Revision | None:
        """The revision under the hand."""
        key = self.query_one(RowList).key
        return None if key is None else self._revisions[int(key)]

    def _show(self, key: str | None = None) -> None:
        trend = self._checks.get(self._trend or "", "no margins yet")
        now = ""
        if self._drafts_own is not None and self._drafting.changes():
            own = next((check for check in self._drafts_own.checks if check.id == self._trend), None)
            now = "" if own is None else f", in the draft {own.outcome or percent(own.margin)}"
        title = line(Span(f" {self._drafting.name}: history", "strong"), f"   trend of {trend}{now}")
        self.query_one("#title", Lines).show(title)
        rows = self.query_one(RowList)
        head = self._drafting.draft.base_revision
        branches = tree(list(self._revisions.values()), head)
        rows.show(
            history_rows(branches, self._marked, head, self._trend, rows.size.width),
            history_heading(rows.size.width),
            key,
        )
        self._show_hand()

    def _show_hand(self) -> None:
        hand = self.query_one("#hand", Lines)
        hand.show(*(revision_lines(self.chosen) if self.chosen else (line(" nothing saved yet"),)))

    def on_row_list_moved(self) -> None:
        """Another revision's note."""
        self._show_hand()

    def action_look(self) -> None:
        """One revision in full."""
        if self.chosen is not None:
            parent = self._revisions.get(self.chosen.parent or 0)
            self.app.push_screen(RevisionPage(self._drafting.name, self.chosen, parent, self._computing))

    def action_mark(self) -> None:
        """Marks for comparing, up to six."""
        if self.chosen is None:
            return
        number = self.chosen.number
        if number in self._marked:
            self._marked.remove(number)
        elif len(self._marked) == MOST_COLUMNS:
            self.refuse(f"{MOST_COLUMNS} revisions are marked; unmark one first")
            return
        else:
            self._marked.append(number)
        self._show()

    def action_compare(self) -> None:
        """The marked revisions, the first marked as the one compared with; else the chosen one with its parent."""
        numbers = list(self._marked)
        if len(numbers) < 2 and self.chosen is not None:
            other = numbers[0] if numbers and numbers[0] != self.chosen.number else self.chosen.parent
            numbers = [number for number in (other, self.chosen.number) if number is not None]
        if len(numbers) < 2:
            self.refuse("mark two revisions with space first; the first revision has no parent")
            return
        sides = [
            Side(f"r{number}", self._revisions[number].sheet, self._revisions[number].design) for number in numbers
        ]
        self.app.push_screen(CompareScreen(self._drafting.name, sides, self._computing))

    def action_branch(self) -> None:
        """Lets the draft go on from the chosen revision, after asking."""
        chosen = self.chosen
        if chosen is None:
            return

        def answered(yes: bool | None) -> None:
            if yes and self.attempt(lambda: self._drafting.branch(chosen.number)):
                self.dismiss(True)

        edits = self._drafting.draft.edits
        stay = f"stay{'s' * (edits == 1)} below r{self._drafting.draft.base_revision}"
        kept = f"The draft's {counted(edits, 'unsaved edit')} {stay}." if edits else ""
        self.app.push_screen(Ask(f"Let the draft go on from r{chosen.number}?", kept or "Nothing is lost."), answered)

    def action_add_result(self) -> None:
        """Writes what came of the revision under its note."""
        chosen = self.chosen
        if chosen is None:
            return

        def written(answers: Answers | None) -> None:
            text = "" if answers is None else answers["result"].strip()
            if text and self.attempt(lambda: self._drafting.add_result(chosen.number, text)):
                self.attempt(self._read)
                self._show()

        fields = [Field("result", "result", "", "what the bench or the figures said")]
        self.app.push_screen(Form(f"What came of r{chosen.number}?", fields), written)

    def action_trend_left(self) -> None:
        """The trend of the margin before."""
        self._turn(-1)

    def action_trend_right(self) -> None:
        """The trend of the next margin."""
        self._turn(1)

    def _turn(self, step: int) -> None:
        names = list(self._checks)
        if names:
            at = names.index(self._trend) if self._trend in names else 0
            self._trend = names[(at + step) % len(names)]
            self._show()

    def action_back(self) -> None:
        """To the bench, where nothing moved."""
        self.dismiss(False)


class RevisionPage(Page[None]):
    """One revision: its note and its margins as they were when it was saved."""

    BINDINGS: ClassVar[list[BindingType]] = bindings("revision")
    WHERE = "revision"

    def __init__(self, design: str, revision: Revision, parent: Revision | None, computing: Computing) -> None:
        super().__init__()
        self._computing = computing
        self._before = parent
        self._design = design
        self._revision = revision

    def compose_body(self) -> ComposeResult:
        """Title and rows."""
        yield Lines(id="title")
        yield Rule()
        yield RowList(id="rows")

    def on_resize(self) -> None:
        """Shows the revision, wrapped to the width there is."""
        revision = self._revision
        parent = "first revision" if revision.parent is None else f"from r{revision.parent}"
        title = f" {self._design} r{revision.number}, {parent}, saved {revision.saved.replace('T', ' ')[:16]}"
        self.query_one("#title", Lines).show(line(Span(title, "strong")))
        rows = revision_rows(revision, self._before, self.size.width)
        self.query_one(RowList).show([Row(key, spans) for key, spans in rows])

    def action_origin(self) -> None:
        """Where the margin under the hand comes from."""
        key = self.query_one(RowList).key
        for check in self._revision.sheet.checks:
            if check.id == key:
                source = f"{self._design} r{self._revision.number}"
                known = not incomplete(self._revision.sheet)
                self.app.push_screen(OriginPage(check, known, source, self._revision.design, self._computing))
                return
        self.refuse("put the hand on a margin first")
