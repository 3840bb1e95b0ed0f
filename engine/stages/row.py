"""Stages in a row: each is connected to the ones before it, and sized by what the one after it takes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

from ..design.conditions import Conditions, Levels
from ..errors import DesignError
from . import stage_kinds
from .kind import NOTHING_KNOWN, Beyond, Drive, Intake, Json, Made, StageKind, Wire
from .kind import Place as Order
from .modified import AS_MADE, digest
from .plan import RETURN, Plan

SUPPLY = "supply"
_NEW = {Wire.OUT, Wire.NEW_RAIL, Wire.NEW_QUIET, Wire.NEW_BASE}
OWN = 2e-3  # A that small stages draw beside what they hand on, from memory
_ROOM = Levels(25.0, 25.0, 25.0)


@dataclass(frozen=True)
class Choice:
    """A stage to be made: its kind, its name (that of the kind where none is given), and what is asked of it."""

    kind: str
    name: str = ""
    settings: Mapping[str, str] = field(default_factory=dict)

    def title(self) -> str:
        """The stage's name."""
        return self.name or usual_name(self.kind)


@dataclass(frozen=True)
class Place:
    """Where a row has got to: the nets that the next stage is connected to, and what they carry."""

    rail: str = SUPPLY
    quiet: str = SUPPLY
    signal: str | None = None
    drive: Drive | None = None
    base: str | None = None
    rail_drop: float = 0.0
    quiet_drop: float = 0.0


@dataclass(frozen=True)
class MadeStage:
    """A stage as the document holds it, and what else it brings. ``rail`` is its nominal rail in V.

    ``holds`` is how long in s what comes into it must stay.
    """

    stage: Json
    made: Made
    kind: StageKind
    rail: float
    holds: float = 0.0


def usual_name(kind: str) -> str:
    """What a stage of a kind is called where nothing is said."""
    found = stage_kinds().get(kind)
    return (found.called if found else "") or kind.replace("_", "-")


def kind_named(name: str) -> StageKind:
    """The stage kind of this name. Raises DesignError."""
    found = stage_kinds().get(name)
    if found is None:
        raise DesignError(f"there is no stage kind {name!r}; write one of {', '.join(stage_kinds())}")
    return found


def checked(choice: Choice) -> Choice:
    """The choice itself, where its settings can be read. Raises DesignError naming stage and setting."""
    any_rail = Levels(12.0, 12.0, 12.0)
    Plan(kind_named(choice.kind), choice.title(), choice.settings, {}, any_rail, any_rail, _ROOM).check()
    return choice


def make_row(
    conditions: Conditions, choices: Sequence[Choice], place: Place = Place(), taken: frozenset[str] = frozenset()
) -> tuple[MadeStage, ...]:
    """All stages of a row, connected and sized. Raises DesignError naming stage and setting."""
    # What an entry must carry follows from the stages behind it, and what these draw a little from what it loses.
    beyond = [Beyond()] * len(choices)
    for _ in range(2):
        plans = _plans(conditions, choices, place, beyond)
        beyond = _beyond(plans)
    following = [plan.next for plan in _plans(conditions, choices, place, beyond)]
    made: list[MadeStage] = []
    for choice, after, behind in zip(choices, following, beyond, strict=True):
        stage, place = make_stage(conditions, choice, place, after, taken, behind)
        taken |= {part["ref"] for part in stage.stage["parts"]}
        made.append(stage)
    return tuple(made)


def _joined(own: Intake, next_one: Intake) -> Intake:
    """What two stages on one net take together."""
    surges = [each.surge for each in (own, next_one) if each.surge is not None]
    surge = max(surges) if surges else None
    return Intake(own.current + next_one.current, own.threshold or next_one.threshold, passes=True, surge=surge)


def _kept(kind: StageKind, own: Intake, next_one: Intake) -> Intake:
    """What a stage takes, with how long it must get it for the stages behind: what an edge starts, or a latch, needs no
    more than a moment."""
    takes = _joined(own, next_one) if own.passes else own
    keeps = kind.edge or kind.port(Wire.NEW_BASE) is not None
    longest = own if keeps or own.holds >= next_one.holds else next_one
    return replace(
        takes, holds=longest.holds, holds_least=longest.holds_least, cut=longest.cut, instead=longest.instead
    )


def _plans(conditions: Conditions, choices: Sequence[Choice], place: Place, beyond: Sequence[Beyond]) -> list[Plan]:
    """Plans of all stages at their places, each with what the one after it takes."""
    places = []
    for choice, behind in zip(choices, beyond, strict=True):
        places.append(place)
        if kind_named(choice.kind).port(Wire.NEW_QUIET) or kind_named(choice.kind).port(Wire.NEW_RAIL):
            # How far rails go down does not depend on what comes in.
            _, place = make_stage(conditions, choice, place, Intake(), frozenset(), behind)
    takes = Intake()
    plans: list[Plan] = []
    for choice, at in zip(reversed(choices), reversed(places), strict=True):
        plan = _plan(conditions, choice, at, takes, frozenset(), Beyond())
        plan.check()
        plans.insert(0, plan)
        own = plan.kind.intake(plan)
        takes = _kept(plan.kind, own, takes)
    return plans


def _beyond(plans: Sequence[Plan]) -> list[Beyond]:
    """What the stages behind each one draw: all loads together, and the largest that a small stage hands on."""
    found = []
    for number in range(len(plans)):
        behind = plans[number + 1 :]
        loads = sum(plan.kind.draws(plan) for plan in behind)
        handed = max((plan.next.current for plan in behind if plan.kind.place is not Order.SWITCH), default=0.0)
        rests = sum(plan.kind.rests(plan) for plan in behind)
        found.append(Beyond(loads or None, OWN + handed + rests if behind else None))
    return found


def make_stage(
    conditions: Conditions,
    choice: Choice,
    place: Place,
    after: Intake,
    taken: frozenset[str],
    beyond: Beyond = NOTHING_KNOWN,
) -> tuple[MadeStage, Place]:
    """One stage at its place, and the place of the next one."""
    plan = _plan(conditions, choice, place, after, taken, beyond)
    plan.check()
    kind = plan.kind
    if place.drive is not None and kind.port(Wire.IN) and place.drive.sense not in kind.takes:
        raise DesignError(
            f"stage {plan.stage}: a {kind.title} does not take a {place.drive.sense} signal, which the stage before it"
            f" gives; put one before it that gives a {' or '.join(kind.takes)}"
        )
    if place.drive is None and kind.port(Wire.IN) and not kind.supply_starts:
        raise DesignError(f"stage {plan.stage}: a {kind.title} needs a signal; put a contact or a sensor before it")
    if place.drive is not None and kind.edge and place.drive.slow:
        raise DesignError(
            f"stage {plan.stage}: a {kind.title} takes only a steep edge, which the stage before it does not give; put"
            " a Schmitt trigger between, or leave a debounce out"
        )
    made = kind.make(plan)
    made = replace(made, doubts=(*made.doubts, *dict.fromkeys(plan.unbought)))
    used = {net for part in plan.parts for net in part["pins"].values()}
    ports = {name: net for name, net in plan.ports.items() if net in used}
    stage: Json = {
        "name": plan.stage,
        "kind": kind.name,
        "roles": plan.roles,
        "settings": {each.name: text for each in kind.settings if (text := plan.text(each.name))},
        "ports": ports,
        "parts": plan.parts,
    }
    stage["settings"] |= {f"{name}_{AS_MADE}": text for name, text in plan.found.items()}
    stage["settings"][AS_MADE] = digest(plan.parts, ports)
    return MadeStage(stage, made, kind, plan.rail.nominal, kind.intake(plan).holds), advance(place, kind, ports, made)


def advance(place: Place, kind: StageKind, ports: Mapping[str, str], made: Made) -> Place:
    """The place behind a stage."""

    def net(wire: Wire) -> str | None:
        port = kind.port(wire)
        return None if port is None else ports.get(port.name)

    rail = net(Wire.NEW_RAIL)
    quiet = net(Wire.NEW_QUIET)
    signal = net(Wire.OUT) if made.output is not None else None
    return Place(
        rail=rail or place.rail,
        quiet=quiet or rail or place.quiet,
        signal=signal or place.signal,
        drive=made.output if signal is not None else place.drive,
        base=net(Wire.NEW_BASE) or place.base,
        rail_drop=place.rail_drop + (made.rail_drop if rail else 0.0),
        quiet_drop=place.quiet_drop + made.quiet_drop
        if quiet
        else place.quiet_drop + (made.rail_drop if rail else 0.0),
    )


def _plan(
    conditions: Conditions, choice: Choice, place: Place, after: Intake, taken: frozenset[str], beyond: Beyond
) -> Plan:
    kind = kind_named(choice.kind)
    supply = conditions.levels("supply")
    if supply is None or supply.min <= 0.0:
        raise DesignError(
            'the catalogue sizes stages by the supply; write "supply": {"min": ..., "nominal": ..., "max": ...}'
        )
    name = choice.title()
    nets = {
        Wire.RAIL: place.rail,
        Wire.QUIET: place.quiet,
        Wire.RETURN: RETURN,
        Wire.IN: place.signal or place.quiet,
        Wire.BASE: place.base or f"{name}.{Wire.BASE}",
    }
    ports = {port.name: f"{name}.{port.name}" if port.wire in _NEW else nets[port.wire] for port in kind.ports}
    drop = place.quiet_drop
    rail = Levels(supply.min - drop, supply.nominal - drop, supply.max - 0.5 * drop)
    if rail.min <= 0.5:
        raise DesignError(
            f"stage {name}: the stages before it leave {rail.min:.2g} V of the lowest supply; feed it more"
        )
    ambient = conditions.levels("ambient") or _ROOM
    lost = place.rail_drop
    loads = Levels(supply.min - lost, supply.nominal - lost, supply.max - 0.5 * lost)
    source = conditions.levels("source_resistance")
    ohms = 0.0 if source is None else source.max
    return Plan(
        kind, name, choice.settings, ports, supply, rail, ambient, place.drive, after, taken, loads, beyond, ohms
    )
