"""How little charge trips an alarm: what the study returns. Plain values, JSON out; nothing of it computes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

LEAST, MOST = 1e-14, 1e-6  # C
WIDTH = 100e-9  # s: short against everything that drains a net
ANY = "any"
NOT_YET = "not computed yet"


@dataclass(frozen=True, slots=True)
class NetImmunity:
    """The least charge that trips an alarm: in C with its sign, None where none up to ``MOST`` does.

    ``condition`` is the corner where it is least. 0 C: there is an alarm without any charge.
    """

    net: str
    charge: float | None
    sign: int | None
    condition: str


@dataclass(frozen=True, slots=True)
class ImmunitySheet:
    """All nets, the weakest first; the steepest supply in V/s that trips no latch, None where none does."""

    design: str
    content: str
    seconds: float
    nets: tuple[NetImmunity, ...]
    slew: float | None
    slew_condition: str

    @property
    def unfinished(self) -> bool:
        """Whether corners are still to come, in which every net may turn out weaker."""
        return self.slew is None and self.slew_condition == NOT_YET

    def as_json(self) -> dict[str, Any]:
        """The sheet as JSON values."""
        return {
            "design": self.design,
            "content": self.content,
            "seconds": self.seconds,
            "width": WIDTH,
            "most": MOST,
            "nets": [
                {"net": found.net, "charge": found.charge, "sign": found.sign, "condition": found.condition}
                for found in self.nets
            ],
            "slew": {"limit": self.slew, "condition": self.slew_condition},
        }
