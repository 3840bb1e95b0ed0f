"""The bench: the chain of stages, the parts of one, its margins now and before, and the part under the hand."""

from __future__ import annotations

from collections.abc import Callable
from typing import ClassVar

from textual import events
from textual.app import ComposeResult
from textual.binding import BindingType
from textual.containers import Horizontal

from ...engine.design.document import Design
from ...engine.design.part import Stage
from ...engine.errors import EngineError
from ...engine.results import Depth
from ...storage.errors import StorageError, TakenOver
from ...storage.values import Revision
from ..actions import bindings
from ..bench_text import (
    check_lines,
    heading,
    links,
    margin_heading,
    margin_rows,
    part_heading,
    part_lines,
    part_rows,
    worse_words,
)
from ..computing import Computing
from ..drafting import Drafting, incomplete
from ..figures import FigureRow, Figures
from ..messages import SheetArrived, SolverPreparing, StudyProgress, StudyRefused
from ..shown import line
from ..side_by_side import Column
from ..widgets.chain import Chain
from ..widgets.lines import Lines
from ..widgets.row_list import RowList
from ..widgets.rule import Divider, Rule
from ..widgets.status import KeyLine
from ..widgets.value_entry import ValueEntry
from .compare import CompareScreen
from .dialog import Answers, Ask, Field, Form
from .history import HistoryScreen
from .origin import OriginPage
from .page import Page
from .part_questions import ask_field, ask_new_part
from .saving import Saving


class BenchScreen(Page[None]):
    """One design's draft. State: the draft, the figures, the chosen stage, and the hand in each stage."""

    WHERE = "bench"
    BINDINGS: ClassVar[list[BindingType]] = bindings("bench")

    def __init__(self, drafting: Drafting, computing: Computing) -> None:
        super().__init__()
        self.drafting = drafting
        self.figures = Figures()
        self._computing = computing
        self._request = 0
        self._progress = ""
        self._stage = 0
        self._hands: dict[str, str] = {}
        self._saving = Saving(self, drafting, lambda: self.figures.newest, self._saved)

    # -- what is seen

    def compose_body(self) -> ComposeResult:
        """Heading, chain, parts beside margins, the hand."""
        yield Lines(id="heading")
        yield Chain(id="chain")
        yield Rule()
        with Horizontal(id="bench-body"):
            yield RowList(id="parts", empty="no parts yet: a adds one")
            yield Divider(id="divider")
            yield RowList(id="margins", empty="no margins here yet")
        yield Rule(id="worse")
        yield Lines(id="hand")
        yield ValueEntry(id="entry")

    def on_mount(self) -> None:
        """Shows what is known and begins the study."""
        self.begin()
        self.query_one("#parts").focus()

    def begin(self) -> None:
        """Takes the draft as it stands in the store: at first, and after it went on from another revision."""
        base = self.drafting.base
        known = None if base is None or incomplete(base.sheet) else base.sheet
        self.figures = Figures(nominal=known, worst=known, before=known)
        self._study()

    def on_unmount(self) -> None:
        """Nobody looks any more."""
        self._computing.cancel_study()

    def on_resize(self) -> None:
        """Another width: other columns."""
        self.call_after_refresh(self._show)

    @property
    def design(self) -> Design:
        """The draft's design."""
        return self.drafting.design

    @property
    def stage(self) -> Stage | None:
        """The chosen stage."""
        return self.design.stages[self._stage] if self.design.stages else None

    @property
    def ref(self) -> str | None:
        """The part under the hand."""
        return self.query_one("#parts", RowList).key

    @property
    def chosen(self) -> FigureRow | None:
        """The margin under the hand."""
        key = self.query_one("#margins", RowList).key
        return next((row for row in self.figures.rows() if row.check.id == key), None)

    def _show(self, ref: str | None = None) -> None:
        """Shows everything; the hand goes to the part ``ref``, or stays."""
        stage = self.stage
        everywhere = self.has_class("-all")
        self._show_heading()
        self.query_one(Chain).show_chain(links(self.design, self.figures), self._stage)
        changed = {change.what for change in self.drafting.changes()}
        parts = self.query_one("#parts", RowList)
        rows = part_rows(stage, changed) if stage else []
        parts.show(rows, part_heading(stage), ref)
        margins = self.query_one("#margins", RowList)
        width = margins.size.width
        found = self.figures.rows(None if everywhere or stage is None else stage.name)
        base = self.drafting.draft.base_revision
        margins.show(margin_rows(found, width, everywhere), margin_heading(width, everywhere, base))
        worse, tone = worse_words(self.figures, base)
        self.query_one("#worse", Rule).say(worse, tone)
        self._show_hand()

    def _show_heading(self) -> None:
        shown = self.query_one("#heading", Lines)
        shown.show(heading(self.drafting.draft, self.figures, self._progress, shown.size.width))

    def _show_hand(self) -> None:
        hand = self.query_one("#hand", Lines)
        if self.query_one("#margins").has_focus and self.chosen is not None:
            hand.show(*check_lines(self.chosen))
        elif self.ref is not None:
            role = next((name for name, ref in self.design.stage_of(self.ref).roles.items() if ref == self.ref), "")
            part, was = self.design.part(self.ref), self.drafting.was(self.ref)
            hand.show(*part_lines(part, role.replace("_", " "), was, *self.drafting.neighbours(self.ref)))
        else:
            hand.show(line(" a adds a part to this stage"))

    def on_row_list_moved(self, event: RowList.Moved) -> None:
        """The hand stands on another part or margin."""
        if event.rows.id == "margins" and self.has_class("-all") and self.chosen is not None:
            names = [stage.name for stage in self.design.stages]
            if self.chosen.check.stage in names:
                self._go_to(names.index(self.chosen.check.stage))
        self._show_hand()

    def on_descendant_focus(self) -> None:
        """Parts or margins: the words about the hand follow."""
        self._show_hand()

    # -- studies

    def _study(self) -> None:
        self.figures = self.figures.edited()
        self._progress = "computing"
        self._saving.begun()
        self._request = self._computing.study(self.design, self.post_message)
        self._show()

    def on_sheet_arrived(self, event: SheetArrived) -> None:
        """Figures of another depth."""
        if event.request != self._request:
            return
        self.figures = self.figures.arrived(event.sheet)
        done = event.sheet.depth is Depth.SPREAD or (event.sheet.depth is Depth.CORNERS and not event.sheet.lanes)
        self._progress = spread_words(event.sheet.lanes) if done else f"computing: {event.sheet.depth} known"
        self._show()
        self._saving.arrived(event.sheet)

    def on_study_progress(self, event: StudyProgress) -> None:
        """Lanes of the spread."""
        if event.request == self._request:
            self._progress = f"spread {event.done}/{event.total}"
            self._show_heading()

    def on_study_refused(self, event: StudyRefused) -> None:
        """The circuit cannot be computed as it stands; the figures stay, marked old."""
        if event.request == self._request:
            self._progress = "not computed"
            self._show_heading()
            self.refuse(event.reason)
            self._saving.refused(event.reason)

    def on_solver_preparing(self, event: SolverPreparing) -> None:
        """The first start on this machine."""
        self._progress = "preparing the solver" if event.busy else "computing"
        self._show_heading()
        if event.trouble:
            self.say(event.trouble)

    # -- walking

    def action_previous_stage(self) -> None:
        """One stage to the left."""
        self._walk(-1)

    def action_next_stage(self) -> None:
        """One stage to the right."""
        self._walk(1)

    def _walk(self, step: int) -> None:
        there = max(0, min(self._stage + step, len(self.design.stages) - 1))
        if there != self._stage:
            self._go_to(there)

    def _go_to(self, there: int) -> None:
        """To another stage, where the hand lies on the part it left there."""
        if self.stage is not None and self.ref is not None:
            self._hands[self.stage.name] = self.ref
        self._stage = there
        stage = self.design.stages[there]
        first = stage.parts[0].ref if stage.parts else None
        self._show(self._hands.get(stage.name, first))

    def action_other_side(self) -> None:
        """Between parts and margins."""
        parts, margins = self.query_one("#parts"), self.query_one("#margins")
        (parts if margins.has_focus and parts.display else margins).focus()

    def action_all_stages(self) -> None:
        """Margins of all stages over the whole width, or of the chosen stage."""
        self.toggle_class("-all")
        (self.query_one("#margins") if self.has_class("-all") else self.query_one("#parts")).focus()
        self.call_after_refresh(self._show)

    # -- editing

    def _edit(self, deed: Callable[[], object]) -> bool:
        """An edit of the draft: kept, then studied."""
        before = self.design
        try:
            deed()
        except TakenOver as refusal:
            self._ask_to_take_over(str(refusal))
            return False
        except (EngineError, StorageError) as refusal:
            self.refuse(str(refusal))
            return False
        self._stage = max(0, min(self._stage, len(self.design.stages) - 1))
        if self.design != before:
            self._study()
        return True

    def _ask_to_take_over(self, reason: str) -> None:
        def answered(yes: bool | None) -> None:
            if yes and self.attempt(self.drafting.take_over):
                self.begin()
                self.say("taken over; this is the state the other sitting left")

        self.refuse(reason)
        self.app.push_screen(Ask("Go on here, from the state of the other sitting?", reason), answered)

    def on_key(self, event: events.Key) -> None:
        """A digit begins the entry of a value for the part under the hand."""
        if isinstance(self.focused, RowList) and event.character and event.character in "0123456789":
            event.stop()
            self._begin_entry(event.character, typed=True)

    def action_change(self) -> None:
        """Another value for the part; on the margins, where the margin comes from."""
        if self.query_one("#margins").has_focus:
            self.action_origin()
        elif self.ref is not None:
            self._begin_entry(self.design.part(self.ref).value or "", typed=False)

    def _begin_entry(self, text: str, *, typed: bool) -> None:
        if self.ref is None:
            self.refuse("there is no part under the hand; a adds one")
            return
        self.add_class("-entering")
        self.query_one(ValueEntry).begin(f"{self.ref}, value:", text, typed=typed)
        self.query_one(KeyLine).of("entry")

    def on_value_entry_committed(self, event: ValueEntry.Committed) -> None:
        """Puts the value in; a refused one stays to be corrected."""
        ref = self.ref
        if ref is not None and self._edit(lambda: self.drafting.set_value(ref, event.text.strip())):
            self.say(f"{ref} {self.design.part(ref).value or ''}")
            self._end_entry()

    def on_value_entry_left(self) -> None:
        """The old value stays."""
        self._end_entry()

    def _end_entry(self) -> None:
        self.remove_class("-entering")
        (self.query_one("#margins") if self.has_class("-all") else self.query_one("#parts")).focus()
        self.query_one(KeyLine).of("bench")

    def action_step_down(self) -> None:
        """Next lower preferred value."""
        self._step(-1)

    def action_step_up(self) -> None:
        """Next higher preferred value."""
        self._step(1)

    def _step(self, direction: int) -> None:
        ref = self.ref
        if ref is not None and self._edit(lambda: self.drafting.step(ref, direction)):
            self.say(f"{ref} {self.design.part(ref).value or ''}")

    def action_undo(self) -> None:
        """Takes the last edit back."""
        self._edit(lambda: self.say(f"taken back: {self.drafting.undo()}"))

    def action_redo(self) -> None:
        """Does it again."""
        self._edit(lambda: self.say(f"done again: {self.drafting.redo()}"))

    def action_edit(self) -> None:
        """Another field of the part."""
        if self.ref is None:
            return
        ref = self.ref
        ask_field(
            self.app,
            self.design.part(ref),
            lambda field, text: self._edit(lambda: self.drafting.set_field(ref, field, text)),
        )

    def action_add_part(self) -> None:
        """Another part in the chosen stage."""
        if self.stage is None:
            self.refuse("the design has no stage yet; import a design document with one")
            return
        ask_new_part(self.app, self.design, self.stage, self._put)

    def _put(self, ref: str, after: Design) -> None:
        if self._edit(lambda: self.drafting.put(f"with {ref}", after)):
            self._show(ref)

    def action_remove_part(self) -> None:
        """Takes the part out, after asking."""
        ref = self.ref
        if ref is None:
            return

        def answered(yes: bool | None) -> None:
            if yes and self._edit(lambda: self.drafting.remove(ref)):
                self.say(f"{ref} is out; u brings it back")

        self.app.push_screen(Ask(f"Take {ref} out of the design?", "u brings it back."), answered)

    # -- freezing

    def action_freeze(self) -> None:
        """Holds figures back; the second time asks for the prediction and shows them."""
        if not self.figures.frozen:
            self.figures = self.figures.freeze()
            self.say("figures are held back; f asks for a prediction and shows them")
            self._show()
            return

        def predicted(answers: Answers | None) -> None:
            if answers is None:
                return
            self._saving.prediction = answers["prediction"].strip()
            self.figures = self.figures.thaw()
            self.say("the note of the next revision begins with it" if self._saving.prediction else "shown again")
            self._show()

        field = Field(
            "prediction", "prediction", self._saving.prediction, "duration stays above 60 s; empty is allowed"
        )
        self.app.push_screen(Form("What will the figures say?", [field]), predicted)

    # -- saving and looking elsewhere

    def action_save(self) -> None:
        """Asks for the note, then keeps the revision as soon as its corners are known."""
        self._saving.ask()

    def _saved(self, revision: Revision) -> None:
        if self.figures.frozen:
            self.figures = self.figures.thaw()
        self.figures = self.figures.compared_with(None if incomplete(revision.sheet) else revision.sheet)
        stamp = ", incomplete: its worst corners were not known" if incomplete(revision.sheet) else ""
        self.say(f"saved as r{revision.number}{stamp}")
        self._show()

    def action_origin(self) -> None:
        """Where the chosen margin comes from."""
        if self.chosen is None:
            self.refuse("there is no margin under the hand yet")
        else:
            self.app.push_screen(OriginPage(self.chosen.check, self.chosen.worst_known, self.drafting.name))

    def action_compare(self) -> None:
        """The draft beside the revision it began from."""
        base, sheet = self.drafting.base, self.figures.newest
        if base is None:
            self.refuse("nothing to compare with yet; s saves the first revision")
        elif sheet is None or sheet.depth is Depth.NOMINAL:
            self.refuse("the draft's corners are still being computed; c again when they are known")
        else:
            columns = [
                Column(f"r{base.number}", base.sheet, base.design),
                Column("draft", sheet, self.design),
            ]
            self.app.push_screen(CompareScreen(self.drafting.name, columns, self._computing))

    def action_history(self) -> None:
        """The revisions of this design."""
        chosen = self.chosen.check.id if self.chosen else None
        screen = HistoryScreen(self.drafting, self._computing, chosen)
        self.app.push_screen(screen, self._back_from_history)

    def _back_from_history(self, moved: bool | None) -> None:
        if moved:
            self.begin()
            self.say(f"the draft goes on from r{self.drafting.draft.base_revision}")


def spread_words(lanes: int) -> str:
    """What stands in the heading when everything is computed."""
    return f"spread of {lanes} lanes" if lanes else "corners, no spread"
