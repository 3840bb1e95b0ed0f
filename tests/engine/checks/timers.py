"""A capacitor that is charged through a resistor, watched by a load whose other end it is.

The load LS1 lies between the supply and the capacitor and draws nothing to speak of: it is on from the connection of
the supply until the capacitor has come within its operating minimum of the supply. So the threshold is exact.
"""

from __future__ import annotations

from collections.abc import Sequence

from stagebook.engine.design.document import Design

from ..circuits import Json, resistor, two
from .sheets import design, exact, sounder

ROLES = {"timing_resistor": "R1", "timing_capacitor": "C1", "load": "LS1"}


def timer(
    leakage: str | None,
    low: str = "100 s",
    high: str = "140 s",
    ends: str = "600 s",
    below_supply: str = "3 V",
    requirements: Sequence[Json] = (),
    states: Sequence[str] = ("specified",),
) -> Design:
    """220 uF 16 V through 470k from 9 V up to 6 V at 20 C; ``leakage`` at 16 V, None for a capacitor without any."""
    capacitor = exact(two("capacitor", "C1", "tc", "0V", "220u", voltage="16 V"))
    if leakage is not None:
        capacitor["leakage"] = {"specified": leakage, "conditioned": "0.1 nA"}
    return design(
        exact(resistor("R1", "supply", "tc", "470k", rating="0.25 W")),
        capacitor,
        sounder("LS1", "supply", "tc", "1 pA", below_supply),
        roles=ROLES,
        leakage=states,
        ends=ends,
        requirements=[{"check": "duration", "of": "LS1", "min": low, "max": high}, *requirements],
    )
