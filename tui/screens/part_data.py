"""The figures of one part, each with who says it, to be replaced by those of the part at hand."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType

from ...engine.design.datum_text import understood
from ...engine.design.part import Part
from ...engine.errors import EngineError
from ...engine.parts import kinds
from ...engine.parts.kind import FLAG, TEXT
from ...engine.parts.part_data import PartDatum, part_data
from ...storage.errors import StorageError
from ..actions import bindings
from ..data_text import data_heading, data_lines, data_rows, data_title
from ..refusal_text import for_form
from ..widgets.lines import Lines
from ..widgets.row_list import RowList
from ..widgets.rule import Rule
from .design_questions import written
from .dialog import Answers, Field, Form
from .page import Page

PLAIN = ("value", "tolerance", "setting")
_WHO = "who says so stands behind it: (datasheet), (measured) or (memory); without that it is not said"
Change = Callable[[str, Any], Part]
"""Writes one field (None takes it out) and returns the part as it is then. Raises EngineError or StorageError."""
Keep = Callable[[str, Part], str]
"""Puts the part into the drawer under a name; returns what was done, in words."""


class PartDataScreen(Page[None]):
    """All data of a part in a design, or of one that is being made for the drawer, where it is ``known`` so far."""

    WHERE = "data"
    BINDINGS: ClassVar[list[BindingType]] = bindings("data")

    def __init__(self, name: str, part: Part, change: Change, keep: Keep, known: str = "") -> None:
        super().__init__()
        self._whose = name
        self._part = part
        self._change = change
        self._keep = keep
        self._known = known
        self._all = False
        self._kept = ""

    def compose_body(self) -> ComposeResult:
        """Title, figures, the one under the hand."""
        yield Lines(id="title")
        yield Rule()
        yield RowList(id="data", empty="it has no figures: v shows what its kind reads")
        yield Rule()
        yield Lines(id="hand")

    def on_mount(self) -> None:
        """Shows the figures."""
        self.query_one(RowList).focus()
        self._show()

    def on_resize(self) -> None:
        """Another width."""
        self.call_after_refresh(self._show)

    def _show(self) -> None:
        self.query_one("#title", Lines).show(data_title(self._part, self._whose))
        rows = self.query_one(RowList)
        rows.show(data_rows(self._part, rows.size.width, all_of_them=self._all), data_heading())
        self._show_hand()

    def _show_hand(self) -> None:
        datum = self._chosen
        self.query_one("#hand", Lines).show(*(() if datum is None else data_lines(datum)))

    @property
    def _chosen(self) -> PartDatum | None:
        key = self.query_one(RowList).key
        return next((datum for datum in part_data(self._part) if datum.name == key), None)

    def on_row_list_moved(self) -> None:
        """Another figure."""
        self._show_hand()

    def action_show_all(self) -> None:
        """Also what the kind reads and the part does not give; or only what it has."""
        self._all = not self._all
        self._show()

    def action_change(self) -> None:
        """Writes the figure under the hand anew."""
        datum = self._chosen
        if datum is None:
            return
        name = datum.name

        def refusal(answers: Answers) -> str | None:
            try:
                self._part = self._change(name, self._read(name, answers["text"].strip()))
            except (EngineError, StorageError) as error:
                return for_form(str(error))
            return None

        def done(answers: Answers | None) -> None:
            if answers is not None:
                self._show()

        example = "as value" if name in PLAIN else "200 .. 300 .. 450 at 2 mA (datasheet); empty takes it out"
        title = f"{self._whose}, {name.replace('_', ' ')}: {datum.about}" if datum.about else f"{self._whose}, {name}"
        self.app.push_screen(
            Form(title, [Field("text", "figure", datum.text, example, "" if name in PLAIN else _WHO)], refusal), done
        )

    def _read(self, name: str, text: str) -> object:
        kind = kinds()[self._part.kind]
        entry = {**kind.data, **kind.fields}.get(name.removeprefix("data.").partition(".")[0])
        plain = name in PLAIN or text[:1] in {"[", "{"} or (entry is not None and entry.unit in (TEXT, FLAG))
        return written(text) if plain or not text else understood(text)

    def action_keep(self) -> None:
        """Puts the part into the drawer, to be used in any design."""

        def refusal(answers: Answers) -> str | None:
            try:
                self._kept = self._keep(answers["name"].strip(), self._part)
            except (EngineError, StorageError) as error:
                return str(error)
            return None

        def done(answers: Answers | None) -> None:
            if answers is not None:
                self.say(self._kept)

        field = Field("name", "name", self._known, "low-leak npn; a name that is there gets another version")
        self.app.push_screen(Form("Keep these data in the drawer", [field], refusal), done)
