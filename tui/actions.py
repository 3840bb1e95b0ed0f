"""The one registry of actions: keys, footer, help and palette are made from it, and nowhere else."""

from __future__ import annotations

from dataclasses import dataclass

from textual.binding import Binding, BindingType


@dataclass(frozen=True, slots=True)
class Action:
    """Something a key does. ``where`` is the screen or widget; ``keys`` are Textual key names, comma separated.

    ``shown`` is how the keys are written for people. ``footer`` orders the key line: lower numbers are kept
    longest when the screen is narrow, 0 keeps the action out of the line.
    """

    where: str
    name: str
    keys: str
    shown: str
    label: str
    help: str
    footer: int = 0

    @property
    def id(self) -> str:
        """The name under which a user may bind other keys."""
        return f"{self.where}.{self.name}"


ACTIONS: tuple[Action, ...] = (
    Action("app", "help", "question_mark,f1", "?", "help", "the keys of this screen and what the marks mean", 1),
    Action("app", "command_palette", "ctrl+p", "Ctrl+P", "find", "find an action of this screen by its name"),
    Action("app", "quit", "ctrl+q", "Ctrl+Q", "leave", "leave from any screen; every edit is kept already"),
    # rows: any list
    Action("rows", "up", "up", "up", "up", "one row up"),
    Action("rows", "down", "down", "down", "down", "one row down"),
    Action("rows", "page_up", "pageup", "PgUp", "page up", "a screenful up"),
    Action("rows", "page_down", "pagedown", "PgDn", "page down", "a screenful down"),
    Action("rows", "first", "home", "Home", "first", "to the first row"),
    Action("rows", "last", "end", "End", "last", "to the last row"),
    # shelf
    Action("shelf", "open", "enter", "Enter", "open", "open the design on the bench", 2),
    Action("shelf", "new", "n", "n", "new", "a new design: stages in a row, empty, or a copy of this one", 3),
    Action("shelf", "import_file", "i", "i", "import", "put a design document (.json) on the shelf", 4),
    Action("shelf", "drawer", "p", "p", "drawer", "parts made of datasheet points, to use in any design", 5),
    Action("shelf", "quit", "q", "q", "leave", "leave; every edit is kept already", 6),
    # a new design of stages in a row
    Action("row", "settings", "enter", "Enter", "settings", "what is asked of the stage under the hand", 2),
    Action("row", "add", "a", "a", "add", "a stage of the catalogue after the one under the hand", 3),
    Action("row", "remove", "x", "x", "remove", "take the stage under the hand out of the row", 4),
    Action("row", "earlier", "comma", ",", "earlier", "the stage one place to the left"),
    Action("row", "later", "full_stop", ", .", "move", "the stage one place to the right; the comma to the left", 5),
    Action("row", "make", "s", "s", "make", "make the design, put it on the shelf and open it", 6),
    Action("row", "about", "k", "k", "about", "how this kind of stage is sized, and from where", 7),
    Action("row", "back", "escape,b", "b", "back", "back to the shelf without a design (Esc as well; asks)", 8),
    # bench
    Action("bench", "change", "enter", "Enter", "change", "write another value; typing a digit begins at once", 2),
    Action("bench", "step_down", "comma", ",", "lower", "next lower preferred value"),
    Action("bench", "step_up", "full_stop", ", .", "step", "next higher preferred value; the comma steps down", 3),
    Action("bench", "undo", "u", "u", "undo", "take the last edit back, also across sittings", 4),
    Action("bench", "redo", "U,r", "r", "redo", "do the undone edit again (U does the same)"),
    Action("bench", "save", "s", "s", "save", "keep this state as a revision, with a note", 5),
    Action("bench", "origin", "w", "w", "origin", "where the chosen margin comes from, with its quantities", 6),
    Action("bench", "compare", "c", "c", "compare", "this draft beside the revision it began from", 7),
    Action("bench", "history", "h", "h", "history", "the revisions of this design", 8),
    Action("bench", "data", "i", "i", "data", "the figures of the part, each with who says it; k there keeps them"),
    Action("bench", "drawer", "p", "p", "drawer", "parts made of datasheet points, to use in the part under the hand"),
    Action("bench", "waves", "v", "v", "waves", "voltages of the nominal run over time, drawn, with a cursor"),
    Action("bench", "faults", "F", "F", "faults", "what the unit does with each part failed, silent failures first"),
    Action(
        "bench", "immunity", "I", "I", "immunity", "how little charge trips an alarm, net by net, the weakest first"
    ),
    Action("bench", "write", "W", "W", "write files", "parts list and margins as CSV files, into a folder you name"),
    Action("bench", "edit", "e", "e", "edit", "another field of the part; on the margins, the required margin", 9),
    Action("bench", "conditions", "d", "d", "conditions", "supply, ambient and source resistance of the design"),
    Action("bench", "requirements", "R", "R", "requirements", "windows, orders, levels: what is wanted of the design"),
    Action("bench", "tables", "t", "t", "factors", "derating factors and required margins of the design, with reasons"),
    Action("bench", "add_stage", "A", "A", "add stage", "a stage of the catalogue, or a free one, at the end"),
    Action(
        "bench", "settings", "S", "S", "settings", "another time, mode, current of a made stage: its row is made anew"
    ),
    Action("bench", "remove_stage", "X", "X", "remove stage", "remove the chosen stage with its parts (asks first)"),
    Action("bench", "about_stage", "k", "k", "about stage", "how the stage is sized, what was asked of it; cautions"),
    Action("bench", "all_stages", "m", "m", "all margins", "margins of all stages, or of the chosen one", 10),
    Action("bench", "freeze", "f", "f", "freeze", "hold the figures back, to write a prediction first", 11),
    Action("bench", "add_part", "a", "a", "add", "add a part to the chosen stage", 12),
    Action("bench", "remove_part", "x", "x", "remove", "remove the part under the hand (asks first)", 13),
    Action("bench", "previous_stage", "left", "left", "stage left", "the stage before"),
    Action("bench", "next_stage", "right", "right", "stage right", "the stage after"),
    Action("bench", "other_side", "tab,shift+tab", "Tab", "other side", "between the parts and the margins", 14),
    Action("bench", "back", "escape,b", "b", "back", "back to the shelf (Esc does the same)", 15),
    # origin of a margin, one revision, help
    Action("revision", "origin", "w,enter", "w", "origin", "where the margin under the hand comes from", 2),
    Action("revision", "back", "escape,b", "b", "back", "back (Esc does the same)", 3),
    Action("page", "back", "escape,b,enter", "b", "back", "back (Esc and Enter do the same)", 2),
    Action("help", "back", "escape,b,enter,question_mark", "b", "back", "back (Esc, Enter and ? do the same)", 2),
    # history
    Action("history", "look", "enter", "Enter", "look", "the note and the margins of this revision", 2),
    Action("history", "mark", "space", "space", "mark", "mark or unmark a revision for comparing", 3),
    Action("history", "compare", "c", "c", "compare", "the marked revisions side by side, else with its parent", 4),
    Action("history", "branch", "o", "o", "go on from here", "let the draft continue from this revision (asks)", 5),
    Action("history", "add_result", "t", "t", "add result", "write what came of it under this revision's note", 7),
    Action("history", "trend_left", "left", "left", "trend", "the trend of the margin before"),
    Action("history", "trend_right", "right", "left right", "trend", "the trend of the next margin", 6),
    Action("history", "back", "escape,b", "b", "back", "back (Esc does the same)", 8),
    # compare
    Action("compare", "column_left", "left", "left", "column", "the causes of the revision before"),
    Action("compare", "column_right", "right", "left right", "column", "the causes of the next revision", 3),
    Action("compare", "origin", "w,enter", "w", "origin", "where the margin of this row comes from", 2),
    Action("compare", "fold", "m", "m", "all or changed", "also the margins that did not change, or not", 4),
    Action("compare", "back", "escape,b", "b", "back", "back (Esc does the same)", 5),
    # data of a part, the drawer
    Action("data", "change", "enter,e", "Enter", "change", "write this figure anew; empty takes it out", 2),
    Action("data", "keep", "k", "k", "keep", "keep these data in the drawer, to use them in any design", 3),
    Action("data", "show_all", "v", "v", "all or given", "also what the kind reads and the part does not give", 4),
    Action("data", "back", "escape,b", "b", "back", "back (Esc does the same)", 5),
    Action("drawer", "use", "enter", "Enter", "use", "copy the data into the part under the hand of the bench", 2),
    Action("drawer", "make", "n", "n", "make", "a new part: its kind, a class, its own figures", 3),
    Action("drawer", "edit", "e", "e", "edit", "the data of this part, to be kept as a new version", 4),
    Action("drawer", "versions", "v", "v", "versions", "all versions, or the newest of each part", 5),
    Action("drawer", "back", "escape,b", "b", "back", "back (Esc does the same)", 6),
    # waves
    Action("waves", "left", "left", "left", "cursor left", "the cursor one column earlier"),
    Action("waves", "right", "right", "left right", "cursor", "the cursor one column later", 2),
    Action("waves", "far_left", "pageup,comma", "PgUp", "far left", "the cursor some columns earlier"),
    Action("waves", "far_right", "pagedown,full_stop", "PgDn", "far right", "the cursor some columns later"),
    Action("waves", "first", "home", "Home", "begin", "the cursor to the begin of the window"),
    Action("waves", "last", "end", "End", "end", "the cursor to the end of the window"),
    Action("waves", "next_event", "e", "e", "next event", "the cursor to the next event", 5),
    Action("waves", "nets", "n", "n", "nets", "which nets are drawn", 3),
    Action("waves", "sequence", "s", "s", "sequence", "the next sequence of the design", 4),
    Action("waves", "closer", "plus,equals_sign", "+", "closer", "a quarter of the time in sight, around the cursor"),
    Action("waves", "wider", "minus", "+ -", "closer, wider", "four times the time in sight", 6),
    Action("waves", "whole", "0", "0", "whole", "the whole sequence"),
    Action("waves", "even", "l", "l", "even time", "time even, or stretched behind every event", 7),
    Action("waves", "plain", "a", "a", "ASCII", "drawn with ASCII signs only, or with dots"),
    Action("waves", "back", "escape,b", "b", "back", "back (Esc does the same)", 8),
    # faults
    Action("faults", "next_outcome", "n", "n", "next outcome", "to the first fault of the next outcome", 2),
    Action("faults", "back", "escape,b", "b", "back", "back; what is not computed yet is given up (Esc as well)", 3),
    # immunity
    Action("immunity", "back", "escape,b", "b", "back", "back; what is not computed yet is given up (Esc as well)", 3),
    # questions
    Action("question", "yes", "y", "y", "yes", "do it", 2),
    Action("question", "no", "n,escape", "n", "no", "leave it as it is (Esc does the same)", 3),
    Action(
        "occupied", "look", "l,enter", "l", "look", "look at the design without editing it (Enter does the same)", 2
    ),
    Action(
        "occupied", "take_over", "t", "t", "take over", "edit it here; the other sitting is told at its next edit", 3
    ),
    Action("occupied", "cancel", "escape,b", "b", "back", "leave it (Esc does the same)", 4),
    Action("form", "done", "enter", "Enter", "done", "take what is written", 2),
    Action("form", "up", "up,shift+tab", "up", "field before", "the field above"),
    Action("form", "down", "down,tab", "down", "next field", "the field below", 3),
    Action("form", "cancel", "escape,ctrl+g", "Esc", "cancel", "leave everything as it is (Ctrl+G does the same)", 4),
    Action("pick", "choose", "enter", "Enter", "choose", "take this one", 2),
    Action("pick", "back", "b", "b", "cancel", "leave everything as it is, while nothing is typed (Esc: always)", 3),
    Action("pick", "cancel", "escape,ctrl+g", "Esc", "cancel", "forget what was typed, else leave (Ctrl+G too)"),
    Action(
        "pick", "find", "slash", "/", "type to find", "letters find rows that hold them (/ before a word with b)", 4
    ),
    Action("pick", "shorter", "backspace", "Backspace", "shorter", "one letter less to find"),
    Action("mark", "mark", "space", "space", "mark", "mark or unmark this one", 2),
    Action("mark", "choose", "enter", "Enter", "take", "take the marked ones", 3),
    Action("mark", "cancel", "escape,b", "b", "cancel", "leave everything as it is (Esc does the same)", 4),
    Action("waiting", "now", "i", "i", "save incomplete", "save now, stamped incomplete: without worst corners", 2),
    Action("waiting", "cancel", "escape,b", "b", "cancel", "do not save (Esc does the same)", 3),
    Action("entry", "commit", "enter", "Enter", "take it", "put this value in", 2),
    Action("entry", "cancel", "escape,ctrl+g", "Esc", "cancel", "leave the old value (Ctrl+G does the same)", 3),
)


_DIALOGS = {"help", "question", "occupied", "form", "pick", "mark", "waiting", "entry"}


def of(where: str) -> tuple[Action, ...]:
    """The actions of one screen or widget, in the order of the registry."""
    return tuple(action for action in ACTIONS if action.where == where)


def with_help(where: str) -> tuple[Action, ...]:
    """The same, and on a full screen those that every full screen has."""
    return of(where) if where in _DIALOGS else (*of(where), *of("app"))


def bindings(where: str) -> list[BindingType]:
    """The key bindings of one screen or widget; their ids let users bind other keys."""
    return [
        Binding(
            action.keys,
            action.name,
            action.label,
            id=action.id,
            show=action.footer > 0,
            priority=action.id == "app.quit",  # otherwise a question over the screen keeps it from being heard
        )
        for action in of(where)
    ]
