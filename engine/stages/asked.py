"""Whether what is asked of a stage can be made, told while it is asked; and what will not hold while it cannot."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from ..design.document import Design
from ..errors import EngineError
from .kind import Drive, Intake, Json
from .making import doubts, new_design
from .row import Choice, Place, checked, kind_named, make_stage


def refuse_settings(conditions: Json, row: Sequence[Choice], at: int) -> None:
    """Raise EngineError where a setting of the stage at this place of a row cannot be read or cannot be made.

    What its neighbours are still to bring or to change is no fault of a setting. Where the row cannot be made for such
    a reason, the stage is tried by itself, behind a signal as it takes it.
    """
    choice = checked(row[at])
    refused = _refused(conditions, row)
    if refused is not None and not _of_setting(refused, choice):
        kind = kind_named(choice.kind)
        drive = Drive(kind.takes[0]) if kind.takes else None
        try:
            make_stage(_known(conditions).conditions, choice, Place(signal="in", drive=drive), Intake(), frozenset())
        except EngineError as refusal:
            refused = refusal
    if refused is not None and _of_setting(refused, choice):
        raise refused


def in_the_way(conditions: Json, row: Sequence[Choice]) -> str | None:
    """The name of the stage for which a row cannot be made; None where it can, or where no stage is named."""
    refused = _refused(conditions, row)
    return None if refused is None else next((c.title() for c in row if _of_stage(refused, c)), None)


def doubts_beside(conditions: Json, row: Sequence[Choice]) -> dict[str, tuple[str, ...]]:
    """The doubts of a row, by stage. Where a stage is in the way of making it, those of the others: with what is usual
    of that stage, or else without it."""
    row = list(row)
    while row:
        try:
            return doubts(conditions, row)
        except EngineError:
            name = in_the_way(conditions, row)
        at = next((n for n, choice in enumerate(row) if choice.title() == name), None)
        if at is None:
            return {}
        usual = [*row[:at], replace(row[at], settings={}), *row[at + 1 :]]
        try:
            return {stage: words for stage, words in doubts(conditions, usual).items() if stage != name}
        except EngineError:
            del row[at]
    return {}


def _refused(conditions: Json, row: Sequence[Choice]) -> EngineError | None:
    try:
        new_design("row", "", conditions, row)
    except EngineError as refusal:
        return refusal
    return None


def _of_setting(refusal: EngineError, choice: Choice) -> bool:
    """Whether a setting of the stage is refused, or its name, which is asked in the same form."""
    return str(refusal).startswith((f"stage {choice.title()}, setting ", f"stage {choice.title()}, field name:"))


def _of_stage(refusal: EngineError, choice: Choice) -> bool:
    return str(refusal).startswith((f"stage {choice.title()}:", f"stage {choice.title()},"))


def _known(conditions: Json) -> Design:
    sequences = {"alarm": {"events": [], "ends": "1 s"}}
    return Design.load({"stagebook": 1, "name": "row", "conditions": conditions, "sequences": sequences})
