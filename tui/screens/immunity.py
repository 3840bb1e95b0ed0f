"""How little charge trips an alarm, net by net, the weakest first, as far as it is computed."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar, cast

from textual.app import ComposeResult
from textual.binding import BindingType

from ...engine.design.document import Design
from ..actions import bindings
from ..computing import Computing
from ..immunity_text import immunity_heading, immunity_lines, immunity_rows, slew_words
from ..messages import Answered, AnswerProgress, AnswerRefused, SolverPreparing
from ..shown import Span, line
from ..widgets.lines import Lines
from ..widgets.row_list import RowList
from ..widgets.rule import Rule
from .page import Page

if TYPE_CHECKING:
    from ...engine.studies.immunity import ImmunitySheet


class ImmunityScreen(Page[None]):
    """The immunity of one design, computed in the background and given up when the screen is left."""

    WHERE = "immunity"
    BINDINGS: ClassVar[list[BindingType]] = bindings("immunity")

    def __init__(self, name: str, design: Design, computing: Computing) -> None:
        super().__init__()
        self._name = name
        self._design = design
        self._computing = computing
        self._sheet: ImmunitySheet | None = None
        self._request = 0
        self._progress = "computing"

    def compose_body(self) -> ComposeResult:
        """Title, slew of the supply, nets, the one under the hand."""
        yield Lines(id="title")
        yield Lines(id="slew")
        yield Rule()
        yield RowList(id="nets", empty="none is computed yet")
        yield Rule()
        yield Lines(id="hand")

    def on_mount(self) -> None:
        """Begins the study."""
        self._request = self._computing.immunity(self._design, self.post_message)
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
        slew = self.query_one("#slew", Lines)
        rows = self.query_one(RowList)
        sheet = self._sheet
        if sheet is None:
            slew.show()
            return
        slew.show(line(f" steepest supply: {slew_words(sheet)}"))
        rows.show(immunity_rows(sheet, rows.size.width), immunity_heading(rows.size.width))
        self._show_hand()

    def _show_title(self) -> None:
        title = Span(f" {self._name}: least charge that trips an alarm", "strong")
        self.query_one("#title", Lines).show(line(title, f"   {self._progress}"))

    def _show_hand(self) -> None:
        key = self.query_one(RowList).key
        nets = () if self._sheet is None else self._sheet.nets
        chosen = next((found for found in nets if found.net == key), None)
        self.query_one("#hand", Lines).show(*(() if chosen is None else immunity_lines(chosen)))

    def on_row_list_moved(self) -> None:
        """Another net's words."""
        self._show_hand()

    def on_answered(self, event: Answered) -> None:
        """After one more corner, or all."""
        if event.request == self._request:
            rows = self.query_one(RowList)
            at_top = not rows.rows or rows.key == rows.rows[0].key
            self._sheet = cast("ImmunitySheet", event.found)
            self._progress = "" if event.whole else self._progress
            self._show()
            if at_top:
                rows.action_first()

    def on_answer_progress(self, event: AnswerProgress) -> None:
        """Lanes done."""
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
