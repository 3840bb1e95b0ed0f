"""The margins of a design: nominal, worst corner with its name, and random spread.

Corners: every combination of supply, ambient, source resistance, capacitor leakage and gain, supply and temperature
also in the middle. At the two worst of them every check is tried again with all parts at the end of their tolerance
that hurts it, as the change of its margin with one part at a time says.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from ..checks.check import Ask, Judged
from ..checks.seen import Seen
from ..checks.trial import Edge
from ..circuit.circuit import Circuit, build
from ..design.document import Design
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..results import ENGINE, CheckResult, Depth, MarginSheet, Verdict
from ..run import never, silent
from .evaluate import Progress, asks_of, judge, kept_state, look
from .lanes import NOMINAL, Setting, conditions_of, lanes_of, random_lanes, settings, tolerances
from .spread import spread_of
from .trials import TrialRun

WORST_CONDITIONS, WORST_OF_TRIAL = 2, 6  # corners of the conditions that are tried with part tolerances
COARSE, SIDES = 1.3, 1.06  # resolution of the trials that only find the worst conditions, the side that hurts
MATTERS, SHARE = 0.002, 0.05  # a corner names what moves the margin by so much, and by so much of the largest move


@dataclass(frozen=True)
class Corner:
    """One ask at its worst: the setting, what was judged there, and in which lane."""

    setting: Setting
    words: str
    judged: Judged
    lane: int
    lanes: Lanes
    broken: str | None
    edge: Edge | None = None


def study(
    design: Design,
    *,
    lanes: int = 0,
    seed: int = 1,
    report: Callable[[MarginSheet], None] | None = None,
    progress: Progress = silent,
    cancelled: Callable[[], bool] = never,
) -> MarginSheet:
    """All margins of a design; ``report`` gets a sheet after each depth. Raises CircuitError or Cancelled.

    ``lanes`` random lanes are drawn with ``seed`` for the spread, none when 0.
    """
    began = time.perf_counter()
    circuit = build(design)
    asks = asks_of(circuit)

    def sheet(depth: Depth, checks: list[CheckResult]) -> MarginSheet:
        taken = time.perf_counter() - began
        made = MarginSheet(
            design.name, design.content, ENGINE, seed, lanes, taken, depth, tuple(checks)
        )  # fmt: skip
        if report is not None:
            report(made)
        return made

    nominal = _nominal(circuit, asks, cancelled)
    checks = [_result(ask, corner, nominal[ask.id].judged.margin[0]) for ask, corner in _pairs(asks, nominal)]
    made = sheet(Depth.NOMINAL, checks)
    worst = _corners(circuit, asks, nominal, progress, cancelled)
    checks = [_result(ask, corner, nominal[ask.id].judged.margin[0]) for ask, corner in _pairs(asks, worst)]
    made = sheet(Depth.CORNERS, checks)
    if lanes > 0:
        drawn = random_lanes(circuit.columns, lanes, seed)
        spreads = spread_of(circuit, asks, drawn, progress, cancelled)
        checks = [replace(check, spread=spreads.get(check.id)) for check in checks]
        made = sheet(Depth.SPREAD, checks)
    return made


def _extremes(conditions: list[Setting]) -> list[int]:
    """The corners without a middle value: what trials are tried in, which cost more than an observation."""
    return [k for k, setting in enumerate(conditions) if all(side for _, side in setting.axes)]


def worst_corners(circuit: Circuit, asks: tuple[Ask, ...], cancelled: Callable[[], bool] = never) -> dict[str, Corner]:
    """The worst corner of every ask, by its id."""
    return _corners(circuit, asks, _nominal(circuit, asks, cancelled), silent, cancelled)


def _pairs(asks: tuple[Ask, ...], corners: dict[str, Corner]) -> list[tuple[Ask, Corner]]:
    return [(ask, corners[ask.id]) for ask in asks]


def _nominal(circuit: Circuit, asks: tuple[Ask, ...], cancelled: Callable[[], bool]) -> dict[str, Corner]:
    lanes = circuit.nominal()
    seen = look(circuit, asks, lanes, trials=_everywhere(asks, [0]), cancelled=cancelled)
    found = {}
    for ask in asks:
        judged, broken = judge(ask, seen)
        edge = None if ask.trial is None else seen.edges.get(ask.trial.key)
        found[ask.id] = Corner(NOMINAL, "nominal", judged, 0, lanes, broken.get(0), edge)
    return found


def _everywhere(asks: tuple[Ask, ...], lanes: Sequence[int]) -> dict[str, Sequence[int]]:
    return {ask.trial.key: lanes for ask in asks if ask.trial is not None}


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
    first = look(
        circuit, asks, lanes_of(columns, tried), trials=_everywhere(asks, _extremes(conditions)), resolution=COARSE,
        progress=progress, cancelled=cancelled,
    )  # fmt: skip
    judged = {ask.id: judge(ask, first) for ask in asks}
    edges = _single_edges(circuit, asks, nominal, first, range(len(conditions), len(tried)), cancelled)
    slopes = {ask.id: _slopes(ask, judged[ask.id][0], first, edges, len(conditions)) for ask in asks}
    vertices: dict[Setting, int] = {}
    wanted: dict[str, list[int]] = {}
    for ask in asks:
        most = WORST_CONDITIONS if ask.trial is None else WORST_OF_TRIAL
        for metric, slope in zip(_metrics(ask, judged[ask.id][0], first), slopes[ask.id], strict=True):
            for vertex in _vertices(metric[: len(conditions)], slope, conditions, single, most):
                lane = vertices.setdefault(vertex, len(vertices))
                if ask.trial is not None:
                    wanted.setdefault(ask.trial.key, []).append(lane)
    order = list(vertices)
    second = None
    if order:
        second = look(circuit, asks, lanes_of(columns, order), trials=wanted, progress=progress, cancelled=cancelled)
    found: dict[str, Corner] = {}
    for ask in asks:
        candidates = [nominal[ask.id]]
        if ask.trial is None or second is None:
            # The coarse edges of the conditions only choose the vertices; they are no margins to be shown.
            candidates.append(_worst(judged[ask.id], first.lanes, tried))
        if second is not None:
            candidates.append(_worst(judge(ask, second), second.lanes, order))
        lowest = min(candidates, key=_rank)
        effects = _effects(
            _measure(ask, judged[ask.id][0], first, len(conditions)), slopes[ask.id][0], conditions, single
        )
        found[ask.id] = replace(lowest, words=lowest.setting.words(_that_matter(effects)))
    return found


def _rank(corner: Corner) -> float:
    margin = float(corner.judged.margin[corner.lane])
    return -np.inf if np.isnan(margin) else margin


def _single_edges(
    circuit: Circuit,
    asks: tuple[Ask, ...],
    nominal: dict[str, Corner],
    seen: Seen,
    single: Sequence[int],
    cancelled: Callable[[], bool],
) -> dict[str, Floats]:
    """What falls when a trial's circuit gets weaker, with one part at an end: the logarithm of the knob at the edge,
    searched near the nominal one, or, where the nominal circuit never gives in, how far it stayed from it. ``single``
    are the lanes of ``seen`` in which one part is at an end."""
    found: dict[str, Floats] = {}
    for ask in asks if single else ():
        edge = nominal[ask.id].edge
        if ask.trial is None or ask.trial.key in found or edge is None or edge.always[0] or edge.missing[0]:
            continue
        kept = kept_state(seen.observed, ask.trial, single)
        made = TrialRun(circuit, ask.trial, seen.lanes.take(single), cancelled, kept)
        if edge.never[0]:
            found[ask.trial.key] = made.spare(float(edge.spare_at[0]))
        else:
            found[ask.trial.key] = np.log(made.edge(around=float(edge.knob[0]), resolution=SIDES).knob)
    return found


def _metrics(ask: Ask, judged: Judged, seen: Seen) -> list[Floats]:
    """What the corners of the conditions make as small as possible: the margin, or both ends of a window's value."""
    if judged.value is not None:
        value = np.where(np.isfinite(judged.value), judged.value, np.nan)
        return [value, -value]
    if ask.trial is not None and ask.trial.key in seen.edges:
        # Conditions in which the circuit never gives in are ranked by how far it stayed from it, behind all others.
        spare = np.nan_to_num(seen.edges[ask.trial.key].spare)
        return [judged.margin + 1e-6 * spare]
    return [judged.margin]


def _slopes(ask: Ask, judged: Judged, seen: Seen, edges: dict[str, Floats], conditions: int) -> list[Floats]:
    """The same with one part at an end: what says which end of its tolerance hurts."""
    if ask.trial is not None:
        return [edges.get(ask.trial.key, np.zeros(seen.lanes.count - conditions))]
    return [metric[conditions:] for metric in _metrics(ask, judged, seen)]


def _vertices(
    metric: Floats, slope: Floats, conditions: list[Setting], single: list[Setting], most: int
) -> list[Setting]:
    """The worst corners of the conditions with every part at the end that hurts."""
    order = np.argsort(np.nan_to_num(metric, nan=-np.inf), kind="stable")[:most]
    sides: list[tuple[tuple[str, str], int]] = []
    for k in range(0, len(single), 2):
        low, high = slope[k], slope[k + 1]
        ((key, _),) = single[k].parts
        if np.isnan(low) or np.isnan(high):
            # An end at which the event did not happen is the end that hurts.
            sides.append((key, -1 if np.isnan(low) else 1))
        elif abs(high - low) > 1e-9 * max(1.0, abs(low), abs(high)):
            sides.append((key, -1 if low < high else 1))
    return [Setting(conditions[int(k)].axes, tuple(sides)) for k in order]


def _worst(judged: tuple[Judged, dict[int, str]], lanes: Lanes, chosen: list[Setting]) -> Corner:
    found, broken = judged
    margin = np.where(np.isnan(found.margin), -np.inf, found.margin)
    lane = int(np.argmin(margin))
    return Corner(chosen[lane], "", found, lane, lanes, broken.get(lane))


def _that_matter(effects: dict[tuple[str, str], float]) -> list[tuple[str, str]]:
    """The keys that a corner names: those with a share of the largest effect."""
    least = max(MATTERS, SHARE * max(effects.values(), default=0.0))
    return [key for key, effect in effects.items() if effect >= least]


def _measure(ask: Ask, judged: Judged, seen: Seen, conditions: int) -> Floats:
    """What says which conditions matter: the margin, or, where a trial never gives in, how far it stayed from it."""
    margin = judged.margin[:conditions]
    if ask.trial is None or ask.trial.key not in seen.edges:
        return margin
    edge = seen.edges[ask.trial.key]
    spare = edge.spare[:conditions]
    measure = spare if np.ptp(np.nan_to_num(margin[edge.tried[:conditions]], nan=-1.0)) < MATTERS else margin
    return np.where(edge.tried[:conditions], measure, np.nan)


def _effects(
    measure: Floats, slope: Floats, conditions: list[Setting], single: list[Setting]
) -> dict[tuple[str, str], float]:
    """How much each axis moves the margin and each part what is made small, so that a corner names what matters."""
    slope = np.nan_to_num(slope, nan=-1.0)
    effects: dict[tuple[str, str], float] = {}
    table = {setting.axes: float(measure[k]) for k, setting in enumerate(conditions)}
    for axes, value in table.items():
        for n, (key, side) in enumerate(axes):
            for other in (-1, 0, 1):
                moved = (*axes[:n], (key, other), *axes[n + 1 :])
                if other != side and np.isfinite(value) and np.isfinite(table.get(moved, np.nan)):
                    effects[key] = max(effects.get(key, 0.0), abs(value - table[moved]))
    parts = {single[k].parts[0][0]: abs(float(slope[k + 1] - slope[k])) for k in range(0, len(single), 2)}
    # Parts are weighed among themselves: what is made small need not have the scale of the margin.
    largest, scale = max(parts.values(), default=0.0), max(effects.values(), default=1.0) or 1.0
    if largest > 0.0:
        effects |= {key: effect / largest * scale for key, effect in parts.items()}
    return effects


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
    value = judged.value
    finite = None if value is None else value[np.isfinite(value)]
    return CheckResult(
        id=ask.id,
        number=ask.check.number,
        title=ask.check.title,
        stage=ask.stage,
        part=ask.part,
        sequence=ask.sequences[0],
        demand=_number(judged.demand, lane),
        capability=_number(judged.capability, lane),
        unit=ask.check.unit,
        limits=judged.limits,
        low=float(finite.min()) if finite is not None and finite.size else None,
        high=float(finite.max()) if finite is not None and finite.size else None,
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
    )


def _overrun(ask: Ask, judged: Judged, lane: int) -> str:
    if judged.value is not None and judged.limits is not None:
        side = "above the upper" if judged.value[lane] > judged.limits[1] else "below the lower"
        return f"{side} limit"
    return "demand is above capability"
