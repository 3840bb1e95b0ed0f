"""The random spread of margins: quantiles, and the share of lanes that keep the required margin with its interval.

The corners try both ends and the middle of every condition. A margin that is worst between two of them, as that of a
driver which one supply starves and another saturates, may be seen by a random lane only: it is told beside the verdict.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ..checks.check import Ask
from ..circuit.circuit import Circuit
from ..circuit.work_inspection import course_points
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..quantity import write
from ..results import CheckResult, Spread
from .evaluate import Progress, judge, kept_state, look
from .lanes import conditions_of
from .trials import TrialRun

PORTION = 4096  # lanes in memory at a time, at most
LEAST_PORTION = 64
COURSE_POINTS = 16_000_000  # pairs of numbers for the courses of all lanes of a portion: 256 MB
Z = 1.959963984540054  # 97.5 % quantile of the normal distribution
WORSE = 0.005  # of a margin, by which a random lane is below the worst corner before it is told
UNITS = {"supply": "V", "ambient": "degC", "source_resistance": "ohm"}


@dataclass(frozen=True)
class Drawn:
    """The spread of one margin, and the least margin that was known in a lane, with that lane; None in a trial."""

    spread: Spread
    least: tuple[float, int] | None

    def beside(self, check: CheckResult, lanes: Lanes) -> str | None:
        """What is said where a random lane is worse than the worst corner that was found; else the reason as it is."""
        if self.least is None or check.margin is None or self.least[0] > check.margin - WORSE:
            return check.reason
        margin, lane = self.least
        at = ", ".join(
            f"{name.replace('_', ' ')} {write(value, UNITS[name], 4)}"
            for name, value in conditions_of(lanes, lane).items()
            if name in UNITS and not isinstance(value, str)
        )
        said = f"a random unit comes to {100.0 * margin:+.1f} %, worse than all corners that are tried, at {at}"
        return said if check.reason is None else f"{check.reason}; {said}"


def wilson(passed: int, total: int) -> tuple[float, float]:
    """Interval at 95 % for a share (Wilson, J. Am. Stat. Assoc. 22 (1927) 209)."""
    if total == 0:
        return 0.0, 1.0
    share = passed / total
    scale = 1.0 + Z * Z / total
    middle = (share + Z * Z / (2.0 * total)) / scale
    half = Z / scale * float(np.sqrt(share * (1.0 - share) / total + Z * Z / (4.0 * total * total)))
    return max(0.0, middle - half), min(1.0, middle + half)


def spread_of(
    circuit: Circuit, asks: tuple[Ask, ...], lanes: Lanes, progress: Progress, cancelled: Callable[[], bool]
) -> dict[str, Drawn]:
    """Spread of every ask over random lanes, by id.

    A trial is one lane at the knob value that the required margin asks for: it says how many lanes pass, no quantiles.
    Lanes are run in portions, so that memory is bounded however many there are.
    """
    judged = [ask for ask in asks if ask.missing is None and (ask.trial is None or ask.screen is not None)]
    margins: dict[str, list[Floats]] = {ask.id: [] for ask in judged if ask.trial is None}
    known: dict[str, list[Floats]] = {name: [] for name in margins}
    passed: dict[str, int] = dict.fromkeys((ask.id for ask in judged), 0)
    fitting = COURSE_POINTS // max(1, course_points(circuit.design))
    size = min(PORTION, max(LEAST_PORTION, fitting))
    for low in range(0, lanes.count, size):
        portion = lanes.take(range(low, min(low + size, lanes.count)))

        def of_all(done: int, total: int, low: int = low, count: int = portion.count) -> None:
            runs = total // count
            progress(low * runs + done, lanes.count * runs)

        seen = look(circuit, asks, portion, progress=of_all, cancelled=cancelled)
        screened: dict[tuple[str, float], int] = {}
        trials: dict[str, TrialRun] = {}
        for ask in judged:
            if ask.trial is None:
                found = judge(ask, seen)[0].margin
                known[ask.id].append(np.nan_to_num(found, nan=np.inf))
                margin = np.where(np.isnan(found), -1.0, found)
                margins[ask.id].append(margin)
                passed[ask.id] += int((margin >= ask.required).sum())
            elif ask.screen is not None:
                key = ask.trial.key, ask.screen
                if key not in screened:
                    everyone = range(portion.count)
                    if ask.trial.key not in trials:
                        kept = kept_state(seen.observed, ask.trial, everyone)
                        trials[ask.trial.key] = TrialRun(circuit, ask.trial, portion, cancelled, kept)
                    trial = trials[ask.trial.key]
                    held = trial.holds(everyone, np.full(portion.count, ask.screen))
                    screened[key] = int((held & ~trial.missing).sum())
                passed[ask.id] += screened[key]
    return {
        name: Drawn(_spread(margins.get(name), count, lanes.count), _least(known.get(name)))
        for name, count in passed.items()
    }


def _least(margins: list[Floats] | None) -> tuple[float, int] | None:
    if margins is None:
        return None
    every = np.concatenate(margins)
    lane = int(np.argmin(every))
    return float(every[lane]), lane


def _spread(margins: list[Floats] | None, passed: int, total: int) -> Spread:
    if margins is None:
        return Spread(None, None, None, passed / total, wilson(passed, total))
    p05, p50, p95 = (float(q) for q in np.quantile(np.concatenate(margins), (0.05, 0.5, 0.95)))
    return Spread(p05, p50, p95, passed / total, wilson(passed, total))
