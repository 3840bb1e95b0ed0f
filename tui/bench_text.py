"""What the bench shows, as lines: heading, chain, rows of parts, the part under the hand, what got worse. Pure."""

from __future__ import annotations

from collections.abc import Collection, Sequence

from rich.cells import cell_len

from ..engine.design.document import Design
from ..engine.design.part import Part, Stage
from ..engine.parts import kinds
from ..engine.parts.edited import unusual_value
from ..engine.parts.made import from_memory
from ..engine.results import CheckResult, Depth, MarginSheet, Verdict, explaining_first
from ..engine.stages.modified import is_modified
from ..storage.values import Draft
from .chain_picture import Link
from .figures import Figures
from .margin_text import check_name
from .shown import WORDS, Line, Span, columns, counted, fit, line, percent, points, visible
from .widgets.row_list import Row

_ROOMY = 60
PARTS_WIDTHS = (4, 6, 5)
_WORSE_THAN_PASS = (Verdict.FAIL, Verdict.THIN, Verdict.UNKNOWN)


def heading(draft: Draft, figures: Figures, progress: str, width: int, looking: bool = False) -> Line:
    """Name, whether it is only looked at, what the draft is based on, conditions, and how far the study is."""
    base = "not saved yet" if draft.base_revision is None else f"draft on r{draft.base_revision}"
    edits = "no edits" if draft.edits == 0 else counted(draft.edits, "edit")
    name = f" {draft.name}{' (only looked at)' if looking else ''}"
    far = " FROZEN: f shows the figures " if figures.frozen else f" {progress} " if width >= _ROOMY else ""
    short = far.replace("spread of ", "")
    conditions = conditions_pieces(draft.design)
    everything = [f"{base}, {edits}", *conditions]
    tight = [f"{base}, {edits}".removeprefix("draft "), *(shortened(words) for words in conditions)]
    # What gives way first stands first. A condition is shown whole or not at all: half of it is another one.
    ways = [(everything, far), (everything, short), (tight, short)]
    ways += [(tight[:count], short) for count in range(len(tight) - 1, -1, -1)]
    lefts = [("  ".join((name, *pieces)), right) for pieces, right in ways]
    left, right = next((way for way in lefts if _cells(way[0]) + len(way[1]) <= width), lefts[-1])
    return line(Span(fit(left, max(0, width - len(right))), "strong"), Span(right, "thin" if figures.frozen else ""))


def _cells(text: str) -> int:
    return cell_len(visible(text))


def shortened(condition: str) -> str:
    """A range whose unit is written once where both ends have the same: ``11 .. 14 V`` for ``11 V .. 14 V``."""
    low, between, high = condition.partition(" .. ")
    number, space, unit = low.rpartition(" ")
    return f"{number}{between}{high}" if space and between and high.endswith(f" {unit}") else condition


def conditions_pieces(design: Design) -> list[str]:
    """Supply and ambient as the document writes them, with their units: ``4 V .. 6.4 V`` and ``0 C .. 50 C``."""
    found = []
    for name, unit in (("supply", "V"), ("ambient", "C")):
        condition = getattr(design.conditions, name)
        if isinstance(condition, str):
            found.append(with_unit(condition, unit))
        elif condition is not None:
            ends = condition.min or condition.nominal, condition.max or condition.nominal
            found.append(" .. ".join(with_unit(end, unit) for end in ends))
    return found


def with_unit(text: str, unit: str) -> str:
    """A text as typed, with the unit that it was read with where it was typed without one."""
    return f"{text} {unit}" if text[-1:].isdigit() else text


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
        known.append(f"{counted(memory, 'figure')} from memory (i)")
    if was is not None and was != part.value:
        known.append(f"last was {was}")
    if lower:
        known.append(f"lower {lower}")
    if higher:
        known.append(f"higher {higher}")
    return line(Span(first)), line(Span(" " + "   ".join(known)))


def has_value(part: Part) -> bool:
    """Whether the kind of a part reads a value."""
    kind = kinds().get(part.kind)
    return kind is None or "value" in kind.fields


def valued(part: Part) -> str:
    """A part's new value, and what is to be said of one that no such part is made with."""
    unusual = unusual_value(part, kinds())
    return f"{part.ref} {part.value or ''}{f': {unusual}' if unusual else ''}"


def spread_words(sheet: MarginSheet, lanes: int) -> str:
    """What stands in the heading when a sheet of this depth is known, of a study that goes on to ``lanes`` lanes."""
    if sheet.depth is Depth.SPREAD:
        return f"spread of {counted(sheet.lanes, 'lane')}"
    if sheet.depth is Depth.CORNERS and not lanes:
        return "corners, no spread"
    return f"computing: {sheet.depth} known"


def worse_words(figures: Figures, base: str, same: bool) -> tuple[str, str]:
    """What got worse than in the base revision, or than at first, anywhere in the design, and the tone it is said in.

    Where nothing did, whether all is well: ``same`` tells that the draft is that state.
    """
    if figures.before is None:
        return "", ""
    if figures.worst is None or figures.worst_old:
        return f"~ compared with {base}: being computed", "dim"
    rows = figures.rows()
    worse = [row for row in rows if row.against.worse]
    if not worse:
        words, tone = standing_words([row.check for row in rows if row.worst_known])
        return f"{f'the same as {base}' if same else f'nothing is worse than in {base}'}; {words}", tone
    row = worse[0]
    name = check_name(row.check)
    change = "" if row.against.change is None else f" {points(row.against.change)}"
    more = f", {len(worse) - 1} more" if len(worse) > 1 else ""
    return f"worse than {base}: {name}{change} ({row.check.stage}){more}", "fail"


def standing_words(checks: Sequence[CheckResult]) -> tuple[str, str]:
    """How a design stands, with the tone: ``1 FAIL, 2 thin: latch hold Q4 -12``."""
    counts = {verdict: sum(check.verdict is verdict for check in checks) for verdict in WORDS}
    found = [f"{counts[verdict]} {WORDS[verdict]}" for verdict in _WORSE_THAN_PASS if counts[verdict]]
    if not found:
        return "every margin holds", ""
    failed = sorted((check for check in checks if check.verdict is not Verdict.PASS), key=lambda check: check.slack)
    weakest = explaining_first(failed, lambda check: check)[0]
    tone = "fail" if counts[Verdict.FAIL] else "thin" if counts[Verdict.THIN] else "unknown"
    return f"{', '.join(found)}: {check_name(weakest)} {weakest.outcome or percent(weakest.margin)}", tone
