"""``stagebook margins``: recompute every margin of a design."""

from __future__ import annotations

from argparse import ArgumentParser, ArgumentTypeError, Namespace

from ...engine.results import CheckResult, MarginSheet, Verdict
from ..shown import MARKS, percent, visible
from .printing import json_argument, print_json, print_table, print_words
from .waiting import computable, prepare_solver, progress
from .what import Subject, find, subject_arguments

MOST_LANES = 100_000


def arguments(parser: ArgumentParser) -> None:
    """Declare WHAT and how it is computed."""
    subject_arguments(parser)
    parser.add_argument(
        "--lanes",
        metavar="K",
        type=_lanes,
        default=1000,
        help=f"lanes of the spread, up to {MOST_LANES} (default 1000; 0 skips it)",
    )
    parser.add_argument("--seed", metavar="S", type=_seed, default=1, help="seed of the spread (default 1)")
    parser.add_argument("--strict", action="store_true", help="exit status 1 if a margin is FAIL or UNKNOWN")
    json_argument(parser)


def run(asked: Namespace) -> int:
    """Compute and print the margins, the one with the least slack first."""
    subject = find(asked)
    prepare_solver(lambda: computable(subject.design))
    # Imported here: it loads the compiler, which must find its folder chosen.
    from ...engine.studies.margins import study

    with progress("margins: lane") as show:
        sheet = study(subject.design, lanes=asked.lanes, seed=asked.seed, progress=show)
    if asked.json:
        found = sheet.as_json()
        del found["design"]
        print_json({"design": subject.name, "revision": subject.revision, **found})
    else:
        _print(subject, sheet)
    failed = any(check.verdict in (Verdict.FAIL, Verdict.UNKNOWN) for check in sheet.checks)
    return 1 if asked.strict and failed else 0


def _print(subject: Subject, sheet: MarginSheet) -> None:
    print(f"{visible(subject.title)}: {len(sheet.checks)} margins in {sheet.seconds:.1f} s", end="")
    print(f", {sheet.lanes} lanes with seed {sheet.seed}" if sheet.lanes else ", without a spread")
    if not sheet.checks:
        print_words("No check applies: give stages their roles, or the design requirements.")
        return
    print()
    ordered = sorted(sheet.checks, key=lambda check: check.slack)
    spread = any(check.spread for check in ordered)
    heads = ("  verdict", "worst %", "needs", "nominal", *(("passing",) if spread else ()), "check")
    print_table(heads, [_cells(check, spread) for check in ordered], right=frozenset(range(1, len(heads) - 1)))


def _cells(check: CheckResult, spread: bool) -> tuple[str, ...]:
    """One row: figures in percent, then in words what is checked and what happens where it is worst."""
    what = " ".join(filter(None, (f"{check.title},", check.stage, check.part)))
    words = dict.fromkeys(filter(None, (check.outcome, check.reason)))
    where = f"worst at {check.corner}" if check.corner else "worst"
    passing = (f"{check.spread.passing * 100:.1f}",) if check.spread else ("",)
    return (
        f"{MARKS[check.verdict]} {check.verdict}",
        percent(check.margin),
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
