"""When an RC low-pass behind a contact comes to what acts: the hand formulas of bounce and acceptance."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..design.part import Part
from ..kernel.layout import Floats
from ..primitives.signals import Row, level, maximum, voltage
from .seen import Seen
from .view import View

HALVINGS = 60
NEAR = 0.98  # of what the net comes to: what acts later than there has another time than this RC

MISSING = "the roles debounce_resistor and debounce_capacitor are not filled"
LATER = "what follows acts when the net behind the debounce has long come to its level"


@dataclass(frozen=True)
class Debounced:
    """The resistor and the capacitor in the roles of a debounce, what its net comes to and what it had as the load came
    on in the sequence. ``other``: the resistor through which the net empties beside its own."""

    resistor: Part
    capacitor: Part
    other: Part | None
    final: Row
    acted: Row

    @classmethod
    def find(cls, view: View, sequence: str) -> Debounced | None:
        """That of a design, None where its roles are not filled or nothing tells when it acts."""
        for stage in view.design.stages:
            if {"debounce_resistor", "debounce_capacitor"} <= view.roles_of(stage).keys():
                load = view.load(stage)
                resistor, capacitor = (
                    view.design.part(view.roles_of(stage)[f"debounce_{p}"]) for p in ("resistor", "capacitor")
                )
                shared = set(resistor.pins.values()) & set(capacitor.pins.values())
                if load is None or len(shared) != 1:
                    return None
                (net,) = shared
                (far,) = set(resistor.pins.values()) - shared
                pulls = (part for _, _, part in view.with_role("pull_down", "pull_up") if far in part.pins.values())
                came = level(voltage(net), view.anchor(f"{load.ref} on", sequence))
                return cls(resistor, capacitor, next(pulls, None), maximum(voltage(net)), came)
        return None

    @property
    def rows(self) -> tuple[Row, ...]:
        """What is read in the sequence."""
        return self.final, self.acted

    def _tau(self, seen: Seen) -> tuple[Floats, Floats]:
        """Time constants while the contact feeds the net and while it empties, s."""
        lanes = seen.lanes
        ohms, farads = lanes[self.resistor.ref, "value"], lanes[self.capacitor.ref, "value"]
        back = ohms if self.other is None else ohms + lanes[self.other.ref, "value"]
        return np.asarray(ohms * farads), np.asarray(back * farads)

    def _share(self, seen: Seen, sequence: str) -> Floats:
        """At which share of what it comes to the net made something act; NaN above :data:`NEAR`."""
        final = seen.value(self.final, sequence)
        share = seen.value(self.acted, sequence) / np.where(final > 0.0, final, np.nan)
        return np.where((share > 0.0) & (share < NEAR), share, np.nan)

    def accepts(self, seen: Seen, sequence: str, bounce: float) -> Floats:
        """The shortest event by hand, s: the bounce, half of which counts, and what is left of
        R C ln(V / (V - V_th))."""
        tau, _ = self._tau(seen)
        begun = -np.expm1(-0.5 * bounce / tau)
        share = self._share(seen, sequence)
        left = tau * np.log((1.0 - begun) / (1.0 - share))
        return np.asarray(np.where(share > begun, bounce + left, 2.0 * tau * -np.log1p(-share)))

    def rejects(self, seen: Seen, sequence: str, times: int) -> Floats:
        """The longest burst by hand, s: as long closed as open, ``times`` times. With a = exp(-t/tau) of the closed and
        b of the open pieces the net comes to (1 - a)(1 - (a b)^n)/(1 - a b)."""
        (tau, back), share = self._tau(seen), self._share(seen, sequence)
        low, high = np.full(seen.lanes.count, -20.0), np.full(seen.lanes.count, 5.0)
        for _ in range(HALVINGS):
            middle = 0.5 * (low + high)
            piece = tau * np.exp(middle)
            both = np.exp(-piece / tau - piece / back)
            comes = -np.expm1(-piece / tau) * (1.0 - both**times) / np.maximum(1.0 - both, 1e-300)
            below = comes < share
            low, high = np.where(below, middle, low), np.where(below, high, middle)
        return np.asarray(np.where(np.isfinite(share), 2.0 * times * tau * np.exp(high), np.nan))
