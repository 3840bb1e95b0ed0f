"""What a check sees of a design: its roles, anchors, requirements and what can be observed at its parts."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property

from ..circuit.circuit import SUPPLY_SWITCH, Circuit
from ..design.anchor import read_anchor
from ..design.datum import number
from ..design.document import Design
from ..design.part import Part, Stage
from ..design.requirement import Requirement
from ..design.sequence import ContactEvent, RelativeMoment
from ..errors import CircuitError, QuantityError
from ..kernel.layout import Floats
from ..parts.figures import Figure, figure
from ..primitives.builder import RETURN, Bench, Handle
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor, Row, Signal, crossing, voltage
from ..quantity import read
from .factors import COMMON_PRACTICE, FACTORS
from .ledger import Ledger

MAIN = "alarm"
VALUED = re.compile("resistor|capacitor|^pull_(up|down)|^end_of_line")
"""Roles of parts whose value is read."""
RESISTIVE = ("resistor", "thermistor", "light_resistor", "probe")
CHATTER = 2.0  # times the longest bounce of a contact: how long what it switches may go to and fro


@dataclass(frozen=True)
class View:
    """A design and its circuit, with the questions that checks ask of them; ``ledger`` notes what was answered."""

    design: Design
    circuit: Circuit
    ledger: Ledger | None = None

    def bench(self, ref: str) -> Bench:
        """What can be observed at a part."""
        return self.circuit.benches.get(ref, Bench())

    def roles_of(self, stage: Stage) -> Mapping[str, str]:
        """The roles of a stage. One that a part cannot be, a resistor that is a contact, is as if not filled."""
        return self._fitting[stage.name]

    @cached_property
    def _fitting(self) -> Mapping[str, Mapping[str, str]]:
        columns = {column.key for column in self.circuit.columns}
        kinds = {part.ref: part.kind for part in self.design.parts}

        def fits(role: str, ref: str) -> bool:
            if not VALUED.search(role):
                return True
            expected = ("capacitor",) if "capacitor" in role else RESISTIVE
            return (ref, "value") in columns and kinds[ref] in expected

        return {
            stage.name: {role: ref for role, ref in stage.roles.items() if fits(role, ref)}
            for stage in self.design.stages
        }

    def with_role(self, *roles: str) -> Iterator[tuple[Stage, str, Part]]:
        """Stage, role and part for every filled role of these names (``driver`` also finds ``driver_2``)."""
        for stage in self.design.stages:
            for role, ref in self.roles_of(stage).items():
                if any(role == name or role.startswith(f"{name}_") for name in roles):
                    yield stage, role, self.design.part(ref)

    def role(self, stage: Stage, name: str) -> Part | None:
        """The part that fills a role: in the stage itself, else in the first stage that fills it."""
        for place in (stage, *self.design.stages):
            if name in self.roles_of(place):
                return self.design.part(self.roles_of(place)[name])
        return None

    def stage_named(self, subject: str) -> str:
        """The stage of a requirement's subject: of a part, the first that has a net, or a stage itself."""
        if self.design.has_part(subject):
            return self.design.stage_of(subject).name
        for stage in self.design.stages:
            if subject == stage.name or any(subject in part.pins.values() for part in stage.parts):
                return stage.name
        return self.design.stages[0].name

    def load(self, stage: Stage) -> Part | None:
        """The load that tells when there is an alarm: of the stage itself, else the first of the design, among those
        that have a level at which they count as on; one that is on in stand-by only where there is no other."""
        loads = [(place, part) for place, _, part in self.with_role("load") if self.bench(part.ref).on is not None]
        loads.sort(key=lambda found: (self.rests_on(found[1]), found[0] is not stage))
        return loads[0][1] if loads else None

    def rests_on(self, load: Part) -> bool:
        """Whether a load is on in stand-by: the coil of a fail-safe relay, whose contacts all break."""
        moved = [part for _, part in self.parts_of("contact") if part.operated_by == load.ref]
        return load.kind == "coil" and bool(moved) and all(part.form == "break" for part in moved)

    def while_on(self, sequence: str, load: Part) -> Anchor:
        """The instant at which a load is on: a moment of the sequence, else a little after it came on."""
        names = ("standby", "normal") if self.rests_on(load) else ("sounding", "on")
        return self.moment(sequence, *names) or Anchor(1e-2, self.event(f"{load.ref} on"))

    def while_off(self, sequence: str, load: Part) -> tuple[Anchor, ...]:
        """The moments of a sequence at which a load must be off."""
        names = ("sounding", "on") if self.rests_on(load) else ("standby", "silent", "reset")
        return tuple(self.anchor(name, sequence) for name in names if name in self.design.sequences[sequence].moments)

    def base_emitter_resistor(self, stage: Stage, role: str) -> Part | None:
        """The resistor across the base-emitter junction of the transistor in this role, where its role is filled."""
        for name in (f"base_emitter_resistor_{role.removeprefix('latch_')}", "base_emitter_resistor"):
            if name in self.roles_of(stage):
                return self.design.part(self.roles_of(stage)[name])
        return None

    def parts_of(self, *kinds: str) -> Iterator[tuple[Stage, Part]]:
        """All parts of these kinds with their stages."""
        for stage in self.design.stages:
            for part in stage.parts:
                if part.kind in kinds:
                    yield stage, part

    def requirement(self, slug: str, *subjects: str) -> Requirement | None:
        """The requirement of a check about one of these parts, nets or stages; one that names nothing fits all."""
        fitting = [r for r in self.design.requirements if r.check == slug]
        for wanted in fitting:
            if wanted.of in subjects or (wanted.of is None and wanted.stage in (None, *subjects)):
                return wanted
        return None

    def required(self, slug: str, customary: float, requirement: Requirement | None = None) -> float:
        """The required margin: of the requirement, of the design's table, or the customary one."""
        own = None if requirement is None else requirement.required
        text = own or self.design.required.get(slug)
        found = customary if text is None else _share(text)
        if self.ledger is not None:
            self.ledger.required(found, self._said_by(slug, own, text, requirement))
        return found

    def derating(self, name: str, requirement: Requirement | None = None) -> float:
        """The factor on a rating: of the requirement, of the design's table, or the customary one of ``FACTORS``."""
        own = None if requirement is None else requirement.derating
        text = own or self.design.derating.get(name)
        found = FACTORS[name].customary if text is None else _share(text)
        if self.ledger is not None:
            source = self._said_by(name, own, text, requirement) or f"customary: {FACTORS[name].source}"
            self.ledger.factor(name, found, FACTORS[name].about, source)
        return found

    def _said_by(self, name: str, own: str | None, text: str | None, requirement: Requirement | None) -> str:
        """Who says a required margin or a factor, with the reason that is given; '' where it is the customary one."""
        if own is not None and requirement is not None:
            return "the requirement" + (f": {requirement.reason}" if requirement.reason else ", without a reason")
        reason = self.design.reasons.get(name)
        return "" if text is None else "the design's table" + (f": {reason}" if reason else ", without a reason")

    def extra(self, requirement: Requirement | None, key: str, unit: str) -> float | None:
        """A field that only one check reads. Raises CircuitError that names it when it cannot be read."""
        if requirement is None or key not in requirement.extras:
            return None
        try:
            found = number(requirement.extras[key], unit)
        except QuantityError as refusal:
            raise CircuitError(f"requirement {requirement.check}, field {key}: {refusal}") from refusal
        if self.ledger is not None:
            self.ledger.field(key, found, unit)
        return found

    def noted(self, what: str, value: float, unit: str, source: str) -> float:
        """A number in SI that enters a margin beside data, factors and columns, noted with who says it."""
        if self.ledger is not None:
            self.ledger.other(what, value, unit, source)
        return value

    def customary(self, what: str, value: float, unit: str) -> float:
        """A number that a check brings along because nothing else is said."""
        return self.noted(what, value, unit, f"customary: {COMMON_PRACTICE}")

    def limit(self, requirement: Requirement, end: str, unit: str) -> float:
        """``min`` or ``max`` of a requirement that gives it."""
        text = requirement.min if end == "min" else requirement.max
        assert text is not None
        return self.noted(f"{end} of the requirement", read(text, unit), unit, "the requirement")

    def strays_at(self, net: str) -> list[float]:
        """The capacitances of all strays to a net, F."""
        return [
            self.noted(f"stray {' - '.join(stray.between)}", read(stray.value, "F"), "F", "the strays of the design")
            for stray in self.design.strays
            if net in stray.between
        ]

    def datum(self, part: Part, key: str, unit: str) -> Figure | None:
        """A datum of a part or its class."""
        found = figure(part, key, unit)
        if self.ledger is not None and found is not None:
            self.ledger.datum(part, key, unit, found)
        return found

    def forward(self, part: Part | None, key: str, lanes: Lanes) -> Floats | float:
        """The forward voltage of a diode at one of its points, in every lane; 0 where it is not given."""
        found = None if part is None else self.datum(part, key, "V")
        if part is None or found is None:
            return 0.0
        column = part.ref, "forward_low"
        low = figure(part, "forward_low", "V")
        return found.typical + (lanes[column] - low.typical if low is not None and column in lanes else 0.0)

    def sequence(self, requirement: Requirement | None, *names: str) -> str:
        """The sequence to judge in: that of the requirement, the first of these names that exists, or the main one."""
        if requirement is not None and requirement.sequence is not None:
            if requirement.sequence not in self.design.sequences:
                known = ", ".join(self.design.sequences)
                raise CircuitError(
                    f"requirement {requirement.check}, field sequence: there is no '{requirement.sequence}';"
                    f" write one of {known}"
                )
            return requirement.sequence
        return next((name for name in names if name in self.design.sequences), MAIN)

    def ends(self, sequence: str) -> float:
        """How long a sequence lasts, s."""
        return read(self.design.sequences[sequence].ends, "s")

    def anchor(self, text: str, sequence: str, after: Anchor | None = None) -> Anchor:
        """The instant that a requirement or moment names: a time, a named moment or an observed event."""
        moments = self.design.sequences[sequence].moments
        if text in moments:
            moment = moments[text]
            if isinstance(moment, RelativeMoment):
                found = self.anchor(moment.after, sequence)
                return Anchor(found.by + read(moment.by, "s"), found.row)
            return Anchor(read(moment, "s"))
        try:
            return Anchor(read(text, "s"))
        except QuantityError:
            return Anchor(0.0, self.event(text, after))

    def moment(self, sequence: str, *names: str) -> Anchor | None:
        """The first of these moments that the sequence has."""
        moments = self.design.sequences[sequence].moments
        return next((self.anchor(name, sequence) for name in names if name in moments), None)

    def awaited(self, text: str, sequence: str) -> str | None:
        """The observed event that an instant waits for, such as ``LS1 on``; None for a time of the sequence."""
        moments = self.design.sequences[sequence].moments
        if text in moments:
            moment = moments[text]
            return self.awaited(moment.after, sequence) if isinstance(moment, RelativeMoment) else None
        try:
            read(text, "s")
        except QuantityError:
            return text
        return None

    def event(self, text: str, after: Anchor | None = None) -> Row:
        """The row that finds an observed event such as ``LS1 on`` or ``timing above 2 V``, the first one ``after``."""
        anchor = read_anchor(text)
        if anchor.level is not None:
            signal, level, rising = voltage(anchor.subject), anchor.level, anchor.change == "above"
            first = after or Anchor()
        else:
            bench = self.bench(anchor.subject)
            on = bench.on
            if anchor.change in ("in", "out") and bench.armature is not None:
                on = bench.armature, RETURN, 0.5
            if on is None:
                raise CircuitError(
                    f"'{text}': part {anchor.subject} has no level at which it counts as on;"
                    " write its operating_minimum"
                )
            plus, minus, level = on
            signal, rising = voltage(plus, minus), anchor.change in ("on", "in")
            # A load goes off after it came on: after the instant asked for, else after it first did.
            first = after or (Anchor() if rising else Anchor(0.0, crossing(signal, level, True)))
        if first.row is not None and first.row.signal == signal and first.row.rising != rising:
            first = Anchor(max(first.by, self.chatter), first.row)
        return crossing(signal, level, rising, first)

    @cached_property
    def chatter(self) -> float:
        """How long a load goes on and off with a bouncing contact, s: on counts from the first time, off after it."""
        events = (event for sequence in self.design.sequences.values() for event in sequence.events)
        bounces = (event.bounce for event in events if isinstance(event, ContactEvent))
        return CHATTER * max((read(bounce.for_, "s") for bounce in bounces if bounce is not None), default=0.0)

    @cached_property
    def supply_current(self) -> Signal | None:
        """Current drawn from the supply; None where the supply has no source resistance to see it through."""
        switch = self.circuit.builder.switches.get(SUPPLY_SWITCH)
        return None if switch is None else Handle("conductance", switch[0], ()).current


def _share(text: str) -> float:
    return read(text, "%") if "%" in text else read(text, "")


def polarity(part: Part) -> float:
    """+1 for an npn or n-channel kind, -1 for a pnp or p-channel kind."""
    return -1.0 if part.kind.endswith(("pnp", "mosfet_p")) else 1.0


def forward_base_voltage(part: Part) -> Signal:
    """The base-emitter voltage, positive when the junction conducts."""
    return voltage(part.pins["base"], part.pins["emitter"]).scaled(polarity(part))
