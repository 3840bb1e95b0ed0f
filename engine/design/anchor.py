"""Observed events by which moments and intervals are anchored: ``LS1 on``, ``K1 out``, ``timing above 2 V``."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Literal

from ..errors import QuantityError
from ..quantity import read

Change = Literal["on", "off", "in", "out", "above", "below"]
_PART = re.compile(r"(\S+)\s+(on|off|in|out)")
_NET = re.compile(r"(?:net\s+)?(\S+)\s+(above|below)\s+(.+)")


@dataclass(frozen=True, slots=True)
class Anchor:
    """An observed event. ``subject`` is a part (on / off of a load, in / out of a relay) or a net (above / below).

    ``level`` is in volts, None for a part.
    """

    subject: str
    change: Change
    level: float | None = None


def read_anchor(text: str) -> Anchor:
    """The anchor that a text names. Raises QuantityError for any other text."""
    typed = text.strip()
    if part := _PART.fullmatch(typed):
        return Anchor(part[1], part[2])  # type: ignore[arg-type]
    if net := _NET.fullmatch(typed):
        return Anchor(net[1], net[2], read(net[3], "V"))  # type: ignore[arg-type]
    raise QuantityError(f"{text!r} names no event; write 'LS1 on', 'LS1 off', 'K1 in', 'K1 out' or 'net above 2 V'")
