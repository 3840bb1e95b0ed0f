"""The shelf: every design of the store in one line."""

from __future__ import annotations

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType

from ...engine.circuit.inspection import inspect
from ...engine.design.document import Design
from ...engine.errors import DesignError, EngineError
from ...engine.results import MarginSheet
from ...storage.errors import DesignOpen, StorageError, StoreBusy, StoreFull, StoreReadOnly
from ...storage.place import at_home
from ...storage.store import Store
from ...storage.values import DesignRow
from ..actions import bindings
from ..computing import Computing
from ..drafting import Drafting, Drawer
from ..messages import SolverPreparing
from ..remembered import Remembered
from ..shelf_text import shelf_heading, shelf_line
from ..shown import Span, line
from ..widgets.lines import Lines
from ..widgets.row_list import Row, RowList
from ..widgets.rule import Rule
from .bench import BenchScreen
from .dialog import Answers, Field, Form, Pick
from .drawer import DrawerScreen
from .new_design import ask_new_design
from .occupied import Occupied
from .page import Page

_ROW = "row"
_EMPTY = "the shelf is empty: n begins a design, i imports one"
_LARGEST_DOCUMENT = 16_000_000


class ShelfScreen(Page[None]):
    """The designs, by name."""

    WHERE = "shelf"
    BINDINGS: ClassVar[list[BindingType]] = bindings("shelf")

    def __init__(self, store: Store, computing: Computing) -> None:
        super().__init__()
        self._store = store
        self._computing = computing
        self._remembered = Remembered(store.keep_half_note)
        self._preparing = False

    def compose_body(self) -> ComposeResult:
        """Title and rows."""
        yield Lines(line(Span(" Stagebook: the shelf", "strong")), id="title")
        yield Rule()
        yield RowList(id="designs", empty=_EMPTY)

    def on_mount(self) -> None:
        """The solver is prepared while the shelf is looked at."""
        if self._store.read_only:
            self.say(self._store.why_read_only)
        self._computing.prepare(self.post_message)

    def on_screen_resume(self) -> None:
        """Reads the shelf, at first and after every bench, whose study may have taken the wait for the solver over."""
        if self._preparing:
            self._preparing = False
            self.say("")
            self._computing.prepare(self.post_message)
        if not self.attempt(self._show):
            self.query_one(RowList).say_empty("the shelf cannot be read")

    def on_solver_preparing(self, event: SolverPreparing) -> None:
        """The first start on this machine."""
        self._preparing = event.busy
        busy = "preparing the solver, once on this machine; go on meanwhile"
        self.say(busy if event.busy else event.trouble or "the solver is ready")

    def _show(self, name: str | None = None) -> None:
        shown = self.query_one(RowList)
        width = shown.size.width or self.app.size.width
        rows = [Row(row.name, shelf_line(row, self._figures_of(row), width)) for row in self._store.designs()]
        shown.say_empty(_EMPTY)
        shown.show(rows, shelf_heading(width), name)

    def _figures_of(self, row: DesignRow) -> MarginSheet | None:
        """The draft's own figures, if they are known and not held back for a prediction."""
        return None if row.name in self._remembered.frozen else self._remembered.sheet(row.content)

    def on_resize(self) -> None:
        """Another width: other columns."""
        self.call_after_refresh(self.attempt, self._show)

    def action_open(self) -> None:
        """Opens the bench of the design under the hand."""
        name = self.query_one(RowList).key
        if name is not None:
            self.attempt(lambda: self._open(Drafting(self._store, name)))

    def _open(self, drafting: Drafting) -> None:
        """To the bench: to edit where nobody else does, else to look, with the reason."""
        try:
            drafting.sit_down()
        except DesignOpen as refusal:
            self._ask_occupied(drafting, refusal)
        except (StoreReadOnly, StoreBusy, StoreFull) as refusal:
            self._bench(drafting, str(refusal))
        else:
            self._bench(drafting)

    def _ask_occupied(self, drafting: Drafting, refusal: DesignOpen) -> None:
        def chosen(how: str | None) -> None:
            if how == "look":
                self._bench(drafting, f"only looked at: {refusal}")
            elif how == "take" and self.attempt(drafting.take_over):
                self._bench(drafting)

        self.app.push_screen(Occupied(refusal), chosen)

    def _bench(self, drafting: Drafting, only_looks: str = "") -> None:
        self.app.push_screen(BenchScreen(drafting, self._computing, self._remembered, only_looks))

    def action_drawer(self) -> None:
        """Parts made of datasheet points."""
        self.app.push_screen(DrawerScreen(Drawer(self._store)))

    async def action_quit(self) -> None:
        """Leaves; every edit is kept already."""
        await self.app.action_quit()

    @property
    def unsaved_notes(self) -> list[str]:
        """The designs for whose next revision a note is begun that leaving would lose."""
        return self._remembered.kept_nowhere

    def on_unmount(self) -> None:
        """Whatever ended the program, a dropped line too: a note that is being written stays."""
        self._remembered.keeping.now()

    def action_new(self) -> None:
        """A new design: of catalogue stages, empty, or a copy of one."""
        names = [row.key for row in self.query_one(RowList).rows]
        here = self.query_one(RowList).key
        rows = [
            (_ROW, "stages of the catalogue in a row, sized by what is asked of them"),
            ("", "an empty design"),
            *((f"copy {n}", f"a copy of {n}") for n in sorted(names, key=lambda n: n != here)),
        ]

        def made(name: str | None) -> None:
            if name is not None:
                self._show(name)
                self.action_open()

        def chosen(key: str | None) -> None:
            if key == _ROW:
                ask_new_design(self.app, self._store, made)
            elif key is not None:
                self._ask_name(key.removeprefix("copy ") or None)

        self.app.push_screen(Pick("A new design", rows), chosen)

    def _ask_name(self, source: str | None) -> None:
        fields = [Field("name", "name", "", "a name of your own")]
        if source is None:
            fields += [
                Field("purpose", "purpose", "", "one sentence (may stay empty)"),
                Field("supply", "supply", "9 V"),
                Field("stage", "first stage", "entry"),
            ]

        def make(answers: Answers) -> str | None:
            try:
                name = answers["name"].strip()
                design = copied(self._store.draft(source).design, name) if source else empty_design(answers)
                self._store.create(name, design)
            except (EngineError, StorageError) as refusal:
                return str(refusal)
            return None

        def done(answers: Answers | None) -> None:
            if answers is not None:
                self._show(answers["name"].strip())
                self.action_open()

        self.app.push_screen(Form("A new design" if source is None else f"A copy of {source}", fields, make), done)

    def action_import_file(self) -> None:
        """Puts a design document on the shelf."""
        fields = [Field("path", "file", "", "path/to/design.json"), Field("name", "name", "", "the document's own")]
        taken: list[str] = []
        faults: list[str] = []

        def take(answers: Answers) -> str | None:
            try:
                design = read_document(answers["path"].strip())
                name = answers["name"].strip() or design.name
                design = design if name == design.name else copied(design, name)
                self._store.create(name, design)
                taken.append(name)
                faults.extend(why_not(design))
            except (EngineError, StorageError) as refusal:
                return str(refusal)
            return None

        def done(answers: Answers | None) -> None:
            if answers is not None:
                self._show(taken[-1])
                if faults:
                    self.refuse(f"{taken[-1]} is on the shelf, but cannot be computed as it stands: {faults[0]}")
                else:
                    self.say(f"{taken[-1]} is on the shelf; Enter opens it")

        self.app.push_screen(Form("Import a design document", fields, take), done)


def why_not(design: Design) -> list[str]:
    """Why a design cannot be computed; nothing where it can."""
    try:
        inspect(design)
    except EngineError as fault:
        return [str(fault)]
    return []


def empty_design(answers: Answers) -> Design:
    """A design of one free stage without parts. Raises DesignError."""
    document = {
        "stagebook": 1,
        "name": answers["name"].strip(),
        "purpose": answers["purpose"].strip(),
        "conditions": {"supply": answers["supply"].strip(), "ambient": "25 C"},
        "stages": [{"name": answers["stage"].strip(), "kind": "free", "parts": []}],
        "sequences": {"alarm": {"events": [{"at": "0 s", "event": "connect supply", "rise": "1 us"}], "ends": "5 s"}},
    }
    return Design.load(document)


def copied(design: Design, name: str) -> Design:
    """The same design under another name. Raises DesignError."""
    return Design.load({**design.dump(), "name": name})


def read_document(path: str) -> Design:
    """The design in a file. Raises DesignError, one line naming the file."""
    if not path:
        raise DesignError("write the path of a design document, such as designs/flood.json")
    place = at_home(path)
    try:
        with place.open("rb") as file:
            content = file.read(_LARGEST_DOCUMENT + 1)
    except (OSError, ValueError) as error:
        raise DesignError(f"{path} cannot be read ({getattr(error, 'strerror', None) or error})") from error
    if len(content) > _LARGEST_DOCUMENT:
        raise DesignError(f"{path} is larger than {_LARGEST_DOCUMENT // 1_000_000} MB: that is no design document")
    return Design.load(content)
