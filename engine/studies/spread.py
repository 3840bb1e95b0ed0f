"""The random spread of margins: quantiles, and the share of lanes that keep the required margin with its interval."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ..checks.check import Ask
from ..circuit.circuit import Circuit
from ..primitives.columns import Lanes
from ..results import Spread
from .evaluate import Progress, judge, kept_state, look
from .trials import TrialRun

Z = 1.959963984540054  # 97.5 % quantile of the normal distribution


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
) -> dict[str, Spread]:
    """Spread of every ask over random lanes, by id.

    A trial is one lane at the knob value that the required margin asks for: it says how many lanes pass, no quantiles.
    """
    seen = look(circuit, asks, lanes, progress=progress, cancelled=cancelled)
    screened: dict[tuple[str, float], np.ndarray[tuple[int], np.dtype[np.bool_]]] = {}
    trials: dict[str, TrialRun] = {}
    found: dict[str, Spread] = {}
    for ask in asks:
        if ask.missing is not None:
            continue
        if ask.trial is not None:
            if ask.screen is None:
                continue
            key = ask.trial.key, ask.screen
            if key not in screened:
                everyone = list(range(lanes.count))
                if ask.trial.key not in trials:
                    kept = kept_state(seen.observed, ask.trial, everyone)
                    trials[ask.trial.key] = TrialRun(circuit, ask.trial, lanes, cancelled, kept)
                trial = trials[ask.trial.key]
                screened[key] = trial.holds(everyone, np.full(lanes.count, ask.screen)) & ~trial.missing
            passed = int(screened[key].sum())
            found[ask.id] = Spread(None, None, None, passed / lanes.count, wilson(passed, lanes.count))
            continue
        judged, _ = judge(ask, seen)
        margin = np.where(np.isnan(judged.margin), -1.0, judged.margin)
        p05, p50, p95 = (float(q) for q in np.quantile(margin, (0.05, 0.5, 0.95)))
        passed = int((margin >= ask.required).sum())
        found[ask.id] = Spread(p05, p50, p95, passed / lanes.count, wilson(passed, lanes.count))
    return found
