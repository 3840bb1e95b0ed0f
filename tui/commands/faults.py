"""``stagebook faults``: what the unit does with each part of it failed, silent failures first."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from typing import TYPE_CHECKING

from ..fault_text import counts_words, mark_of
from .printing import json_argument, print_json, print_table, print_words
from .waiting import computable, prepare_solver, progress
from .what import Subject, find, subject_arguments

if TYPE_CHECKING:
    from ...engine.studies.fault_outcomes import FaultSheet


def arguments(parser: ArgumentParser) -> None:
    """Declare WHAT and ``--json``."""
    subject_arguments(parser)
    json_argument(parser)


def run(asked: Namespace) -> int:
    """Compute and print the outcome of every fault."""
    subject = find(asked)
    prepare_solver(lambda: computable(subject.design))
    # Imported here: it loads the compiler, which must find its folder chosen.
    from ...engine.studies.faults import study

    with progress("faults: fault") as show:
        sheet = study(subject.design, progress=show)
    if asked.json:
        found = sheet.as_json()
        del found["design"]
        print_json({"design": subject.name, "revision": subject.revision, **found})
    else:
        _print(subject, sheet)
    return 0


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
