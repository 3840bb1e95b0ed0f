"""``stagebook faults``: what the unit does with each part of it failed, silent failures first."""

from __future__ import annotations

from argparse import Namespace
from collections.abc import Callable
from typing import TYPE_CHECKING

from ..fault_text import counts_words, mark_of
from .one_study import arguments, run_study
from .printing import print_table, print_words
from .what import Subject

if TYPE_CHECKING:
    from ...engine.studies.fault_outcomes import FaultSheet

__all__ = ["arguments", "run"]


def run(asked: Namespace) -> int:
    """Compute and print the outcome of every fault."""
    return run_study(asked, "faults: fault", _study, _print)


def _study() -> Callable[..., FaultSheet]:
    from ...engine.studies.faults import study

    return study


def _print(subject: Subject, sheet: FaultSheet) -> None:
    print_words(f"{subject.title}: {len(sheet.faults)} single faults: {counts_words(sheet)}")
    for note in sheet.notes:
        print_words(f"note: {note}", 2)
    print()
    rows = [
        (mark_of(fault)[0], fault.part, fault.fault, fault.words + (f"\n{fault.detail}" if fault.detail else ""))
        for fault in sheet.faults
    ]
    print_table(("", "part", "fault", "outcome"), rows)
