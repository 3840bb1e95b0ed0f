"""The trial of a pulse of charge: ever more is put into a net in stand-by, until there is an alarm."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from ..circuit.timeline import Timeline
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor, Row
from ..run import Observed
from .alarm_state import AlarmState
from .check import Mask
from .trial import Trial

SETTLE = 0.05  # s after a pulse at which the last look is taken, where the requirement gives none

Put = Callable[[Timeline, float, Floats], None]


def charge_trial(
    key: str,
    sequence: str,
    start: Anchor,
    states: Sequence[AlarmState],
    pulses: Sequence[Put],
    safe: float,
    severe: float,
    settle: float = SETTLE,
    rows: tuple[Row, ...] = (),
) -> Trial:
    """Each of ``pulses`` puts charge in at the instant it is given, one after the other has settled; the knob is the
    charge in C or what it goes with."""
    begins = [k * settle for k in range(len(pulses))]

    def drive(line: Timeline, knob: Floats) -> None:
        for begin, put in zip(begins, pulses, strict=True):
            put(line, begin, knob)

    def gives_in(lanes: Lanes, observed: Observed) -> Mask:
        seen = [state.tripped(lanes, observed, begin, settle) for state in states for begin in begins]
        return np.asarray(np.any(seen, axis=0))

    def spare(lanes: Lanes, observed: Observed) -> Floats:
        return np.asarray(np.min([state.spare(lanes, observed) for state in states], axis=0))

    looks = [row for state in states for begin in begins for row in (*state.watch(begin, settle), *state.lifts())]
    return Trial(
        key=key,
        sequence=sequence,
        start=start,
        drive=drive,
        ends=settle * len(pulses),
        safe=safe,
        severe=severe,
        rows=(*rows, *dict.fromkeys(looks)),
        gives_in=gives_in,
        spare=spare,
        unit="C",
    )
