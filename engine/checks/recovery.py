"""How a timer's capacitor empties between two alarms: the hand formulas of re-arm and repeatability.

An alarm of R and C lasts T = R C ln(V/X), and with v left on the capacitor R C ln((V - v)/X): shorter by
R C ln(1 - v/V), whichever end of the capacitor is watched. v falls with the time constant of what empties it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..design.part import Part
from ..kernel.layout import Floats
from ..primitives.columns import SUPPLY
from ..primitives.signals import Anchor, Row, level, voltage
from .seen import Seen
from .stepped_base import rails
from .view import View

MISSING = "no stage fills timing_resistor, timing_capacitor and discharge_resistor: nothing says what empties"
ROLES = {"timing_resistor", "timing_capacitor", "discharge_resistor"}


@dataclass(frozen=True)
class Recovery:
    """The parts of a timer in their roles, and what its capacitor has as its rest begins."""

    resistor: Part
    capacitor: Part
    discharge: Part
    in_series: bool
    left: Row

    @classmethod
    def find(cls, view: View, at: Anchor) -> Recovery | None:
        """That of a design whose rest begins ``at``; None where the roles are not filled in one stage."""
        for stage in view.design.stages:
            if view.roles_of(stage).keys() >= ROLES and view.design.conditions.supply is not None:
                resistor, capacitor, discharge = (
                    view.design.part(view.roles_of(stage)[role])
                    for role in ("timing_resistor", "timing_capacitor", "discharge_resistor")
                )
                in_series = not rails(view) & set(capacitor.pins.values())
                plus, minus = capacitor.pins.values()
                return cls(resistor, capacitor, discharge, in_series, level(voltage(plus, minus), at))
        return None

    def _tau(self, seen: Seen) -> tuple[Floats, Floats]:
        """Time constants of the alarm and of emptying: through both resistors where the capacitor lies between them,
        else through both beside each other."""
        lanes = seen.lanes
        ohms, other = lanes[self.resistor.ref, "value"], lanes[self.discharge.ref, "value"]
        farads = lanes[self.capacitor.ref, "value"]
        back = ohms + other if self.in_series else ohms * other / (ohms + other)
        return np.asarray(ohms * farads), np.asarray(back * farads)

    def rest(self, seen: Seen, sequence: str, lasted: Floats, least: float) -> Floats:
        """The rest after which an alarm that lasted ``lasted`` lasts ``least`` again, s."""
        tau, back = self._tau(seen)
        may = -np.expm1((least - lasted) / tau) * seen.lanes[SUPPLY]
        ratio = np.abs(seen.value(self.left, sequence)) / np.where(may > 0.0, may, np.nan)
        return np.asarray(back * np.log(np.maximum(ratio, 1.0)))

    def change(self, seen: Seen, sequence: str, lasted: Floats, rest: float) -> Floats:
        """By which share of ``lasted`` the alarm after a rest is shorter."""
        tau, back = self._tau(seen)
        left = np.abs(seen.value(self.left, sequence)) * np.exp(-rest / back) / seen.lanes[SUPPLY]
        return np.asarray(-tau * np.log1p(-np.minimum(left, 1.0 - 1e-9)) / lasted)
