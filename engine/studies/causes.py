"""Which changed part caused which change of margin between two designs.

Every combination of the changes is evaluated over the union of both designs' worst corners.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from math import fsum
from typing import Any

import numpy as np

from ..checks.check import Ask
from ..circuit.circuit import Circuit, build
from ..design.differences import Change, apply, differences
from ..design.document import Design
from ..errors import CircuitError, EngineError
from ..kernel.layout import Floats
from ..results import ENGINE, Depth, MarginSheet
from ..run import never, silent
from .effort import causes_beyond
from .evaluate import Progress, asks_of, judge, look, observe
from .lanes import Setting, lanes_of
from .margins import worst_corners
from .shapley import EXACT_UP_TO, Chosen, combinations, shares

STRUCTURE = ("added", "removed", "net")


@dataclass(frozen=True)
class Cause:
    """One check: its margin before and after, held within -1 .. 1, and what each change has to do with it.

    ``shares`` sum to ``after - before``; ``interaction`` is that difference less the sum of what each change does
    alone, and is never added. ``error`` is the standard error of a sampled share. ``formula`` is what a newer engine
    makes of the old document less what was stored.
    """

    id: str
    before: float
    after: float
    shares: dict[str, float]
    interaction: float
    alone: dict[str, float]
    reverted: dict[str, float]
    error: dict[str, float] | None
    formula: float | None


@dataclass(frozen=True)
class CausesSheet:
    """Causes of all checks that both designs have; ``unknown`` lists those without a margin on either side."""

    design: str
    changed: tuple[str, ...]
    checks: tuple[Cause, ...]
    appeared: tuple[str, ...]
    vanished: tuple[str, ...]
    unknown: tuple[str, ...]

    def as_json(self) -> dict[str, Any]:
        """Plain JSON values, keys as in the headless command (``from`` and ``to`` are the caller's)."""
        return {
            "design": self.design,
            "changed": list(self.changed),
            "checks": [
                {
                    "id": cause.id,
                    "before": cause.before,
                    "after": cause.after,
                    "shares": cause.shares,
                    "interaction": cause.interaction,
                    "alone": cause.alone,
                    "reverted": cause.reverted,
                    **({} if cause.error is None else {"error": cause.error}),
                    **({} if cause.formula is None else {"formula": cause.formula}),
                }
                for cause in self.checks
            ],
            "appeared": list(self.appeared),
            "vanished": list(self.vanished),
            "unknown": list(self.unknown),
        }


def causes(
    old: Design,
    new: Design,
    *,
    stored: MarginSheet | None = None,
    stored_new: MarginSheet | None = None,
    seed: int = 1,
    progress: Progress = silent,
    cancelled: Callable[[], bool] = never,
) -> CausesSheet:
    """Causes of every change of margin from ``old`` to ``new``. Raises EngineError, also for too much to compute, or
    Cancelled.

    ``stored`` and ``stored_new`` are the margins kept with the designs: their worst corners need not be searched again;
    where another engine made the old ones, the change of formula is told apart. Nothing changed gives an empty sheet.
    """
    if old.content == new.content and (stored is None or stored.engine == ENGINE):
        return CausesSheet(new.name, (), (), (), (), ())
    before, after = _Side(old, stored, cancelled), _Side(new, stored_new, cancelled)
    common = [name for name in before.asks if name in after.asks]
    corners = {name: list(dict.fromkeys((before.corners[name], after.corners[name]))) for name in common}
    players = _players(differences(old, new))
    _check_effort(new, after, corners, len(players), cancelled)
    try:
        table = _Table(old, new, players, corners, progress, cancelled)
        found = table.shares(seed)
    except EngineError:
        structural = [p for p in players if p.structural]
        if len(structural) < 2:
            raise
        # Some of these parts cannot be without the others: they are one change.
        block = _Player(", ".join(p.name for p in structural), tuple(c for p in structural for c in p.changes), True)
        players = [block, *(p for p in players if not p.structural)]
        table = _Table(old, new, players, corners, progress, cancelled)
        found = table.shares(seed)
    return _sheet(new.name, before, after, table, found, stored)


def _check_effort(
    design: Design, side: _Side, corners: dict[str, list[Setting]], changes: int, cancelled: Callable[[], bool]
) -> None:
    circuit = build(design)
    nominal = {name: observe(circuit, circuit.nominal(), name, (), cancelled=cancelled) for name in design.sequences}
    lanes = len({setting for settings in corners.values() for setting in settings})
    trials = sum(len(corners[name]) for name in corners if side.asks[name].trial is not None)
    too_large = causes_beyond(circuit, nominal, len(corners), changes, lanes, trials, combinations(changes))
    if too_large is not None:
        raise CircuitError(too_large)


@dataclass(frozen=True)
class _Player:
    name: str
    changes: tuple[Change, ...]
    structural: bool


class _Side:
    """One design with its margins' worst corners, searched where no sheet of this engine holds them."""

    def __init__(self, design: Design, sheet: MarginSheet | None, cancelled: Callable[[], bool]) -> None:
        circuit = build(design)
        asks = asks_of(circuit)
        self.asks = {ask.id: ask for ask in asks}
        if sheet is not None and sheet.content == design.content and sheet.engine == ENGINE:
            kept = {check.id: Setting.from_kept(check.setting) for check in sheet.checks}
            if sheet.depth is not Depth.NOMINAL and self.asks.keys() <= kept.keys() and not _too_large(sheet):
                self.corners = kept
                return
        self.corners = {name: corner.setting for name, corner in worst_corners(circuit, asks, cancelled).items()}


def _too_large(sheet: MarginSheet) -> bool:
    """Whether the corners were not searched (:mod:`.effort`): a margin that is known in the nominal lane only."""
    return any(check.margin is None and check.nominal is not None and not check.setting for check in sheet.checks)


def _players(changes: Sequence[Change]) -> list[_Player]:
    """Changes by what they are about; roles and orders go with the parts that were added or removed."""
    groups: dict[str, list[Change]] = {}
    quiet: list[Change] = []
    for change in changes:
        if change.what.startswith(("roles ", "order of ", "stage ", "design ")):
            quiet.append(change)
        else:
            groups.setdefault(change.what, []).append(change)
    players = [
        _Player(what, tuple(group), any(change.kind in STRUCTURE for change in group)) for what, group in groups.items()
    ]
    if quiet:
        host = next((n for n, player in enumerate(players) if player.structural), None)
        if host is None:
            players.append(_Player(quiet[0].what, tuple(quiet), True))
        else:
            players[host] = _Player(players[host].name, (*players[host].changes, *quiet), True)
    return players


class _Table:
    """Margins of every combination that was asked for, (checks,), each within -1 .. 1 and NaN where unknown."""

    def __init__(
        self,
        old: Design,
        new: Design,
        players: list[_Player],
        corners: dict[str, list[Setting]],
        progress: Progress,
        cancelled: Callable[[], bool],
    ) -> None:
        self.players, self.ids = players, list(corners)
        self._old, self._new, self._corners = old, new, corners
        self._progress, self._cancelled = progress, cancelled
        self._known: dict[Chosen, Floats] = {}

    def value(self, chosen: Chosen) -> Floats:
        """Margins with these changes made."""
        if chosen not in self._known:
            self._known[chosen] = self._evaluated(chosen)
            total = 2 ** min(len(self.players), EXACT_UP_TO)
            self._progress(min(len(self._known), total), total)
        return self._known[chosen]

    def shares(self, seed: int) -> tuple[Floats, Floats]:
        """Shares and their standard errors, (players, checks)."""
        found = shares(len(self.players), lambda chosen: np.nan_to_num(self.value(chosen), nan=-1.0), seed)
        return found.values, found.error

    def _evaluated(self, chosen: Chosen) -> Floats:
        everyone = len(self.players)
        if not chosen:
            design = self._old
        elif len(chosen) == everyone:
            design = self._new
        else:
            design = apply(self._old, self._new, [c for p in sorted(chosen) for c in self.players[p].changes])
        circuit = build(design)
        asks = {ask.id: ask for ask in asks_of(circuit)}
        order: dict[Setting, int] = {}
        lanes_by_check: dict[str, list[int]] = {}
        trials: dict[str, list[int]] = {}
        for name in self.ids:
            for setting in self._corners[name]:
                lane = order.setdefault(_known_to(circuit, setting), len(order))
                lanes_by_check.setdefault(name, []).append(lane)
                ask = asks.get(name)
                if ask is not None and ask.trial is not None:
                    trials.setdefault(ask.trial.key, []).append(lane)
        wanted: list[Ask] = [asks[name] for name in self.ids if name in asks]
        seen = look(circuit, wanted, lanes_of(circuit.columns, list(order)), trials=trials, cancelled=self._cancelled)
        margins = np.full(len(self.ids), np.nan)
        for n, name in enumerate(self.ids):
            if name in asks:
                judged, _ = judge(asks[name], seen)
                margins[n] = np.min(judged.margin[lanes_by_check[name]])
        clipped: Floats = np.clip(margins, -1.0, 1.0)
        return clipped


def _known_to(circuit: Circuit, setting: Setting) -> Setting:
    """The setting without columns that this circuit does not have."""
    keys = {column.key for column in circuit.columns}
    axes = tuple((k, s) for k, s in setting.axes if k in keys or k[1] == "gain")
    return Setting(axes, tuple((k, s) for k, s in setting.parts if k in keys))


def _sheet(
    design: str,
    before: _Side,
    after: _Side,
    table: _Table,
    found: tuple[Floats, Floats],
    stored: MarginSheet | None,
) -> CausesSheet:
    names = [player.name for player in table.players]
    everyone = frozenset(range(len(names)))
    first, last = table.value(frozenset()), table.value(everyone)
    alone = {p: table.value(frozenset({p})) for p in everyone}
    reverted = {p: table.value(everyone - {p}) for p in everyone}
    kept = {check.id: check.margin for check in stored.checks} if stored and stored.engine != ENGINE else {}
    checks, unknown = [], []
    for n, name in enumerate(table.ids):
        if np.isnan(first[n]) or np.isnan(last[n]):
            unknown.append(name)
            continue
        was, now = float(first[n]), float(last[n])
        share = [float(s) for s in found[0][:, n]]
        if share:
            # Rounding of the weights is put where the largest share is, so that the sum is the change to the bit.
            largest = max(range(len(share)), key=lambda k: abs(share[k]))
            share[largest] = (now - was) - fsum(s for k, s in enumerate(share) if k != largest)
        by_itself = {names[p]: float(np.nan_to_num(alone[p][n], nan=-1.0)) for p in everyone}
        checks.append(
            Cause(
                id=name,
                before=was,
                after=now,
                shares=dict(zip(names, share, strict=True)),
                interaction=(now - was) - sum(value - was for value in by_itself.values()),
                alone=by_itself,
                reverted={names[p]: float(np.nan_to_num(reverted[p][n], nan=-1.0)) for p in everyone},
                error=dict(zip(names, map(float, found[1][:, n]), strict=True)) if len(names) > EXACT_UP_TO else None,
                formula=None if kept.get(name) is None else was - float(np.clip(kept[name] or 0.0, -1.0, 1.0)),
            )
        )
    appeared = tuple(name for name in after.asks if name not in before.asks)
    vanished = tuple(name for name in before.asks if name not in after.asks)
    return CausesSheet(design, tuple(names), tuple(checks), appeared, vanished, tuple(unknown))
