"""Revisions side by side: rows by what got worse, a strip of changed parts, and the causes of the chosen row."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType

from ...engine.studies.comparison import Comparison, Side, compare
from ..actions import bindings
from ..computing import Computing
from ..drafting import changes_words, incomplete
from ..messages import CausesArrived, CausesProgress, CausesRefused, SolverPreparing
from ..shown import Line, Span, line
from ..side_by_side import (
    FOLDED,
    causes_line,
    columns_in_sight,
    compare_heading,
    compare_rows,
    side_lines,
    title_cells,
)
from ..widgets.lines import Lines
from ..widgets.row_list import RowList
from ..widgets.rule import Rule
from .origin import OriginPage
from .page import Page

if TYPE_CHECKING:
    from ...engine.studies.causes import CausesSheet


class CompareScreen(Page[None]):
    """Two to six columns; the first is the one compared with, the chosen one is the one whose causes are shown."""

    WHERE = "compare"
    BINDINGS: ClassVar[list[BindingType]] = bindings("compare")

    def __init__(self, design: str, sides: Sequence[Side], computing: Computing) -> None:
        super().__init__()
        self._design = design
        self._sides = tuple(sides)
        self._chosen = len(sides) - 1
        self._computing = computing
        self._compared: Comparison = compare(self._sides, self._chosen)
        self._causes: dict[int, CausesSheet] = {}
        self._refusals: dict[int, str] = {}
        self._request = 0
        self._progress = ""
        self._fold = True

    def compose_body(self) -> ComposeResult:
        """Title, changed parts, checks, causes."""
        yield Lines(id="title")
        yield Lines(id="changed")
        yield Rule()
        yield RowList(id="checks", empty="neither side has margins")
        yield Rule()
        yield Lines(id="hand")

    def on_mount(self) -> None:
        """Shows the columns and asks for the causes."""
        self._ask()

    def on_resize(self) -> None:
        """Another width: more or fewer columns."""
        self.call_after_refresh(self._show)

    def on_unmount(self) -> None:
        """Nobody looks any more."""
        self._computing.cancel_causes()

    def _ask(self) -> None:
        known = self._chosen in self._causes or self._chosen in self._refusals
        if not known and self._compared.changed[self._chosen]:
            first, chosen = self._sides[0], self._sides[self._chosen]
            self._progress = "being computed"
            self._request = self._computing.causes(first, chosen, self.post_message)
        self._show()

    def _show(self) -> None:
        first, chosen = self._sides[0], self._sides[self._chosen]
        title = f" {self._design}: {' | '.join(column.label for column in self._sides)}"
        note = f"   {first.label} > {chosen.label}"
        if incomplete(first.sheet) or incomplete(chosen.sheet):
            note += "   ~ saved before its worst corners were known"
        self.query_one("#title", Lines).show(line(Span(title, "strong"), note))
        changed = changes_words(self._compared.changed[self._chosen])
        self.query_one("#changed", Lines).show(line(f" {changed or 'no part differs'}"))
        rows = self.query_one(RowList)
        width = rows.size.width
        title_width = title_cells(len(self._sides), width)
        sight = columns_in_sight(len(self._sides), self._chosen, width, title_width)
        rows.show(
            compare_rows(self._compared, self._sides, sight, title_width, fold=self._fold),
            compare_heading(self._sides, sight, self._chosen, title_width),
        )
        self._show_hand()

    def _show_hand(self) -> None:
        name = self.query_one(RowList).key
        hand = self.query_one("#hand", Lines)
        if name is None:
            hand.show()
            return
        if name == FOLDED:
            hand.show(line(" verdict and figure, to half a percent, are the same on every side"))
            return
        hand.show(*side_lines(self._compared, self._chosen, name, self.size.width), self._causes_line(name))

    def _causes_line(self, name: str) -> Line:
        if not self._compared.changed[self._chosen]:
            return line(Span(" causes: ", "strong"), "nothing was changed")
        if self._chosen in self._refusals:
            return line(Span(" causes: ", "strong"), self._refusals[self._chosen])
        if self._chosen in self._causes:
            return causes_line(self._causes[self._chosen], name)
        return line(Span(f" causes: ~ {self._progress}", "dim"))

    def on_row_list_moved(self) -> None:
        """Another check's causes."""
        self._show_hand()

    def on_causes_progress(self, event: CausesProgress) -> None:
        """Combinations done."""
        if event.request == self._request:
            self._progress = f"{event.done} of {event.total} combinations"
            self._show_hand()

    def on_causes_arrived(self, event: CausesArrived) -> None:
        """Shares of every check."""
        if event.request == self._request:
            self._causes[self._chosen] = event.causes
            self._show_hand()

    def on_causes_refused(self, event: CausesRefused) -> None:
        """They cannot be computed."""
        if event.request == self._request:
            self._refusals[self._chosen] = event.reason
            self._show_hand()

    def on_solver_preparing(self, event: SolverPreparing) -> None:
        """The first start on this machine."""
        self._progress = "preparing the solver" if event.busy else "being computed"
        self._show_hand()

    def action_column_left(self) -> None:
        """The causes of the column before."""
        self._turn(-1)

    def action_column_right(self) -> None:
        """The causes of the next column."""
        self._turn(1)

    def _turn(self, step: int) -> None:
        there = max(1, min(self._chosen + step, len(self._sides) - 1))
        if there != self._chosen:
            self._chosen = there
            self._compared = compare(self._sides, there)
            self._ask()

    def action_fold(self) -> None:
        """All margins, or only those that changed."""
        self._fold = not self._fold
        self._show()

    def action_origin(self) -> None:
        """Where the chosen column's margin of this row comes from; on the count of what did not change, these rows."""
        name = self.query_one(RowList).key
        if name == FOLDED:
            self.action_fold()
            return
        column = self._sides[self._chosen]
        for check in column.sheet.checks:
            if check.id == name:
                source = f"{self._design} {column.label}"
                known = not incomplete(column.sheet)
                self.app.push_screen(OriginPage(check, known, source, column.design, self._computing))
                return
        self.refuse(f"{column.label} does not have this check")
