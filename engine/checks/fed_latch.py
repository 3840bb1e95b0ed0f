"""How long a filter capacitor feeds a latch while the supply is away: the hand formulas of brown-out."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..design.part import Part
from ..kernel.layout import Floats
from ..primitives.signals import Anchor, Row, level, voltage
from .alarm_state import AlarmState
from .latch import holding_by_hand, holds_down_to
from .seen import Seen
from .view import View

NOT_FED = "no set latch with filter_capacitor, filter_resistor and both base-emitter resistors in their roles"

HOLDS_ON = "by hand no such dip takes a latch's current, or it is not set"


@dataclass(frozen=True)
class Fed:
    """The latch, its filter, and what it stands at and carries as the dip begins."""

    state: AlarmState
    capacitor: Part
    resistor: Part
    diode: Part | None
    volts: Row
    carried: Row

    @classmethod
    def find(cls, view: View, state: AlarmState, at: Anchor) -> Fed | None:
        """That of a design whose dip is ``at``; None where a role is not filled."""
        if state.latch is None or holding_by_hand(state.latch, view.circuit.nominal()) is None:
            return None
        capacitor, resistor, diode = (
            view.role(state.latch.stage, role) for role in ("filter_capacitor", "filter_resistor", "reverse_diode")
        )
        if capacitor is None or resistor is None:
            return None
        plus, minus = capacitor.pins.values()
        return cls(state, capacitor, resistor, diode, level(voltage(plus, minus), at), level(state.latch.current, at))

    @property
    def rows(self) -> tuple[Row, ...]:
        """What is read as the dip begins."""
        return self.volts, self.carried

    def _hold(self, seen: Seen, sequence: str) -> tuple[Floats, Floats, Floats]:
        """Volts of the capacitor, those at which the latch lets go, and the latch's current; NaN without an alarm."""
        volts, carried = seen.value(self.volts, sequence), seen.value(self.carried, sequence)
        assert self.state.latch is not None
        hold = holds_down_to(self.state.latch, seen.lanes, volts, carried)
        assert hold is not None
        set_ = hold < volts
        return volts, np.where(set_, hold, np.nan), carried

    def _tau(self, seen: Seen) -> Floats:
        return np.asarray(seen.lanes[self.resistor.ref, "value"] * seen.lanes[self.capacitor.ref, "value"])

    def seconds(self, seen: Seen, sequence: str, to: float) -> Floats:
        """The longest dip to ``to`` volts that it bears, s."""
        volts, hold, carried = self._hold(seen, sequence)
        if self.diode is not None:
            mean = 0.5 * carried * (1.0 + hold / volts)
            return np.asarray(seen.lanes[self.capacitor.ref, "value"] * (volts - hold) / mean)
        left = (volts - to) / np.where(hold > to, hold - to, np.nan)
        return np.asarray(self._tau(seen) * np.log(left))

    def depth(self, seen: Seen, sequence: str, during: float) -> Floats:
        """The deepest dip of that length that it bears, V."""
        volts, hold, _ = self._hold(seen, sequence)
        if self.diode is not None:
            return np.where(self.seconds(seen, sequence, 0.0) > during, np.nan, volts - hold)
        return np.asarray((volts - hold) / -np.expm1(-during / self._tau(seen)))
