"""The watch for a loss of stability over the lanes of a study: what was judged there is judged anew where need be."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np

from ..checks.check import Ask
from ..checks.seen import Seen
from ..checks.trial import Edge
from ..circuit.circuit import Circuit
from ..primitives.columns import Lanes
from ..primitives.signals import Row
from ..run import Observed
from .corner import Corner
from .diagnosis import diagnosed
from .evaluate import judge, observe
from .lanes import Setting
from .stability import Watched, watched
from .trials import TrialRun, begin_of

MOST_LANES = 2  # worst corners that are watched
MOST_DIAGNOSED = 3  # lanes that are run once more to tell why they came to no end


def watch(
    circuit: Circuit, asks: Sequence[Ask], corners: dict[str, Corner], cancelled: Callable[[], bool]
) -> dict[str, Corner]:
    """The same corners, by id; where a run walked past a loss of stability, judged anew with the repeated run.

    What cannot be followed within the work bound has no margin, and the words of the watch as its reason. Lanes that
    came to no end get their reason in words.
    """
    at: dict[Setting, list[Ask]] = {}
    for ask in sorted(asks, key=lambda ask: corners[ask.id].rank - ask.required):
        if ask.missing is None and corners[ask.id].broken is None:
            at.setdefault(corners[ask.id].setting, []).append(ask)
    found = _with_reasons(circuit, asks, corners, cancelled)
    for there in list(at.values())[:MOST_LANES]:
        corner = corners[there[0].id]
        lane = corner.lanes.take([corner.lane])
        seen = {name: _watched(circuit, there, lane, name, cancelled) for name in _sequences(there)}
        if any(each.words for each in seen.values()):
            for ask in there:
                found[ask.id] = _anew(circuit, ask, corners[ask.id], lane, seen, cancelled)
    return found


def _with_reasons(
    circuit: Circuit, asks: Sequence[Ask], corners: dict[str, Corner], cancelled: Callable[[], bool]
) -> dict[str, Corner]:
    found = dict(corners)
    known: dict[tuple[Setting, str], str | None] = {}
    for ask in asks:
        corner = corners[ask.id]
        if corner.broken is None:
            continue
        lane = corner.lanes.take([corner.lane])
        for name in ask.sequences:
            key = corner.setting, name
            if key not in known and len(known) < MOST_DIAGNOSED:
                words = diagnosed(observe(circuit, lane, name, (), cancelled=cancelled), lane, name, 0)
                known[key] = None if words is None else f"{name}: {words}"
            if known.get(key) is not None:
                found[ask.id] = replace(corner, broken=known[key])
                break
    return found


def _sequences(asks: Sequence[Ask]) -> list[str]:
    return list(dict.fromkeys(name for ask in asks for name in ask.sequences))


def _watched(
    circuit: Circuit, asks: Sequence[Ask], lane: Lanes, sequence: str, cancelled: Callable[[], bool]
) -> Watched:
    rows = dict.fromkeys(row for ask in asks if sequence in ask.sequences for row in ask.rows)
    begins = [begin_of(ask.trial) for ask in asks if ask.trial is not None and ask.trial.sequence == sequence]
    keep = list(dict.fromkeys(begin for begin in begins if begin is not None))
    return watched(circuit, lane, sequence, list(rows), keep, cancelled)


def _anew(
    circuit: Circuit, ask: Ask, corner: Corner, lane: Lanes, seen: dict[str, Watched], cancelled: Callable[[], bool]
) -> Corner:
    """One ask judged in one lane from the runs to believe."""
    words = [f"{name}: {seen[name].words}" for name in ask.sequences if seen[name].words]
    if not words:
        return corner
    said = "; ".join(words)
    if any(seen[name].unknown for name in ask.sequences):
        judged = replace(
            corner.judged, margin=np.where(np.arange(corner.lanes.count) == corner.lane, np.nan, corner.judged.margin)
        )
        return replace(corner, judged=judged, broken=said)
    edges: dict[str, Edge] = {}
    if ask.trial is not None:
        begin = begin_of(ask.trial)
        kept = None if begin is None else seen[ask.trial.sequence].observed.state(begin)
        edges[ask.trial.key] = TrialRun(circuit, ask.trial, lane, cancelled, kept).edge()

    def again(sequence: str, rows: tuple[Row, ...], altered: Lanes) -> Observed:
        return observe(circuit, altered, sequence, rows, cancelled=cancelled)

    judged, broken = judge(ask, Seen(circuit, lane, {name: each.observed for name, each in seen.items()}, edges, again))
    edge = None if ask.trial is None else edges[ask.trial.key]
    return replace(corner, judged=judged, lane=0, lanes=lane, broken=broken.get(0), edge=edge, remark=said)
