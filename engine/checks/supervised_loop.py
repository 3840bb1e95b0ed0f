"""Check 19: are the levels of an end-of-line loop clear of both thresholds, with line, leakage and threshold drift?

Each of the four gaps between short, low threshold, normal, high threshold and open is compared with what it is in the
nominal unit, thresholds without drift; the smallest share that is left counts.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace

import numpy as np

from ..design.datum import number
from ..design.part import Part, Stage
from ..design.requirement import Requirement
from ..errors import CircuitError, QuantityError
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Row, level, voltage
from .check import Ask, Check, Judged, ratio, unknown
from .seen import Seen
from .view import View

SHORT, NORMAL, OPEN = MOMENTS = ("short", "normal", "open")
Look = Callable[[Row], Floats]


@dataclass(frozen=True)
class Threshold:
    """A threshold with its drift, each volts or a share of the rail; or what ``row`` shows of the loop as it trips."""

    value: float
    share: bool
    drift: float
    drift_share: bool
    row: Row | None = None

    def volts(self, look: Look, rail: Floats, side: float) -> Floats:
        """The threshold, drifted to one side."""
        drift = side * self.drift * (rail if self.drift_share else 1.0)
        if self.row is not None:
            return np.asarray(look(self.row) + drift)
        return np.asarray(self.value * (rail if self.share else 1.0) + drift + 0.0 * rail)


@dataclass(frozen=True)
class Divider:
    """Pull resistor, line and end-of-line resistor alone, without what is connected to the loop."""

    pull: Part
    end: Part
    leads: tuple[Part, ...]
    up: bool

    @classmethod
    def of(cls, view: View, stage: Stage) -> Divider | None:
        """That of the design, where the roles end_of_line and pull_up (or pull_down) are filled."""
        end = view.role(stage, "end_of_line")
        for role in ("pull_up", "pull_down"):
            pull = view.role(stage, role)
            if end is not None and pull is not None:
                leads = tuple(part for place, part in view.parts_of("lead") if place is view.design.stage_of(end.ref))
                return cls(pull, end, leads, role == "pull_up")
        return None

    def levels(self, lanes: Lanes, rail: Floats) -> tuple[Floats, Floats, Floats]:
        """Shorted, normal and open: rail / (1 + R_pull G), for a pull-down from the other side."""
        line, leak = np.zeros(lanes.count), np.zeros(lanes.count)
        for lead in self.leads:
            line = line + lanes[lead.ref, "resistance"]
            if (lead.ref, "insulation") in lanes:
                leak = leak + 1.0 / lanes[lead.ref, "insulation"]
        ends = (1.0 / np.maximum(line, 1e-3), 1.0 / (lanes[self.end.ref, "value"] + line), np.zeros(lanes.count))
        pull = lanes[self.pull.ref, "value"]
        if self.up:
            short, normal, opened = (rail / (1.0 + pull * (each + leak)) for each in ends)
        else:
            # The line leaks to 0V beside the pull resistor.
            short, normal, opened = (rail * each / (each + leak + 1.0 / pull) for each in ends)
        return short, normal, opened


@dataclass(frozen=True)
class Loop:
    """Levels of the loop and of its rail at the three moments, and the two thresholds."""

    levels: tuple[Row, ...]
    rail: Row
    low: Threshold
    high: Threshold
    divider: Divider | None

    @property
    def rows(self) -> tuple[Row, ...]:
        """Everything that is observed."""
        found = (*self.levels, self.rail, *(each.row for each in (self.low, self.high) if each.row is not None))
        return tuple(dict.fromkeys(found))

    def gaps(self, look: Look, lanes: Lanes, drifted: bool = True) -> Floats:
        """Volts between short, low threshold, normal, high threshold and open, (4, lanes).

        What trips may hold the line near its threshold once it conducts: beyond a threshold the level counts that the
        divider has without it, where the divider is known.
        """
        short, normal, opened = (look(row) for row in self.levels)
        if self.divider is not None:
            alone = self.divider.levels(lanes, look(self.rail))
            outer = (np.minimum, np.maximum) if self.divider.up else (np.maximum, np.minimum)
            # A level that was not seen stays so.
            short, opened = outer[0](short, alone[0]), outer[1](opened, alone[2])
        return self.between(short, normal, opened, look, drifted)

    def between(self, short: Floats, normal: Floats, opened: Floats, look: Look, drifted: bool = True) -> Floats:
        """The same for given levels; a loop to the supply is open at the bottom and shorted at the top."""
        rail, side = look(self.rail), 1.0 if drifted else 0.0
        bottom, top = np.minimum(short, opened), np.maximum(short, opened)
        return np.array(
            [
                self.low.volts(look, rail, -side) - bottom,
                normal - self.low.volts(look, rail, side),
                self.high.volts(look, rail, -side) - normal,
                top - self.high.volts(look, rail, side),
            ]
        )


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement of a supervised loop."""
    for requirement in view.design.requirements:
        if requirement.check == check.slug:
            yield _ask(check, view, requirement)


def _ask(check: Check, view: View, requirement: Requirement) -> Ask:
    net = requirement.of
    if net is None or net not in view.design.nets:
        raise CircuitError('requirement supervised_loop: write the net of the loop as "of", for example "line"')
    sequence = view.sequence(requirement, "loop")
    required = view.required(check.slug, check.required, requirement)
    stage = view.design.stage(view.stage_named(net))
    for name in MOMENTS:
        if name not in view.design.sequences[sequence].moments:
            missing = f"moment {name} of the sequence {sequence}, at which the level of the loop is read"
            return unknown(check, stage.name, net, sequence, required, missing)
    found = {key: _threshold(view, requirement, key, net, sequence) for key in ("low", "high")}
    low, high = found["low"], found["high"]
    if low is None or high is None:
        missing = f"{'low' if low is None else 'high'} threshold of the loop (requirement field: 35 %, 2 V or an event)"
        return unknown(check, stage.name, net, sequence, required, missing)
    ats = {name: view.anchor(name, sequence) for name in MOMENTS}
    rail = level(voltage(str(requirement.extras.get("rail", "supply"))), ats[NORMAL])
    levels = tuple(level(voltage(net), ats[name]) for name in MOMENTS)
    loop = Loop(levels, rail, low, high, Divider.of(view, stage))

    def judge(seen: Seen) -> Judged:
        nominal = seen.circuit.nominal()
        planned = loop.gaps(seen.again(sequence, loop.rows, nominal).value, nominal, drifted=False)[:, 0]

        def look(row: Row) -> Floats:
            return seen.value(row, sequence)

        left = loop.gaps(look, seen.lanes)
        shares = _shares(left, planned)
        smallest = np.argmin(np.nan_to_num(shares, nan=np.inf), axis=0)
        there, was = np.take_along_axis(left, smallest[None], 0)[0], planned[smallest]
        hand = None
        if loop.divider is not None:
            alone = loop.divider.levels(seen.lanes, look(rail))
            hand = _shares(loop.between(*alone, look), planned).min(axis=0)
        never = np.asarray(~np.isfinite(left).all(axis=0))
        apart = "the roles end_of_line and pull_up or pull_down are not filled" if hand is None else ""
        judged = ratio(was - there, was, [(never, check.words["never"])], hand, apart)
        return replace(judged, each=tuple(shares))

    return Ask(check, stage.name, net, (sequence,), required, judge, loop.rows)


def _shares(left: Floats, planned: Floats) -> Floats:
    """What is left of each planned gap; of one that even the nominal unit does not have less than nothing."""
    safe = np.where(planned > 0.0, planned, 1.0)[:, None]
    return np.where(planned[:, None] > 0.0, left / safe, -1.0)


def _threshold(view: View, requirement: Requirement, key: str, net: str, sequence: str) -> Threshold | None:
    text = requirement.extras.get(key)
    if text is None:
        return None
    share, drift_share = "%" in str(text), "%" in str(requirement.extras.get("drift", ""))
    drift = view.extra(requirement, "drift", "" if drift_share else "V") or 0.0
    try:
        return Threshold(number(text, "" if share else "V"), share, drift, drift_share)
    except QuantityError:
        row = level(voltage(net), view.anchor(str(text), sequence))
        return Threshold(0.0, False, drift, drift_share, row)


CHECKS = (
    Check(
        number=19,
        slug="supervised_loop",
        title="supervised loop",
        unit="V",
        required=0.3,
        formula="C = nominal gap between a level and a threshold, D = what spread and drift take of it, worst of four",
        asks=asks,
        reads={"of": "line", "low": "35 %", "high": "65 %", "drift": "3 %", "rail": "supply"},
        worst="longest and leakiest line, thresholds at both ends of their drift",
        by_hand="rail / (1 + R_pull (1/(R_end + R_line) + 1/R_leak)) and the same shorted and open",
        hand_source="divider, Ohm's law",
        accuracy=0.05,
        leaves_out="draw of the thresholds",
        words={"never": "one of the moments at which the loop is read, or an event of a threshold, never came"},
    ),
)
