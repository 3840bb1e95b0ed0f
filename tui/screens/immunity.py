"""How little charge trips an alarm, net by net, the weakest first, as far as it is computed."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, ClassVar

from textual.binding import BindingType

from ..actions import bindings
from ..immunity_text import immunity_heading, immunity_lines, immunity_rows, slew_words
from ..shown import Line
from ..widgets.row_list import Row
from .study_page import StudyPage

if TYPE_CHECKING:
    from ...engine.studies.immunity_sheet import ImmunitySheet


class ImmunityScreen(StudyPage["ImmunitySheet"]):
    """The immunity of one design."""

    WHERE = "immunity"
    BINDINGS: ClassVar[list[BindingType]] = bindings("immunity")
    TITLE_WORDS = "least charge that trips an alarm"

    def begin(self) -> int:
        """Asks for it."""
        return self._computing.immunity(self._design, self.post_message)

    def whole(self, sheet: ImmunitySheet) -> str:
        """How steep the supply may come."""
        return f"steepest supply: {slew_words(sheet)}"

    def heading(self, width: int) -> Line:
        """The column heads."""
        return immunity_heading(width)

    def rows(self, sheet: ImmunitySheet, width: int) -> Sequence[Row]:
        """A row a net."""
        return immunity_rows(sheet, width)

    def words(self, sheet: ImmunitySheet, key: str) -> Sequence[Line]:
        """What trips one net."""
        return next((immunity_lines(found, sheet) for found in sheet.nets if found.net == key), ())
