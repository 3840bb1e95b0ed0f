"""Runs a set of lanes through all sequences and trials that the asks of a design need, and judges every ask."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from difflib import get_close_matches

import numpy as np

from ..checks import catalogue
from ..checks.check import Ask, Judged
from ..checks.factors import FACTORS
from ..checks.fuse import with_blown_fuses
from ..checks.seen import Seen
from ..checks.trial import Edge, Trial
from ..checks.view import View
from ..circuit.circuit import Circuit
from ..design.document import Design
from ..errors import CircuitError, QuantityError
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Row
from ..run import Observed, never, run, silent
from .sequences import program_of, starts_of
from .trials import TrialRun, begin_of

Progress = Callable[[int, int], None]


def asks_of(circuit: Circuit) -> tuple[Ask, ...]:
    """Everything that the catalogue asks of a design, in the order of the catalogue. Raises CircuitError where the
    design sets a margin or a factor that there is not."""
    inspect_tables(circuit.design)
    inspect_requirements(circuit.design)
    view = View(circuit.design, circuit)
    found: dict[str, Ask] = {}
    for check in catalogue().values():
        try:
            for ask in check.asks(check, view):
                found.setdefault(ask.id, ask)
        except QuantityError as refusal:
            raise CircuitError(f"requirement {check.slug}: {refusal}") from refusal
    return tuple(found.values())


def inspect_tables(design: Design) -> None:
    """Refuse a required margin or a factor of a name that there is not. Raises CircuitError."""
    for table, names, known in (("required", design.required, catalogue()), ("derating", design.derating, FACTORS)):
        for name in names:
            if name not in known:
                near = get_close_matches(name, known, 1, 0.5)
                meant = f"'{near[0]}'" if near else f"one of {', '.join(sorted(known))}"
                raise CircuitError(f"field {table}: there is no '{name}'; write {meant}")


def inspect_requirements(design: Design) -> None:
    """Refuse a requirement that no check reads, and a field that its check does not read. Raises CircuitError."""
    for number, requirement in enumerate(design.requirements, 1):
        where = f"requirement {number} ({requirement.check})"
        check = catalogue().get(requirement.check)
        if check is None:
            near = get_close_matches(requirement.check, catalogue(), 1, 0.5)
            meant = f"'{near[0]}'" if near else f"one of {', '.join(catalogue())}"
            raise CircuitError(f"{where}, field check: there is no check '{requirement.check}'; write {meant}")
        for field in requirement.extras:
            if field not in check.reads:
                near = get_close_matches(field, check.reads, 1, 0.6)
                known = ", ".join(check.reads) or "no fields of its own"
                meant = f"write '{near[0]}'" if near else f"leave it out (it reads {known})"
                raise CircuitError(f"{where}, field {field}: the check does not read it; {meant}")


def _rows(asks: Sequence[Ask]) -> dict[str, list[Row]]:
    wanted: dict[str, dict[Row, None]] = {}
    for ask in asks:
        if ask.missing is None:
            for sequence in ask.sequences:
                wanted.setdefault(sequence, {}).update(dict.fromkeys(ask.rows))
    return {sequence: list(rows) for sequence, rows in wanted.items()}


def observe(
    circuit: Circuit,
    lanes: Lanes,
    sequence: str,
    rows: Sequence[Row],
    progress: Progress = silent,
    cancelled: Callable[[], bool] = never,
    keep: Sequence[Row] = (),
) -> Observed:
    """Run one sequence of the document in all lanes."""
    _, program = program_of(circuit, lanes, sequence)
    starts = starts_of(circuit, sequence, program)
    return run(circuit, lanes, program, rows, start=starts, keep=keep, progress=progress, cancelled=cancelled)


def look(
    circuit: Circuit,
    asks: Sequence[Ask],
    lanes: Lanes,
    *,
    trials: Mapping[str, Sequence[int]] | None = None,
    resolution: float | None = None,
    progress: Progress = silent,
    cancelled: Callable[[], bool] = never,
) -> Seen:
    """Observe all sequences, and bisect every trial in the lanes that ``trials`` gives for its key (None: in none)."""
    wanted = _rows(asks)
    begins: dict[str, list[Row]] = {}
    for ask in asks:
        begin = None if ask.trial is None else begin_of(ask.trial)
        if ask.trial is not None and begin is not None and begin not in begins.setdefault(ask.trial.sequence, []):
            begins[ask.trial.sequence].append(begin)
    observed: dict[str, Observed] = {}
    for k, (sequence, rows) in enumerate(wanted.items()):

        def portion(done: int, total: int, k: int = k) -> None:
            progress(k * total + done, len(wanted) * total)

        observed[sequence] = observe(circuit, lanes, sequence, rows, portion, cancelled, begins.get(sequence, ()))
    edges = {} if trials is None else edges_of(circuit, asks, lanes, observed, trials, resolution, cancelled)

    def again(sequence: str, rows: tuple[Row, ...], altered: Lanes) -> Observed:
        return observe(circuit, altered, sequence, rows, cancelled=cancelled)

    return Seen(circuit, lanes, observed, edges, again)


def edges_of(
    circuit: Circuit,
    asks: Sequence[Ask],
    lanes: Lanes,
    observed: Mapping[str, Observed],
    trials: Mapping[str, Sequence[int]],
    resolution: float | None = None,
    cancelled: Callable[[], bool] = never,
) -> dict[str, Edge]:
    """Bisect every trial, by its key, in the lanes that ``trials`` gives for it; ``observed`` are the runs of all."""
    edges: dict[str, Edge] = {}
    for ask in asks:
        if ask.trial is not None and ask.trial.key not in edges:
            index = sorted(set(trials.get(ask.trial.key, ())))
            if index:
                kept = kept_state(observed, ask.trial, index)
                found = TrialRun(circuit, ask.trial, lanes.take(index), cancelled, kept).edge(resolution)
                edges[ask.trial.key] = found.scattered(index, lanes.count)
    return edges


def kept_state(observed: Mapping[str, Observed], trial: Trial, index: Sequence[int]) -> tuple[Floats, Floats] | None:
    """States and times from which a trial goes on in lanes ``index``, as a run of its sequence has kept them."""
    begin = begin_of(trial)
    if begin is None or trial.sequence not in observed or begin not in observed[trial.sequence].keep:
        return None
    states, times = observed[trial.sequence].state(begin)
    return np.ascontiguousarray(states[index]), times[index]


def judge(ask: Ask, seen: Seen) -> tuple[Judged, dict[int, str]]:
    """Judge one ask in all lanes; lanes that could not be solved come with the reason and have no margin.

    Lanes in which the trial of an ask was not run count as infinitely good: they cannot be the worst.
    """
    judged = ask.judge(seen)
    if ask.missing is None and ask.check.slug != "fuse_pulse":
        judged = with_blown_fuses(judged, (seen.observed[sequence] for sequence in ask.sequences))
    if ask.trial is not None and ask.missing is None:
        edge = seen.edges.get(ask.trial.key)
        untried = np.ones(seen.lanes.count, dtype=bool) if edge is None else ~edge.tried
        judged.margin[untried] = np.inf
    broken: dict[int, str] = {}
    if ask.missing is None:
        for sequence in ask.sequences:
            observed = seen.observed[sequence]
            for failed in np.flatnonzero(observed.failed):
                broken.setdefault(int(failed), f"{sequence}: {observed.failure(int(failed))}")
    for lane in broken:
        judged.margin[lane] = np.nan
    return judged, broken
