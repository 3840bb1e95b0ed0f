"""What a study returns: margins with their corner, verdict and words. Plain frozen values, JSON in and out."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterable, Mapping
from dataclasses import asdict, dataclass, fields
from enum import StrEnum
from typing import Any, TypeVar

ENGINE = "1"
"""Version of laws and formulas, stored with every margin: it moves when the same document gives other numbers."""


SAME_MARGIN = 5e-4
"""A margin that is computed again and lies nearer than this to what it was is the same."""


class Verdict(StrEnum):
    """What a margin says about a requirement."""

    PASS = "PASS"
    THIN = "THIN"
    FAIL = "FAIL"
    UNKNOWN = "UNKNOWN"


class Depth(StrEnum):
    """How far a study has come: the nominal lane, the worst corners, the random spread."""

    NOMINAL = "nominal"
    CORNERS = "corners"
    SPREAD = "spread"


@dataclass(frozen=True, slots=True)
class Spread:
    """Distribution of one margin over random part values: quantiles, share of lanes at or above the requirement."""

    p05: float | None
    p50: float | None
    p95: float | None
    passing: float
    interval: tuple[float, float]


@dataclass(frozen=True, slots=True)
class CheckResult:
    """One margin of one design in SI units (temperature in deg C); margins are fractions of the capability.

    D/C checks fill ``demand`` and ``capability``; window checks fill ``limits``, ``low`` and ``high``.
    ``margin`` is None when the verdict is UNKNOWN. ``formula`` says in words how the number is made. ``setting`` is the
    corner itself: (reference, datum, side) with side -1 low, +1 high, for everything that is not nominal there.
    ``by_hand`` is the hand formula in words and ``accuracy`` how far it can be trusted, see :attr:`disagrees`;
    ``bound``: it says how bad the margin is at most. ``apart`` says why there is no hand value to compare with,
    ``left_out`` what the formula leaves out where it disagrees. ``hand_scale``: what the accuracy is a share of.
    ``extrapolated`` says which figure was used beyond where it is given.
    """

    id: str
    number: int
    title: str
    stage: str
    part: str
    sequence: str
    demand: float | None
    capability: float | None
    unit: str
    limits: tuple[float, float] | None
    low: float | None
    high: float | None
    margin: float | None
    required: float
    verdict: Verdict
    outcome: str | None
    reason: str | None
    corner: str
    conditions: Mapping[str, float | str]
    nominal: float | None
    hand: float | None
    spread: Spread | None
    formula: str = ""
    setting: tuple[tuple[str, str, int], ...] = ()
    by_hand: str = ""
    accuracy: float | None = None
    extrapolated: str | None = None
    bound: bool = False
    apart: str | None = None
    left_out: str | None = None
    hand_scale: float | None = None

    @property
    def disagrees(self) -> bool:
        """Whether the hand formula is further off than it says of itself: a share of the larger of D and C, or of the
        value of a window. A bound is only wrong where the margin is worse than it."""
        if self.hand is None or self.margin is None or self.accuracy is None or self.outcome is not None:
            return False
        if self.apart is not None or (self.bound and self.margin >= self.hand):
            return False
        scale = max(1.0, 1.0 - self.margin) if self.hand_scale is None else self.hand_scale
        return abs(self.hand - self.margin) > self.accuracy * scale

    @property
    def slack(self) -> float:
        """Margin less the requirement; an unknown margin ranks below every known one."""
        return -math.inf if self.margin is None else self.margin - self.required


Item = TypeVar("Item")


def explaining_first(items: Iterable[Item], check_of: Callable[[Item], CheckResult]) -> list[Item]:
    """The same in their order, but a margin that fails with a figure stands above those that fail because something
    did not happen with its part: that LS1 gets too little voltage explains that it never came on."""
    ordered = list(items)
    for item in list(ordered):
        check = check_of(item)
        if check.verdict is Verdict.FAIL and check.outcome is None and check.part:
            named = (at for at, other in enumerate(ordered) if check.part in _named(check_of(other)))
            first, here = next(named, len(ordered)), ordered.index(item)
            if first < here:
                ordered.insert(first, ordered.pop(here))
    return ordered


def _named(check: CheckResult) -> frozenset[str]:
    """The words of what happened where a margin fails by that."""
    words = check.outcome if check.verdict is Verdict.FAIL else None
    return frozenset(re.findall(r"\w+", words or ""))


@dataclass(frozen=True, slots=True)
class MarginSheet:
    """All margins of one document at one depth of study. ``content`` is the hash of the document."""

    design: str
    content: str
    engine: str
    seed: int
    lanes: int
    seconds: float
    depth: Depth
    checks: tuple[CheckResult, ...]

    def as_json(self) -> dict[str, Any]:
        """The sheet as plain JSON values, keys as in the headless command."""
        return asdict(self)

    @classmethod
    def from_json(cls, data: Mapping[str, Any]) -> MarginSheet:
        """The sheet that :meth:`as_json` wrote; unknown keys of a later version are ignored."""
        checks = tuple(_check(entry) for entry in data["checks"])
        known = {f.name for f in fields(cls)} - {"checks", "depth"}
        return cls(**{k: data[k] for k in known}, depth=Depth(data["depth"]), checks=checks)

    @property
    def worst(self) -> CheckResult | None:
        """The check with the least slack, None on an empty sheet."""
        return min(self.checks, key=lambda check: check.slack, default=None)


_CHECK_FIELDS = frozenset(f.name for f in fields(CheckResult))


def _check(entry: Mapping[str, Any]) -> CheckResult:
    values = dict(entry)
    for later in entry.keys() - _CHECK_FIELDS:
        del values[later]
    values["verdict"] = Verdict(values["verdict"])
    if values.get("limits") is not None:
        low, high = values["limits"]
        values["limits"] = (low, high)
    values["setting"] = tuple([(ref, datum, side) for ref, datum, side in values.get("setting", ())])
    if values.get("spread") is not None:
        spread = dict(values["spread"])
        low, high = spread["interval"]
        values["spread"] = Spread(**{**spread, "interval": (low, high)})
    return CheckResult(**values)
