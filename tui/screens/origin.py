"""Where one margin comes from: what is stored with it at once, and what explains it as soon as it is computed."""

from __future__ import annotations

from collections.abc import Sequence
from textwrap import wrap
from typing import TYPE_CHECKING, ClassVar, cast

from textual.app import ComposeResult
from textual.binding import BindingType

from ...engine.design.document import Design
from ...engine.results import CheckResult
from ..actions import bindings
from ..computing import Computing
from ..margin_text import check_name
from ..messages import Answered, AnswerRefused, SolverPreparing
from ..origin_text import explanation_rows, origin_rows, together
from ..shown import Span, fit, line, visible
from ..widgets.lines import Lines
from ..widgets.row_list import Row, RowList
from ..widgets.rule import Rule
from .page import Page

if TYPE_CHECKING:
    from ...engine.studies.explanation import Explanation


class OriginPage(Page[None]):
    """One check's quantities, as rows that can be walked where the screen is low.

    ``design`` is the document the margin belongs to; its corner is computed once more in the background, to tell what
    was observed, when, and with which data.
    """

    BINDINGS: ClassVar[list[BindingType]] = bindings("page")

    def __init__(
        self, check: CheckResult, worst_known: bool, source: str, design: Design, computing: Computing
    ) -> None:
        super().__init__()
        self._check = check
        self._source = source
        self._design = design
        self._computing = computing
        self._stored = origin_rows(check, worst_known)
        self._explained = [("data", "being computed: values put in, observations with their instants, sources", "dim")]
        self._request = 0

    def compose_body(self) -> ComposeResult:
        """Title above, quantities below."""
        yield Lines(id="title")
        yield Rule()
        yield RowList(id="quantities")

    def on_mount(self) -> None:
        """Asks what explains the margin."""
        self._request = self._computing.explain(self._design, self._check, self.post_message)

    def on_unmount(self) -> None:
        """Nobody looks any more."""
        self._computing.cancel_aside()

    def on_resize(self) -> None:
        """Shows them, wrapped to the width there is."""
        self._show()

    def on_answered(self, event: Answered) -> None:
        """The corner was computed once more."""
        if event.request == self._request:
            self._explained = explanation_rows(self._check, cast("Explanation", event.found))
            self._show()

    def on_answer_refused(self, event: AnswerRefused) -> None:
        """It cannot be computed as the design stands."""
        if event.request == self._request:
            self._explained = [("data", event.reason, "fail")]
            self._show()

    def on_solver_preparing(self, event: SolverPreparing) -> None:
        """The first start on this machine."""
        if event.busy:
            self._explained = [("data", "the solver is being prepared on this machine", "dim")]
            self._show()

    def _show(self) -> None:
        check = self._check
        title = f" {check_name(check)}, stage {check.stage}, in {self._source}"
        self.query_one("#title", Lines).show(line(Span(title, "strong")))
        rows = wrapped(together(self._stored, self._explained), self.size.width - 2)
        self.query_one(RowList).show(rows, line(Span("figures, and where each comes from", "strong")))


_LABEL = 20


def wrapped(rows: Sequence[tuple[str, str, str]], width: int) -> list[Row]:
    """Name and text side by side; what is longer than the width goes on below."""
    found: list[Row] = []
    for name, text, tone in rows:
        for at, piece in enumerate(wrap(visible(text), max(10, width - _LABEL)) or [""]):
            label = Span(fit(name if at == 0 else "", _LABEL), "strong")
            found.append(Row(str(len(found)), line(label, Span(piece, tone))))
    return found
