"""The frame of commands that make one study of one design: find it, compute, print it or give it as JSON."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from collections.abc import Callable
from typing import Any, Protocol, TypeVar

from .printing import json_argument, print_json
from .waiting import computable, prepare_solver, progress
from .what import Subject, find, subject_arguments


class Sheet(Protocol):
    """What a study returns."""

    def as_json(self) -> dict[str, Any]:
        """The sheet as JSON values; it names its design."""


Found = TypeVar("Found", bound=Sheet)


def arguments(parser: ArgumentParser) -> None:
    """Declare WHAT and ``--json``."""
    subject_arguments(parser)
    json_argument(parser)


def run_study(
    asked: Namespace, counted: str, load: Callable[[], Callable[..., Found]], show: Callable[[Subject, Found], None]
) -> int:
    """Compute and print what was asked for.

    Args:
        asked: The arguments of the command line.
        counted: What the progress counts: ``faults: fault``.
        load: Returns the study; it loads the compiler, which must find its folder chosen.
        show: Prints the sheet for people.
    """
    subject = find(asked)
    prepare_solver(lambda: computable(subject.design))
    study = load()
    with progress(counted) as told:
        sheet = study(subject.design, progress=told)
    if asked.json:
        print_json({**sheet.as_json(), "design": subject.name, "revision": subject.revision})
    else:
        show(subject, sheet)
    return 0
