"""What the unit does with each part failed: silent failures first, as far as they are computed."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, ClassVar

from textual.binding import BindingType

from ..actions import bindings
from ..fault_text import counts_words, fault_heading, fault_key, fault_lines, fault_rows
from ..shown import Line
from ..widgets.row_list import Row
from .study_page import StudyPage

if TYPE_CHECKING:
    from ...engine.studies.fault_outcomes import FaultSheet


class FaultsScreen(StudyPage["FaultSheet"]):
    """The single-fault study of one design."""

    WHERE = "faults"
    BINDINGS: ClassVar[list[BindingType]] = bindings("faults")
    TITLE_WORDS = "single faults at nominal values"

    def begin(self) -> int:
        """Asks for it."""
        return self._computing.faults(self._design, self.post_message)

    def whole(self, sheet: FaultSheet) -> str:
        """How many come to which outcome."""
        return counts_words(sheet)

    def heading(self, width: int) -> Line:
        """The column heads."""
        return fault_heading()

    def rows(self, sheet: FaultSheet, width: int) -> Sequence[Row]:
        """A row a fault."""
        return fault_rows(sheet, width)

    def words(self, sheet: FaultSheet, key: str) -> Sequence[Line]:
        """What comes of one fault."""
        return next((fault_lines(fault) for fault in sheet.faults if fault_key(fault) == key), ())

    def last_words(self, sheet: FaultSheet) -> str:
        """What the study cannot tell."""
        return "; ".join(sheet.notes)

    def action_next_outcome(self) -> None:
        """To the first fault of the next outcome, after the last one to the first."""
        faults = () if self._sheet is None else self._sheet.faults
        keys = [fault_key(fault) for fault in faults]
        if self.found.key in keys:
            at = keys.index(self.found.key)
            there = (k for k in range(at, len(faults)) if faults[k].outcome != faults[at].outcome)
            self.found.move_to(next(there, 0))
