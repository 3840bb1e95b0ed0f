"""A complementary latch fed through a resistor: Q1 pnp above, Q2 npn below, S1 fires it and S2 shorts it."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from stagebook.engine.design.document import Design
from stagebook.engine.parts.physics import gain_factor, saturation_factor

from ..circuits import Json, resistor, transistor, two
from .sheets import design, exact

CELSIUS = 26.85  # 300 K
CONNECT: Json = {"at": "0 s", "event": "connect supply", "rise": "0.5 ms"}  # too slow to fire it
ROLES = {"latch_pnp": "Q1", "latch_npn": "Q2", "base_emitter_resistor_npn": "R2", "base_emitter_resistor_pnp": "R3"}


def law(gain: float, saturation: float = 1e-14) -> Json:
    """Gain and saturation current are those at 300 K: the document gives them at 25 C."""
    return {
        "saturation_current": saturation / float(saturation_factor(CELSIUS)),
        "forward_gain": gain / float(gain_factor(CELSIUS)),
        "reverse_gain": 1,
        "base_emitter_capacitance": "10 pF",
        "base_collector_capacitance": "10 pF",
    }


def latch(
    feed: str = "10k",
    npn: str = "1k",
    pnp: str | None = None,
    events: Sequence[Json] = (),
    gains: tuple[float, float] = (50.0, 100.0),
    fired: bool = True,
    reset: str = "1R",
    extra: Sequence[Json] = (),
    **more: Any,
) -> Design:
    """``feed`` from 12 V to the pnp's emitter; fired at 1 ms; S2 shorts the latch through ``reset``."""
    pulse: list[Json] = [
        {"at": "1 ms", "event": "close", "part": "S1"},
        {"at": "2 ms", "event": "open", "part": "S1"},
    ]
    above = [] if pnp is None else [exact(resistor("R3", "top", "mid", pnp))]
    roles = {role: ref for role, ref in ROLES.items() if pnp is not None or ref != "R3"}
    more = {"moments": {"latched": "10 ms"}, "ends": "0.1 s", **more}
    return design(
        exact(resistor("R1", "supply", "top", feed)),
        transistor("Q1", "gate", "mid", "top", "pnp", law=law(gains[0])),
        transistor("Q2", "mid", "gate", "0V", law=law(gains[1])),
        exact(resistor("R2", "gate", "0V", npn)),
        *above,
        two("contact", "S1", "fire", "gate", data={"insulation": "1000G"}),
        exact(resistor("R4", "top", "fire", "1k")),
        two("contact", "S2", "top", "short", data={"insulation": "1000G", "resistance": "1 mohm"}),
        exact(resistor("R5", "short", "0V", reset)),
        *extra,
        supply="12 V",
        ambient=f"{CELSIUS} C",
        roles=roles,
        events=[CONNECT, *(pulse if fired else []), *events],
        **more,
    )
