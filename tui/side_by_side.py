"""Two to six revisions side by side as lines: rows by what got worse, columns by revision, causes of one row. Pure."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from ..engine.results import CheckResult
from ..engine.studies.comparison import Comparison, Side
from ..engine.studies.comparison import Row as Compared
from .drafting import incomplete
from .margin_text import check_name, corner_words
from .shown import MARKS, TONES, WORDS, Line, Span, counted, figure, fit, fit_right, line, percent, points
from .widgets.row_list import Row

if TYPE_CHECKING:
    from ..engine.studies.causes import CausesSheet

FOLDED = "folded"
_FIRST = 11
_OTHER = 17
_BESIDES = 3  # cells of the hand's mark and of the gap behind the title


def title_cells(count: int, width: int) -> int:
    """Cells for the names of the checks in a list of this width, so that two columns beside the first are in sight."""
    return max(10, min(34, width - _BESIDES - _FIRST - _OTHER * min(2, count - 1)))


def columns_in_sight(count: int, chosen: int, width: int, title: int) -> list[int]:
    """The first column and as many others around the chosen one as there is room for."""
    room = max(1, (width - title - _BESIDES - _FIRST) // _OTHER)
    if room >= count - 1:
        return list(range(count))
    start = max(1, min(chosen - room // 2, count - room))
    return [0, *range(start, start + room)]


def compare_heading(sides: Sequence[Side], sight: Sequence[int], chosen: int, title: int) -> Line:
    """The column heads; the chosen column stands in brackets."""
    hidden = len(sides) - len(sight)
    spans = [Span(fit(f"({hidden} more columns)" if hidden else "", title + 1), "dim")]
    for at in sight:
        label = f"[{sides[at].label}]" if at == chosen else sides[at].label
        if incomplete(sides[at].sheet):
            label += "~"
        spans.append(Span(fit_right(label, _width(at)), "strong"))
        if at:
            spans.append(Span(fit_right("diff", _OTHER - _FIRST + 1), "strong"))
    return tuple(spans)


def compare_rows(
    compared: Comparison, sides: Sequence[Side], sight: Sequence[int], title: int, *, fold: bool = False
) -> list[Row]:
    """One row a check: figure with mark in each column, difference to the first one.

    ``fold`` leaves out what changed in no column and ends with a row :data:`FOLDED` that counts it.
    """
    shown = [row for row in compared.rows if not (fold and row.same)]
    rows = [Row(row.id, _compare_row(row, sides, sight, title)) for row in shown]
    hidden = len(compared.rows) - len(shown)
    if hidden:
        words = f"{counted(hidden, 'margin')} did not change: m shows {'it' if hidden == 1 else 'them'}"
        rows.append(Row(FOLDED, line(Span(words, "dim"))))
    return rows


def _compare_row(row: Compared, sides: Sequence[Side], sight: Sequence[int], title: int) -> Line:
    known = next(check for check in row.cells if check is not None)
    spans = [Span(fit(f"{check_name(known)} ({known.stage})", title) + " ")]
    for at in sight:
        check = row.cells[at]
        if check is None:
            spans.append(Span(fit_right("-", _width(at))))
        else:
            stamp = "~" if incomplete(sides[at].sheet) else ""
            shown = f"{MARKS[check.verdict]} {figure(check.margin, check.outcome, 7)}{stamp}"
            spans.append(Span(fit_right(shown, _width(at)), TONES[check.verdict]))
        if at:
            against = row.against(at)
            change = "" if against.change is None else points(against.change)
            spans.append(Span(fit_right(change, _OTHER - _FIRST + 1), "fail" if against.worse else ""))
    return tuple(spans)


def _width(column: int) -> int:
    return _FIRST - 1 if column else _FIRST


def side_lines(compared: Comparison, chosen: int, name: str, width: int) -> tuple[Line, ...]:
    """The first and the chosen side of a row in words: label, figure, verdict, required margin, corner."""
    row = next(row for row in compared.rows if row.id == name)
    return tuple(_side_line(compared.labels[at], row.cells[at], width) for at in (0, chosen))


def _side_line(label: str, check: CheckResult | None, width: int) -> Line:
    head = Span(f" {fit(label, 6)} ", "strong")
    if check is None:
        return line(head, Span("does not have this check", "dim"))
    shown = f"{MARKS[check.verdict]} {check.outcome or percent(check.margin)} {WORDS[check.verdict]}"
    required = f"   required {percent(check.required)}   "
    room = width - 9 - len(shown) - len(required)
    return line(head, Span(shown, TONES[check.verdict]), required + corner_words(check, max(10, room)))


def causes_line(causes: CausesSheet, name: str) -> Line:
    """The causes of one check: every change's share, largest first; apart from them what they do only together."""
    head = Span(" causes: ", "strong")
    if name in (*causes.appeared, *causes.vanished):
        return line(head, Span("this check is on one side only", "dim"))
    cause = next((cause for cause in causes.checks if cause.id == name), None)
    if cause is None:
        return line(head, Span("unknown, as the margin is", "dim"))
    ranked = sorted(cause.shares.items(), key=lambda item: -abs(item[1]))
    words = [f"{what} {points(share)}" for what, share in ranked] or ["nothing changed"]
    if cause.error is not None:
        words = [
            f"{word} (+/-{abs(cause.error[what]) * 100:.0f})" for word, (what, _) in zip(words, ranked, strict=True)
        ]
    if cause.formula is not None:
        words.append(f"newer formulas {points(cause.formula)}")
    together = f"   (together {points(cause.interaction)})" if len(ranked) > 1 else ""
    return line(head, "   ".join(words), Span(together, "dim"))
