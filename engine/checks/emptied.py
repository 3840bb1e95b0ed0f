"""How long a contact must be closed to empty what feeds a latch: the hand formula of the reset pulse."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..design.part import Part
from ..kernel.layout import Floats
from ..primitives.builder import RETURN
from ..primitives.columns import SUPPLY
from ..primitives.signals import Anchor, Row, level, voltage
from .complementary_latch import Latch
from .latch import holding_by_hand, holds_down_to
from .seen import Seen
from .view import View

CLOSED = 1e-3  # ohm, of a contact that leads to 0V without a resistor


@dataclass(frozen=True)
class Emptied:
    """A capacitor that a contact discharges, what feeds it meanwhile, and the latch behind it, as they begin."""

    capacitor: Part
    short: Part | None
    feed: Part | None
    latch: Latch
    volts: Row
    carried: Row

    @classmethod
    def find(cls, view: View, contact: Part, latch: Latch | None, at: Anchor) -> Emptied | None:
        """What the contact empties from ``at`` on; None where there is no latch, or no such capacitor."""
        if latch is None or view.design.conditions.supply is None:
            return None
        if holding_by_hand(latch, view.circuit.nominal()) is None:
            return None
        for net in contact.pins.values():
            (other,) = set(contact.pins.values()) - {net}
            held = [c for _, c in view.parts_of("capacitor") if set(c.pins.values()) == {net, RETURN}]
            shorts = [r for _, r in view.parts_of("resistor") if set(r.pins.values()) == {other, RETURN}]
            if held and (other == RETURN or shorts):
                feeds = [r for _, _, r in view.with_role("filter_resistor") if net in r.pins.values()]
                return cls(
                    held[0],
                    shorts[0] if shorts else None,
                    feeds[0] if feeds else None,
                    latch,
                    level(voltage(net), at),
                    level(latch.current, at),
                )
        return None

    @property
    def rows(self) -> tuple[Row, ...]:
        """What is read as the reset begins."""
        return self.volts, self.carried

    def seconds(self, seen: Seen, sequence: str) -> Floats:
        """R C ln((V - V_low)/(V_hold - V_low)), R both ways to the capacitor and V_low what it comes to; NaN where it
        does not come down to V_hold."""
        lanes, volts = seen.lanes, seen.value(self.volts, sequence)
        down = np.full(lanes.count, CLOSED) if self.short is None else lanes[self.short.ref, "value"]
        along = down
        if self.feed is not None:
            along = 1.0 / (1.0 / down + 1.0 / lanes[self.feed.ref, "value"])
        low = np.zeros(lanes.count)
        if self.feed is not None:
            low = lanes[SUPPLY] * down / (down + lanes[self.feed.ref, "value"])
        hold = holds_down_to(self.latch, lanes, volts, seen.value(self.carried, sequence))
        assert hold is not None
        left = np.where(hold > low, (volts - low) / np.where(hold > low, hold - low, 1.0), np.nan)
        return np.asarray(along * lanes[self.capacitor.ref, "value"] * np.log(np.maximum(left, 1.0)))
