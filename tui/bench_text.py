"""What the bench shows, as lines: heading, rows of parts and margins, and the words about what is under the hand."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

from rich.cells import cell_len

from ..engine.design.document import Design
from ..engine.design.part import Part, Stage
from ..engine.parts.made import from_memory
from ..engine.results import CheckResult, Depth, MarginSheet
from ..engine.stages.modified import is_modified
from ..storage.values import Draft
from .chain_picture import Link
from .figures import FigureRow, Figures
from .shown import MARKS, TONES, WORDS, Line, Span, columns, figure, fit, fit_right, line, percent, points, visible
from .widgets.row_list import Row

_ROOMY = 60
PARTS_WIDTHS = (4, 6, 5)


def heading(draft: Draft, figures: Figures, progress: str, width: int, looking: bool = False) -> Line:
    """Name, whether it is only looked at, what the draft is based on, conditions, and how far the study is."""
    base = "not saved yet" if draft.base_revision is None else f"draft on r{draft.base_revision}"
    edits = "no edits" if draft.edits == 0 else f"{draft.edits} edit{'s' * (draft.edits != 1)}"
    left = f" {draft.name}{' (only looked at)' if looking else ''}  {base}, {edits}  {conditions_words(draft.design)}"
    right = " FROZEN: f shows the figures " if figures.frozen else f" {progress} " if width >= _ROOMY else ""
    room = max(0, width - len(right))
    return line(Span(fit(left, room), "strong"), Span(right, "thin" if figures.frozen else ""))


def conditions_words(design: Design) -> str:
    """Supply and ambient as the document writes them: ``4 V .. 6.4 V  0 C .. 50 C``."""
    found = []
    for name in ("supply", "ambient"):
        condition = getattr(design.conditions, name)
        if isinstance(condition, str):
            found.append(condition)
        elif condition is not None:
            found.append(f"{condition.min or condition.nominal} .. {condition.max or condition.nominal}")
    return "  ".join(found)


def links(design: Design, figures: Figures) -> tuple[Link, ...]:
    """The stages for the chain."""
    rows = figures.rows()
    found = []
    for stage in design.stages:
        here = [row for row in rows if row.check.stage == stage.name]
        known = [row for row in here if row.worst_known]
        weakest = min(known, key=lambda row: row.check.slack, default=None)
        found.append(Link(stage.name, weakest, bool(here) or figures.nominal is None))
    return tuple(found)


def part_rows(stage: Stage, changed: Collection[str]) -> list[Row]:
    """The parts of a stage: reference, value, tolerance, what it is; a star where it differs from the revision."""
    roles = {ref: name.replace("_", " ") for name, ref in stage.roles.items()}
    rows = []
    for part in stage.parts:
        star = Span("*", "strong") if part.ref in changed else Span(" ")
        role = roles.get(part.ref, "")
        if part.value is None and part.tolerance is None:
            what = ", ".join(filter(None, (part.class_ or kind_words(part), role)))
            text = f"{fit(part.ref, PARTS_WIDTHS[0])} {what}"
        else:
            what = role or kind_words(part)
            text = columns((*PARTS_WIDTHS, 24), (part.ref, part.value or "-", part.tolerance or "", what))
        rows.append(Row(part.ref, (star, Span(text))))
    return rows


def part_heading(stage: Stage | None) -> Line:
    """The line above the parts."""
    if stage is None:
        return line(Span("no stage", "strong"))
    return line(Span(f"{stage.name}: {'modified' if is_modified(stage) else 'parts'}", "strong"))


def kind_words(part: Part) -> str:
    """The kind of a part for people: ``npn``, ``light resistor``."""
    return part.kind.replace("_", " ")


@dataclass(frozen=True, slots=True)
class MarginColumns:
    """Cells for the columns whose width depends on the room there is; the others have theirs always."""

    title: int
    difference: int
    corner: int

    @classmethod
    def for_width(cls, width: int) -> MarginColumns:
        """The columns of a list of this width. A narrow one leaves the difference to the mark ``<``."""
        rest = width - 2 - 2 - (_NOMINAL + 1) - (_WORST + 1) - (_WAS + 1) - 1
        difference = 5 if rest > 30 else 0
        rest -= difference + 1 if difference else 0
        corner = max(0, min(44, rest * 9 // 20))
        return cls(max(6, rest - corner), difference, corner)


_NOMINAL, _WORST, _WAS = 7, 7, 5


def margin_heading(width: int, all_stages: bool, base: int | None) -> Line:
    """The column heads of the margins."""
    cells = MarginColumns.for_width(width)
    was = "-" if base is None else f"r{base}"
    name = "all margins" if all_stages else "margins"
    texts = [fit(name, cells.title), fit_right("nominal", _NOMINAL), fit_right("worst", _WORST), fit_right(was, _WAS)]
    if cells.difference:
        texts.append(fit_right("diff", cells.difference))
    return line(Span("  " + " ".join([*texts, fit("corner", cells.corner)]), "strong"))


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
        spans.append(Span(fit_right(change, cells.difference) + " ", old or ("fail" if row.against.worse else "")))
    return (*spans, Span(fit(check.corner if row.worst_known else "", cells.corner), old))


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


def part_lines(part: Part, role: str, was: str | None, lower: str | None, higher: str | None) -> tuple[Line, Line]:
    """Two lines about the part under the hand: what it is and where, and what it was and could be."""
    pins = "  ".join(f"{pin} {net}" for pin, net in part.pins.items())
    data = [part.value, part.tolerance, part.rating if isinstance(part.rating, str) else None, part.class_]
    facts = "  ".join(text for text in data if text)
    first = " " + "   ".join(filter(None, (part.ref, f"{kind_words(part)}  {facts}".strip(), role, pins)))
    known = []
    memory = len(from_memory(part))
    if part.drawer:
        known.append(f"drawer: {part.drawer}")
    if memory:
        known.append(f"{memory} figures from memory (i)")
    if was is not None and was != part.value:
        known.append(f"last was {was}")
    if lower:
        known.append(f"lower {lower}")
    if higher:
        known.append(f"higher {higher}")
    return line(Span(first)), line(Span(" " + "   ".join(known)))


def check_lines(row: FigureRow) -> tuple[Line, Line]:
    """Two lines about the chosen margin: figure, requirement and corner, and the words where there are any."""
    check = row.check
    where = check_name(check)
    if row.worst_known:
        worst = f"{check.outcome or percent(check.margin)} {WORDS[check.verdict]}"
        first = f" {where}: worst {worst}, required {percent(check.required)}, at {check.corner or 'any corner'}"
    else:
        first = f" {where}: worst corner not known yet, required {percent(check.required)}"
    spread = "" if check.spread is None else f"spread: {check.spread.passing * 100:.1f} % hold   "
    off = f"by hand {percent(check.hand)}, which disagrees   " if check.disagrees else ""
    return line(first), line(f" {off}{spread}{check.reason or ''}   sequence {check.sequence}")


def spread_words(sheet: MarginSheet, lanes: int) -> str:
    """What stands in the heading when a sheet of this depth is known, of a study that goes on to ``lanes`` lanes."""
    if sheet.depth is Depth.SPREAD:
        return f"spread of {sheet.lanes} lanes"
    if sheet.depth is Depth.CORNERS and not lanes:
        return "corners, no spread"
    return f"computing: {sheet.depth} known"


def worse_words(figures: Figures, base: int | None) -> tuple[str, str]:
    """What got worse than the base revision, anywhere in the design, and the tone it is said in."""
    if figures.before is None or base is None:
        return "", ""
    if figures.worst is None or figures.worst_old:
        return f"~ compared with r{base}: being computed", "dim"
    worse = [row for row in figures.rows() if row.against.worse]
    if not worse:
        return f"nothing is worse than in r{base}", ""
    row = worse[0]
    name = check_name(row.check)
    change = "" if row.against.change is None else f" {points(row.against.change)}"
    more = f", {len(worse) - 1} more" if len(worse) > 1 else ""
    return f"worse than r{base}: {name}{change} ({row.check.stage}){more}", "fail"
