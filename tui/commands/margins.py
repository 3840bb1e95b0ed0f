"""``stagebook margins``: recompute every margin of a design."""

from __future__ import annotations

import sys
from argparse import ArgumentParser, ArgumentTypeError, Namespace
from collections.abc import Sequence
from dataclasses import asdict
from difflib import get_close_matches

from ...engine.results import CheckResult, MarginSheet, Verdict, explaining_first
from ..origin_text import left_out
from ..shown import MARKS, counted, figure, percent, visible
from .printing import json_argument, print_json, print_pairs, print_table, print_words
from .refusal import CommandRefused
from .waiting import computable, prepare_solver, progress
from .what import Subject, find, subject_arguments

_OUTCOME = 6
"""Signs for a word of what happened instead of a figure: the whole of it stands beside."""
MOST_LANES = 100_000
LANES = 1000


def arguments(parser: ArgumentParser) -> None:
    """Declare WHAT and how it is computed."""
    subject_arguments(parser)
    parser.add_argument(
        "--lanes",
        metavar="K",
        type=_lanes,
        help=f"lanes of the spread, up to {MOST_LANES} (default {LANES}; 0 skips it, as --explain does by itself)",
    )
    parser.add_argument("--seed", metavar="S", type=_seed, default=1, help="seed of the spread (default 1)")
    parser.add_argument(
        "--explain",
        metavar="ID",
        help="where one margin comes from: values put in, observations with their instants, data with their sources;"
        " ID is slug:stage:part, or a piece of it that only one margin has",
    )
    parser.add_argument("--strict", action="store_true", help="exit status 1 if a margin is FAIL or UNKNOWN")
    json_argument(parser)


def run(asked: Namespace) -> int:
    """Compute and print the margins, the one with the least slack first."""
    subject = find(asked)
    prepare_solver(lambda: computable(subject.design))
    # Imported here: it loads the compiler, which must find its folder chosen.
    from ...engine.studies.margins import study

    if asked.explain is not None:
        return _explain(asked, subject)
    with progress("margins: lane") as show:
        lanes = LANES if asked.lanes is None else asked.lanes
        sheet = study(subject.design, lanes=lanes, seed=asked.seed, progress=show)
    if sheet.lanes < lanes:
        # Beside the figures, not among them.
        said = "more of them would take over an hour of one processor core"
        print(f"margins: the spread is of {sheet.lanes} lanes: {said}", file=sys.stderr)
    if asked.json:
        found = sheet.as_json()
        del found["design"]
        print_json({"design": subject.name, "revision": subject.revision, **found})
    else:
        _print(subject, sheet)
    failed = any(check.verdict in (Verdict.FAIL, Verdict.UNKNOWN) for check in sheet.checks)
    return 1 if asked.strict and failed else 0


def _print(subject: Subject, sheet: MarginSheet) -> None:
    print(f"{visible(subject.title)}: {counted(len(sheet.checks), 'margin')} in {sheet.seconds:.1f} s", end="")
    print(f", {counted(sheet.lanes, 'lane')} with seed {sheet.seed}" if sheet.lanes else ", without a spread")
    if not sheet.checks:
        print_words("No check applies: give stages their roles, or the design requirements.")
        return
    print()
    ordered = explaining_first(sorted(sheet.checks, key=lambda check: check.slack), lambda check: check)
    spread = any(check.spread for check in ordered)
    heads = ("  verdict", "worst %", "needs", "nominal", *(("passing",) if spread else ()), "check")
    print_table(heads, [_cells(check, spread) for check in ordered], right=frozenset(range(1, len(heads) - 1)))


def _explain(asked: Namespace, subject: Subject) -> int:
    """Compute one margin and print where it comes from."""
    from ...engine.circuit.circuit import build
    from ...engine.studies.evaluate import asks_of
    from ...engine.studies.explanation import explain
    from ...engine.studies.margins import study
    from ..margin_text import check_name
    from ..origin_text import explanation_rows, origin_rows, together

    name = _meant(asked.explain, [ask.id for ask in asks_of(build(subject.design))])
    with progress("margins: lane") as show:
        # All of them: a corner that is searched for one margin may be the worst of another.
        checks = study(subject.design, lanes=asked.lanes or 0, seed=asked.seed, progress=show).checks
    check = next(each for each in checks if each.id == name)
    found = explain(subject.design, check)
    if asked.json:
        explained = {"check": asdict(check), "explanation": found.as_json()}
        print_json({"design": subject.name, "revision": subject.revision, **explained})
    else:
        print_words(f"{subject.title}, stage {check.stage}: {check_name(check)}")
        print()
        rows = together(origin_rows(check, True), explanation_rows(check, found))
        print_pairs([(label, text) for label, text, _ in rows])
    return 1 if asked.strict and check.verdict in (Verdict.FAIL, Verdict.UNKNOWN) else 0


def _meant(text: str, names: Sequence[str]) -> str:
    """The one margin that a text names, in whole or by a piece that no other has."""
    if text in names:
        return text
    holding = [name for name in names if text in name]
    if len(holding) == 1:
        return holding[0]
    near = holding or get_close_matches(text, names, 3, 0.4) or names
    if not near:
        raise CommandRefused("the design has no margins; give stages their roles, or the design requirements")
    listed = ", ".join(near[:6]) + (" ..." if len(near) > 6 else "")
    why = "could be several margins" if holding else "is no margin of this design"
    raise CommandRefused(f"--explain {visible(text)!r} {why}; write one of {listed}")


def _cells(check: CheckResult, spread: bool) -> tuple[str, ...]:
    """One row: figures in percent, then in words what is checked and what happens where it is worst."""
    what = " ".join(filter(None, (f"{check.title},", check.stage, check.part)))
    off = (
        f"by hand {percent(check.hand)} % is off: trust the simulation, left out: {left_out(check)}"
        if check.disagrees
        else None
    )
    words = dict.fromkeys(filter(None, (check.outcome, check.reason, off, check.extrapolated)))
    where = f"worst at {check.corner}" if check.corner else "worst"
    passing = (f"{check.spread.passing * 100:.1f}",) if check.spread else ("",)
    return (
        f"{MARKS[check.verdict]} {check.verdict}",
        figure(check.margin, check.outcome, _OUTCOME),
        f"{check.required * 100:.0f}",
        percent(check.nominal),
        *(passing if spread else ()),
        "\n".join((what, ": ".join((where, *words)))),
    )


def _lanes(text: str) -> int:
    return _whole(text, 0, MOST_LANES, "number of lanes")


def _seed(text: str) -> int:
    return _whole(text, 0, 2**32 - 1, "seed")


def _whole(text: str, least: int, most: int, what: str) -> int:
    if not (text.isascii() and text.isdecimal() and len(text) < 12 and least <= int(text) <= most):
        raise ArgumentTypeError(f"{text!r} cannot be the {what}; write a whole number from {least} to {most}")
    return int(text)
