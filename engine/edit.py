"""Edits of a design: each is a pure function that returns a new design and leaves the old one as it was.

Every function raises DesignError, in one line that says what to write, where the result would not be a document.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from .design.anchor import read_anchor
from .design.document import Design
from .design.part import Part
from .errors import DesignError, QuantityError
from .parts import kinds
from .parts.classes import CLASSES
from .parts.edited import objections, only_class, same_pins
from .parts.made import OF_THE_PLACE, resolved
from .preferred import next_down, next_up, series_for
from .quantity import read, write

_USUAL_TOLERANCE = {"ohm": 0.05, "F": 0.1}
"""Which series steps a value whose tolerance is not given (common practice, no source)."""
_FIELDS = {field.alias or name for name, field in Part.model_fields.items()}
_SAME_REQUIREMENT = ("check", "of", "stage", "sequence")


def with_field(design: Design, ref: str, field: str, text: Any) -> Design:
    """One field of a part written anew; None takes it out.

    ``field`` is a dotted path: ``tolerance``, ``pins.a``, ``current.max``, ``law.forward_gain``. A datum that the part
    has under ``data`` is written there, one that the document does not know as a field as well.
    """
    part = design.part(ref)
    first, *rest = field.split(".")
    if first == "ref":
        raise DesignError(f"{_where(design, ref)}, field ref: a designator stays; add a part of the other name instead")
    if first == "kind":
        return with_kind(design, ref, str(text))
    inside = first in part.data or first not in _FIELDS
    path = ["data", first, *rest] if inside else [first, *rest]

    def change(document: dict[str, Any]) -> None:
        _put(_part_in(document, ref), path, text)

    edited = _edited(design, change)
    _suits(part, edited, path)
    return edited


def with_kind(design: Design, ref: str, name: str) -> Design:
    """A part of another kind with the same pins. A class that the kind does not have gives way to its only one."""
    part = design.part(ref)
    kind = kinds().get(name)
    others = same_pins(part, kinds())
    if kind is None or name not in (part.kind, *others):
        offered = ", ".join(others) or "none: take it out and add another"
        raise DesignError(f"{_where(design, ref)}, field kind: with these pins it could be {offered}")

    def change(document: dict[str, Any]) -> None:
        place = _part_in(document, ref)
        place["kind"] = name
        if part.class_ not in CLASSES.get(name, {}):
            place.pop("class", None)
            only = only_class(name)
            if only is not None:
                place["class"] = only

    edited = _edited(design, change)
    _suits(part, edited)
    return edited


def _suits(before: Part, edited: Design, path: list[str] | None = None) -> None:
    """Raise DesignError for what the kind of an edited part says against it; fields not on ``path`` may be missing."""
    for field, words in objections(before, edited.part(before.ref), kinds()):
        if path is None or field.split(".")[: len(path)] == path or path[0] == field:
            words = words.replace(" is missing;", " is needed;")
            raise DesignError(f"{_where(edited, before.ref)}, field {field}: {words}")


def with_value(design: Design, ref: str, text: str) -> Design:
    """A part's value written anew."""
    return with_field(design, ref, "value", text)


def stepped_value(design: Design, ref: str, steps: int) -> Design:
    """A part's value moved by preferred values of the series that suits its tolerance, up or down (IEC 60063)."""
    part = design.part(ref)
    kind = kinds().get(part.kind)
    entry = None if kind is None else kind.fields.get("value")
    if entry is None or part.value is None:
        raise DesignError(f"{_where(design, ref)}, field value: it has no value to step; write one or edit its data")
    try:
        value = read(part.value, entry.unit)
        known = _USUAL_TOLERANCE.get(entry.unit, 0.05) if part.tolerance is None else read(part.tolerance, "%")
        step = next_up if steps > 0 else next_down
        for _ in range(abs(steps)):
            value = step(value, series_for(known))
        return with_value(design, ref, write(value, entry.unit))
    except QuantityError as refusal:
        raise DesignError(f"{_where(design, ref)}, field value: {refusal}") from refusal


def with_part(design: Design, stage: str, part: Mapping[str, Any]) -> Design:
    """A part added to a stage at its end, or written anew where the stage has one of that designator."""
    design.stage(stage)

    def change(document: dict[str, Any]) -> None:
        _put_entry(_stage_in(document, stage).setdefault("parts", []), dict(part), ("ref",))

    return _edited(design, change)


def with_made_part(design: Design, ref: str, made: Mapping[str, Any], name: str) -> Design:
    """A part with the data of a made part, copied in full with their sources; ``name`` says which one it was.

    Designator, nets and what the place asks for stay, and so do value and tolerance where the made part has none.
    """
    part = design.part(ref)
    if made.get("kind") != part.kind:
        raise DesignError(
            f"{_where(design, ref)}, field kind: it is a {part.kind} and no {made.get('kind')}; add a part"
        )
    before = part.model_dump(mode="json", by_alias=True, exclude_unset=True)
    stays = {key: value for key, value in before.items() if key in (*OF_THE_PLACE, "value", "tolerance")}
    after = {**stays, **resolved(made), "drawer": name}

    def change(document: dict[str, Any]) -> None:
        stage = _stage_in(document, design.stage_of(ref).name)
        stage["parts"] = [after if each["ref"] == ref else each for each in stage["parts"]]

    return _edited(design, change)


def without_part(design: Design, ref: str) -> Design:
    """A part taken out, with the roles, events, requirements and moments that are about it."""
    design.part(ref)

    def change(document: dict[str, Any]) -> None:
        for stage in document["stages"]:
            stage["parts"] = [part for part in stage.get("parts", []) if part["ref"] != ref]
            if "roles" in stage:
                stage["roles"] = {role: its for role, its in stage["roles"].items() if its != ref}
        for sequence in document["sequences"].values():
            if "events" in sequence:
                sequence["events"] = [event for event in sequence["events"] if event.get("part") != ref]
            if "moments" in sequence:
                sequence["moments"] = {k: v for k, v in sequence["moments"].items() if _subject(v) != ref}
        if "requirements" in document:
            document["requirements"] = [each for each in document["requirements"] if each.get("of") != ref]

    return _edited(design, change)


def with_stage(design: Design, stage: Mapping[str, Any]) -> Design:
    """A stage added at the end, or written anew where the design has one of that name."""

    def change(document: dict[str, Any]) -> None:
        _put_entry(document.setdefault("stages", []), dict(stage), ("name",))

    return _edited(design, change)


def without_stage(design: Design, name: str) -> Design:
    """A stage taken out with its parts and what is about them."""
    for part in design.stage(name).parts:
        design = without_part(design, part.ref)

    def change(document: dict[str, Any]) -> None:
        document["stages"] = [stage for stage in document["stages"] if stage["name"] != name]

    return _edited(design, change)


def with_role(design: Design, stage: str, role: str, ref: str | None) -> Design:
    """A role of a stage filled by a part; None leaves it open."""
    design.stage(stage)
    return _edited(design, lambda document: _put(_stage_in(document, stage), ["roles", role], ref))


def with_condition(design: Design, name: str, text: Any) -> Design:
    """A condition written anew: ``supply.min``, ``ambient.nominal``, ``leakage``; None takes it out."""
    return _edited(design, lambda document: _put(document, ["conditions", *name.split(".")], text))


def with_requirement(design: Design, requirement: Mapping[str, Any]) -> Design:
    """A requirement added, or written anew where check, subject, stage and sequence are those of one there is."""

    def change(document: dict[str, Any]) -> None:
        _put_entry(document.setdefault("requirements", []), dict(requirement), _SAME_REQUIREMENT)

    return _edited(design, change)


def with_requirement_at(design: Design, index: int, requirement: Mapping[str, Any]) -> Design:
    """The requirement at ``index`` (from 0) written anew in its place."""
    without_requirement(design, index)

    def change(document: dict[str, Any]) -> None:
        document["requirements"][index] = dict(requirement)

    return _edited(design, change)


def without_requirement(design: Design, index: int) -> Design:
    """The requirement at ``index`` (from 0) taken out."""
    if not 0 <= index < len(design.requirements):
        raise DesignError(f"there is no requirement {index + 1}; write a number from 1 to {len(design.requirements)}")
    return _edited(design, lambda document: document["requirements"].pop(index))


def with_required(design: Design, check: str, text: str | None, reason: str | None = None) -> Design:
    """The required margin of a check in this design, and why it differs; None returns to the customary one."""
    return _tabled(design, "required", check, text, reason)


def with_derating(design: Design, name: str, text: str | None, reason: str | None = None) -> Design:
    """A derating factor of this design, and why it differs; None returns to the customary one."""
    return _tabled(design, "derating", name, text, reason)


def _tabled(design: Design, table: str, name: str, text: str | None, reason: str | None) -> Design:
    def change(document: dict[str, Any]) -> None:
        _put(document, [table, name], text)
        stands = any(name in document.get(each, {}) for each in ("required", "derating"))
        _put(document, ["reasons", name], reason if stands else None)

    return _edited(design, change)


def with_sequence(design: Design, name: str, sequence: Mapping[str, Any] | None) -> Design:
    """A sequence added or written anew; None takes it out."""
    return _edited(design, lambda document: _put(document, ["sequences", name], sequence))


def with_stray(design: Design, one: str, other: str, text: str | None) -> Design:
    """The stray capacitance between two nets; None takes it out."""

    def change(document: dict[str, Any]) -> None:
        strays = document.setdefault("strays", [])
        places = [place for place, stray in enumerate(strays) if {*stray["between"]} == {one, other}]
        if text is None:
            document["strays"] = [stray for place, stray in enumerate(strays) if place not in places]
        elif places:
            strays[places[0]]["value"] = text
        else:
            strays.append({"between": [one, other], "value": text})

    return _edited(design, change)


def with_name(design: Design, name: str) -> Design:
    """The design under another name."""
    return _edited(design, lambda document: _put(document, ["name"], name))


def with_purpose(design: Design, purpose: str) -> Design:
    """The sentence that says what the design is for."""
    return _edited(design, lambda document: _put(document, ["purpose"], purpose))


def _edited(design: Design, change: Callable[[dict[str, Any]], object]) -> Design:
    document = design.dump()
    change(document)
    return Design.load(document)


def _put(place: dict[str, Any], path: list[str], value: Any) -> None:
    """Write or take out what stands at a path; a plain text on the way becomes the usual member of its object."""
    first, *rest = path
    if not rest:
        if value is None:
            place.pop(first, None)
        else:
            place[first] = value
        return
    inner = place.get(first)
    if not isinstance(inner, dict):
        usual = {"supply": "nominal", "ambient": "nominal", "source_resistance": "nominal", "leakage": "specified"}
        inner = {} if inner is None else {usual.get(first, "typical"): inner}
    _put(inner, rest, value)
    if inner:
        place[first] = inner
    else:
        place.pop(first, None)


def _put_entry(entries: list[Any], entry: dict[str, Any], named_by: tuple[str, ...]) -> None:
    """Write an entry in the place of the first that has the same name, or at the end."""
    for place, each in enumerate(entries):
        if all(each.get(key) == entry.get(key) for key in named_by):
            entries[place] = entry
            return
    entries.append(entry)


def _stage_in(document: dict[str, Any], name: str) -> dict[str, Any]:
    found: dict[str, Any] = next(stage for stage in document["stages"] if stage["name"] == name)
    return found


def _part_in(document: dict[str, Any], ref: str) -> dict[str, Any]:
    parts = (part for stage in document["stages"] for part in stage.get("parts", []))
    found: dict[str, Any] = next(part for part in parts if part["ref"] == ref)
    return found


def _subject(moment: Any) -> str | None:
    """What a relative moment observes; None for an absolute one."""
    return read_anchor(moment["after"]).subject if isinstance(moment, dict) else None


def _where(design: Design, ref: str) -> str:
    return f"stage {design.stage_of(ref).name}, part {ref}"
