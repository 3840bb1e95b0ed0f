"""What the bench shows and how it is walked: chain, parts, margins now and before, and the words about the hand."""

from __future__ import annotations

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType
from textual.containers import Horizontal, Vertical

from ...engine.design.document import Design
from ...engine.design.part import Stage
from ...engine.results import Depth, MarginSheet
from ..actions import bindings
from ..bench_text import heading, links, part_heading, part_lines, part_rows, spread_words, worse_words
from ..computing import Computing
from ..drafting import Drafting, incomplete
from ..figures import FigureRow, Figures
from ..margin_text import check_lines, corner_line, margin_heading, margin_rows
from ..messages import SheetArrived, SolverPreparing, StudyProgress, StudyRefused
from ..refusal_text import for_bench
from ..remembered import Remembered
from ..shown import line
from ..widgets.chain import Chain
from ..widgets.lines import Lines
from ..widgets.row_list import RowList
from ..widgets.rule import Divider, Rule
from ..widgets.status import KeyLine
from ..widgets.value_entry import ValueEntry
from .page import Page

_ON_MARGINS = {"change": "origin", "edit": "required"}
NO_REQUEST = -1
BEGUN = "start"
"""What a design without a revision is compared with: its state as its worst corners were first known."""
"""What no message of a study answers."""


class BenchView(Page[None]):
    """One design's draft. State: the draft, the figures, the chosen stage, and the hand in each stage."""

    WHERE = "bench"
    BINDINGS: ClassVar[list[BindingType]] = bindings("bench")

    def __init__(self, drafting: Drafting, computing: Computing, remembered: Remembered) -> None:
        super().__init__()
        self.drafting = drafting
        self.computing = computing
        self.remembered = remembered
        self.figures = Figures()
        self._request = 0
        self._progress = ""
        self._lanes_of = "corners"
        self._stage = 0
        self._hands: dict[str, str] = {}
        self._watched: str | None = None
        self.trouble = ""
        """Why the draft cannot be computed as it stands."""

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
        with Vertical(id="foot"):
            yield Lines(id="hand")
            yield ValueEntry(id="entry")

    def on_mount(self) -> None:
        """Shows what is known and begins the study; the hand lies where it was left."""
        self._stage, ref = self.remembered.hands.get(self.drafting.name, (0, None))
        self.begin()
        self.show(ref)
        self.parts.focus()

    def begin(self) -> None:
        """Takes the draft as it stands in the store: at first, and after it went on from another revision."""
        base = self.drafting.base
        known = None if base is None or incomplete(base.sheet) else base.sheet
        begun = self.remembered.begun.get(self.drafting.name) if base is None else None
        self.figures = Figures(nominal=known, worst=known, before=known if begun is None else begun[1])
        if self.drafting.name in self.remembered.frozen:
            self.figures = self.figures.freeze()
        self.study()

    def on_unmount(self) -> None:
        """Nobody looks any more."""
        self.computing.cancel_study()

    def on_resize(self) -> None:
        """Another width: other columns."""
        self.call_after_refresh(self.show)

    # -- what is under the hand

    @property
    def design(self) -> Design:
        """The draft's design."""
        return self.drafting.design

    @property
    def stage(self) -> Stage | None:
        """The chosen stage."""
        return self.design.stages[self._stage] if self.design.stages else None

    @property
    def parts(self) -> RowList:
        """The list of parts."""
        return self.query_one("#parts", RowList)

    @property
    def margins(self) -> RowList:
        """The list of margins."""
        return self.query_one("#margins", RowList)

    @property
    def ref(self) -> str | None:
        """The part under the hand."""
        return self.parts.key

    @property
    def chosen(self) -> FigureRow | None:
        """The margin under the hand."""
        key = self.margins.key
        return next((row for row in self.figures.rows() if row.check.id == key), None)

    @property
    def reference(self) -> str:
        """What the figures are compared with: the revision the draft began from, or its state in :data:`BEGUN`."""
        base = self.drafting.draft.base_revision
        return f"r{base}" if base is not None else BEGUN if self.figures.before is not None else "-"

    @property
    def _as_reference(self) -> bool:
        """Whether the draft is what it is compared with."""
        begun = self.remembered.begun.get(self.drafting.name)
        if self.drafting.draft.base_revision is None and begun is not None:
            return begun[0].content == self.design.content
        return not self.drafting.changes()

    def _begins(self, sheet: MarginSheet) -> None:
        """Worst corners of a design without a revision: the first of them are what later ones are compared with."""
        if self.drafting.draft.base_revision is not None or sheet.depth is Depth.NOMINAL or self.figures.frozen:
            return
        self.remembered.begun.setdefault(self.drafting.name, (self.design, sheet))
        self.figures = self.figures.compared_with(self.remembered.begun[self.drafting.name][1])

    # -- showing

    def show(self, ref: str | None = None) -> None:
        """Shows everything; the hand goes to the part ``ref``, or stays."""
        self._stage = max(0, min(self._stage, len(self.design.stages) - 1))
        stage = self.stage
        everywhere = self.has_class("-all")
        self.show_heading()
        self.query_one(Chain).show_chain(links(self.design, self.figures), self._stage)
        changed = {change.what for change in self.drafting.changes()}
        self.parts.show(part_rows(stage, changed) if stage else [], part_heading(stage), ref)
        width = self.margins.size.width
        found = self.figures.rows(None if everywhere or stage is None else stage.name)
        # The hand stays on a margin that was chosen; else it lies on the first, where what got worse stands.
        names = [row.check.id for row in found]
        watched = self._watched if self._watched in names else next(iter(names), None)
        self.margins.show(
            margin_rows(found, width, everywhere), margin_heading(width, everywhere, self.reference), watched
        )
        worse = worse_words(self.figures, self.reference, self._as_reference)
        self.query_one("#worse", Rule).say(*(("cannot be computed: w says why", "fail") if self.trouble else worse))
        self._show_hand()

    def show_heading(self) -> None:
        """Shows name, base, conditions and how far the study is."""
        shown = self.query_one("#heading", Lines)
        shown.show(heading(self.drafting.draft, self.figures, self._progress, shown.size.width, self.drafting.looking))

    def _show_hand(self) -> None:
        self.remembered.hands[self.drafting.name] = (self._stage, self.ref)
        hand = self.query_one("#hand", Lines)
        width = self.size.width
        if self.margins.has_focus and self.chosen is not None:
            hand.show(*check_lines(self.chosen, width))
        elif self.ref is not None:
            roles = self.design.stage_of(self.ref).roles
            role = next((name.replace("_", " ") for name, ref in roles.items() if ref == self.ref), "")
            part, was = self.design.part(self.ref), self.drafting.was(self.ref)
            corner = () if self.chosen is None else (corner_line(self.chosen, width),)
            hand.show(*part_lines(part, role, was, *self.drafting.neighbours(self.ref)), *corner)
        else:
            hand.show(line(" a adds a part to this stage"))

    def on_row_list_moved(self, event: RowList.Moved) -> None:
        """The hand stands on another part or margin."""
        if event.rows is self.margins:
            self._watched = event.key
            names = [stage.name for stage in self.design.stages]
            if self.has_class("-all") and self.chosen is not None and self.chosen.check.stage in names:
                self.go_to(names.index(self.chosen.check.stage))
        self._show_hand()

    def on_descendant_focus(self) -> None:
        """Parts or margins: the words about the hand and what the keys do follow."""
        self._show_hand()
        self.show_keys()

    def show_keys(self) -> None:
        """What the keys do on this side."""
        self.query_one(KeyLine).of("bench", _ON_MARGINS if self.margins.has_focus else None)

    # -- studies

    def study(self) -> None:
        """The draft changed: a study begins, unless a revision holds its figures or this sitting computed them."""
        self.figures = self.figures.edited()
        if self.trouble:
            self.trouble = ""
            self.say("")
        known = self.remembered.sheet(self.design.content)
        stored = self.drafting.stored_figures()
        if stored is not None and (known is None or known.lanes < stored.lanes or known.depth is not Depth.SPREAD):
            known = stored
        if known is not None:
            self.figures = self.figures.arrived(known)
            self._begins(known)
        computed = known is not None and known is self.remembered.sheet(self.design.content)
        # Of this sitting it has as many lanes as could be had: in a large design fewer than are asked for.
        if known is not None and (known.lanes >= self.computing.lanes or (computed and known.depth is Depth.SPREAD)):
            self.computing.cancel_study()
            self._request = NO_REQUEST
        else:
            self._request = self.computing.study(self.design, self.post_message)
        self._progress = "computing" if known is None else spread_words(known, self.computing.lanes)
        self.show()
        if known is not None:
            self.sheet_known(known)

    def on_sheet_arrived(self, event: SheetArrived) -> None:
        """Figures of another depth."""
        if event.request == self._request:
            self.remembered.keep(event.sheet)
            self.figures = self.figures.arrived(event.sheet)
            self._progress = spread_words(event.sheet, self.computing.lanes)
            self._lanes_of = "corners" if event.sheet.depth is Depth.NOMINAL else "spread"
            self._begins(event.sheet)
            self.show()
            self.sheet_known(event.sheet)

    def sheet_known(self, sheet: MarginSheet) -> None:
        """For whoever waits for a depth of the draft's study."""

    def on_study_progress(self, event: StudyProgress) -> None:
        """Lanes of the corners, then of the spread."""
        if event.request == self._request and event.done < event.total:
            self._progress = f"{self._lanes_of} {event.done}/{event.total}"
            self.show_heading()

    def on_study_refused(self, event: StudyRefused) -> None:
        """The circuit cannot be computed as it stands; the figures stay, marked old."""
        if event.request == self._request:
            self._progress = "not computed"
            self.trouble = f"cannot be computed: {for_bench(event.reason)}"
            self.show()
            self.refuse(self.trouble, passing=False)
            self.no_sheet(event.reason)

    def no_sheet(self, reason: str) -> None:
        """For whoever waits for a sheet that will not come."""

    def on_solver_preparing(self, event: SolverPreparing) -> None:
        """The first start on this machine."""
        self._progress = "preparing the solver" if event.busy else "computing"
        self.show_heading()
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
            self.go_to(there)

    def go_to(self, there: int) -> None:
        """To another stage, where the hand lies on the part it left there."""
        if self.stage is not None and self.ref is not None:
            self._hands[self.stage.name] = self.ref
        self._stage = there
        stage = self.design.stages[there]
        first = stage.parts[0].ref if stage.parts else None
        self.show(self._hands.get(stage.name, first))

    def action_other_side(self) -> None:
        """Between parts and margins."""
        (self.parts if self.margins.has_focus and self.parts.display else self.margins).focus()

    def action_all_stages(self) -> None:
        """Margins of all stages over the whole width, or of the chosen stage."""
        self.toggle_class("-all")
        self.focus_list()
        self.call_after_refresh(self.show)

    def action_back(self) -> None:
        """From the margins of all stages to the chosen stage; from there to the shelf."""
        if self.has_class("-all"):
            self.action_all_stages()
        else:
            super().action_back()

    def focus_list(self) -> None:
        """Gives the keyboard to the list that can be seen."""
        (self.margins if self.has_class("-all") else self.parts).focus()
