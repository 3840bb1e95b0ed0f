"""A new design of stages in a row, and a stage of the catalogue added to a design."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import TypeVar

from ..design.conditions import Conditions
from ..design.document import Design
from ..design.part import Stage
from ..errors import DesignError
from ..quantity import read, write
from . import stage_kinds
from .kind import Drive, Intake, Json, Sense, Wire
from .modified import asked
from .row import Choice, MadeStage, Place, advance, kind_named, make_row, make_stage

RISE = "20 ms"  # in which the supply comes where a sequence does not ask for another
FIRST = 1.0  # s before the alarm begins, at least
AFTER = 2.0  # s after all that stages bring
BEGINS = "begins"
"""The moment at which the alarm begins: what starts it does so, or the supply comes."""
_FACTS = ("load", "contact", "trips")
RESTS_ON = "rests on"
"""The fact that the load is the coil of a fail-safe relay."""
_STATES = re.compile(r"{load} (on|off)")
T = TypeVar("T")
READ = 0.5  # s after the load came on at which levels are read, at most


def new_design(name: str, purpose: str, conditions: Json, choices: Sequence[Choice]) -> Design:
    """A design of catalogue stages from left to right, with sequences and requirements that follow from them.

    ``conditions`` are those of the document. Raises DesignError naming the stage and setting that does not fit.
    """
    if not choices:
        raise DesignError("the row has no stage; put one in first")
    _single_names([choice.title() for choice in choices])
    empty = Design.load(_document(name, purpose, conditions, [], {"alarm": {"events": [], "ends": "1 s"}}, []))
    row = make_row(empty.conditions, choices)
    stages = [made.stage for made in row]
    facts = _facts(row)
    sequences: dict[str, Json] = {"alarm": _alarm(row, facts)}
    for made in row:
        sequences.update(_filled(dict(made.made.sequences), facts))
    requirements = [
        each
        for n, made in enumerate(row)
        for each in _required(made, facts | _trips(row[n + 1 :], facts))
        if not _too_short(each, row[n + 1 :])
    ]
    return Design.load(_document(name, purpose, conditions, stages, sequences, requirements))


def _document(
    name: str, purpose: str, conditions: Json, stages: Sequence[Json], sequences: Json, requirements: Sequence[Json]
) -> Json:
    return {
        "stagebook": 1,
        "name": name,
        "purpose": purpose,
        "conditions": conditions,
        "stages": list(stages),
        "sequences": sequences,
        **({"requirements": list(requirements)} if requirements else {}),
    }


def _single_names(names: Sequence[str]) -> None:
    for name in names:
        if names.count(name) > 1:
            raise DesignError(f"two stages are called {name}; give each a name of its own")


def _facts(row: Sequence[MadeStage]) -> dict[str, str]:
    """The load and the contact of the design, which texts of its stages name."""
    return _named([made.stage for made in row])


def _trips(following: Sequence[MadeStage], facts: Mapping[str, str]) -> dict[str, str]:
    """The event with which what follows a stage acts: its output passes half of its rail, or the load comes on."""
    for made in following[:1]:
        port = made.kind.port(Wire.OUT)
        if port is not None and made.made.output is not None and made.made.output.sense is Sense.LEVEL:
            return {"trips": f"{made.stage['ports'][port.name]} above {write(0.5 * made.rail, 'V')}"}
    return {"trips": _filled("{load} on", facts)} if "load" in facts else {}


def _named(stages: Sequence[Json]) -> dict[str, str]:
    # A relay is what switches: the load that it switches tells of the alarm where there is one.
    roles = sorted((stage.get("roles", {}) for stage in stages), key=lambda each: "relay_contact" in each)
    found = {name: next((each[name] for each in roles if name in each), None) for name in ("load", "contact")}
    facts = {name: ref for name, ref in found.items() if ref is not None}
    moved = [part for stage in stages for part in stage["parts"] if part.get("operated_by") == facts.get("load", "")]
    return facts | ({RESTS_ON: "yes"} if moved and all(part.get("form") == "break" for part in moved) else {})


def _start(row: Sequence[MadeStage]) -> float:
    acts = any(made.made.acts for made in row)
    return max(FIRST, 1.5 * sum(made.made.settles for made in row)) if acts else 0.0


def _alarm(row: Sequence[MadeStage], facts: Mapping[str, str]) -> Json:
    """The sequence that fires the alarm: the supply comes, all settles, and what starts it starts it."""
    start = _start(row)
    events: list[Json] = [{"at": "0 s", "event": "connect supply", "rise": RISE}]
    own = [act for made in row for act in made.made.acts]
    acts = sorted(((max(0.0, start + at), event) for at, event in own), key=lambda act: act[0])
    over = max([start + sum(made.made.lasts for made in row), *(at for at, _ in acts)])
    if not acts:
        # What the supply itself starts goes on until it is taken away.
        acts = [(over + 0.5 * AFTER, {"event": "disconnect supply"})]
    events += [{"at": write(at, "s", digits=6), **event} for at, event in acts]
    moments: Json = {BEGINS: write(start, "s", digits=6)}
    rests = [made.made.standby for made in row if made.made.standby is not None]
    if start > 0.0:
        moments["standby"] = write(0.9 * start, "s", digits=6)
    elif rests:
        moments["standby"] = write(min(rests), "s", digits=6)
    active = [made.made.active for made in row if made.made.active is not None]
    if "load" in facts:
        by = write(min([READ, *(0.2 * each for each in active)]), "s")
        moments["sounding"] = _filled({"after": "{load} on", "by": by}, facts)
        if active and RESTS_ON not in facts:
            moments["silent"] = {"after": f"{facts['load']} off", "by": by}
    for made in row:
        moments.update(_moments(made, facts))
    if "silent" in moments:
        # What flashes from the start rests between two flashes only.
        moments.setdefault("standby", moments["silent"])
    return {"events": events, "ends": write(over + AFTER, "s", digits=6), "moments": moments}


def _moments(made: MadeStage, facts: Mapping[str, str]) -> Json:
    """The moments that a stage knows of; those after a load only where the design has one."""
    return _filled({name: each for name, each in made.made.moments.items() if _answered(each, facts)}, facts)


def _answered(entry: object, facts: Mapping[str, str]) -> bool:
    text = json.dumps(entry)
    return all(name in facts or f"{{{name}}}" not in text for name in _FACTS)


def _required(made: MadeStage, facts: Mapping[str, str]) -> list[Json]:
    """The requirements that a stage brings; those about a load or a contact only where the design has one."""
    return [_filled(each, facts) for each in made.made.requirements if _answered(each, facts)]


def _too_short(requirement: Json, following: Sequence[MadeStage]) -> bool:
    """Whether an event of the asked length cannot count, because what follows wants it to last longer."""
    holds = max((made.holds for made in following), default=0.0)
    return requirement["check"] == "acceptance" and read(requirement["min"], "s") < holds


def _filled(entry: T, facts: Mapping[str, str]) -> T:
    """The texts of an entry with the names that it leaves open; a load that rests on tells of an alarm by going off."""
    text = json.dumps(entry)
    if RESTS_ON in facts:
        text = _STATES.sub(lambda found: "{load} off" if found[1] == "on" else "{load} on", text)
    for name, value in facts.items():
        text = text.replace(f"{{{name}}}", value)
    found: T = json.loads(text)
    return found


def doubts(conditions: Json, choices: Sequence[Choice]) -> dict[str, tuple[str, ...]]:
    """What will not hold of a row as it is asked for, by stage: the check, why, and what to write instead."""
    empty = Design.load(_document("row", "", conditions, [], {"alarm": {"events": [], "ends": "1 s"}}, []))
    return doubted(make_row(empty.conditions, choices))


def doubted(row: Sequence[MadeStage]) -> dict[str, tuple[str, ...]]:
    """What will not hold of stages that are made, by stage."""
    found = {made.stage["name"]: made.made.doubts for made in row}
    for name, words in _set_again(row).items():
        found[name] = (*found[name], words)
    return {name: words for name, words in found.items() if words}


def _set_again(row: Sequence[MadeStage]) -> dict[str, str]:
    """The doubt about a timer that resets a latch which what started it still sets: by the timer's name."""
    held, level, found = 0.0, False, {}
    for made in row:
        begun = [at for at, event in made.made.acts if event["event"] in ("close", "open")]
        held = max([held, *(max(begun) - min(begun) for _ in begun[:1])])
        if "latch_npn" in made.stage["roles"]:
            level = "input_resistor" in made.stage["roles"]
        resets = made.kind.port(Wire.BASE) is not None and "base" in made.stage["ports"]
        if level and resets and made.made.active is not None and held > made.made.active:
            over, lasts = write(held, "s", digits=3), write(made.made.active, "s", digits=3)
            found[made.stage["name"]] = (
                f"duration: what sets the latch is held for {over}, longer than the alarm of {lasts}: it comes again"
                " and again meanwhile; put a differentiator before the latch, or write a longer time"
            )
    return found


# -- a stage added to a design


def place_after(design: Design) -> Place:
    """Where a stage stands that is put at the end of a design: behind the rails and signals of its catalogue stages."""
    place = Place()
    for stage in design.stages:
        kind = stage_kinds().get(stage.kind)
        if kind is not None:
            made = _made_again(design.conditions, stage, place)
            place = advance(place, kind, stage.ports, made.made)
    return place


def _made_again(conditions: Conditions, stage: Stage, place: Place) -> MadeStage:
    """What the catalogue makes of a stage's settings: what it gives to the next one is read from that."""
    return make_stage(conditions, Choice(stage.kind, stage.name, asked(stage.settings)), place, Intake(), frozenset())[
        0
    ]


def with_catalogue_stage(design: Design, choice: Choice, ports: Mapping[str, str] | None = None) -> Design:
    """A catalogue stage at the end of a design, connected to what stands before it, or by ``ports`` to other nets.

    It brings its parts and roles, the requirements that the design can answer, and its own sequences; what starts it
    is added to the sequence ``alarm``. Raises DesignError.
    """
    _single_names([*(stage.name for stage in design.stages), choice.title()])
    place = place_after(design)
    kind = kind_named(choice.kind)
    wanted = {port.wire: net for port in kind.ports if (net := (ports or {}).get(port.name))}
    if Wire.IN in wanted and wanted[Wire.IN] != place.signal:
        place = replace(place, signal=wanted[Wire.IN], drive=Drive((kind.takes or (Sense.LEVEL,))[0]))
    place = replace(
        place,
        rail=wanted.get(Wire.RAIL, place.rail),
        quiet=wanted.get(Wire.QUIET, place.quiet),
        base=wanted.get(Wire.BASE, place.base),
    )
    taken = frozenset(part.ref for part in design.parts)
    (made,) = make_row(design.conditions, [choice], place, taken)
    return _added(design, made)


def _added(design: Design, made: MadeStage) -> Design:
    document = design.dump()
    document.setdefault("stages", []).append(made.stage)
    facts = _named(document["stages"])
    alarm = document["sequences"]["alarm"]
    events = alarm.setdefault("events", [])
    begun = [read(event["at"], "s") for event in events if event["event"] in ("close", "open", "set", "ramp")]
    start = begun[0] if begun else FIRST * bool(made.made.acts)
    alarm.setdefault("moments", {}).setdefault(BEGINS, write(start, "s", digits=6))
    events += [{"at": write(max(0.0, start + at), "s", digits=6), **event} for at, event in made.made.acts]
    ends = max(read(alarm["ends"], "s") + made.made.lasts, *(start + at + AFTER for at, _ in made.made.acts), 0.0)
    alarm["ends"] = write(ends, "s", digits=6)
    moments = _moments(made, facts)
    if "load" in facts:
        moments.setdefault("sounding", _filled({"after": "{load} on", "by": write(READ, "s")}, facts))
    for name, moment in moments.items():
        alarm["moments"].setdefault(name, moment)
    for name, sequence in _filled(dict(made.made.sequences), facts).items():
        document["sequences"].setdefault(name, sequence)
    required = _required(made, facts | _trips((), facts))
    if required:
        document.setdefault("requirements", []).extend(required)
    return Design.load(document)
