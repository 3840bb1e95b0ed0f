"""Which figures of a draft are on the screen, how old each is, and what they are compared with. Pure values."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from ..engine.results import CheckResult, Depth, MarginSheet, explaining_first
from ..engine.studies.comparison import Against


@dataclass(frozen=True, slots=True)
class FigureRow:
    """One check: newest figures, whether each is still of the edited document, and the figure it had before.

    ``check`` describes the check; its margin is a worst one only if ``worst_known``: a nominal figure never
    stands where a worst one is read.
    """

    check: CheckResult
    worst_known: bool
    nominal: float | None
    nominal_old: bool
    worst_old: bool
    before: CheckResult | None

    @property
    def against(self) -> Against:
        """The worst margin beside the one before."""
        return Against(self.before, self.check if self.worst_known else None)

    @property
    def order(self) -> tuple[int, float]:
        """What got worse first, then by least slack; a margin whose worst corner is not known stands above."""
        return self.against.order if self.worst_known else (2, -3.0)


@dataclass(frozen=True, slots=True)
class Figures:
    """The sheets a bench shows. ``edited`` makes them old, ``arrived`` replaces them; nothing is ever blanked.

    ``worst`` is the newest sheet of corners; ``nominal`` the newest sheet of any depth; ``before`` the sheet of
    the revision compared with. ``held`` collects what arrives while frozen.
    """

    nominal: MarginSheet | None = None
    worst: MarginSheet | None = None
    before: MarginSheet | None = None
    nominal_old: bool = True
    worst_old: bool = True
    spread_old: bool = True
    frozen: bool = False
    held: tuple[MarginSheet, ...] = ()

    def edited(self) -> Figures:
        """After an edit of the draft: every figure is old, whatever was held belongs to the past."""
        return replace(self, nominal_old=True, worst_old=True, spread_old=True, held=())

    def arrived(self, sheet: MarginSheet) -> Figures:
        """With a fresh sheet shown, or held back while frozen."""
        if self.frozen:
            return replace(self, held=(*self.held, sheet))
        if sheet.depth is Depth.NOMINAL:
            return replace(self, nominal=sheet, nominal_old=False)
        spread_old = sheet.depth is not Depth.SPREAD
        return replace(self, nominal=sheet, nominal_old=False, worst=sheet, worst_old=False, spread_old=spread_old)

    def compared_with(self, before: MarginSheet | None) -> Figures:
        """Beside the figures of another revision."""
        return replace(self, before=before)

    def freeze(self) -> Figures:
        """From now on what arrives is held back."""
        return replace(self, frozen=True)

    def thaw(self) -> Figures:
        """Shows again, beginning with what was held back."""
        shown = replace(self, frozen=False, held=())
        for sheet in self.held:
            shown = shown.arrived(sheet)
        return shown

    @property
    def newest(self) -> MarginSheet | None:
        """The deepest sheet that belongs to the document as it stands, held or shown; None while there is none."""
        if self.held:
            return self.held[-1]
        if not self.worst_old:
            return self.worst
        return None if self.nominal_old else self.nominal

    def rows(self, stage: str | None = None) -> tuple[FigureRow, ...]:
        """The checks of one stage (None: of all), what got worse first, then by least slack; what explains an outcome
        above it."""
        nominal = _by_id(self.nominal)
        worst = _by_id(self.worst)
        before = _by_id(self.before)
        names = dict.fromkeys((*worst, *nominal)) if worst else dict.fromkeys(nominal)
        rows = []
        for name in names:
            if self.nominal is not None and not self.nominal_old and name not in nominal:
                continue
            check = worst.get(name) or nominal[name]
            if stage is not None and check.stage != stage:
                continue
            fresh = nominal.get(name)
            rows.append(
                FigureRow(
                    check=check,
                    worst_known=name in worst,
                    nominal=(fresh or check).nominal,
                    nominal_old=self.nominal_old or fresh is None,
                    worst_old=self.worst_old or name not in worst,
                    before=before.get(name),
                )
            )
        return tuple(explaining_first(sorted(rows, key=lambda row: row.order), lambda row: row.check))


def _by_id(sheet: MarginSheet | None) -> Mapping[str, CheckResult]:
    return {} if sheet is None else {check.id: check for check in sheet.checks}
