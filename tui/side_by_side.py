"""Two to six revisions side by side as lines: rows by what got worse, columns by revision, causes of one row. Pure."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from ..engine.design.document import Design
from ..engine.results import CheckResult, MarginSheet, Verdict
from .drafting import incomplete
from .shown import MARKS, TONES, WORDS, Line, Span, figure, fit, fit_right, line, percent
from .solver import Share
from .widgets.row_list import Row


@dataclass(frozen=True, slots=True)
class Column:
    """One revision, or the draft, with its margins."""

    label: str
    sheet: MarginSheet
    design: Design


@dataclass(frozen=True, slots=True)
class Against:
    """One check of one column beside the same check of the first column."""

    before: CheckResult | None
    after: CheckResult | None

    @property
    def change(self) -> float | None:
        """What the margin changed by; None where either side has no margin."""
        if self.before is None or self.after is None or self.before.margin is None or self.after.margin is None:
            return None
        return self.after.margin - self.before.margin

    @property
    def fell(self) -> bool:
        """Whether the verdict is a lower one."""
        if self.before is None or self.after is None:
            return False
        return _RANK[self.after.verdict] < _RANK[self.before.verdict]

    @property
    def worse(self) -> bool:
        """Whether the verdict fell, or the margin by more than half a percent."""
        return self.fell or (self.change is not None and self.change < -0.005)

    @property
    def order(self) -> tuple[int, float]:
        """What got worse comes first: fallen verdicts, then losses; the others by least slack."""
        if self.worse:
            return (0 if self.fell else 1, self.change if self.change is not None else -2.0)
        known = self.after or self.before
        return (2, known.slack if known else 0.0)


_RANK = {Verdict.FAIL: 0, Verdict.UNKNOWN: 1, Verdict.THIN: 2, Verdict.PASS: 3}


def order(columns: Sequence[Column], chosen: int) -> list[str]:
    """The ids of all checks of the first and the chosen column, what got worse first."""
    tables = [_by_id(columns[at]) for at in (0, chosen)]
    names = dict.fromkeys([*tables[1], *tables[0]])
    return sorted(names, key=lambda name: Against(tables[0].get(name), tables[1].get(name)).order)


def columns_in_sight(count: int, chosen: int, width: int, title: int) -> list[int]:
    """The first column and as many others around the chosen one as there is room for."""
    room = max(1, (width - title - 2 - _FIRST) // _OTHER)
    if room >= count - 1:
        return list(range(count))
    start = max(1, min(chosen - room // 2, count - room))
    return [0, *range(start, start + room)]


_FIRST = 11
_OTHER = 17


def compare_heading(columns: Sequence[Column], sight: Sequence[int], chosen: int, title: int) -> Line:
    """The column heads; the chosen column stands in brackets."""
    hidden = len(columns) - len(sight)
    spans = [Span(fit(f"({hidden} more columns)" if hidden else "", title + 1), "dim")]
    for at in sight:
        label = f"[{columns[at].label}]" if at == chosen else columns[at].label
        if incomplete(columns[at].sheet):
            label += "~"
        spans.append(Span(fit_right(label, _FIRST if at == 0 else _FIRST - 1), "strong"))
        if at:
            spans.append(Span(fit_right("diff", _OTHER - _FIRST + 1), "strong"))
    return tuple(spans)


def compare_rows(columns: Sequence[Column], sight: Sequence[int], chosen: int, title: int) -> list[Row]:
    """One row a check: figure with mark in each column, difference to the first one."""
    tables = {at: _by_id(columns[at]) for at in {*sight, 0, chosen}}
    return [Row(name, _compare_row(name, tables, columns, sight, title)) for name in order(columns, chosen)]


def _compare_row(
    name: str,
    tables: Mapping[int, Mapping[str, CheckResult]],
    columns: Sequence[Column],
    sight: Sequence[int],
    title: int,
) -> Line:
    known = next(table[name] for table in tables.values() if name in table)
    spans = [Span(fit(f"{known.title} {known.part} ({known.stage})", title) + " ")]
    for at in sight:
        check = tables[at].get(name)
        if check is None:
            spans.append(Span(fit_right("-", _FIRST if at == 0 else _FIRST - 1)))
        else:
            stamp = "~" if incomplete(columns[at].sheet) else ""
            shown = f"{MARKS[check.verdict]} {figure(check.margin, check.outcome, 7)}{stamp}"
            spans.append(Span(fit_right(shown, _FIRST if at == 0 else _FIRST - 1), TONES[check.verdict]))
        if at:
            against = Against(tables[0].get(name), check)
            shown = "" if against.change is None else percent(against.change)
            spans.append(Span(fit_right(shown, _OTHER - _FIRST + 1), "fail" if against.worse else ""))
    return tuple(spans)


def verdict_lines(columns: Sequence[Column], chosen: int, name: str) -> tuple[Line, Line]:
    """The chosen row in words, one line a side: label, figure, verdict, corner."""
    first, second = (_side(columns[at], _by_id(columns[at]).get(name)) for at in (0, chosen))
    return first, second


def _side(column: Column, check: CheckResult | None) -> Line:
    label = Span(f" {fit(column.label, 6)} ", "strong")
    if check is None:
        return line(label, Span("does not have this check", "dim"))
    shown = f"{MARKS[check.verdict]} {check.outcome or percent(check.margin)} {WORDS[check.verdict]}"
    return line(label, Span(shown, TONES[check.verdict]), f"   required {percent(check.required)}   {check.corner}")


def causes_line(share: Share | None) -> Line:
    """The causes of one row: every changed part's share, largest first, and what they do only together."""
    if share is None:
        return line(Span(" causes: this check is on one side only", "dim"))
    parts = sorted(share.shares.items(), key=lambda item: -abs(item[1]))
    words = "   ".join(f"{what} {percent(value)}" for what, value in parts) or "nothing changed"
    together = f"   together {percent(share.interaction)}" if len(parts) > 1 else ""
    return line(Span(" causes: ", "strong"), words, Span(together, "dim"))


def _by_id(column: Column) -> dict[str, CheckResult]:
    return {check.id: check for check in column.sheet.checks}
