"""Check 21: does a sensor trip within its window, with the hysteresis that is asked for and more than its ripple?

Everything is in the quantity of the sensor that the sequence ramps: ohm, lux, deg C, volts of a generator. The level at
an event is that of the ramp at the instant of the event: the ramp must be slow against the circuit.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from ..circuit.name_inspection import LEVELS
from ..circuit.timeline import timeline
from ..design.requirement import Requirement
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor
from .check import Apart, Ask, Check, Judged, ratio, unknown, window
from .divider_point import divider_point
from .duration import instant
from .seen import Seen
from .view import View

DIFFERENCE = {"degC": "K"}


@dataclass(frozen=True)
class Ramped:
    """What a requirement is about: a part that events set, or the name of a quantity that parts follow."""

    name: str
    ref: str
    unit: str
    stage: str

    def level(self, seen: Seen, sequence: str, at: Floats) -> Floats:
        """The quantity at an instant per lane, NaN where the instant is not known."""
        design = seen.circuit.design
        lanes = Lanes(seen.lanes.columns, seen.lanes.values)
        starts = design.starts_of(sequence) is not None
        line = timeline(seen.circuit, lanes, design.sequences[sequence], starts=starts)
        source = seen.circuit.builder.generators.get(self.ref)
        wave = line.quantities[self.ref] if source is None else line.sources[source]
        known = np.isfinite(at)
        when = np.where(known, at, 0.0)[:, None]
        value, _ = wave.pieces(when, when)
        return np.where(known, np.broadcast_to(value[:, 0], at.shape), np.nan)


def _ramped(view: View, requirement: Requirement) -> Ramped:
    subject = requirement.of
    for part in view.design.parts:
        if subject is not None and subject in (part.ref, part.follows) and part.kind in LEVELS:
            return Ramped(subject, part.ref, LEVELS[part.kind], view.design.stage_of(part.ref).name)
    raise CircuitError(
        f'requirement {requirement.check}: write the part whose level the sequence ramps as "of", for example "RT1"'
    )


def window_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement of a trip window."""
    for requirement in view.design.requirements:
        if requirement.check == check.slug:
            yield _window_ask(check, view, requirement)


def _window_ask(check: Check, view: View, requirement: Requirement) -> Ask:
    ramped = _ramped(view, requirement)
    if requirement.min is None or requirement.max is None or requirement.at is None:
        raise CircuitError(
            f'requirement trip_window of {ramped.name}: write "at" (the event with which it trips), "min" and "max"'
        )
    low, high = (view.limit(requirement, end, ramped.unit) for end in ("min", "max"))
    if not low < high:
        raise CircuitError(
            f"requirement trip_window of {ramped.name}: min {requirement.min} is not below max {requirement.max}"
        )
    sequence = view.sequence(requirement, "trip")
    required = view.required(check.slug, check.required, requirement)
    anchor, words = view.anchor(requirement.at, sequence), check.words["never"].format(what=requirement.at)

    def judge(seen: Seen) -> Judged:
        at = instant(seen, anchor, sequence)
        hand = divider_point(view, requirement, "trip_level", ramped.ref, seen)
        return window(ramped.level(seen, sequence, at), low, high, [(~np.isfinite(at), words)], hand, _why(hand))

    rows = () if anchor.row is None else (anchor.row,)
    return Ask(check, ramped.stage, ramped.ref, (sequence,), required, judge, rows, unit=ramped.unit)


def _why(hand: Floats | None) -> Apart:
    """Why there is no hand value, and where."""
    if hand is None:
        return ((None, "no bridge_resistor in its role, or no trip_level (and release_level) in the requirement"),)
    return ((np.isnan(hand), "by hand the level is not reached within what the sequences set"),)


@dataclass(frozen=True)
class Pair:
    """The events of tripping and of letting go again, and the level between them."""

    ramped: Ramped
    sequence: str
    texts: tuple[str, str]
    anchors: tuple[Anchor, Anchor]
    view: View
    requirement: Requirement

    @classmethod
    def of(cls, view: View, requirement: Requirement) -> Pair:
        """The pair that a requirement names."""
        ramped, trip, release = _ramped(view, requirement), requirement.from_, requirement.to
        if trip is None or release is None:
            raise CircuitError(
                f'requirement {requirement.check} of {ramped.name}: write "from" (the event with which it trips) and'
                ' "to" (the one with which it lets go)'
            )
        sequence = view.sequence(requirement, "trip")
        first = view.anchor(trip, sequence)
        last = view.anchor(release, sequence, first)
        return cls(ramped, sequence, (trip, release), (first, last), view, requirement)

    @property
    def unit(self) -> str:
        """The unit of a difference."""
        return DIFFERENCE.get(self.ramped.unit, self.ramped.unit)

    def hysteresis(self, seen: Seen) -> Floats:
        """Level between the two events per lane, NaN where one of them never came."""
        ends = [self.ramped.level(seen, self.sequence, instant(seen, each, self.sequence)) for each in self.anchors]
        return np.abs(ends[1] - ends[0])

    def by_hand(self, seen: Seen) -> Floats | None:
        """The same from the divider, where the requirement tells both levels."""
        keys = ("trip_level", "release_level")
        ends = [divider_point(self.view, self.requirement, key, self.ramped.ref, seen) for key in keys]
        return None if ends[0] is None or ends[1] is None else np.abs(ends[1] - ends[0])

    def outcomes(self, seen: Seen, words: str) -> list[tuple[np.ndarray, str]]:
        """Which of the events never came."""
        pairs = zip(self.anchors, self.texts, strict=True)
        return [(~np.isfinite(instant(seen, each, self.sequence)), words.format(what=text)) for each, text in pairs]

    def ask(self, check: Check, required: float, judge: object) -> Ask:
        """The ask that such a requirement makes."""
        rows = tuple(each.row for each in self.anchors if each.row is not None)
        return Ask(check, self.ramped.stage, self.ramped.ref, (self.sequence,), required, judge, rows, unit=self.unit)  # type: ignore[arg-type]


def hysteresis_window_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement of a hysteresis between two limits."""
    for requirement in view.design.requirements:
        if requirement.check == check.slug:
            pair = Pair.of(view, requirement)
            if requirement.min is None or requirement.max is None:
                raise CircuitError(f'requirement hysteresis_window of {pair.ramped.name}: write "min" and "max"')
            low, high = (view.limit(requirement, end, pair.unit) for end in ("min", "max"))
            if not low < high:
                raise CircuitError(
                    f"requirement hysteresis_window of {pair.ramped.name}: min {requirement.min} is not below"
                    f" max {requirement.max}"
                )
            required = view.required(check.slug, check.required, requirement)
            yield _hysteresis_window(check, pair, required, low, high)


def _hysteresis_window(check: Check, pair: Pair, required: float, low: float, high: float) -> Ask:
    def judge(seen: Seen) -> Judged:
        hand = pair.by_hand(seen)
        return window(pair.hysteresis(seen), low, high, pair.outcomes(seen, check.words["never"]), hand, _why(hand))

    return pair.ask(check, required, judge)


def hysteresis_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement of a hysteresis above its ripple."""
    for requirement in view.design.requirements:
        if requirement.check == check.slug:
            pair = Pair.of(view, requirement)
            required = view.required(check.slug, check.required, requirement)
            ripple = view.extra(requirement, "ripple", pair.unit)
            if ripple is None:
                missing = f"ripple of {pair.ramped.name}, peak to peak (requirement field ripple)"
                yield unknown(check, pair.ramped.stage, pair.ramped.ref, pair.sequence, required, missing)
            else:
                yield _hysteresis(check, pair, required, ripple)


def _hysteresis(check: Check, pair: Pair, required: float, ripple: float) -> Ask:
    def judge(seen: Seen) -> Judged:
        wanted = np.full(seen.lanes.count, ripple)
        by_hand = pair.by_hand(seen)
        hand = None if by_hand is None else 1.0 - ripple / by_hand
        return ratio(wanted, pair.hysteresis(seen), pair.outcomes(seen, check.words["never"]), hand, _why(hand))

    return pair.ask(check, required, judge)


NEVER = {"never": "'{what}' never came"}
CHECKS = (
    Check(
        number=21,
        slug="trip_window",
        title="trip window",
        unit="",
        required=0.1,
        formula="x = level of the sensor at the event of tripping, m = min(U - x, x - L) / ((U - L)/2)",
        asks=window_asks,
        reads={"of": "RT1", "at": "LS1 on", "min": "1.3 C", "max": "2.7 C", "trip_level": "50 %"},
        worst="both extremes of temperature and supply",
        by_hand="level at which sensor and bridge_resistor give the trip_level of the requirement",
        accuracy=0.1,
        leaves_out="other draws on the divider",
        words=NEVER,
        source="that of the duration window: common practice, no source",
    ),
    Check(
        number=21,
        slug="hysteresis_window",
        title="hysteresis window",
        unit="",
        required=0.1,
        formula="x = level between the events of tripping and letting go, m = min(U - x, x - L) / ((U - L)/2)",
        asks=hysteresis_window_asks,
        reads={
            "of": "RT1",
            "from": "LS1 on",
            "to": "LS1 off",
            "min": "1 K",
            "max": "2 K",
            "trip_level": "50 %",
            "release_level": "40 %",
        },
        worst="both extremes of supply and gain",
        by_hand="between the levels at which sensor and bridge_resistor give trip_level and release_level",
        accuracy=0.1,
        leaves_out="other draws on the divider",
        words=NEVER,
        source="that of the duration window: common practice, no source",
    ),
    Check(
        number=21,
        slug="hysteresis",
        title="hysteresis",
        unit="",
        required=0.5,
        formula="D = ripple peak to peak, C = level between the events of tripping and letting go",
        asks=hysteresis_asks,
        reads={
            "of": "RT1",
            "from": "LS1 on",
            "to": "LS1 off",
            "ripple": "0.2 K",
            "trip_level": "50 %",
            "release_level": "40 %",
        },
        worst="low supply, weak h_FE",
        by_hand="ripple over what lies between trip_level and release_level of sensor and bridge_resistor",
        accuracy=0.1,
        leaves_out="other draws on the divider",
        words=NEVER,
    ),
)
