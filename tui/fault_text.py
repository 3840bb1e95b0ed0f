"""What the faults of a design do, as lines: rows by outcome, and the words about the one under the hand. Pure."""

from __future__ import annotations

from typing import TYPE_CHECKING

from .shown import Line, Span, columns, fit, line
from .widgets.row_list import Row

if TYPE_CHECKING:
    from ..engine.studies.fault_outcomes import FaultResult, FaultSheet

# Outcomes by their place in the engine's order: silent, not known, runs on, false alarm, overheats, still alarms.
MARKS = ("X", "?", "X", "X", "!", "=")
TONES = ("fail", "unknown", "fail", "fail", "thin", "pass")
_DO = ("no alarm", "not known", "endless", "false", "overheat", "still alarm")
_PART, _FAULT = 7, 27


def counts_words(sheet: FaultSheet) -> str:
    """How many faults come to which outcome: ``46 no alarm, 22 endless``."""
    counted = [sum(fault.outcome == at for fault in sheet.faults) for at in range(len(_DO))]
    return ", ".join(f"{count} {word}" for count, word in zip(counted, _DO, strict=True) if count)


def fault_heading() -> Line:
    """The column heads."""
    return line(Span("  " + columns((_PART, _FAULT, 8), ("part", "fault", "outcome")), "strong"))


def fault_rows(sheet: FaultSheet, width: int) -> list[Row]:
    """One row a fault in the order of the sheet: mark, part, what failed, what comes of it."""
    room = max(8, width - 2 - 2 - _PART - _FAULT - 2)
    return [Row(fault_key(fault), _row(fault, room)) for fault in sheet.faults]


def fault_key(fault: FaultResult) -> str:
    """The name of a fault on the screen."""
    return f"{fault.part} {fault.fault}"


def _row(fault: FaultResult, room: int) -> Line:
    said = fault.words + (f", {fault.detail}" if fault.detail else "")
    mark, tone = mark_of(fault)
    return line(
        Span(mark + " ", tone),
        Span(columns((_PART, _FAULT), (fault.part, fault.fault)) + " "),
        Span(fit(said, room), "" if mark == "=" else tone),
    )


def mark_of(fault: FaultResult) -> tuple[str, str]:
    """Mark and tone of a fault: one that still gives an alarm passes only where nothing else differs either."""
    if fault.outcome == len(_DO) - 1 and fault.detail:
        return "!", "thin"
    return MARKS[fault.outcome], TONES[fault.outcome]


def fault_lines(fault: FaultResult) -> tuple[Line, Line]:
    """Two lines about one fault: what comes of it in full, and where it was seen."""
    first = f" {fault.part} {fault.fault}: {fault.words}"
    where = f"{fault.stage}   {fault.load} in sequence {fault.sequence}"
    return line(Span(first, "strong")), line(f" {fault.detail + '   ' if fault.detail else ''}{where}")
