"""About a stage: how it is sized and from where, what was asked of it, its ports; and the cautions of the design."""

from __future__ import annotations

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType

from ...engine.design.document import Design
from ...engine.design.part import Stage
from ...engine.stages.kind import StageKind
from ...engine.stages.remade import doubts_of
from ..actions import bindings
from ..caution_text import caution_rows
from ..shown import Span, line
from ..stage_text import Rows, kind_rows, stage_rows
from ..widgets.lines import Lines
from ..widgets.row_list import RowList
from ..widgets.rule import Rule
from .origin import wrapped
from .page import Page


class StagePage(Page[None]):
    """Rows about one stage of a design, or about a kind of the catalogue, that can be walked."""

    BINDINGS: ClassVar[list[BindingType]] = bindings("page")

    def __init__(self, design: Design | None, about: Stage | StageKind) -> None:
        super().__init__()
        if isinstance(about, Stage):
            doubts = () if design is None else doubts_of(design).get(about.name, ())
            self._title, self._rows = f" stage {about.name}", stage_rows(about, doubts)
        else:
            self._title, self._rows = f" {about.title}, in the catalogue", kind_rows(about)
        self._cautions: Rows = [] if design is None else caution_rows(design)

    def compose_body(self) -> ComposeResult:
        """Title above, rows below."""
        yield Lines(line(Span(self._title, "strong")), id="title")
        yield Rule()
        yield RowList(id="about")

    def on_resize(self) -> None:
        """Shows them, wrapped to the width there is."""
        self.query_one(RowList).show(wrapped([*self._rows, *self._cautions], self.size.width - 2))
