"""What one fault does, in words, and the sheet of all of them with silent failures first. Plain values, JSON out."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from enum import IntEnum
from typing import Any

from .healthy import Behaviour


class Outcome(IntEnum):
    """What a unit with one fault does, the worst first. What is not known is never counted as an alarm."""

    SILENT = 0
    UNKNOWN = 1
    RUNS_ON = 2
    FALSE_ALARM = 3
    OVERHEATS = 4
    STILL_ALARMS = 5


WORDS = {
    Outcome.SILENT: "silent",
    Outcome.UNKNOWN: "not known",
    Outcome.RUNS_ON: "runs on for ever",
    Outcome.FALSE_ALARM: "false alarm",
    Outcome.OVERHEATS: "overheats",
    Outcome.STILL_ALARMS: "still alarms",
}
"""The names of the outcomes, as in JSON."""

SAID = {
    Outcome.SILENT: "no alarm when due",
    Outcome.UNKNOWN: "not known",
    Outcome.RUNS_ON: "alarm never ends",
    Outcome.FALSE_ALARM: "alarms without cause",
    Outcome.STILL_ALARMS: "still alarms",
}
"""What the unit does, for people. A part that overheats is named instead."""


@dataclass(frozen=True, slots=True)
class FaultResult:
    """One fault and what comes of it. ``load`` and ``sequence`` are where the worst was seen.

    ``words`` say it whole, ``detail`` what else differs from the unit without a fault. ``on`` and ``off`` in s are of
    that load; ``standby`` is the supply current at the moment of that name in A. None where there is no such number.
    """

    stage: str
    part: str
    fault: str
    outcome: Outcome
    words: str
    detail: str
    load: str
    sequence: str
    overheats: tuple[str, ...]
    on: float | None
    off: float | None
    standby: float | None
    drains: bool = False

    @property
    def rank(self) -> tuple[int, bool, bool, bool]:
        """Order of a sheet: the worst outcome first, in each what overheats, drains the cells or is otherwise not as
        it was."""
        return int(self.outcome), not self.overheats, not self.drains, not self.detail


@dataclass(frozen=True, slots=True)
class FaultSheet:
    """All single faults of one document, silent ones first. ``notes`` say what the study cannot tell."""

    design: str
    content: str
    engine: str
    seconds: float
    healthy: tuple[Behaviour, ...]
    standby: float | None
    faults: tuple[FaultResult, ...]
    notes: tuple[str, ...] = ()

    def count(self, outcome: Outcome) -> int:
        """How many faults come to this."""
        return sum(fault.outcome is outcome for fault in self.faults)

    def as_json(self) -> dict[str, Any]:
        """The sheet as plain JSON values; outcomes are the words of the study."""
        found = asdict(self)
        for fault in found["faults"]:
            fault["outcome"] = WORDS[fault["outcome"]]
        found["counts"] = {WORDS[outcome]: self.count(outcome) for outcome in Outcome}
        return found
