"""The shelf as lines: every design with its newest revision, its draft, and the worst margin there is of it. Pure."""

from __future__ import annotations

from ..engine.results import MarginSheet, Verdict
from ..storage.values import DesignRow, Worst
from .shown import MARKS, TONES, WORDS, Line, Span, columns, counted, figure, line

_BROAD = 100
_FIGURE = 14
_OUTCOME = 6


def _widths(width: int) -> tuple[int, ...]:
    """Cells for name, newest revision, when it was saved, edits since."""
    return (30, 6, 16, 9) if width >= _BROAD else (16, 6, 10, 8)


def shelf_heading(width: int) -> Line:
    """The column heads."""
    return line(Span(columns(_widths(width), ("design", "newest", "saved", "draft")) + "   worst margin", "strong"))


def shelf_line(row: DesignRow, drafts_own: MarginSheet | None, width: int) -> Line:
    """One design. The worst margin is the draft's where its figures are known; else the newest revision's, which is
    said and marked old (``~``) where the draft differs from it."""
    widths = _widths(width)
    newest = f"r{row.revisions}" if row.revisions else "-"
    saved = row.saved.replace("T", " ")[: widths[2]] if row.saved else "never"
    pending = counted(row.edits_pending, "edit") if row.edits_pending else ""
    left = columns(widths, (row.name, newest, saved, pending)) + " "
    worst, whose, old = row.worst, "", ""
    check = None if drafts_own is None else drafts_own.worst
    if check is not None and (row.edits_pending or worst is None):
        worst, whose = Worst(check.id, check.margin, check.verdict, check.outcome), "draft: "
    elif worst is not None and row.edits_pending:
        whose, old = f"{newest}: ", "~"
    if worst is None:
        return line(left, Span("  no margins yet", "dim"))
    shown = figure(worst.margin, worst.outcome, _OUTCOME)
    # What fails by what happened needs no second word for it.
    word = "" if worst.outcome and worst.verdict is Verdict.FAIL else f" {WORDS[worst.verdict]}"
    words = f"{MARKS[worst.verdict]} {shown}{old}{word}"
    return line(left, Span(f"{words:<{_FIGURE}} ", "dim" if old else TONES[worst.verdict]), whose + id_words(worst.id))


def id_words(id: str) -> str:
    """The id of a check for people: ``latch_hold:latch:Q4`` is ``latch hold Q4``."""
    slug, *_, part = id.split(":")
    return " ".join(filter(None, (slug.replace("_", " ").replace("-", " "), part if ":" in id else "")))
