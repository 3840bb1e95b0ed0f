"""A new design of catalogue stages in a row: chosen from left to right, with what is asked of each."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from textwrap import wrap
from typing import Any, ClassVar

from textual.app import App, ComposeResult
from textual.binding import BindingType

from ...engine.design.document import Design
from ...engine.errors import EngineError
from ...engine.stages import stage_kinds
from ...engine.stages.asked import doubts_beside, in_the_way, refuse_settings
from ...engine.stages.making import new_design
from ...engine.stages.row import Choice, usual_name
from ...storage.errors import StorageError
from ...storage.store import Store
from ..actions import bindings
from ..bench_text import with_unit
from ..shown import Span, columns, counted, fit, line
from ..stage_text import asked
from ..widgets.lines import Lines
from ..widgets.row_list import Row, RowList
from ..widgets.rule import Rule
from .dialog import Answers, Ask, Field, Form
from .page import Page
from .stage_page import StagePage
from .stage_questions import ask_kind, ask_settings, free_name

_WIDTHS = (18, 24)
_HELP_LINES = 5
_CONDITIONS = {
    "supply": ("11 V", "12 V", "14 V"),
    "ambient": ("0 C", "25 C", "45 C"),
    "source_resistance": ("0R1", "0R5", "2R"),
}
_ENDS = ("min", "nominal", "max")


class NewDesignPage(Page[str | None]):
    """The row of stages of a design to be. Left with the name of the design that was put on the shelf, or None."""

    WHERE = "row"
    BINDINGS: ClassVar[list[BindingType]] = bindings("row")

    def __init__(self, store: Store, name: str, purpose: str, conditions: dict[str, Any]) -> None:
        super().__init__()
        self._store = store
        self._called, self._purpose, self._conditions = name, purpose, conditions
        self._row: list[Choice] = []
        self._doubts: dict[str, tuple[str, ...]] = {}
        self._in_the_way: str | None = None

    def compose_body(self) -> ComposeResult:
        """Title, the row from left to right, and what the stage under the hand is."""
        yield Lines(id="title")
        yield Rule()
        yield RowList(id="stages", empty="no stage yet: a adds the first, such as a supply entry")
        yield Rule(id="what")
        yield Lines(id="hand")

    def on_mount(self) -> None:
        """Nothing is chosen yet."""
        self.query_one(RowList).focus()
        self._show()

    def on_resize(self) -> None:
        """Another width: other columns."""
        self.call_after_refresh(self._show)

    @property
    def unmade(self) -> str:
        """The row, as long as no design is made of it."""
        return "the row of stages" if self._row else ""

    @property
    def _at(self) -> int:
        """The place of the stage under the hand; -1 where there is none."""
        key = self.query_one(RowList).key
        return -1 if key is None else next(n for n, choice in enumerate(self._row) if choice.title() == key)

    def _show(self, name: str | None = None) -> None:
        supply = self._conditions.get("supply", {})
        ends = [with_unit(supply.get(end) or supply.get("nominal", ""), "V") for end in ("min", "max")]
        words = f" {self._called}: a new design, stages from left to right   {' .. '.join(filter(None, ends))}"
        title = self.query_one("#title", Lines)
        title.show(line(Span(fit(words, title.size.width or 80), "strong")))
        self._doubts = doubts_beside(self._conditions, self._row)
        self._in_the_way = in_the_way(self._conditions, self._row) if self._row else None
        heading = line(Span(columns(_WIDTHS, ("stage", "kind")) + " asked of it", "strong"))
        rows = [
            Row(
                choice.title(),
                line(
                    columns(_WIDTHS, (choice.title(), stage_kinds()[choice.kind].title)),
                    self._mark(choice.title()),
                    asked(choice),
                ),
            )
            for choice in self._row
        ]
        self.query_one("#stages", RowList).show(rows, heading, name)
        self._show_hand()
        if self._row:
            self._judge()

    def _show_hand(self) -> None:
        hand, at = self.query_one("#hand", Lines), self._at
        if at < 0:
            hand.show(line(" Each stage is sized by the supply and by what the next one takes."))
            return
        kind, width = stage_kinds()[self._row[at].kind], max(20, self.size.width - 2)
        doubted = [wrap(f"! will not hold: {words}", width) for words in self._doubts.get(self._row[at].title(), ())]
        pieces = [line(Span(f" {piece}", "thin")) for words in doubted for piece in words]
        pieces += [line(f" {piece}") for piece in wrap(kind.help, width)]
        more = line(" Enter: what is asked of it   k: how it is sized, in full")
        hand.show(*pieces[:_HELP_LINES], more)

    def _judge(self) -> None:
        """Says what the row would become, or why it cannot be made yet."""
        try:
            design = self._design()
        except EngineError as refusal:
            self.refuse(str(refusal), passing=False)
            return
        asked_for = counted(len(design.requirements), "requirement")
        words = f"{counted(len(design.parts), 'part')}, {asked_for}; s makes the design"
        if self._doubts:
            words += f"; not all will hold: see ! {', '.join(self._doubts)}"
        self.say(words)

    def _mark(self, name: str) -> Span:
        """X for the stage for which the row cannot be made, ! for one of which not all will hold."""
        if name == self._in_the_way:
            return Span(" X ", "fail")
        return Span(" ! ", "thin") if name in self._doubts else Span(" ")

    def _design(self) -> Design:
        return new_design(self._called, self._purpose, self._conditions, self._row)

    def on_row_list_moved(self) -> None:
        """The hand stands on another stage."""
        self._show_hand()

    def action_add(self) -> None:
        """A stage after the one under the hand."""
        at = self._at + 1

        def put(choice: Choice) -> None:
            self._put(at, choice, self._row[:at], self._row[at:])

        def chosen(kind: str) -> None:
            name = free_name(usual_name(kind), {each.title() for each in self._row})
            ask_settings(self.app, Choice(kind, name), put, self._tried(self._row[:at], self._row[at:]))

        ask_kind(self.app, "a stage of the catalogue: which kind?", chosen)

    def action_settings(self) -> None:
        """What is asked of the stage under the hand."""
        at = self._at
        if at < 0:
            self.action_add()
            return
        before, after = self._row[:at], self._row[at + 1 :]
        tried = self._tried(before, after)
        ask_settings(self.app, self._row[at], lambda choice: self._put(at, choice, before, after), tried)

    def _tried(self, before: Sequence[Choice], after: Sequence[Choice]) -> Callable[[Choice], None]:
        """What refuses a setting that cannot be made at this place."""

        def tried(choice: Choice) -> None:
            named = replace(choice, name=free_name(choice.title(), {each.title() for each in (*before, *after)}))
            refuse_settings(self._conditions, [*before, named, *after], len(before))

        return tried

    def _put(self, at: int, choice: Choice, before: Sequence[Choice], after: Sequence[Choice]) -> None:
        """A stage at its place; a name that another one has gets a number."""
        taken = {each.title() for each in (*before, *after)}
        self._row = [*before, replace(choice, name=free_name(choice.title(), taken)), *after]
        self._show(self._row[at].title())

    def action_remove(self) -> None:
        """The stage under the hand leaves the row."""
        at = self._at
        if at >= 0:
            del self._row[at]
            self._show()

    def action_earlier(self) -> None:
        """One place to the left."""
        self._move(-1)

    def action_later(self) -> None:
        """One place to the right."""
        self._move(1)

    def _move(self, step: int) -> None:
        at = self._at
        there = at + step
        if at >= 0 and 0 <= there < len(self._row):
            self._row[at], self._row[there] = self._row[there], self._row[at]
            self._show(self._row[there].title())

    def action_about(self) -> None:
        """How the kind under the hand is sized."""
        if self._at >= 0:
            self.app.push_screen(StagePage(None, stage_kinds()[self._row[self._at].kind]))

    def action_make(self) -> None:
        """Puts the design on the shelf."""
        if self.attempt(lambda: self._store.create(self._called, self._design())):
            self.dismiss(self._called)

    def action_back(self) -> None:
        """Back without a design; asks where stages are chosen already."""
        if not self._row:
            self.dismiss(None)
            return

        def answered(yes: bool | None) -> None:
            if yes:
                self.dismiss(None)

        self.app.push_screen(Ask("Leave without making the design?", "The chosen stages are not kept."), answered)


def ask_new_design(app: App[Any], store: Store, made: Any) -> None:
    """Name and conditions first, then the row; ``made`` is told the name of the design that came of it, or None."""
    fields = [
        Field("name", "name", "", "a name of your own"),
        Field("purpose", "purpose", "", "one sentence (may be empty)"),
    ]
    for name, usual in _CONDITIONS.items():
        words = name.replace("_resistance", " R")
        fields += [
            Field(
                f"{name}-{end}",
                words if end == "nominal" else f"{end} {words}",
                text,
                "",
                f"{name.replace('_', ' ')}: {end} of what it is judged in",
            )
            for end, text in zip(_ENDS, usual, strict=True)
        ]

    def refusal(answers: Answers) -> str | None:
        name = answers["name"].strip()
        try:
            Design.load(
                {
                    "stagebook": 1,
                    "name": name,
                    "conditions": conditions_of(answers),
                    "sequences": {"alarm": {"ends": "1 s"}},
                }
            )
            if name in {row.name for row in store.designs()}:
                return f"there is a design {name} already; write another name"
        except (EngineError, StorageError) as error:
            return str(error)
        return None

    def done(answers: Answers | None) -> None:
        if answers is not None:
            page = NewDesignPage(store, answers["name"].strip(), answers["purpose"].strip(), conditions_of(answers))
            app.push_screen(page, made)

    app.push_screen(Form("A new design of stages in a row", fields, refusal), done)


def conditions_of(answers: Answers) -> dict[str, Any]:
    """The conditions that a form tells; an end that is left empty is the nominal one, as in the document."""
    found: dict[str, Any] = {}
    for name in _CONDITIONS:
        ends = {end: text for end in _ENDS if (text := answers.get(f"{name}-{end}", "").strip())}
        if ends:
            found[name] = ends
    return found
