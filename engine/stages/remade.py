"""A design that was made of catalogue stages: what will not hold of it as it is now, and the same with a stage that is
asked for something else."""

from __future__ import annotations

from ..design.document import Design
from ..design.part import Part, Stage
from ..errors import DesignError, QuantityError
from ..quantity import read
from . import stage_kinds
from .making import doubted, new_design
from .modified import asked, is_modified
from .row import Choice, MadeStage, make_row

FAR = 1.3  # times: a value that is no further off than that is what the catalogue would put in
_UNITS = {"resistor": "ohm", "capacitor": "F"}
_SHOWN = 3


def doubts_of(design: Design) -> dict[str, tuple[str, ...]]:
    """By stage: the doubts that its row has now, and where a stage was sized for another row or other conditions.

    A stage that was changed by hand is not compared. Where the row could not be made as it is now, the stage that is in
    the way is told.
    """
    stages = [stage for stage in design.stages if stage.kind in stage_kinds()]
    try:
        row = make_row(design.conditions, [choice_of(stage) for stage in stages])
    except DesignError as refusal:
        named = [
            stage.name for stage in stages if str(refusal).startswith((f"stage {stage.name}:", f"stage {stage.name},"))
        ]
        return dict.fromkeys(named, (f"sizing: as the row is now it could not be made: {refusal}",))
    found = doubted(row)
    for stage, made in zip(stages, row, strict=True):
        other = [] if is_modified(stage) else _others(stage, made)
        if other:
            more = f" and {len(other) - _SHOWN} more" if len(other) > _SHOWN else ""
            words = (
                "sizing: it was made for another row or other conditions; for these the catalogue puts in"
                f" {', '.join(other[:_SHOWN])}{more}"
            )
            found[stage.name] = (*found.get(stage.name, ()), words)
    return found


def asked_again(design: Design, name: str, choice: Choice) -> Design:
    """The design made anew with ``choice`` for the stage of this name: its row is sized as a whole, and its sequences
    and requirements follow. Raises DesignError where something that was changed by hand would be lost."""
    for stage in design.stages:
        if stage.kind not in stage_kinds():
            raise DesignError(f"stage {stage.name} was put in by hand; only a row of catalogue stages is made anew")
        if is_modified(stage):
            raise DesignError(f"stage {stage.name} was changed by hand, which would be lost; take that back first (u)")
    document = design.dump()
    row = [choice_of(stage) for stage in design.stages]
    again = [choice if each.title() == name else each for each in row]
    before, after = (new_design(design.name, "", document["conditions"], each).dump() for each in (row, again))
    for field in ("sequences", "requirements"):
        if document.get(field) != before.get(field):
            raise DesignError(
                f"its {field} are others than its row brings, and would be lost; take that back first (u), or begin"
                " another design of stages (n on the shelf)"
            )
    for field in ("stages", "sequences", "requirements"):
        document[field] = after.get(field, [])
    return Design.load(document)


def choice_of(stage: Stage) -> Choice:
    """What was asked of a stage."""
    return Choice(stage.kind, stage.name, asked(stage.settings))


def _others(stage: Stage, made: MadeStage) -> list[str]:
    """What would be another part now, by the roles that both fill: ``R11 330R, not 680R``."""
    now = {part["ref"]: part for part in made.stage["parts"]}
    found = []
    for role, ref in stage.roles.items():
        fresh = now.get(made.stage["roles"].get(role, ""))
        part = next((each for each in stage.parts if each.ref == ref), None)
        if fresh is None or part is None:
            continue
        if _far(part, fresh.get("value")):
            found.append(f"{ref} {fresh['value']}, not {part.value}")
        elif part.kind not in _UNITS and fresh.get("class") != part.entry("class"):
            found.append(f"{ref} {fresh.get('class')}, not {part.entry('class')}")
    return found


def _far(part: Part, text: str | None) -> bool:
    unit = _UNITS.get(part.kind)
    if unit is None or text is None or part.value is None:
        return False
    try:
        one, other = read(text, unit), read(part.value, unit)
    except QuantityError:
        return False
    return max(one, other) > FAR * min(one, other)
