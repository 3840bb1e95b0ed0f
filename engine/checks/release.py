"""Check 16: does a coil let go of its contacts in time?

Its current goes on through the clamp: i(t) = (I_0 + V_k/R) exp(-t R/L) - V_k/R (circuit of R and L against a constant
voltage), down to the drop-out current; the armature then takes its own time.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..design.requirement import Requirement
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..parts.physics import copper_factor
from ..primitives.signals import Anchor, Row, level, maximum, voltage
from .check import Ask, Check, Judged, ratio, unknown
from .duration import instant
from .seen import Seen
from .view import View

DELAYS = ("release_delay", "armature_delay")


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every coil of which a requirement says how soon it must let go."""
    for stage, coil in view.parts_of("coil"):
        requirement = view.requirement(check.slug, coil.ref, stage.name)
        if requirement is not None:
            yield _ask(check, view, stage, coil, requirement)


def _ask(check: Check, view: View, stage: Stage, coil: Part, requirement: Requirement) -> Ask:
    if requirement.max is None:
        raise CircuitError(f'requirement release of {coil.ref}: write "max", the time allowed, for example "20 ms"')
    allowed = view.limit(requirement, "max", "s")
    required = view.required(check.slug, check.required, requirement)
    sequence = view.sequence(requirement)
    delay = next((key for key in DELAYS if view.datum(coil, key, "s") is not None), None)
    if delay is None:
        return unknown(check, stage.name, coil.ref, sequence, required, f"armature_delay of {coil.ref}")
    let_go, opens = requirement.from_ or f"{coil.ref} off", requirement.to or f"{coil.ref} out"
    first = view.anchor(let_go, sequence)
    last = view.anchor(opens, sequence, first)
    hand = _Decay(view, coil, delay, first)

    def judge(seen: Seen) -> Judged:
        begin, end = (instant(seen, anchor, sequence) for anchor in (first, last))
        outcomes = [
            (~np.isfinite(begin), check.words["never"].format(what=let_go)),
            (np.isfinite(begin) & ~np.isfinite(end), check.words["holds"].format(coil=coil.ref)),
        ]
        capability = np.full(seen.lanes.count, allowed)
        return ratio(end - begin, capability, outcomes, hand=1.0 - hand.seconds(seen, sequence) / allowed)

    rows = (*hand.rows, *(anchor.row for anchor in (first, last) if anchor.row is not None))
    return Ask(check, stage.name, coil.ref, (sequence,), required, judge, rows)


class _Decay:
    """The closed form of the time until a coil lets go."""

    def __init__(self, view: View, coil: Part, delay: str, first: Anchor) -> None:
        self.ref, self.delay = coil.ref, delay
        ohms = view.datum(coil, "resistance", "ohm")
        assert ohms is not None
        self.typical = ohms.typical
        across = voltage(coil.pins["a"], coil.pins["b"])
        self.before = maximum(across, Anchor(), first)
        self.clamp = maximum(across.scaled(-1.0), first)
        rise = view.bench(coil.ref).rise
        self.warm = None if rise is None else level(rise, first)
        self.rows: tuple[Row, ...] = (self.before, self.clamp, *(() if self.warm is None else (self.warm,)))

    def seconds(self, seen: Seen, sequence: str) -> Floats:
        """L/R ln((I_0 R + V_k) / (I_drop R + V_k)) and the armature's time, s."""
        lanes = seen.lanes
        rise = 0.0 if self.warm is None else np.nan_to_num(seen.value(self.warm, sequence))
        ohms = lanes[self.ref, "resistance"] * copper_factor(lanes.ambient + rise)
        clamp = np.maximum(0.0, seen.value(self.clamp, sequence))
        start = np.maximum(0.0, seen.value(self.before, sequence)) + clamp
        end = lanes[self.ref, "drop_out"] / self.typical * ohms + clamp
        decay = lanes[self.ref, "inductance"] / ohms * np.log(np.maximum(start / end, 1.0))
        return np.asarray(decay + lanes[self.ref, self.delay])


CHECKS = (
    Check(
        number=16,
        slug="release",
        title="release of a coil",
        unit="s",
        required=0.2,
        formula="D = time from the coil's voltage being taken away until its contacts move, C = allowed time",
        asks=asks,
        reads={"of": "K1", "from": "K1 off", "to": "K1 out", "max": "20 ms"},
        worst="high supply, cold, a coil that lets go at little current",
        by_hand="L/R ln((I_0 R + V_k) / (I_drop R + V_k)) + armature, V_k the highest voltage of the clamp",
        hand_source="closed form of R and L against a constant voltage",
        accuracy=0.05,
        leaves_out="a clamp that yields",
        words={"never": "'{what}' never came", "holds": "{coil} did not let go"},
    ),
)
