"""Names that a design uses for its parts and nets: in roles, sequences, strays, starting voltages and requirements."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping
from difflib import get_close_matches

from ..design.anchor import Anchor, read_anchor
from ..design.document import Design
from ..design.requirement import Requirement
from ..design.sequence import (
    ContactEvent,
    Dip,
    Inject,
    RampLevel,
    RelativeMoment,
    Sequence,
    SetLevel,
    Surge,
    Timed,
)
from ..errors import QuantityError
from ..quantity import read
from .net_inspection import RETURN, SUPPLY

LEVELS = {"probe": "ohm", "lead": "ohm", "preset": "", "generator": "V", "light_resistor": "lx", "thermistor": "degC"}
"""What ``set`` and ``ramp`` write for a part of this kind."""
_SENSORS = ("light_resistor", "thermistor")
AMBIENT = "ambient"
_EQUAL = 1e-9
"""Times that differ by less than this share are the same: they are sums of what was typed."""


def name_faults(design: Design) -> Iterator[str]:
    """Names of parts, nets, moments and sequences that the design does not have, a line each."""
    refs = {part.ref: part.kind for part in design.parts}
    nets = {*design.nets, RETURN, SUPPLY}
    for stage in design.stages:
        for role, ref in stage.roles.items():
            if ref not in refs:
                yield f"stage {stage.name}, role {role}: {_absent('part', ref, refs)}"
        for part in stage.parts:
            if part.operated_by is not None and refs.get(part.operated_by) != "coil":
                coils = [ref for ref, kind in refs.items() if kind == "coil"]
                where = f"stage {stage.name}, part {part.ref}, field operated_by"
                yield f"{where}: {_absent('coil', part.operated_by, coils)}"
    for number, stray in enumerate(design.strays, 1):
        for net in stray.between:
            if net not in nets:
                yield f"stray {number}, field between: {_absent('net', net, nets)}"
    yield from _start_faults("field starts", design.starts or {}, nets)
    for name, sequence in design.sequences.items():
        for words in _sequence_faults(design, sequence, refs, nets):
            yield f"sequence {name}, {words}"
    for number, requirement in enumerate(design.requirements, 1):
        what = " ".join(filter(None, (requirement.check, requirement.of)))
        for words in _requirement_faults(design, requirement, refs, nets):
            yield f"requirement {number} ({what}), {words}"


def _sequence_faults(
    design: Design, sequence: Sequence, refs: Mapping[str, str], nets: Collection[str]
) -> Iterator[str]:
    ends = read(sequence.ends, "s")
    yield from _start_faults("field starts", sequence.starts or {}, nets)
    for number, event in enumerate(sequence.events, 1):
        for words in _event_faults(design, event, ends, refs, nets):
            yield f"event {number} ({event.event}), {words}"
    for name, moment in sequence.moments.items():
        if isinstance(moment, RelativeMoment):
            for words in _anchor_faults(read_anchor(moment.after), refs, nets):
                yield f"moment {name}, field after: {words}"
        elif read(moment, "s") > ends:
            yield f"moment {name}: {moment} lies after the end at {sequence.ends}; write a time up to it"


def _event_faults(
    design: Design, event: Timed, ends: float, refs: Mapping[str, str], nets: Collection[str]
) -> Iterator[str]:
    over = read(event.at, "s")
    if isinstance(event, Dip | Surge | RampLevel):
        over += read(event.for_, "s")
    if isinstance(event, Inject):
        over += read(event.width, "s")
    if over > ends * (1 + _EQUAL):
        yield f"field at: it is over {over - ends:.3g} s after the end; write an earlier time or a later 'ends'"
    if isinstance(event, ContactEvent):
        contacts = [part.ref for part in design.parts if part.kind == "contact" and part.operated_by is None]
        if event.part not in refs:
            yield f"field part: {_absent('part', event.part, contacts)}"
        elif event.part not in contacts:
            operator = design.part(event.part).operated_by
            why = f"is operated by {operator}" if operator else f"is a {refs[event.part]}, not a contact"
            yield f"field part: {event.part} {why}; write {_one_of(contacts, 'contact')}"
    elif isinstance(event, SetLevel | RampLevel):
        yield from _level_faults(design, event, refs)
    elif isinstance(event, Inject):
        if event.net not in nets:
            yield f"field net: {_absent('net', event.net, nets)}"
        if read(event.width, "s") <= 0.0:
            yield f"field width: a pulse of {event.width} cannot be; write it like '100 ns'"
    elif SUPPLY not in design.nets:
        yield f"no pin is on '{SUPPLY}', so nothing would feel it; write '{SUPPLY}' as a net or leave the event out"


def _level_faults(design: Design, event: SetLevel | RampLevel, refs: Mapping[str, str]) -> Iterator[str]:
    quantities = {part.follows for part in design.parts if part.follows is not None}
    if event.part not in refs and event.part not in quantities:
        yield f"field part: {_absent('part or followed quantity', event.part, {*refs, *quantities})}"
    elif event.part in refs and refs[event.part] not in LEVELS:
        settable = [ref for ref, kind in refs.items() if kind in LEVELS]
        why = "a contact, which close and open move" if refs[event.part] == "contact" else f"a {refs[event.part]}"
        yield f"field part: {event.part} is {why}, and has no level; write {_one_of(settable, 'probe or a preset')}"
    elif event.part == AMBIENT:
        yield "field part: the ambient is a condition; let the sensor follow a quantity with a name of its own"
    elif isinstance(event.to, str):
        unit = LEVELS.get(_kind_set(design, event.part))
        try:
            read(event.to, unit)
        except QuantityError as refusal:
            yield f"field to: {refusal}"


def _kind_set(design: Design, name: str) -> str:
    """The kind of the part, or of the sensor that follows the quantity, that an event sets."""
    return next((part.kind for part in design.parts if part.ref == name), "") or next(
        (part.kind for part in design.parts if part.follows == name and part.kind in _SENSORS), ""
    )


def _start_faults(where: str, starts: Mapping[str, str], nets: Collection[str]) -> Iterator[str]:
    for net, voltage in starts.items():
        if net not in nets:
            yield f"{where}: {_absent('net', net, nets)}"
        elif net == RETURN and read(voltage, "V") != 0:
            yield f"{where}: {RETURN} is the return and stands at 0 V; leave it out"


def _requirement_faults(
    design: Design, requirement: Requirement, refs: Mapping[str, str], nets: Collection[str]
) -> Iterator[str]:
    stages = [stage.name for stage in design.stages]
    followed = {part.follows for part in design.parts}
    if requirement.of is not None and requirement.of not in {*refs, *nets, *stages, *followed}:
        yield f"field of: {_absent('part, net or stage', requirement.of, [*refs, *nets, *stages])}"
    if requirement.stage is not None and requirement.stage not in stages:
        yield f"field stage: {_absent('stage', requirement.stage, stages)}"
    if requirement.sequence is not None and requirement.sequence not in design.sequences:
        yield f"field sequence: {_absent('sequence', requirement.sequence, design.sequences)}"
        return
    moments = design.sequences[requirement.sequence or "alarm"].moments
    for field, text in (("from", requirement.from_), ("to", requirement.to)):
        if text is None or text in moments or _is_time(text):
            continue
        try:
            faults = list(_anchor_faults(read_anchor(text), refs, nets))
        except QuantityError as refusal:
            faults = [f"{refusal}" + (f", or a moment ({', '.join(moments)})" if moments else "")]
        yield from (f"field {field}: {words}" for words in faults)


def _is_time(text: str) -> bool:
    try:
        read(text, "s")
    except QuantityError:
        return False
    return True


def _anchor_faults(anchor: Anchor, refs: Mapping[str, str], nets: Collection[str]) -> Iterator[str]:
    if anchor.level is not None:
        if anchor.subject not in nets:
            yield _absent("net", anchor.subject, nets)
        return
    coils = [ref for ref, kind in refs.items() if kind == "coil"]
    if anchor.subject not in refs:
        yield _absent("part", anchor.subject, refs)
    elif anchor.change in ("in", "out") and anchor.subject not in coils:
        kind = refs[anchor.subject]
        yield f"{anchor.subject} is a {kind}, and only a coil goes in and out; write {_one_of(coils, 'coil')}"


def _absent(what: str, name: str, known: Collection[str]) -> str:
    """That a name is not there, and the one that is probably meant."""
    near = get_close_matches(name, known, 1, 0.5)
    return f"there is no {what} '{name}'; write {near[0] if near else _one_of(sorted(known), what)}"


def _one_of(known: Collection[str], what: str) -> str:
    if not known:
        return f"one after adding a {what} to the design"
    listed = list(known)
    return ("one of " if len(listed) > 1 else "") + ", ".join(listed[:8]) + (" ..." if len(listed) > 8 else "")
