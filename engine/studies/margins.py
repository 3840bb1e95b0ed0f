"""The margins of a design: nominal, worst corner with its name, and random spread.

Corners: every combination of supply, ambient, source resistance, capacitor leakage and gain, supply and temperature
also in the middle. At the worst of them, and at the worst with each side of every condition, a check is tried again
with all parts at the end of their tolerance that hurts it, as the change of its margin with one part at a time says.
Trials: see :mod:`.trial_corners`.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterable
from dataclasses import replace

import numpy as np

from ..checks.check import Ask, Judged
from ..circuit.circuit import Circuit, build
from ..design.document import Design
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..results import ENGINE, CheckResult, Depth, MarginSheet, Verdict
from ..run import Observed, never, silent
from .corner import Corner
from .corner_words import Effects, named, of_conditions, of_parts, used
from .effort import beyond, spread_lanes
from .evaluate import Progress, asks_of, edges_of, judge, look
from .lanes import NOMINAL, Setting, conditions_of, lanes_of, random_lanes, settings, tolerances
from .mirrored import with_mirrored
from .spread import spread_of
from .trial_corners import TrialCorners, part_ends
from .vertices import Vertices, sides, weak, worst_conditions
from .watch import watch

SAME = 1e-5  # a corner whose margin is less below the nominal one is not worse


def study(
    design: Design,
    *,
    lanes: int = 0,
    seed: int = 1,
    only: str | None = None,
    report: Callable[[MarginSheet], None] | None = None,
    progress: Progress = silent,
    cancelled: Callable[[], bool] = never,
) -> MarginSheet:
    """All margins of a design; ``report`` gets a sheet after each depth. Raises CircuitError or Cancelled.

    ``lanes`` random lanes are drawn with ``seed`` for the spread, none when 0, and fewer where so many would take too
    long; the sheet tells how many. ``only`` the margin of this id, all
    where None.
    """
    began = time.perf_counter()
    circuit = build(design)
    asks = tuple(ask for ask in asks_of(circuit) if only in (None, ask.id))

    def sheet(depth: Depth, checks: list[CheckResult]) -> MarginSheet:
        taken = time.perf_counter() - began
        made = MarginSheet(
            design.name, design.content, ENGINE, seed, lanes, taken, depth, tuple(checks)
        )  # fmt: skip
        if report is not None:
            report(made)
        return made

    first, too_large, observed = _nominal(circuit, asks, cancelled)
    lanes = spread_lanes(circuit, asks, observed, lanes)
    nominal = watch(circuit, asks, first if too_large is None else _unsearched(first, too_large), cancelled)
    middle = nominal if too_large is None else first
    checks = [_result(ask, corner, middle[ask.id].judged.margin[0]) for ask, corner in _pairs(asks, nominal)]
    made = sheet(Depth.NOMINAL, checks)
    known = tuple(ask for ask in asks if nominal[ask.id].broken is None)
    worst = watch(circuit, known, _searched(circuit, asks, nominal, progress, cancelled), cancelled)
    worst = with_mirrored(circuit, asks, worst, cancelled)
    checks = [_result(ask, corner, middle[ask.id].judged.margin[0]) for ask, corner in _pairs(asks, worst)]
    made = sheet(Depth.CORNERS, checks)
    if lanes > 0:
        drawn = random_lanes(circuit.columns, lanes, seed)
        spreads = spread_of(circuit, known, drawn, progress, cancelled)
        checks = [
            replace(check, spread=found.spread, reason=found.beside(check, drawn))
            if (found := spreads.get(check.id)) is not None
            else check
            for check in checks
        ]
        made = sheet(Depth.SPREAD, checks)
    return made


def worst_corners(circuit: Circuit, asks: tuple[Ask, ...], cancelled: Callable[[], bool] = never) -> dict[str, Corner]:
    """The worst corner of every ask, by its id. Raises CircuitError where the design is too large for them."""
    nominal, too_large, _ = _nominal(circuit, asks, cancelled)
    if too_large is not None:
        raise CircuitError(too_large)
    return _searched(circuit, asks, nominal, silent, cancelled)


def _searched(
    circuit: Circuit,
    asks: tuple[Ask, ...],
    nominal: dict[str, Corner],
    progress: Progress,
    cancelled: Callable[[], bool],
) -> dict[str, Corner]:
    """The worst corner of every ask. No work is spent on what is not even known in the nominal lane."""
    rest = tuple(ask for ask in asks if nominal[ask.id].broken is None)
    if not rest:
        return nominal
    return nominal | _corners(circuit, rest, nominal, progress, cancelled)


def _pairs(asks: tuple[Ask, ...], corners: dict[str, Corner]) -> list[tuple[Ask, Corner]]:
    return [(ask, corners[ask.id]) for ask in asks]


def _nominal(
    circuit: Circuit, asks: tuple[Ask, ...], cancelled: Callable[[], bool]
) -> tuple[dict[str, Corner], str | None, dict[str, Observed]]:
    """Every ask in the nominal lane, and why no corners can be searched; trials are not begun where that is so. And
    the runs of the nominal lane."""
    lanes = circuit.nominal()
    seen = look(circuit, asks, lanes, cancelled=cancelled)
    too_large = beyond(circuit, asks, seen.observed)
    if too_large is None:
        trials = {ask.trial.key: [0] for ask in asks if ask.trial is not None}
        seen = replace(seen, edges=edges_of(circuit, asks, lanes, seen.observed, trials, cancelled=cancelled))
    found = {}
    for ask in asks:
        judged, broken = judge(ask, seen)
        edge = None if ask.trial is None else seen.edges.get(ask.trial.key)
        if ask.trial is not None and too_large is not None:
            judged.margin[:] = np.nan
        found[ask.id] = Corner(NOMINAL, "nominal", judged, 0, lanes, broken.get(0), edge, _reach([judged]))
    return found, too_large, dict(seen.observed)


def _unsearched(corners: dict[str, Corner], why: str) -> dict[str, Corner]:
    """The same without margins: what is known in the nominal lane only is no worst corner."""
    return {
        name: replace(
            corner,
            words=corner.words if corner.broken else "",
            judged=replace(corner.judged, margin=np.full_like(corner.judged.margin, np.nan)),
            broken=corner.broken or why,
        )
        for name, corner in corners.items()
    }


def _corners(
    circuit: Circuit,
    asks: tuple[Ask, ...],
    nominal: dict[str, Corner],
    progress: Progress,
    cancelled: Callable[[], bool],
) -> dict[str, Corner]:
    columns = circuit.columns
    conditions = settings(columns)
    single = [Setting((), ((column.key, side),)) for column in tolerances(columns) for side in (-1, 1)]
    tried = [*conditions, *single]
    first = look(circuit, asks, lanes_of(columns, tried), progress=progress, cancelled=cancelled)
    judged = {ask.id: judge(ask, first) for ask in asks}
    edges = {name: corner.edge for name, corner in nominal.items() if corner.edge is not None}
    ends = part_ends(circuit, asks, edges, first, range(len(conditions), len(tried)), cancelled)
    trials = TrialCorners(circuit, asks, ends, conditions, single, progress, cancelled)
    vertices = Vertices(single)
    tried_out: dict[Setting, list[str]] = {}
    for ask in asks:
        if ask.trial is not None:
            for vertex in trials.worst(ask):
                tried_out.setdefault(vertex, []).append(ask.trial.key)
            continue
        for metric in _metrics(judged[ask.id][0]):
            slope = metric[len(conditions) :]
            for k in worst_conditions(metric[: len(conditions)], conditions):
                vertices.add(conditions[k].axes, sides(slope, single), weak(slope, single))
    order = [*tried_out, *vertices.settings()]
    wanted: dict[str, list[int]] = {}
    for lane, keys in enumerate(tried_out.values()):
        for key in keys:
            wanted.setdefault(key, []).append(lane)
    second = look(circuit, asks, lanes_of(columns, order), trials=wanted, progress=progress, cancelled=cancelled)
    found: dict[str, Corner] = {}
    for ask in asks:
        candidates = [_worst(judge(ask, second), second.lanes, order)]
        if ask.trial is None:
            # The coarse edges of trials only choose the vertices; they are no margins to be shown.
            candidates.append(_worst(judged[ask.id], first.lanes, tried))
        worst, middle = min(candidates, key=lambda corner: corner.rank), nominal[ask.id]
        reach = _reach([middle.judged, *(candidate.judged for candidate in candidates)])
        if middle.rank <= worst.rank + SAME:
            found[ask.id] = replace(middle, reach=reach)
            continue
        if ask.trial is None:
            effects = _effects(judged[ask.id][0], worst, conditions, single)
        else:
            effects = trials.effects(ask, middle, worst.margin)
        found[ask.id] = replace(worst, words=named(worst.setting, effects), reach=reach)
    return found


def _reach(judged: Iterable[Judged]) -> tuple[float | None, float | None]:
    values = [j.value[np.isfinite(j.value)] for j in judged if j.value is not None]
    if not values or not np.concatenate(values).size:
        return None, None
    return float(np.concatenate(values).min()), float(np.concatenate(values).max())


def _metrics(judged: Judged) -> list[Floats]:
    """What the corners make as small as possible: the margin, each of several, or both ends of a window's value."""
    if judged.each:
        return list(judged.each)
    if judged.value is None:
        return [judged.margin]
    value = np.where(np.isfinite(judged.value), judged.value, np.nan)
    return [value, -value]


def _effects(judged: Judged, worst: Corner, conditions: list[Setting], single: list[Setting]) -> Effects:
    """What moves a margin that is observed: ``conditions`` and then ``single`` are the lanes."""
    if judged.value is not None and judged.limits is not None:
        measure = judged.value / (0.5 * (judged.limits[1] - judged.limits[0]))
    else:
        # Of several margins the one that is smallest in the worst corner tells what made it so.
        each = [float(one[worst.lane]) for one in worst.judged.each]
        measure = used(judged.each[int(np.argmin(each))] if each else judged.margin, worst.margin)
    return of_conditions(measure, conditions) | of_parts(measure[len(conditions) :], single)


def _worst(judged: tuple[Judged, dict[int, str]], lanes: Lanes, chosen: list[Setting]) -> Corner:
    found, broken = judged
    margin = np.where(np.isnan(found.margin), -np.inf, found.margin)
    lane = int(np.argmin(margin))
    return Corner(chosen[lane], "", found, lane, lanes, broken.get(lane))


def _number(values: Floats | None, lane: int) -> float | None:
    if values is None or not np.isfinite(values[lane]):
        return None
    return float(values[lane])


def _result(ask: Ask, corner: Corner, nominal: float) -> CheckResult:
    judged, lane = corner.judged, corner.lane
    margin = _number(judged.margin, lane)
    outcome = None if ask.missing else judged.outcome(lane)
    reason = None
    if ask.missing is not None:
        reason = f"missing: {ask.missing}"
    elif corner.broken is not None:
        reason = corner.broken
    elif margin is None:
        reason = outcome or "could not be judged"
    if margin is None:
        verdict = Verdict.UNKNOWN
    elif margin < 0.0:
        verdict = Verdict.FAIL
        reason = outcome or _overrun(ask, judged, lane)
    else:
        verdict = Verdict.PASS if margin >= ask.required else Verdict.THIN
    if corner.remark is not None:
        reason = corner.remark if reason is None else f"{reason}; {corner.remark}"
    found = CheckResult(
        id=ask.id,
        number=ask.check.number,
        title=ask.check.title,
        stage=ask.stage,
        part=ask.part,
        sequence=ask.sequences[0],
        demand=_number(judged.demand, lane),
        capability=_number(judged.capability, lane),
        unit=ask.check.unit if ask.unit is None else ask.unit,
        limits=judged.limits,
        low=corner.reach[0],
        high=corner.reach[1],
        margin=margin,
        required=ask.required,
        verdict=verdict,
        outcome=outcome,
        reason=reason,
        corner=corner.words,
        conditions=conditions_of(corner.lanes, lane),
        nominal=None if np.isnan(nominal) else float(nominal),
        hand=_number(judged.hand, lane),
        spread=None,
        formula=ask.check.formula,
        setting=corner.setting.kept(),
        by_hand=ask.check.by_hand,
        accuracy=ask.check.accuracy,
        extrapolated=None if ask.missing else judged.beyond(lane),
        bound=ask.check.bound,
        apart=None if ask.missing else judged.why_apart(lane),
        hand_scale=_number(judged.hand_scale, lane),
    )
    return replace(found, left_out=ask.check.leaves_out) if found.disagrees else found


def _overrun(ask: Ask, judged: Judged, lane: int) -> str:
    if judged.value is not None and judged.limits is not None:
        side = "above the upper" if judged.value[lane] > judged.limits[1] else "below the lower"
        return f"{side} limit"
    return "demand is above capability"
