"""Whether a design is in alarm, as trials see it: its latch conducts or, where it has none, its load is on."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ..design.part import Stage
from ..design.sequence import ConnectSupply, DisconnectSupply
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor, Row, Signal, crossing, level, maximum, minimum, voltage
from ..quantity import read
from ..run import Observed
from .check import Mask
from .complementary_latch import Latch, latches
from .view import View

TOLD_BY = "the roles latch_npn and latch_pnp, or a load with operating_minimum"
"""What is missing where nothing tells whether there is an alarm."""
HOLDS = 20e-6  # s that a load must be on: what is shorter is a spike (from memory)
WAIT = "wait of the trial for what it looks for"
SPIKES = 3  # times that a load may come on before it does for good
LOOKS = (0.1, 1.0)  # shares of the time to settle at which a latch is looked at: a timed one may let go again


@dataclass(frozen=True)
class AlarmState:
    """What tells of an alarm: a latch, or the voltage across a load against the level at which it counts as on."""

    name: str
    latch: Latch | None
    load: tuple[Signal, float] | None

    def probes(self, at: Anchor) -> tuple[Row, ...]:
        """The rows by which :meth:`alarmed` tells."""
        if self.latch is not None:
            return self.latch.probes(at)
        assert self.load is not None
        return (level(self.load[0], at),)

    def alarmed(self, lanes: Lanes, observed: Observed, at: Anchor) -> Mask:
        """Whether there is an alarm at an instant."""
        if self.latch is not None:
            return self.latch.conducts(lanes, observed, self.latch.probes(at))
        assert self.load is not None
        return np.asarray(observed.value(level(self.load[0], at)) > self.load[1])

    def watch(self, start: float, settle: float) -> tuple[Row, ...]:
        """The rows by which :meth:`tripped` tells."""
        if self.latch is not None:
            return tuple(row for look in LOOKS for row in self.latch.probes(Anchor(start + look * settle)))
        assert self.load is not None
        signal, least = self.load
        came = [crossing(signal, least, True, nth=n + 1) for n in range(SPIKES)]
        lasted = [minimum(signal, Anchor(0.05 * HOLDS, row), Anchor(HOLDS, row)) for row in came]
        return (*lasted, *(level(signal, Anchor(start + look * settle)) for look in LOOKS))

    def tripped(self, lanes: Lanes, observed: Observed, start: float, settle: float) -> Mask:
        """Whether an alarm came by ``settle`` after ``start``, in s of the run."""
        if self.latch is not None:
            looks = [self.alarmed(lanes, observed, Anchor(start + look * settle)) for look in LOOKS]
            return np.asarray(np.any(looks, axis=0))
        assert self.load is not None
        seen = [observed.value(row) > self.load[1] for row in self.watch(start, settle)]
        return np.asarray(np.any(seen, axis=0))

    def lifts(self) -> tuple[Row, ...]:
        """The rows by which :meth:`spare` tells."""
        if self.latch is not None:
            return tuple(maximum(lift) for lift in self.latch.lifts)
        assert self.load is not None
        return (maximum(self.load[0]),)

    def spare(self, lanes: Lanes, observed: Observed) -> Floats:
        """How far it stayed from an alarm, V: of a latch the transistor that is lifted less."""
        if self.latch is not None:
            turn_on = self.latch.turn_on(lanes)
            left = [on - observed.value(row) for row, on in zip(self.lifts(), turn_on, strict=True)]
            return np.asarray(np.max(left, axis=0))
        assert self.load is not None
        return np.asarray(self.load[1] - observed.value(*self.lifts()))


def alarm_states(view: View, stage: Stage | None = None) -> Sequence[AlarmState]:
    """Everything that tells of an alarm: the latch of ``stage``, else every latch, else the load."""
    found = [AlarmState(f"{latch.stage.name} {latch.npn.ref}", latch, None) for latch in latches(view)]
    own = [state for state in found if state.latch is not None and state.latch.stage is stage]
    if own or found:
        return own or found
    load = view.load(stage or view.design.stages[0]) if view.design.stages else None
    if load is None:
        return []
    on = view.bench(load.ref).on
    assert on is not None
    plus, minus, least = on
    return [AlarmState(load.ref, None, (voltage(plus, minus), least))]


def settling(view: View, states: Sequence[AlarmState], sequence: str, usual: float) -> float:
    """How long a trial waits for an alarm, s: ``usual`` for a latch, which tells at once; for a load as long as the
    sequence itself gives it after its first event, for there may be a delay before it."""
    if all(state.latch is not None for state in states):
        return view.customary(WAIT, usual, "s")
    waits = max(usual, view.ends(sequence) - _first_event(view, sequence))
    return view.noted(WAIT, waits, "s", f"what sequence {sequence} leaves after its first event")


def _first_event(view: View, sequence: str) -> float:
    """When the first event happens that is none of the supply; 0 where there is none."""
    events = view.design.sequences[sequence].events
    own = [read(event.at, "s") for event in events if not isinstance(event, ConnectSupply | DisconnectSupply)]
    return min(own, default=0.0)


def standby(view: View, sequence: str) -> Anchor:
    """The moment ``standby``, else just before the first event that is none of the supply, else half of the time."""
    found = view.moment(sequence, "standby")
    if found is not None:
        return found
    first = _first_event(view, sequence)
    return Anchor(0.999 * first if first > 0.0 else 0.5 * view.ends(sequence))
