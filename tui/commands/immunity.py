"""``stagebook immunity``: the least charge that trips an alarm, net by net, and the slew that the supply may have."""

from __future__ import annotations

from argparse import Namespace
from collections.abc import Callable
from typing import TYPE_CHECKING

from ..immunity_text import charge_words, slew_words, where_words
from .one_study import arguments, run_study
from .printing import print_table, print_words
from .what import Subject

if TYPE_CHECKING:
    from ...engine.studies.immunity_sheet import ImmunitySheet

__all__ = ["arguments", "run"]


def run(asked: Namespace) -> int:
    """Compute and print the immunity of every net."""
    return run_study(asked, "immunity: lane", _study, _print)


def _study() -> Callable[..., ImmunitySheet]:
    from ...engine.studies.immunity import study

    return study


def _print(subject: Subject, sheet: ImmunitySheet) -> None:
    print_words(f"{subject.title}: least charge within 100 ns that trips an alarm in stand-by")
    print_words(f"steepest supply that trips none: {slew_words(sheet)}", 2)
    print()
    rows = [(found.net, charge_words(found), where_words(found)) for found in sheet.nets]
    print_table(("net", "charge", "worst at"), rows, right=frozenset({1}))
