"""The history as plain lines: the tree of revisions, their worst margins, and the trend of one margin. Pure."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass
from textwrap import wrap

from ..engine.design.differences import differences
from ..engine.results import CheckResult, explaining_first
from ..storage.values import Revision
from .drafting import change_words, incomplete
from .margin_text import corner_words, name_cell
from .shown import MARKS, TONES, Line, Span, figure, fit, fit_right, line, percent, visible
from .widgets.row_list import Row

TREND_WIDTH = 13
_LABEL = 12
_WIDE = 100


@dataclass(frozen=True, slots=True)
class Branch:
    """A revision and how far from the line that leads to the draft it stands."""

    revision: Revision
    depth: int


def tree(revisions: Sequence[Revision], head: int | None) -> list[Branch]:
    """The revisions from the first on: side branches stand indented below the revision they left from.

    The line at no depth is the one that leads to ``head``, or to the newest revision.
    """
    by_number = {revision.number: revision for revision in revisions}
    children: dict[int | None, list[int]] = {}
    for revision in revisions:
        parent = revision.parent if revision.parent in by_number else None
        children.setdefault(parent, []).append(revision.number)
    main: set[int] = set()
    at = head if head in by_number else max(by_number, default=None)
    while at is not None and at not in main:
        main.add(at)
        at = by_number[at].parent
    found: list[Branch] = []
    waiting = [(number, 0) for number in sorted(children.get(None, []), key=lambda n: (n not in main, n), reverse=True)]
    while waiting:
        number, depth = waiting.pop()
        found.append(Branch(by_number[number], depth))
        here = sorted(children.get(number, []))
        onward = next((n for n in here if n in main), here[-1] if here else None)
        if onward is not None:
            waiting.append((onward, depth))
        waiting += [(n, depth + 1) for n in reversed(here) if n != onward]
    return found


def check_names(revisions: Sequence[Revision]) -> dict[str, str]:
    """Every check that any revision has, by id, with its title; those of the newest revision first, worst first."""
    names: dict[str, str] = {}
    for revision in reversed(revisions):
        for check in sorted(revision.sheet.checks, key=lambda check: check.slack):
            names.setdefault(check.id, f"{check.title} {check.part}".strip())
    return names


def history_heading(width: int) -> Line:
    """The column heads."""
    saved = fit("saved", 11) if width >= _WIDE else ""
    words = f"  {fit('revision', 10)} {saved}{fit('worst', _worst_cells(width))} {fit('trend', TREND_WIDTH + 6)} note"
    return line(Span(fit(words, max(0, width - 2)), "strong"))


def _worst_cells(width: int) -> int:
    """Cells for the worst margin and the name of its check."""
    return 20 if width < _WIDE else min(36, 20 + (width - _WIDE) // 2 + 4)


def history_rows(
    branches: Sequence[Branch], marked: Collection[int], head: int | None, trend: str | None, width: int
) -> list[Row]:
    """One row a revision: mark, place in the tree, when, worst margin with its check, trend, first line of the note."""
    values = [_value(_check(branch.revision, trend)) for branch in branches]
    return [
        _row(branch, branch.revision.number in marked, branch.revision.number == head, trend, values, width)
        for branch in branches
    ]


def _row(
    branch: Branch, marked: bool, is_head: bool, trend: str | None, values: Sequence[float | None], width: int
) -> Row:
    revision = branch.revision
    place = (
        f"{'  ' * min(branch.depth, 3)}{'- ' if branch.depth else ''}r{revision.number}{' draft' if is_head else ''}"
    )
    worst = revision.sheet.worst
    if worst is None:
        worst_text, tone = "no margins", "unknown"
    else:
        words = figure(worst.margin, worst.outcome, 8)
        stamp = "~" if incomplete(revision.sheet) else " "
        worst_text = f"{MARKS[worst.verdict]} {fit(words + stamp, 8)} {worst.title}"
        tone = "dim" if incomplete(revision.sheet) else TONES[worst.verdict]
    check = _check(revision, trend)
    shown = "" if check is None else figure(check.margin, check.outcome, 5)
    return Row(
        str(revision.number),
        (
            Span("+ " if marked else "  ", "strong"),
            Span(fit(place, 10) + " ", "strong"),
            Span(fit(revision.saved[:10], 11) if width >= _WIDE else ""),
            Span(fit(worst_text, _worst_cells(width)) + " ", tone),
            Span(fit_right(shown, 5) + " "),
            Span(trend_cells(_value(check), values, TREND_WIDTH) + " "),
            Span(revision.note.line.splitlines()[0] if revision.note.line else ""),
        ),
    )


def trend_cells(value: float | None, values: Sequence[float | None], width: int) -> str:
    """One row of the trend: ``o`` where the value lies between the least and the greatest, ``|`` at zero."""
    known = [each for each in values if each is not None]
    low, high = min([0.0, *known]), max([0.0, *known])
    if high - low < 1e-9:
        high = low + 1.0

    def place(number: float) -> int:
        return round((number - low) / (high - low) * (width - 1))

    cells = [" "] * width
    cells[place(0.0)] = "|"
    if value is not None:
        cells[place(value)] = "o"
    return "".join(cells)


def _check(revision: Revision, id: str | None) -> CheckResult | None:
    return next((check for check in revision.sheet.checks if check.id == id), None)


def _value(check: CheckResult | None) -> float | None:
    """A margin for the trend, held within -100 % .. +100 %."""
    return None if check is None or check.margin is None else max(-1.0, min(1.0, check.margin))


def revision_lines(revision: Revision) -> tuple[Line, ...]:
    """Four lines about the revision under the hand: where it comes from, why it is, what was changed, what came of
    it."""
    parent = "first" if revision.parent is None else f"from r{revision.parent}"
    stamp = ", saved incomplete" if incomplete(revision.sheet) else ""
    when = revision.saved.replace("T", " ")[:16]
    first = f" r{revision.number}, {parent}, saved {when}{stamp}"
    note = [(label, " ".join(getattr(revision.note, name).split())) for name, label in _IN_SHORT]
    return line(first), *(line(Span(f" {label:<8}", "strong"), text) for label, text in note if text)


_IN_SHORT = (("line", "why"), ("change", "change"), ("result", "result"))


def revision_rows(revision: Revision, parent: Revision | None, width: int) -> list[tuple[str, Line]]:
    """Everything about one revision: its note in full, what differs from its parent, its margins from the worst."""
    rows: list[tuple[str, Line]] = []
    room = max(20, width - 2 - _LABEL)
    for name in ("line", "symptom", "hypothesis", "change", "prediction", "result", "next"):
        texts = [piece for text in getattr(revision.note, name).splitlines() for piece in wrap(visible(text), room)]
        for at, text in enumerate(texts):
            label = {"line": "why"}.get(name, name) if at == 0 else ""
            rows.append((f"note {name} {at}", line(Span(f"{label:<{_LABEL}}", "strong"), text)))
    if parent is not None:
        for at, change in enumerate(differences(parent.design, revision.design)):
            label = f"since r{parent.number}" if at == 0 else ""
            rows.append((f"change {at}", line(Span(f"{label:<{_LABEL}}", "strong"), change_words(change))))
    rows.append(("gap", line(Span("margins as they were when it was saved", "dim"))))
    ordered = sorted(revision.sheet.checks, key=lambda check: check.slack)
    for check in explaining_first(ordered, lambda check: check):
        shown = figure(check.margin, check.outcome, 10)
        rows.append(
            (
                check.id,
                line(
                    Span(f"{MARKS[check.verdict]} {fit(shown, 10)} ", TONES[check.verdict]),
                    f"of {fit_right(percent(check.required), 4)} required  {name_cell(check, 24, False)} ",
                    corner_words(check, max(10, width - 58)),
                ),
            )
        )
    return rows
