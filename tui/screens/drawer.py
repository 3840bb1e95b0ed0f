"""The drawer: parts made of datasheet points, to be looked at, made, changed as a new version, and used."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType

from ...engine import edit
from ...engine.design.document import Design
from ...engine.design.part import Part
from ...engine.parts import kinds
from ...engine.parts.classes import CLASSES
from ...storage.values import MadePart
from ..actions import bindings
from ..drafting import Drawer, MadeDraft
from ..drawer_text import drawer_heading, drawer_lines, drawer_rows, made_key
from ..shown import Span, fit, line
from ..widgets.lines import Lines
from ..widgets.row_list import RowList
from ..widgets.rule import Rule
from ..widgets.status import KeyLine
from .dialog import Pick
from .page import Page
from .part_data import PartDataScreen

NO_CLASS = "no class"


@dataclass(frozen=True, slots=True)
class InHand:
    """The part on the bench that Enter gives data to, and who is told the design that comes of it."""

    design: Design
    ref: str
    put: Callable[[str, Design], None]


class DrawerScreen(Page[None]):
    """All parts in the drawer, and the part of a design under the hand, if it was opened from a bench."""

    WHERE = "drawer"
    BINDINGS: ClassVar[list[BindingType]] = bindings("drawer")

    def __init__(self, drawer: Drawer, hand: InHand | None = None) -> None:
        super().__init__()
        self._drawer = drawer
        self._hand = hand
        self._parts: list[MadePart] = []
        self._every_version = False

    def compose_body(self) -> ComposeResult:
        """Title, parts, the one under the hand."""
        yield Lines(id="title")
        yield Rule()
        yield RowList(id="parts-made", empty="the drawer is empty: n makes a part, i and k on the bench keep one")
        yield Rule()
        yield Lines(id="hand")

    def on_mount(self) -> None:
        """Reads the drawer."""
        self.query_one(RowList).focus()
        if self._hand is None:
            self.query_one(KeyLine).of("drawer", {"use": "edit"})
        self._read()

    def on_screen_resume(self) -> None:
        """Something may have been kept meanwhile."""
        self._read()

    def on_resize(self) -> None:
        """Another width."""
        self.call_after_refresh(self._show)

    def _read(self) -> None:
        def read() -> None:
            self._parts = self._drawer.drawer(every_version=self._every_version)

        self.attempt(read)
        self._show()

    @property
    def _part(self) -> Part | None:
        return None if self._hand is None else self._hand.design.part(self._hand.ref)

    @property
    def _chosen(self) -> MadePart | None:
        key = self.query_one(RowList).key
        return next((made for made in self._parts if made_key(made) == key), None)

    def _show(self) -> None:
        part = self._part
        use = "" if part is None else f"   Enter gives its data to {part.ref} ({part.kind.replace('_', ' ')})"
        self.query_one("#title", Lines).show(line(Span(" the drawer: parts made of datasheet points", "strong"), use))
        rows = self.query_one(RowList)
        rows.show(drawer_rows(self._parts, None if part is None else part.kind, rows.size.width), drawer_heading())
        self._show_hand()

    def _show_hand(self) -> None:
        made = self._chosen
        self.query_one("#hand", Lines).show(*(() if made is None else drawer_lines(made)))

    def on_row_list_moved(self) -> None:
        """Another part."""
        self._show_hand()

    def action_use(self) -> None:
        """Copies the data into the part under the hand of the bench, and goes back there; elsewhere edits them."""
        made, hand = self._chosen, self._hand
        if made is None:
            self.refuse("the drawer is empty; n makes a part")
        elif hand is None:
            self.action_edit()
        else:
            found: list[Design] = []

            def use() -> None:
                found.append(edit.with_made_part(hand.design, hand.ref, made.document, made.title))

            if self.attempt(use):
                self.dismiss()
                hand.put(f"{hand.ref} {made.title}", found[0])

    def action_make(self) -> None:
        """A new part: first its kind, then the class that gives what is not written."""

        def of_kind(kind: str | None) -> None:
            if kind is None:
                return

            def of_class(name: str | None) -> None:
                if name is not None:
                    self._open({"kind": kind} | ({} if name == NO_CLASS else {"class": name}), f"a new {kind}")

            classes = [*CLASSES.get(kind, {}), NO_CLASS]
            title = f"{kind.replace('_', ' ')}: which class gives what is not written?"
            self.app.push_screen(Pick(title, [(name, name) for name in classes]), of_class)

        rows = [(name, fit(name.replace("_", " "), 18).rstrip()) for name in sorted(kinds())]
        self.app.push_screen(Pick("a part for the drawer: which kind?", rows), of_kind)

    def action_edit(self) -> None:
        """The data of this part, to be kept as another version."""
        made = self._chosen
        if made is not None:
            self._open(made.document, made.name, made.name)

    def _open(self, document: dict[str, Any], name: str, known: str = "") -> None:
        opened: list[MadeDraft] = []
        if not self.attempt(lambda: opened.append(MadeDraft(document, name))):
            return
        draft = opened[0]

        def keep(name: str, part: Part) -> str:
            return f"kept as {self._drawer.keep_part(name, draft.document).title}"

        self.app.push_screen(PartDataScreen(name, draft.part, draft.write, keep, known))

    def action_versions(self) -> None:
        """All versions, or only the newest of each."""
        self._every_version = not self._every_version
        self._read()
