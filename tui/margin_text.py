"""Margins on the bench as lines: rows of the table, and the words about the one under the hand. Pure."""

from __future__ import annotations

import re
from dataclasses import dataclass
from textwrap import wrap

from rich.cells import cell_len

from ..engine.results import CheckResult
from .figures import FigureRow
from .origin_text import left_out
from .shown import MARKS, TONES, WORDS, Line, Span, figure, fit, fit_right, line, percent, points, visible
from .widgets.row_list import Row

_OF_A_PART = re.compile(r"[A-Z]+\d")
"""A designator begins a piece of a corner that is about a part; the others are conditions."""


@dataclass(frozen=True, slots=True)
class MarginColumns:
    """Cells for the columns whose width depends on the room there is; the others have theirs always.

    Where there is no room for a corner that says something, names and differences have it; the corner of the margin
    under the hand stands below the table then as ever.
    """

    title: int
    difference: int
    corner: int

    @classmethod
    def for_width(cls, width: int) -> MarginColumns:
        """The columns of a list of this width. A very narrow one leaves the difference to the mark ``<``."""
        rest = width - 2 - 2 - (_NOMINAL + 1) - (_WORST + 1) - (_WAS + 1)
        difference = 5 if rest > 20 else 0
        rest -= difference + 1 if difference else 0
        corner = 0 if rest < _CORNER_FROM else min(44, rest * 9 // 20)
        return cls(max(6, rest - corner - 1), difference, corner)


_NOMINAL, _WORST, _WAS = 7, 7, 5
_CORNER_FROM = 40


def margin_heading(width: int, all_stages: bool, was: str) -> Line:
    """The column heads of the margins; ``was`` is what they are compared with."""
    cells = MarginColumns.for_width(width)
    name = "all margins" if all_stages else "margins"
    texts = [fit(name, cells.title), fit_right("nominal", _NOMINAL), fit_right("worst", _WORST), fit_right(was, _WAS)]
    if cells.difference:
        texts.append(fit_right("diff", cells.difference))
    texts += [fit("corner", cells.corner)] if cells.corner else []
    return line(Span("  " + " ".join(texts), "strong"))


def margin_rows(rows: tuple[FigureRow, ...], width: int, all_stages: bool) -> list[Row]:
    """The checks with nominal, worst, what it was, and the corner in words. Old figures are dim and carry ``~``."""
    cells = MarginColumns.for_width(width)
    return [Row(row.check.id, _margin_row(row, cells, all_stages)) for row in rows]


def _margin_row(row: FigureRow, cells: MarginColumns, all_stages: bool) -> Line:
    check = row.check
    old = "dim" if row.worst_old else ""
    tone = old or TONES[check.verdict]
    mark = (MARKS[check.verdict] if row.worst_known else " ") + ("<" if row.against.worse else " ")
    worst = figure(check.margin, check.outcome, _WORST - 1) if row.worst_known else ""
    before = "-" if row.before is None else figure(row.before.margin, row.before.outcome, _WAS)
    spans = [
        Span(mark, old or ("fail" if row.against.worse else tone)),
        Span(name_cell(check, cells.title, all_stages) + " "),
        Span(fit_right(percent(row.nominal) + _age(row.nominal_old), _NOMINAL) + " ", "dim" if row.nominal_old else ""),
        Span(fit_right(worst + _age(row.worst_old), _WORST) + " ", tone),
        Span(fit_right(before, _WAS) + " "),
    ]
    if cells.difference:
        change = "" if row.against.change is None else points(row.against.change)
        change = "" if change == "+0" else change  # what stayed as it was leaves the eye free for what did not
        spans.append(Span(fit_right(change, cells.difference) + " ", old or ("fail" if row.against.worse else "")))
    return (*spans, Span(corner_words(check, cells.corner) if row.worst_known and cells.corner else "", old))


def _age(old: bool) -> str:
    return "~" if old else " "


def name_cell(check: CheckResult, width: int, with_stage: bool) -> str:
    """Title and part in ``width`` cells; of a long title the end gives way, never the part."""
    title = f"{check.stage}: {check.title}" if with_stage else check.title
    part = f" {visible(check.part)}" if check.part else ""
    room = width - cell_len(part)
    return fit(check_name(check), width) if room < 4 else fit(fit(title, room).rstrip() + part, width)


def check_name(check: CheckResult) -> str:
    """Title and part of a check: ``duration LS1``."""
    return f"{check.title} {check.part}".strip()


def corner_words(check: CheckResult, width: int) -> str:
    """As much of the corner as fits, whole words: conditions first, then what belongs to the part itself; the rest is
    counted (``+12``)."""
    pieces = check.corner.split(", ")
    pieces.sort(key=lambda piece: (bool(_OF_A_PART.match(piece)), piece.split()[:1] != [check.part]))
    for count in range(len(pieces), 0, -1):
        more = f" +{len(pieces) - count}" if count < len(pieces) else ""
        words = ", ".join(pieces[:count]) + more
        if cell_len(visible(words)) <= width:
            return words
    return fit(check.corner, width).rstrip()


def check_lines(row: FigureRow, width: int) -> tuple[Line, ...]:
    """Three lines about the chosen margin: figure and requirement, then its corner, and words where there are any."""
    check = row.check
    where = check_name(check)
    if row.worst_known:
        worst = f"{check.outcome or percent(check.margin)} {WORDS[check.verdict]}"
        first = f" {where}: worst {worst}, required {percent(check.required)}"
    else:
        first = f" {where}: worst corner not known yet, required {percent(check.required)}"
    spread = "" if check.spread is None else f", spread {check.spread.passing * 100:.1f} % hold"
    off = (
        f"by hand {percent(check.hand)} is off: trust the simulation, left out: {left_out(check)}"
        if check.disagrees
        else ""
    )
    said = "   ".join(filter(None, (off, check.reason, check.extrapolated)))
    first += f"{spread}, sequence {check.sequence}"
    if not row.worst_known:
        return line(first), line(f" {said}")
    if said:
        return line(first), line(f" {said}"), line(f" at {corner_words(check, width - 5)}")
    # A little less than two lines, because words are not broken.
    corner = wrap(f"at {corner_words(check, 2 * width - 20)}", max(10, width - 2))
    return line(first), *(line(f" {piece}") for piece in corner[:2])


def corner_line(row: FigureRow, width: int) -> Line:
    """One line: the margin under the hand with its corner, however many parts are at an end there."""
    check = row.check
    if not row.worst_known:
        return line(Span(f" {check_name(check)}: worst corner not known yet", "dim"))
    head = f" {check_name(check)} at "
    return line(Span(head + corner_words(check, width - cell_len(head) - 1), "dim" if row.worst_old else ""))
