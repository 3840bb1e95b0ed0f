"""What the unit does with each part failed: silent failures first, as far as they are computed."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar, cast

from textual.app import ComposeResult
from textual.binding import BindingType

from ...engine.design.document import Design
from ..actions import bindings
from ..computing import Computing
from ..fault_text import counts_words, fault_heading, fault_key, fault_lines, fault_rows
from ..messages import Answered, AnswerProgress, AnswerRefused, SolverPreparing
from ..shown import Span, line
from ..widgets.lines import Lines
from ..widgets.row_list import RowList
from ..widgets.rule import Rule
from .page import Page

if TYPE_CHECKING:
    from ...engine.studies.fault_outcomes import FaultSheet


class FaultsScreen(Page[None]):
    """The single-fault study of one design, computed in the background and given up when the screen is left."""

    WHERE = "faults"
    BINDINGS: ClassVar[list[BindingType]] = bindings("faults")

    def __init__(self, name: str, design: Design, computing: Computing) -> None:
        super().__init__()
        self._whose = name
        self._design = design
        self._computing = computing
        self._sheet: FaultSheet | None = None
        self._request = 0
        self._progress = "computing"

    def compose_body(self) -> ComposeResult:
        """Title, counts, faults, the one under the hand."""
        yield Lines(id="title")
        yield Lines(id="counts")
        yield Rule()
        yield RowList(id="faults", empty="none is computed yet")
        yield Rule()
        yield Lines(id="hand")

    def on_mount(self) -> None:
        """Begins the study."""
        self._request = self._computing.faults(self._design, self.post_message)
        self.query_one(RowList).focus()
        self._show()

    def on_unmount(self) -> None:
        """Nobody looks any more."""
        self._computing.cancel_aside()

    def on_resize(self) -> None:
        """Another width: more or fewer words."""
        self.call_after_refresh(self._show)

    def _show(self) -> None:
        self._show_title()
        counts = self.query_one("#counts", Lines)
        rows = self.query_one(RowList)
        sheet = self._sheet
        if sheet is None:
            counts.show()
            return
        counts.show(line(f" {counts_words(sheet)}"))
        rows.show(fault_rows(sheet, rows.size.width), fault_heading())
        self._show_hand()

    def _show_title(self) -> None:
        title = Span(f" {self._whose}: single faults at nominal values", "strong")
        self.query_one("#title", Lines).show(line(title, f"   {self._progress}"))

    def _show_hand(self) -> None:
        key = self.query_one(RowList).key
        faults = () if self._sheet is None else self._sheet.faults
        chosen = next((fault for fault in faults if fault_key(fault) == key), None)
        self.query_one("#hand", Lines).show(*(() if chosen is None else fault_lines(chosen)))

    def on_row_list_moved(self) -> None:
        """Another fault's words."""
        self._show_hand()

    def on_answered(self, event: Answered) -> None:
        """Faults of more stages, or all."""
        if event.request == self._request:
            rows = self.query_one(RowList)
            at_top = not rows.rows or rows.key == rows.rows[0].key
            self._sheet = cast("FaultSheet", event.found)
            self._progress = "" if event.whole else self._progress
            self._show()
            if at_top:
                rows.action_first()
            if event.whole and self._sheet.notes:
                self.say("; ".join(self._sheet.notes))

    def on_answer_progress(self, event: AnswerProgress) -> None:
        """Faults done."""
        if event.request == self._request and event.done < event.total:
            self._progress = f"~ {event.done} of {event.total}"
            self._show_title()

    def on_answer_refused(self, event: AnswerRefused) -> None:
        """The circuit cannot be computed as it stands."""
        if event.request == self._request:
            self._progress = "not computed"
            self._show_title()
            self.refuse(event.reason)

    def on_solver_preparing(self, event: SolverPreparing) -> None:
        """The first start on this machine."""
        self._progress = "preparing the solver" if event.busy else "computing"
        self._show_title()

    def action_next_outcome(self) -> None:
        """To the first fault of the next outcome, after the last one to the first."""
        rows = self.query_one(RowList)
        faults = () if self._sheet is None else self._sheet.faults
        keys = [fault_key(fault) for fault in faults]
        if rows.key in keys:
            at = keys.index(rows.key)
            there = (k for k in range(at, len(faults)) if faults[k].outcome != faults[at].outcome)
            rows.move_to(next(there, 0))
