"""Two or more revisions side by side: what got worse comes first, and which changes lie between them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from ..design.differences import Change, differences
from ..design.document import Design
from ..results import CheckResult, MarginSheet, Verdict

RANK = {Verdict.FAIL: 0, Verdict.UNKNOWN: 1, Verdict.THIN: 2, Verdict.PASS: 3}
LOSS = 0.005  # a margin that fell by no more counts as the same


@dataclass(frozen=True, slots=True)
class Side:
    """One revision, or a draft, with its margins."""

    label: str
    sheet: MarginSheet
    design: Design


@dataclass(frozen=True, slots=True)
class Against:
    """One check of one side beside the same check of the side compared with; None where a side does not have it."""

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
        return RANK[self.after.verdict] < RANK[self.before.verdict]

    @property
    def worse(self) -> bool:
        """Whether the verdict fell, or the margin by more than half a percent."""
        return self.fell or (self.change is not None and self.change < -LOSS)

    @property
    def rose(self) -> bool:
        """Whether the verdict is a higher one."""
        if self.before is None or self.after is None:
            return False
        return RANK[self.after.verdict] > RANK[self.before.verdict]

    @property
    def same(self) -> bool:
        """Whether verdict and figure stayed, but for half a percent; also where neither side has the check."""
        if self.before is None or self.after is None:
            return self.before is self.after
        moved = (self.before.margin is None) != (self.after.margin is None) or abs(self.change or 0.0) > LOSS
        return not (moved or self.fell or self.rose or self.before.outcome != self.after.outcome)

    @property
    def corner_moved(self) -> bool:
        """Whether another corner has become the worst one."""
        return self.before is not None and self.after is not None and self.before.corner != self.after.corner

    @property
    def order(self) -> tuple[int, float]:
        """What got worse first: fallen verdicts, then losses by size; then risen verdicts, then the least slack."""
        if self.worse:
            return (0 if self.fell else 1, self.change if self.change is not None else -2.0)
        known = self.after or self.before
        return (2 if self.rose else 3, known.slack if known else 0.0)


@dataclass(frozen=True, slots=True)
class Row:
    """One check in all columns; the first column is the one compared with."""

    id: str
    cells: tuple[CheckResult | None, ...]

    def against(self, column: int) -> Against:
        """The check of a column beside that of the first."""
        return Against(self.cells[0], self.cells[column])

    @property
    def same(self) -> bool:
        """Whether it is in no column other than in the first."""
        return all(self.against(n).same for n in range(1, len(self.cells)))


@dataclass(frozen=True, slots=True)
class Comparison:
    """Revisions side by side. ``changed`` has the changes from the first column to each, () for the first itself."""

    labels: tuple[str, ...]
    rows: tuple[Row, ...]
    changed: tuple[tuple[Change, ...], ...]

    def as_json(self) -> dict[str, Any]:
        """Plain JSON values: rows by what got worse, per column margin, verdict and difference to the first."""
        return {
            "revisions": list(self.labels),
            "changed": [
                [{"what": c.what, "kind": c.kind, "before": c.before, "after": c.after} for c in changes]
                for changes in self.changed
            ],
            "checks": [
                {
                    "id": row.id,
                    "worse": any(row.against(n).worse for n in range(1, len(row.cells))),
                    "columns": [self._cell(row, n) for n in range(len(row.cells))],
                }
                for row in self.rows
            ],
        }

    def _cell(self, row: Row, column: int) -> dict[str, Any] | None:
        check = row.cells[column]
        if check is None:
            return None
        return {
            "margin": check.margin,
            "verdict": str(check.verdict),
            "required": check.required,
            "corner": check.corner,
            "outcome": check.outcome,
            "difference": row.against(column).change if column else None,
        }


def compare(sides: Sequence[Side], chosen: int | None = None) -> Comparison:
    """All sides against the first. Rows are ordered by what got worse in column ``chosen``, or in any column."""
    tables = [{check.id: check for check in side.sheet.checks} for side in sides]
    names = dict.fromkeys(name for table in reversed(tables) for name in table)
    rows = [Row(name, tuple(table.get(name) for table in tables)) for name in names]
    columns = range(1, len(sides)) if chosen is None else (chosen,)
    rows.sort(key=lambda row: min((row.against(n).order for n in columns), default=(3, 0.0)))
    changed = tuple(differences(sides[0].design, side.design) for side in sides)
    return Comparison(tuple(side.label for side in sides), tuple(rows), changed)
