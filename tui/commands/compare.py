"""``stagebook compare``: the stored margins of several revisions side by side, what got worse first."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from collections.abc import Sequence

from ...engine.design.differences import Change
from ...engine.results import CheckResult, Verdict
from ...engine.studies.comparison import Comparison, Row, Side, compare
from ..shown import MARKS, WORDS, percent
from .printing import json_argument, print_json, print_table, print_words
from .revisions import revision_arguments, stored

MOST = 6


def arguments(parser: ArgumentParser) -> None:
    """Declare WHAT and the revisions."""
    revision_arguments(parser, f"two to {MOST}")
    json_argument(parser)


def run(asked: Namespace) -> int:
    """Print the margins as they were when the revisions were saved; nothing is computed."""
    name, revisions = stored(asked, 2, MOST)
    comparison = compare([Side(f"r{found.number}", found.sheet, found.design) for found in revisions])
    engines = [found.sheet.engine for found in revisions]
    if asked.json:
        print_json({"design": name, "engines": engines, **comparison.as_json()})
    else:
        _print(name, comparison, engines)
    return 0


def _print(name: str, comparison: Comparison, engines: Sequence[str]) -> None:
    first, *others = comparison.labels
    print_words(f"{name}: {', '.join(others)} against {first}")
    for label, changes in zip(others, comparison.changed[1:], strict=True):
        print_words(f"{label}: {'; '.join(map(_change, changes)) or 'the same document'}", hanging=4)
    if len(set(engines)) > 1:
        told = ", ".join(f"{label} by {engine}" for label, engine in zip(comparison.labels, engines, strict=True))
        print_words(f"Computed by different versions of the engine, whose formulas may differ: {told}.")
    worse = [row for row in comparison.rows if _worse_in(row, comparison.labels)]
    rest = [row for row in comparison.rows if row not in worse]
    for title, rows in (("got worse", worse), ("others", rest)):
        if rows:
            print()
            cells = [_cells(row, comparison.labels) for row in rows]
            print_table((*comparison.labels, title), cells, right=frozenset(range(len(comparison.labels))))
    print()
    marks = ", ".join(f"{MARKS[verdict]} {WORDS[verdict]}" for verdict in Verdict)
    print_words(f"Margins in percent. {marks}, - no such check" if comparison.rows else "No check in any of them.")


def _change(change: Change) -> str:
    if change.before is None or change.after is None:
        return f"{change.what} {change.kind}"
    return f"{change.what} {change.before} to {change.after}"


def _worse_in(row: Row, labels: Sequence[str]) -> list[str]:
    return [label for n, label in enumerate(labels) if n and row.against(n).worse]


def _cells(row: Row, labels: Sequence[str]) -> tuple[str, ...]:
    """One row: a cell for each revision, then the check and in words what happens instead of a number."""
    known = next(check for check in reversed(row.cells) if check is not None)
    words = [" ".join(filter(None, (f"{known.title},", known.stage, known.part)))]
    worse = _worse_in(row, labels)
    if worse and len(labels) > 2:
        words.append(f"worse in {', '.join(worse)}")
    words += [
        f"{label}: {cell.outcome}" for label, cell in zip(labels, row.cells, strict=True) if cell and cell.outcome
    ]
    return *map(_cell, row.cells), "\n".join(words)


def _cell(check: CheckResult | None) -> str:
    if check is None:
        return "-"
    return f"{MARKS[check.verdict]} {percent(check.margin)}"
