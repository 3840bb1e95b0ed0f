"""The complementary latch as checks see it: its two transistors, and whether it conducts."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from ..design.part import Part, Stage
from ..kernel.layout import Floats
from ..primitives.builder import SUPPLY_NET
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor, Row, Signal, level, voltage
from ..run import Observed
from .check import Mask
from .view import View, forward_base_voltage

TRIP_CURRENT = 10e-6  # A, collector current that begins to trip a latch
CONDUCTS = 0.5  # of the base-emitter voltage at that current: far above leakage, below every holding current


@dataclass(frozen=True)
class Latch:
    """An npn and a pnp that feed each other's base."""

    view: View
    stage: Stage
    npn: Part
    pnp: Part

    @property
    def rail(self) -> Signal:
        """What the latch is fed with: from the pnp's emitter to the npn's."""
        return voltage(self.pnp.pins["emitter"], self.npn.pins["emitter"])

    @property
    def rails(self) -> tuple[Signal, ...]:
        """What feeds it, at the latch and at the supply: a latch fed through a resistor keeps little for itself."""
        supply = (voltage(SUPPLY_NET),) if SUPPLY_NET in self.view.circuit.nets else ()
        return (self.rail, *supply)

    @property
    def current(self) -> Signal:
        """Current into the latch: the emitter current of its pnp, and what the resistor across its junction takes."""
        current = self.view.bench(self.pnp.ref).currents["emitter"]
        emitter, base = self.pnp.pins["emitter"], self.pnp.pins["base"]
        resistor = self.view.base_emitter_resistor(self.stage, "latch_pnp")
        if resistor is not None and set(resistor.pins.values()) == {emitter, base}:
            through = self.view.bench(resistor.ref).currents.get("a")
            if through is not None:
                current += through.scaled(1.0 if resistor.pins["a"] == emitter else -1.0)
        return current

    @property
    def lifts(self) -> tuple[Signal, Signal]:
        """Base-emitter voltages of npn and pnp, positive when they conduct."""
        return forward_base_voltage(self.npn), forward_base_voltage(self.pnp)

    def turn_on(self, lanes: Lanes) -> tuple[Floats, Floats]:
        """Base-emitter voltages of npn and pnp at which the latch begins to trip."""
        npn, pnp = (self.view.bench(part.ref).base_voltage for part in (self.npn, self.pnp))
        assert npn is not None
        assert pnp is not None
        return npn(lanes, TRIP_CURRENT), pnp(lanes, TRIP_CURRENT)

    def probes(self, at: Anchor) -> tuple[Row, Row]:
        """The rows by which :meth:`conducts` tells."""
        npn, pnp = self.lifts
        return level(npn, at), level(pnp, at)

    def conducts(self, lanes: Lanes, observed: Observed, probes: tuple[Row, Row]) -> Mask:
        """Whether both transistors conduct, whichever of them is saturated and wherever the load is."""
        needed = self.turn_on(lanes)
        lifted = [observed.value(p) > CONDUCTS * v for p, v in zip(probes, needed, strict=True)]
        return np.asarray(np.all(lifted, axis=0))


def latches(view: View) -> Iterator[Latch]:
    """Every stage in which both transistors of a latch are named."""
    for stage in view.design.stages:
        if {"latch_npn", "latch_pnp"} <= view.roles_of(stage).keys():
            npn, pnp = (view.design.part(view.roles_of(stage)[role]) for role in ("latch_npn", "latch_pnp"))
            if view.bench(npn.ref).base_voltage is not None and view.bench(pnp.ref).base_voltage is not None:
                yield Latch(view, stage, npn, pnp)
