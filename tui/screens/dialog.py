"""Questions over a screen: yes or no, one of a list, or a form of a few lines."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from textwrap import wrap
from typing import ClassVar

from rich.cells import cell_len
from textual import events
from textual.app import ComposeResult
from textual.binding import BindingType
from textual.containers import Horizontal, Vertical, VerticalScroll
from textual.screen import ModalScreen
from textual.widgets import Input

from ..actions import bindings, of
from ..shown import Line, Span, line, visible
from ..widgets.lines import Lines
from ..widgets.row_list import Row, RowList
from ..widgets.rule import Rule
from ..widgets.status import KeyLine, Notice
from ..widgets.value_entry import TextLine


class Ask(ModalScreen[bool]):
    """A yes or no question. Anything but yes leaves everything as it is."""

    BINDINGS: ClassVar[list[BindingType]] = bindings("question")

    def __init__(self, question: str, *details: str) -> None:
        super().__init__()
        self._question = line(Span(f" {question}", "strong"))
        self._details = details

    def compose(self) -> ComposeResult:
        """The question at the foot of the screen."""
        width = max(10, self.app.size.width - 2)
        details = [line(f" {piece}") for detail in self._details for piece in wrap(visible(detail), width)]
        with Vertical(classes="dialog"):
            yield Rule()
            asked = Lines(self._question, *details)
            asked.styles.height = 1 + len(details)
            yield asked
            yield KeyLine("question")

    def action_yes(self) -> None:
        """Do it."""
        self.dismiss(True)

    def action_no(self) -> None:
        """Leave it."""
        self.dismiss(False)


_IN_FULL = 6
_ROOMY = 20


def in_full_lines(text: str, width: int, most: int) -> tuple[Line, ...]:
    """The whole of a text that a row of this width cuts, wrapped, ``most`` lines of it; nothing for one that fits."""
    if cell_len(visible(text)) <= width:
        return ()
    pieces = wrap(_GAP.sub("  ", visible(text)), width)
    if len(pieces) > most:
        pieces[most - 1] = f"{pieces[most - 1][: width - 4]} ..."
    return tuple(line(Span(f" {piece}", "dim")) for piece in pieces[:most])


_GAP = re.compile(" {2,}")


_KEYS = {key for action in of("pick") for key in action.keys.split(",")}


class Pick(ModalScreen[str | None]):
    """One of a list, or None. What is typed leaves only the rows that hold it, the ones that begin with it first."""

    BINDINGS: ClassVar[list[BindingType]] = bindings("pick")

    def __init__(self, title: str, rows: Sequence[tuple[str, str]], empty: str = "nothing to choose from") -> None:
        super().__init__()
        self._title = title
        self._choices = [Row(key, line(text)) for key, text in rows]
        self._texts = dict(rows)
        self._empty = empty
        self._typed: str | None = None

    def compose(self) -> ComposeResult:
        """The list at the foot of the screen, and below it the whole text of a row that is cut."""
        with Vertical(classes="dialog"):
            yield Rule()
            rows = RowList(empty=self._empty, id="choices")
            rows.styles.height = max(2, len(self._choices) + 1)
            yield rows
            yield Lines(id="in-full")
            yield KeyLine("pick")

    def on_mount(self) -> None:
        """Shows the choices."""
        self._show()

    def _show(self) -> None:
        wanted = (self._typed or "").lower()
        places = [(self._texts[row.key].lower().find(wanted), n, row) for n, row in enumerate(self._choices)]
        found = [row for place, _, row in sorted(places, key=lambda each: each[:2]) if place >= 0]
        heading = [Span(self._title, "strong")]
        if self._typed is not None:
            heading.append(Span(f"   find: {self._typed}" + ("" if found else "   no row holds that"), "strong"))
        first = found[0].key if wanted and found else None
        self.query_one(RowList).show(found if wanted else self._choices, tuple(heading), first)
        self._about()

    def on_key(self, event: events.Key) -> None:
        """A letter narrows the list; those that are keys of it do so only once something is looked for."""
        if event.character is not None and event.is_printable and (self._typed is not None or event.key not in _KEYS):
            event.stop()
            self._typed = (self._typed or "") + event.character
            self._show()

    def on_resize(self) -> None:
        """Another width: other lines."""
        self._about()

    def on_row_list_moved(self) -> None:
        """Another row's text."""
        self._about()

    def _about(self) -> None:
        width = max(10, self.app.size.width - 2)
        in_full = {key: in_full_lines(text, width, _IN_FULL) for key, text in self._texts.items()}
        shown = self.query_one("#in-full", Lines)
        most = max(map(len, in_full.values()), default=0)
        shown.display = most > 0 and self.app.size.height >= _ROOMY
        shown.styles.height = most
        shown.show(*in_full.get(self.query_one(RowList).key or "", ()))

    def action_choose(self) -> None:
        """This one."""
        if (key := self.query_one(RowList).key) is not None or not self._choices:
            self.dismiss(key)

    def action_find(self) -> None:
        """Letters go to what is looked for from now on, b too."""
        self._typed = self._typed or ""
        self._show()

    def action_shorter(self) -> None:
        """One letter less is looked for."""
        if self._typed is not None:
            self._typed = self._typed[:-1]
            self._show()

    def action_back(self) -> None:
        """None of them."""
        self.dismiss(None)

    def action_cancel(self) -> None:
        """Nothing is looked for any more, or none of them."""
        if self._typed is None:
            self.dismiss(None)
        else:
            self._typed = None
            self._show()


class Mark(ModalScreen[list[str] | None]):
    """Some of a list, up to a number, in the order in which they were marked; None when cancelled."""

    BINDINGS: ClassVar[list[BindingType]] = bindings("mark")

    def __init__(self, title: str, rows: Sequence[tuple[str, str]], marked: Sequence[str], most: int) -> None:
        super().__init__()
        self._title = title
        self._choices = tuple(rows)
        self._marked = [key for key in marked if key in dict(rows)]
        self._most = most

    def compose(self) -> ComposeResult:
        """The list at the foot of the screen."""
        with Vertical(classes="dialog"):
            yield Rule()
            rows = RowList(empty="nothing to choose from", id="choices")
            rows.styles.height = max(2, len(self._choices) + 1)
            yield rows
            yield Notice()
            yield KeyLine("mark")

    def on_mount(self) -> None:
        """Shows the choices."""
        self._show()

    def _show(self) -> None:
        rows = [Row(key, line("* " if key in self._marked else "  ", text)) for key, text in self._choices]
        self.query_one(RowList).show(rows, heading=line(Span(self._title, "strong")))

    def action_mark(self) -> None:
        """Marks or unmarks this one."""
        key = self.query_one(RowList).key
        if key in self._marked:
            self._marked.remove(key)
        elif len(self._marked) == self._most:
            self.query_one(Notice).refuse(f"{self._most} are marked; unmark one first")
        elif key is not None:
            self._marked.append(key)
        self._show()

    def action_choose(self) -> None:
        """These; the one under the hand where none is marked."""
        key = self.query_one(RowList).key
        self.dismiss(self._marked or ([] if key is None else [key]))

    def action_cancel(self) -> None:
        """As it was."""
        self.dismiss(None)


@dataclass(frozen=True, slots=True)
class Field:
    """One line of a form: its name, what stands before it, what it begins with, and a grey example.

    A ``hint`` is said while the line is written in.
    """

    name: str
    label: str
    value: str = ""
    example: str = ""
    hint: str = ""


Answers = Mapping[str, str]


def in_brackets(example: str) -> str:
    """An example as it stands in an empty line: no terminal and no eye takes it for what is written there."""
    return f"({example.replace(' (may stay empty)', '; may stay empty')})" if example else ""


class Form(ModalScreen[Answers | None]):
    """A few lines to fill in; None when cancelled. ``check`` returns a refusal, which keeps the form open.

    ``kept`` is told what is written, after each change of it and when the form is cancelled, and keeps it.
    """

    BINDINGS: ClassVar[list[BindingType]] = bindings("form")

    def __init__(
        self,
        title: str,
        fields: Sequence[Field],
        check: Callable[[Answers], str | None] | None = None,
        kept: Callable[[Answers], None] | None = None,
    ) -> None:
        super().__init__()
        self._kept = kept
        self._touched = False
        self._title: Line = line(Span(f" {title}", "strong"))
        self._fields = tuple(fields)
        self._check = check

    def compose(self) -> ComposeResult:
        """The lines at the foot of the screen."""
        with Vertical(classes="dialog"):
            yield Rule()
            yield Lines(self._title, classes="one")
            with VerticalScroll(can_focus=False, id="fields"):
                for field in self._fields:
                    with Horizontal(classes="field"):
                        yield Lines(line(f" {field.label}"), classes="label")
                        yield TextLine(field.value, in_brackets(field.example), id=f"field-{field.name}")
            yield Notice()
            yield KeyLine("form")

    def on_descendant_focus(self, event: events.DescendantFocus) -> None:
        """Says what the line is for."""
        hint = next((field.hint for field in self._fields if event.widget.id == f"field-{field.name}"), "")
        if hint:
            self.query_one(Notice).say(hint)

    def on_input_submitted(self, event: Input.Submitted) -> None:
        """Enter in any line takes the whole form."""
        event.stop()
        self.action_done()

    def action_done(self) -> None:
        """Takes the form, unless the check refuses it."""
        answers = self._answers()
        refusal = self._check(answers) if self._check else None
        if refusal:
            self.query_one(Notice).refuse(refusal)
        else:
            self.dismiss(answers)

    def on_input_changed(self, event: Input.Changed) -> None:
        """What is written so far is kept, where somebody keeps it."""
        event.stop()
        if self._kept is not None and (self._touched or self.is_written):
            self._touched = True
            self._kept(self._answers())

    @property
    def is_kept(self) -> bool:
        """Whether what is written outlives the form."""
        return self._kept is not None

    @property
    def is_written(self) -> bool:
        """Whether a line says something else than it began with."""
        answers = self._answers()
        return any(answers[field.name] != visible(field.value) for field in self._fields)

    def _answers(self) -> Answers:
        return {field.name: self.query_one(f"#field-{field.name}", TextLine).value for field in self._fields}

    def action_up(self) -> None:
        """To the line above."""
        self.focus_previous()

    def action_down(self) -> None:
        """To the line below."""
        self.focus_next()

    def action_cancel(self) -> None:
        """Leaves everything as it is."""
        if self._kept is not None:
            self._kept(self._answers())
        self.dismiss(None)
