"""Check 18: does a pulse that is induced in a line stay, behind the input filter, below what raises an alarm?

The pulse is an event ``inject`` of a sequence. The trial puts ever larger pulses of that width into the line; demand
and capability are read behind the filter, where the requirement says.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from ..circuit.timeline import Timeline
from ..design.requirement import Requirement
from ..design.sequence import Inject
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..primitives.signals import Anchor, Row, level, maximum, minimum, voltage
from ..quantity import read
from .alarm_state import TOLD_BY, alarm_states, settling
from .base_capacitance import held_by
from .charge_trial import SETTLE, charge_trial
from .check import Ask, Check, Judged, ratio, unknown
from .seen import Seen
from .view import View

LEAST, MOST = 1e-2, 300.0  # charges of the trial, in that of the event
BEFORE = 1e-6  # s before the pulse: what the net stands at


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement; it names the net behind the filter."""
    for requirement in view.design.requirements:
        if requirement.check == check.slug:
            yield _ask(check, view, requirement)


def _ask(check: Check, view: View, requirement: Requirement) -> Ask:
    net = requirement.of
    stages = [stage for stage in view.design.stages if any(net in part.pins.values() for part in stage.parts)]
    if net is None or not stages:
        raise CircuitError('requirement line_pulse: write "of", the net behind the input filter')
    stage = stages[0]
    pulses = {
        name: next((e for e in sequence.events if isinstance(e, Inject)), None)
        for name, sequence in view.design.sequences.items()
    }
    sequence = view.sequence(requirement, *(name for name, pulse in pulses.items() if pulse is not None))
    required = view.required(check.slug, check.required, requirement)
    pulse = pulses[sequence]
    if pulse is None:
        missing = f"an event inject in sequence {sequence}, with the charge that a pulse brings into the line"
        return unknown(check, stage.name, net, sequence, required, missing)
    states = alarm_states(view, stage)
    if not states:
        return unknown(check, stage.name, net, sequence, required, TOLD_BY)
    charge = view.noted("charge of the pulse", read(pulse.charge, "C"), "C", f"sequence {sequence}")
    width, at = (
        view.noted("width of the pulse", read(pulse.width, "s"), "s", f"sequence {sequence}"),
        read(pulse.at, "s"),
    )
    if charge == 0.0:
        raise CircuitError(f"sequence {sequence}, event inject: a charge of {pulse.charge} is no pulse; write another")
    sign = 1.0 if charge > 0.0 else -1.0
    settle = view.extra(requirement, "settle", "s") or settling(view, states, sequence, max(SETTLE, 10.0 * width))
    line_net = pulse.net

    def put(line: Timeline, begin: float, knob: Floats) -> None:
        line.inject(begin, line_net, sign * knob, width)

    own = _moved(net, sign, Anchor(at - BEFORE), Anchor(min(at + settle, view.ends(sequence))))
    # In the trial the pulse comes at once, and what the net stands at is the start.
    tried = _moved(net, sign, Anchor(0.0), Anchor(settle))
    trial = charge_trial(
        f"line pulse {net}",
        sequence,
        Anchor(at - BEFORE),
        states,
        [put],
        LEAST * abs(charge),
        MOST * abs(charge),
        settle,
        rows=tried,
    )

    def judge(seen: Seen) -> Judged:
        demand = sign * (seen.value(own[0], sequence) - seen.value(own[1], sequence))
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), demand=demand)
        capability = sign * (edge.values[tried[0]] - edge.values[tried[1]])
        words = check.words
        held = held_by(view, seen.lanes, net) + (held_by(view, seen.lanes, line_net) if line_net != net else 0.0)
        hand = 1.0 - abs(charge) / np.where(held > 0.0, held, np.nan) / np.where(capability > 0.0, capability, np.nan)
        apart = ((~(held > 0.0), f"nothing holds {net} against the pulse"),)
        judged = ratio(demand, capability, [(edge.always, words["always"])], hand, apart)
        margin = np.where(edge.never, 1.0, judged.margin)
        outcomes = (*judged.outcomes, (edge.never, words["immune"]))
        return replace(judged, margin=margin, outcomes=outcomes)

    screen = min(abs(charge) / (1.0 - required), MOST * abs(charge)) if required < 1.0 else None
    return Ask(check, stage.name, net, (sequence,), required, judge, own, trial, screen)


def _moved(net: str, sign: float, start: Anchor, end: Anchor) -> tuple[Row, Row]:
    """The extreme of a net in a window, and what it stands at when that begins."""
    extreme = maximum if sign > 0.0 else minimum
    return extreme(voltage(net), start, end), level(voltage(net), start)


CHECKS = (
    Check(
        number=18,
        slug="line_pulse",
        title="line pulse",
        unit="V",
        required=0.5,
        formula="D = how far the pulse moves the net behind the input filter, C = how far it may before an alarm comes",
        asks=asks,
        reads={"of": "line", "settle": "0.1 s"},
        words={
            "always": "a hundredth of the pulse raises an alarm",
            "immune": "no pulse raises an alarm, up to three hundred times the charge",
        },
        worst="high supply, hot, small filter capacitor",
        by_hand="(Q / (C_line + C_filter)) / C: the charge spreads over both and none of it leaks away meanwhile",
        accuracy=0.15,
        leaves_out="drains of the line, clamps",
    ),
)
