"""How little charge trips an alarm, net by net, and how steep a supply may come: what to protect first.

In stand-by a short pulse of charge of either sign is put into one net after the other, ever larger; nominal and in
every combination of extreme supply, temperature and gain. All nets are searched in one bisection.
"""

from __future__ import annotations

import time
from collections.abc import Callable

import numpy as np

from ..checks.alarm_state import TOLD_BY, alarm_states, settling, standby
from ..checks.charge_trial import SETTLE, charge_trial
from ..checks.check import Ask
from ..checks.trial import Trial
from ..checks.view import MAIN, View
from ..circuit.circuit import Circuit, build
from ..circuit.timeline import Timeline
from ..design.document import Design
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..primitives.builder import RETURN
from ..primitives.columns import AMBIENT, SUPPLY, Column, Lanes
from ..run import never, run, silent
from .effort import immunity_beyond
from .evaluate import Progress, asks_of
from .immunity_sheet import ANY, LEAST, MOST, NOT_YET, WIDTH, ImmunitySheet, NetImmunity
from .lanes import GAIN, Setting, lanes_of, settings
from .margins import worst_corners
from .sequences import program_of, starts_of
from .trials import TrialRun, begin_of

RESOLUTION = 1.05
CASE = Column("immunity", "case", 0.0, 0.0, 0.0)
"""Which net and sign a lane is about: 2 n for a positive, 2 n + 1 for a negative charge into net n."""


def study(
    design: Design,
    *,
    report: Callable[[ImmunitySheet], None] | None = None,
    progress: Progress = silent,
    cancelled: Callable[[], bool] = never,
) -> ImmunitySheet:
    """The immunity of every net; ``report`` gets what is known after each corner, the slew not yet.

    Raises CircuitError where nothing tells of an alarm or there is too much to compute, and Cancelled.
    """
    began = time.perf_counter()
    circuit = build(design, [net for net in design.nets if net != RETURN])

    def sheet(nets: tuple[NetImmunity, ...], slew: float | None, condition: str) -> ImmunitySheet:
        return ImmunitySheet(design.name, design.content, time.perf_counter() - began, nets, slew, condition)

    def partly(nets: tuple[NetImmunity, ...]) -> None:
        if report is not None:
            report(sheet(nets, None, NOT_YET))

    found = _nets(circuit, partly, progress, cancelled)
    return sheet(found, *_slew(circuit, cancelled))


def _nets(
    circuit: Circuit,
    report: Callable[[tuple[NetImmunity, ...]], None],
    progress: Progress,
    cancelled: Callable[[], bool],
) -> tuple[NetImmunity, ...]:
    view = View(circuit.design, circuit)
    states = alarm_states(view)
    if not states:
        raise CircuitError(f"nothing tells of an alarm; give the design {TOLD_BY}")
    held = int(circuit.topology.size[0])
    names = {circuit.builder.net(net): net for net in reversed(circuit.design.nets)}
    nets = [net for place, net in names.items() if place != RETURN and circuit.index(place) < held]
    nets.sort(key=circuit.design.nets.index)
    corners = _corners(circuit)

    def put(line: Timeline, at: float, knob: Floats) -> None:
        case = line.lanes[CASE.key]
        for n, net in enumerate(nets):
            signs = np.where(case == 2 * n, 1.0, np.where(case == 2 * n + 1, -1.0, 0.0))
            line.inject(at, net, signs * knob, WIDTH)

    start = standby(view, MAIN)
    settle = settling(view, states, MAIN, SETTLE)
    trial = charge_trial("immunity", MAIN, start, states, [put], LEAST, MOST, settle)
    # Every net begins with the same stand-by: it is run once in each corner.
    base = lanes_of(circuit.columns, corners)
    begin = begin_of(trial)
    assert begin is not None
    _, program = program_of(circuit, base, MAIN)
    first = run(
        circuit, base, program, [], start=starts_of(circuit, MAIN, program), stop=begin, keep=[begin],
        cancelled=cancelled,
    )  # fmt: skip
    state, at = first.state(begin)
    cases = 2 * len(nets)
    _check_effort(circuit, trial, base, (state, at), len(corners) * cases, cancelled)
    charge = np.empty((len(corners), cases))
    found: tuple[NetImmunity, ...] = ()
    for k in range(len(corners)):
        values = np.vstack([np.repeat(base.values[:, [k]], cases, axis=1), np.arange(cases, dtype=float)])
        lanes = Lanes((*circuit.columns, CASE), values)
        kept = np.ascontiguousarray(np.repeat(state[[k]], cases, axis=0)), np.repeat(at[k], cases)
        edge = TrialRun(circuit, trial, lanes, cancelled, kept).edge(RESOLUTION)
        charge[k] = np.where(edge.never, np.inf, np.where(edge.always | edge.missing, 0.0, edge.knob))
        weakest = [_weakest(n, net, charge[: k + 1], corners[: k + 1]) for n, net in enumerate(nets)]
        found = tuple(sorted(weakest, key=_rank))
        report(found)
        progress((k + 1) * cases, len(corners) * cases)
    return found


def _check_effort(
    circuit: Circuit,
    trial: Trial,
    base: Lanes,
    kept: tuple[Floats, Floats],
    lanes: int,
    cancelled: Callable[[], bool],
) -> None:
    """Refuse what would take too long, told from the first net at nominal with the least charge and the largest."""
    values = np.vstack([np.repeat(base.values[:, [0]], 2, axis=1), np.zeros(2)])
    state, at = (np.ascontiguousarray(np.repeat(each[[0]], 2, axis=0)) for each in kept)
    one = TrialRun(circuit, trial, Lanes((*circuit.columns, CASE), values), cancelled, (state, at))
    too_large = immunity_beyond(circuit, lanes, one.tried([0, 1], np.array([LEAST, MOST])), trial.sequence)
    if too_large is not None:
        raise CircuitError(too_large)


def _corners(circuit: Circuit) -> list[Setting]:
    """Nominal, and every combination of the extremes of supply, temperature and gain, all else nominal."""
    wanted = (SUPPLY, AMBIENT, GAIN)
    found: dict[Setting, None] = {Setting(()): None}
    for setting in settings(circuit.columns):
        axes = tuple((key, side) for key, side in setting.axes if key in wanted)
        if all(side for _, side in axes):
            found[Setting(axes)] = None
    return list(found)


def _weakest(n: int, net: str, charge: Floats, corners: list[Setting]) -> NetImmunity:
    own = charge[:, 2 * n : 2 * n + 2]
    corner, sign = np.unravel_index(int(np.argmin(own)), own.shape)
    least = float(own[corner, sign])
    if not np.isfinite(least):
        return NetImmunity(net, None, None, ANY)
    # What could as well be the other way round is not named.
    charges = {setting.axes: float(own[k, sign]) for k, setting in enumerate(corners)}
    axes = corners[corner].axes
    flipped = (tuple((key, -side if key == own_key else side) for key, side in axes) for own_key, _ in axes)
    telling = [key for (key, _), other in zip(axes, flipped, strict=True) if charges.get(other) != least]
    words = Setting(axes).words(telling) if telling else "nominal" if charges[()] == least else Setting(axes).words()
    return NetImmunity(net, least, -1 if sign else 1, words)


def _rank(found: NetImmunity) -> float:
    return np.inf if found.charge is None else found.charge


def _slew(circuit: Circuit, cancelled: Callable[[], bool]) -> tuple[float | None, str]:
    """The least slew of the supply that a latch bears, of all latches, with its corner."""
    asks: tuple[Ask, ...] = tuple(ask for ask in asks_of(circuit) if ask.check.slug == "supply_slew")
    if not asks:
        return None, "no latch that the supply could trip"
    limits: list[tuple[float, str]] = []
    for ask_id, corner in worst_corners(circuit, asks, cancelled).items():
        missing = next(ask.missing for ask in asks if ask.id == ask_id)
        if missing is not None:
            raise CircuitError(f"the slew that a latch bears cannot be told; missing: {missing}")
        if corner.broken is not None:
            raise CircuitError(f"the slew that a latch bears cannot be told: {corner.broken}")
        judged, lane = corner.judged, corner.lane
        if corner.edge is not None and bool(corner.edge.never[0]) and corner.margin >= 1.0:
            continue
        if corner.margin >= 1.0 or judged.capability is None:
            continue
        outcome = judged.outcome(lane)
        limits.append((0.0 if outcome else float(judged.capability[lane]), corner.words))
    return min(limits) if limits else (None, "immune at any slew, in every corner")
