"""Where a trial is worst. A trial costs more than an observation, and what its circuit bears may jump from nothing to
everything between corners, so conditions are compared with every part at the end of its tolerance that hurts.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np

from ..checks.check import Ask
from ..checks.seen import Seen
from ..checks.trial import Edge
from ..circuit.circuit import Circuit
from ..kernel.layout import Floats
from .corner import Corner
from .corner_words import Effects, of_conditions, of_parts, used, weighed
from .evaluate import Progress, judge, kept_state, look
from .lanes import Setting, lanes_of
from .trials import TrialRun
from .vertices import lowest, sides

WORST = 6  # corners that are tried at the trial's own resolution
COARSE, SIDES = 1.08, 1.06  # resolution of the trials that only find the worst conditions, the side that hurts
FLAT = 1e-4  # margins that differ by less say nothing about which conditions matter


def part_ends(
    circuit: Circuit,
    asks: Sequence[Ask],
    nominal: dict[str, Edge],
    seen: Seen,
    single: Sequence[int],
    cancelled: Callable[[], bool],
) -> dict[str, Floats]:
    """What falls as an ask with a trial gets worse, with one part at an end, by the ask's id.

    It is the logarithm of the knob at the edge, searched near the ``nominal`` one (by id too), or the margin where that
    does not follow the knob, or, where the nominal circuit never gives in, how far it stayed from it. ``single`` are
    the lanes of ``seen`` in which one part is at an end.
    """
    found: dict[str, Floats] = {}
    edges: dict[str, Edge] = {}
    spares: dict[str, Floats] = {}
    for ask in asks:
        if ask.trial is None:
            continue
        key = ask.trial.key
        found[ask.id] = np.zeros(len(single))
        edge = nominal.get(ask.id)
        if edge is None or edge.always[0] or edge.missing[0] or not single:
            continue
        if key not in edges and key not in spares:
            kept = kept_state(seen.observed, ask.trial, single)
            own = TrialRun(circuit, ask.trial, seen.lanes.take(single), cancelled, kept)
            if edge.never[0]:
                spares[key] = own.spare(float(edge.spare_at[0]))
            else:
                near = own.edge(around=float(edge.knob[0]), resolution=SIDES)
                edges[key] = near.scattered(single, seen.lanes.count)
        if key in spares:
            found[ask.id] = spares[key]
        elif ask.follows_knob:
            found[ask.id] = np.log(edges[key].knob[list(single)])
        else:
            found[ask.id] = judge(ask, replace(seen, edges={key: edges[key]}))[0].margin[list(single)]
    return found


class TrialCorners:
    """Coarse trials at the extremes of the conditions, every part at the end that hurts."""

    def __init__(
        self,
        circuit: Circuit,
        asks: Sequence[Ask],
        ends: dict[str, Floats],
        conditions: Sequence[Setting],
        single: Sequence[Setting],
        progress: Progress,
        cancelled: Callable[[], bool],
    ) -> None:
        """``ends`` are those of :func:`part_ends`, ``single`` the settings they belong to."""
        self._single, self._ends = single, ends
        extremes = [setting.axes for setting in conditions if all(side for _, side in setting.axes)]
        hurting = {name: sides(end, single) for name, end in ends.items()}
        self._settings = {name: [Setting(axes, parts) for axes in extremes] for name, parts in hurting.items()}
        order: dict[Setting, int] = {}
        self._lanes = {
            name: [order.setdefault(setting, len(order)) for setting in chosen]
            for name, chosen in self._settings.items()
        }
        with_trial = [ask for ask in asks if ask.trial is not None]
        trials: dict[str, list[int]] = {}
        for ask in with_trial:
            assert ask.trial is not None
            trials.setdefault(ask.trial.key, []).extend(self._lanes[ask.id])
        self._seen = look(
            circuit, with_trial, lanes_of(circuit.columns, list(order)), trials=trials, resolution=COARSE,
            progress=progress, cancelled=cancelled,
        )  # fmt: skip

    def worst(self, ask: Ask) -> list[Setting]:
        """The settings to try at the trial's own resolution."""
        margin, spare = self._margin(ask)
        # Where the circuit never gives in, what stayed nearest to it counts, behind all others.
        return [self._settings[ask.id][k] for k in lowest(margin + 1e-6 * spare, WORST)]

    def effects(self, ask: Ask, nominal: Corner, worst: float) -> Effects:
        """What moves the margin from that of ``nominal`` to ``worst``."""
        margin, spare = self._margin(ask)
        flat = bool(np.ptp(margin) < FLAT)
        plain = [Setting(setting.axes) for setting in self._settings[ask.id]]
        conditions = of_conditions(spare if flat else used(margin, worst), plain)
        ends = self._ends[ask.id]
        if nominal.edge is not None and bool(nominal.edge.never[0]):
            parts = of_parts(ends, self._single)
            return conditions | parts if flat else weighed(conditions, parts)
        # D or C follows the knob, whose edges are known by steps only.
        step = 1.5 * float(np.log(SIDES))
        parts = of_parts(ends if ask.follows_knob else used(ends, worst), self._single, step)
        return weighed(conditions, parts) if flat else conditions | parts

    def _margin(self, ask: Ask) -> tuple[Floats, Floats]:
        assert ask.trial is not None
        lanes = self._lanes[ask.id]
        margin = judge(ask, self._seen)[0].margin[lanes]
        return np.nan_to_num(margin, nan=-1.0), np.nan_to_num(self._seen.edges[ask.trial.key].spare[lanes])
