"""``stagebook immunity``: the least charge that trips an alarm, net by net, and the slew that the supply may have."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from typing import TYPE_CHECKING

from ..immunity_text import charge_words, slew_words
from .printing import json_argument, print_json, print_table, print_words
from .waiting import computable, prepare_solver, progress
from .what import Subject, find, subject_arguments

if TYPE_CHECKING:
    from ...engine.studies.immunity import ImmunitySheet


def arguments(parser: ArgumentParser) -> None:
    """Declare WHAT and ``--json``."""
    subject_arguments(parser)
    json_argument(parser)


def run(asked: Namespace) -> int:
    """Compute and print the immunity of every net."""
    subject = find(asked)
    prepare_solver(lambda: computable(subject.design))
    # Imported here: it loads the compiler, which must find its folder chosen.
    from ...engine.studies.immunity import study

    with progress("immunity: lane") as show:
        sheet = study(subject.design, progress=show)
    if asked.json:
        found = sheet.as_json()
        del found["design"]
        print_json({"design": subject.name, "revision": subject.revision, **found})
    else:
        _print(subject, sheet)
    return 0


def _print(subject: Subject, sheet: ImmunitySheet) -> None:
    print_words(f"{subject.title}: least charge within 100 ns that trips an alarm in stand-by")
    print_words(f"steepest supply that trips none: {slew_words(sheet)}", 2)
    print()
    rows = [(found.net, charge_words(found), found.condition) for found in sheet.nets]
    print_table(("net", "charge", "worst at"), rows, right=frozenset({1}))
