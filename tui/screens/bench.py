"""The bench: what is done to a draft. Every edit is kept in the store first, then studied in the background."""

from __future__ import annotations

from collections.abc import Callable
from contextlib import suppress
from typing import Any

from textual import events

from ...engine import edit
from ...engine.design.document import Design
from ...engine.design.part import Part
from ...engine.parts.made import kept
from ...engine.results import Depth, MarginSheet
from ...engine.stages import stage_kinds
from ...engine.stages.remade import asked_again, choice_of, doubts_of
from ...engine.stages.row import Choice
from ...storage.errors import StorageError
from ...storage.values import Revision
from ..bench_text import has_value, valued
from ..caution_text import new_cautions
from ..computing import Computing
from ..drafting import Drafting, incomplete, refuse_newly_wrong
from ..remembered import Remembered
from ..shown import counted
from ..widgets.row_list import RowList
from ..widgets.status import KeyLine, Notice
from ..widgets.value_entry import ValueEntry
from .bench_ways import BenchWays
from .design_questions import ask_condition, ask_field, ask_new_part, ask_required, ask_tables
from .dialog import Answers, Ask, Field, Form
from .drawer import DrawerScreen, InHand
from .part_data import PartDataScreen
from .requirement_questions import ask_requirement
from .saving import Saving
from .stage_page import StagePage
from .stage_questions import ask_settings, ask_stage

_BEGUN = "the note for the next revision is begun already: s goes on with it"


class BenchScreen(BenchWays):
    """Editing, freezing and saving the draft that is shown."""

    def __init__(
        self, drafting: Drafting, computing: Computing, remembered: Remembered | None = None, only_looks: str = ""
    ) -> None:
        """``only_looks`` says why the draft is not open to be edited here."""
        super().__init__(drafting, computing, remembered or Remembered())
        self._only_looks = only_looks
        self._past_base = False
        known = drafting.name in self.remembered.notes
        notes = self.remembered.notes_of(drafting.name, drafting.half_note)
        self._found = "" if known or not any(notes.values()) else _BEGUN
        self._saving = Saving(self, drafting, lambda: self.figures.newest, self._saved, notes, self.remembered.keeping)

    def on_mount(self) -> None:
        """Says why nothing can be edited, if so, and the cautions that come with the design."""
        if self._only_looks:
            self.say(self._only_looks)
        elif self._found:
            self.say(self._found, passing=True)
        self.tell_cautions(self._only_looks.rstrip(".") or self._found)

    def on_unmount(self) -> None:
        """Whoever opens the design next need not ask."""
        # A design that cannot be given back now is given back with the store, or by the end of this process.
        with suppress(StorageError):
            self.drafting.leave()

    def tell_cautions(self, words: str = "") -> None:
        """Says each caution once in a sitting, when a part or stage that brings it is in a design."""
        text = new_cautions(self.design, self.remembered.told)
        if text:
            self.say(f"{words}. {text}" if words else text, passing=not words)

    # -- editing

    def _edit(self, deed: Callable[[], object]) -> bool:
        """An edit of the draft: kept, then studied. False when it was refused, with the reason on the notice line."""
        before = self.design
        if not self.attempt(deed):
            return False
        if self.drafting.looking:  # whoever had the design has left it
            self.drafting.looking = False
            self.show_heading()
        if self.design != before:
            self.study()
        return True

    def study(self) -> None:
        """The draft changed: corners are to be expected again."""
        self._saving.begun()
        self._past_base = False
        super().study()

    def _put(self, words: str, after: Design) -> None:
        """A design that an answered question made."""
        if self._edit(lambda: self.drafting.put(words, after)):
            self.say(words, passing=True)
            self.tell_cautions(words)

    def taken_over(self, reason: str) -> None:
        """Another sitting edited the design: it is taken over only when asked for."""

        def answered(yes: bool | None) -> None:
            if yes and self.attempt(self.drafting.take_over):
                self.begin()
                self.say("taken over; this is the state the other sitting left")

        self.drafting.looking = True
        self.show_heading()
        self.refuse(reason)
        self.app.push_screen(Ask("Go on here, from the state of the other sitting?", reason), answered)

    def on_key(self, event: events.Key) -> None:
        """A digit begins the entry of a value for the part under the hand."""
        if isinstance(self.focused, RowList) and event.character and event.character in "0123456789":
            event.stop()
            self._begin_entry(event.character, typed=True)

    def action_change(self) -> None:
        """Another value for the part; on the margins, where the margin comes from."""
        if self.margins.has_focus:
            self.action_origin()
        elif self.ref is not None:
            part = self.design.part(self.ref)
            if part.value is None and not has_value(part):
                self.action_edit()
            else:
                self._begin_entry(part.value or "", typed=False)

    def _begin_entry(self, text: str, *, typed: bool) -> None:
        if self.ref is None:
            self.refuse("there is no part under the hand; a adds one")
            return
        self.query_one("#foot").add_class("-entering")
        self.query_one(ValueEntry).begin(f"{self.ref}, value:", text, typed=typed)
        self.query_one(KeyLine).of("entry")

    def on_value_entry_committed(self, event: ValueEntry.Committed) -> None:
        """Puts the value in; a refused one stays to be corrected."""
        ref = self.ref
        if ref is not None and self._edit(lambda: self.drafting.set_value(ref, event.text.strip())):
            self.say(valued(self.design.part(ref)))
            self._end_entry()

    def on_value_entry_left(self) -> None:
        """The old value stays, and with it goes what was said against another."""
        self.query_one(Notice).put_away()
        self._end_entry()

    def _end_entry(self) -> None:
        self.query_one("#foot").remove_class("-entering")
        self.focus_list()
        self.show_keys()

    def action_step_down(self) -> None:
        """Next lower preferred value."""
        self._step(-1)

    def action_step_up(self) -> None:
        """Next higher preferred value."""
        self._step(1)

    def _step(self, direction: int) -> None:
        ref = self.ref
        if ref is not None and self._edit(lambda: self.drafting.step(ref, direction)):
            self.say(f"{ref} {self.design.part(ref).value or ''}")

    def action_undo(self) -> None:
        """Takes the last edit back. Those from before the revision only when asked a second time."""
        base, draft = self.drafting.base, self.drafting.draft
        at_base = base is not None and draft.edits == 0 and draft.can_undo
        if base is not None and at_base and not self._past_base:
            self._past_base = True
            older = "o in the history (h) goes on from an older revision"
            self.refuse(f"this is r{base.number} as it was saved; {older}, u again takes back edits made before it")
            return
        before = f", made before r{base.number}" if base is not None and at_base else ""
        self._edit(lambda: self.say(f"taken back: {self.drafting.undo()}{before}"))

    def action_redo(self) -> None:
        """Does it again."""
        self._edit(lambda: self.say(f"done again: {self.drafting.redo()}"))

    def action_edit(self) -> None:
        """Another field of the part; on the margins, the required margin."""
        if self.margins.has_focus and self.chosen is not None:
            ask_required(self.app, self.design, self.chosen.check, self._put)
        elif self.ref is not None:
            ask_field(self.app, self.design, self.ref, self._put)

    def action_conditions(self) -> None:
        """Supply, ambient, source resistance."""
        ask_condition(self.app, self.design, self._put)

    def action_requirements(self) -> None:
        """What is wanted of the design."""
        ask_requirement(self.app, self.design, self._put)

    def action_tables(self) -> None:
        """Derating factors and required margins."""
        ask_tables(self.app, self.design, self._put)

    def action_add_part(self) -> None:
        """Another part in the chosen stage."""
        if self.stage is None:
            self.refuse("the design has no stage yet; A adds one")
            return
        known = {part.ref for part in self.design.parts}

        def put(words: str, after: Design) -> None:
            self._put(words, after)
            self.show(next((part.ref for part in self.design.parts if part.ref not in known), None))

        stage = self.stage
        self.attempt(lambda: ask_new_part(self.app, self.design, stage, put, self.drafting.drawer()))

    def action_add_stage(self) -> None:
        """A stage of the catalogue, or a free one, at the end of the chain."""

        def put(words: str, after: Design) -> None:
            self._put(words, after)
            self.go_to(len(self.design.stages) - 1)
            doubted = doubts_of(self.design)
            if doubted:
                self.say(f"{words}; not all will hold as made: k on {', '.join(doubted)} says what", passing=True)

        ask_stage(self.app, self.design, put)

    def action_remove_stage(self) -> None:
        """Takes the stage out with its parts, after asking."""
        stage = self.stage
        if stage is None:
            return

        def answered(yes: bool | None) -> None:
            if yes:
                self._edit(
                    lambda: self.drafting.put(
                        f"without stage {stage.name}", edit.without_stage(self.design, stage.name)
                    )
                )

        count = f"{counted(len(stage.parts), 'part')} and what is about them go with it"
        self.app.push_screen(
            Ask(f"Take stage {stage.name} out of the design?", f"{count}; u brings all back."), answered
        )

    def action_settings(self) -> None:
        """What is asked of the chosen stage, to be asked again: the row is made anew."""
        stage = self.stage
        if stage is None or stage.kind not in stage_kinds():
            self.refuse("nothing was asked of this stage: its parts were put in by hand")
            return

        def chosen(choice: Choice) -> None:
            words = f"{stage.name} asked again"
            self.attempt(lambda: self._put(words, asked_again(self.design, stage.name, choice)))

        def tried(choice: Choice) -> None:
            refuse_newly_wrong(self.design, asked_again(self.design, stage.name, choice))

        ask_settings(self.app, choice_of(stage), chosen, tried)

    def action_about_stage(self) -> None:
        """How the stage is sized, what was asked of it, and the cautions of the design."""
        if self.stage is None:
            self.refuse("the design has no stage yet; A adds one")
        else:
            self.app.push_screen(StagePage(self.design, self.stage))

    def action_remove_part(self) -> None:
        """Takes the part out, after asking."""
        ref = self.ref
        if ref is None:
            return

        def answered(yes: bool | None) -> None:
            if yes:
                self._edit(lambda: self.drafting.put(f"without {ref}", edit.without_part(self.design, ref)))

        self.app.push_screen(Ask(f"Take {ref} out of the design?", "u brings it back."), answered)

    # -- freezing and saving

    def action_freeze(self) -> None:
        """Holds figures back; the second time asks for the prediction and shows them."""
        if not self.figures.frozen:
            self.remembered.frozen.add(self.drafting.name)
            self.figures = self.figures.freeze()
            self.say("figures are held back; f asks for a prediction and shows them")
            self.show_heading()
            return

        def predicted(answers: Answers | None) -> None:
            if answers is None:
                return
            self._saving.predict(answers["prediction"].strip())
            self._thaw()
            self.say("it goes into the note of the next revision" if self._saving.prediction else "shown again")
            self.show()

        example = "duration stays above 60 s (may stay empty)"
        field = Field("prediction", "prediction", self._saving.prediction, example)
        self.app.push_screen(Form("What will the figures say?", [field]), predicted)

    def _thaw(self) -> None:
        self.remembered.frozen.discard(self.drafting.name)
        self.figures = self.figures.thaw()

    def action_save(self) -> None:
        """Asks for the note, then keeps the revision as soon as its corners are known."""
        self._saving.ask()

    def sheet_known(self, sheet: MarginSheet) -> None:
        """A revision may wait for it, or a comparison."""
        self._saving.arrived(sheet)
        if self._compare_waits and sheet.depth is not Depth.NOMINAL:
            self._compare_waits = False
            # Over a question or another screen, or in the middle of a value, it would take the keys away.
            if self.is_current and isinstance(self.focused, RowList):
                self.say("")
                self.action_compare()

    def no_sheet(self, reason: str) -> None:
        """A revision or a comparison may wait for what will not come."""
        self._compare_waits = False
        self._saving.refused(reason)

    def _saved(self, revision: Revision) -> None:
        known = None if incomplete(revision.sheet) else revision.sheet
        self._thaw()
        self.figures = self.figures.compared_with(known)
        stamp = "" if known else ", incomplete: its worst corners were not known"
        self.say(f"saved as r{revision.number}{stamp}")
        self.show()

    # -- data of parts

    def action_data(self) -> None:
        """The figures of the part under the hand, each with who says it."""
        ref = self.ref
        if ref is None:
            self.refuse("there is no part under the hand; a adds one")
            return

        def change(field: str, value: Any) -> Part:
            after = edit.with_field(self.design, ref, field, value)
            if after != self.design:
                refuse_newly_wrong(self.design, after)
                self.drafting.put(f"{ref} {field}", after)
                self.study()
            return self.design.part(ref)

        def keep(name: str, part: Part) -> str:
            return f"kept as {self.drafting.keep_part(name, kept(part)).title}"

        part = self.design.part(ref)
        known = (part.drawer or "").rpartition(", version")[0]
        self.app.push_screen(PartDataScreen(ref, part, change, keep, known))

    def action_drawer(self) -> None:
        """Parts made of datasheet points."""
        hand = None if self.ref is None else InHand(self.design, self.ref, self._put)
        self.app.push_screen(DrawerScreen(self.drafting, hand))
