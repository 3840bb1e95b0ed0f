"""The one table of derating factors: what share of a rating counts as capability where a design says nothing else."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Final

COMMON_PRACTICE = "common practice, from memory"


@dataclass(frozen=True, slots=True)
class Factor:
    """A customary factor, what it multiplies, and where it comes from."""

    customary: float
    about: str
    source: str = COMMON_PRACTICE


FACTORS: Final[Mapping[str, Factor]] = {
    "v_ceo": Factor(0.8, "collector-emitter voltage rating"),
    "v_ebo": Factor(0.8, "reverse base-emitter voltage rating"),
    "v_gss": Factor(0.8, "gate-source voltage rating"),
    "i_c_max": Factor(1.0, "collector or drain current rating"),
    "v_rrm": Factor(1.0, "reverse voltage rating of diodes"),
    "capacitor_film": Factor(0.6, "voltage rating of film and ceramic capacitors"),
    "capacitor_electrolytic": Factor(0.8, "voltage rating of electrolytic capacitors"),
    "ripple_current": Factor(1.0, "ripple current rating of capacitors"),
    "resistor_power": Factor(0.6, "power rating of resistors at the ambient temperature"),
    "fuse": Factor(0.75, "rated current of fuses"),
    "fuse_pulse": Factor(0.5, "melting I2t of fuses, for pulses that come again"),
}
