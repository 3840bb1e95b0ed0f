"""What the loads of a design do without a fault: when each comes on, because of which event, and when it is over."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ..checks.view import MAIN, View
from ..design.document import Design
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..quantity import read
from ..run import never
from .waves import waves

CLICK = 0.02  # s: shorter than that is no alarm (common practice, no source)


@dataclass(frozen=True, slots=True)
class Behaviour:
    """One load in one sequence, times in s. ``cause`` is when the event comes without which it stays off.

    ``on`` is None for a load that stays off, ``over`` (off for the last time) None for one that is on at the end.
    ``by_supply``: the cause is that the supply is connected.
    """

    load: str
    sequence: str
    plus: str
    minus: str
    level: float
    ends: float
    cause: float | None = None
    on: float | None = None
    over: float | None = None
    by_supply: bool = False

    @property
    def alarms(self) -> bool:
        """Whether an alarm is called for: in any but the main sequence, one that the supply causes is not."""
        return self.on is not None and (self.sequence == MAIN or not self.by_supply)

    @property
    def lasts(self) -> float:
        """How long it is on, from first to last, s."""
        return 0.0 if self.on is None else (self.ends if self.over is None else self.over) - self.on


def alarm_loads(view: View) -> tuple[tuple[str, tuple[str, str, float]], ...]:
    """The parts that tell when there is an alarm, with nets and level: in the role ``load``, else all with a level.

    Raises CircuitError where no part has a level.
    """
    filled = [part.ref for _, _, part in view.with_role("load")]
    for refs in (filled, [part.ref for part in view.design.parts]):
        found = [(ref, on) for ref in dict.fromkeys(refs) if (on := view.bench(ref).on) is not None]
        if found:
            return tuple(found)
    raise CircuitError(
        "no part tells when there is an alarm; give a sounder its operating_minimum and the role 'load' of its stage"
    )


def behaviours(view: View, cancelled: Callable[[], bool] = never) -> tuple[Behaviour, ...]:
    """Every load in every sequence of a design, at nominal values. Raises CircuitError or Cancelled."""
    found = []
    for sequence in view.design.sequences:
        for load, (plus, minus, level) in alarm_loads(view):
            ends = view.ends(sequence)
            quiet = Behaviour(load, sequence, plus, minus, level, ends)
            on, over = _times(view.design, quiet, cancelled)
            cause, by_supply = (None, False) if on is None else _cause(view.design, quiet, on, cancelled)
            found.append(Behaviour(load, sequence, plus, minus, level, ends, cause, on, over, by_supply))
    return tuple(found)


def _times(design: Design, of: Behaviour, cancelled: Callable[[], bool]) -> tuple[float | None, float | None]:
    """When a load comes on, and when it goes off for the last time."""
    nets = list(dict.fromkeys((of.plus, of.minus)))
    seen = waves(design, of.sequence, nets, cancelled=cancelled)
    across: Floats = seen.values[:, 0] - seen.values[:, -1]
    above = np.flatnonzero(across > of.level)
    if above.size == 0:
        return None, None
    over = None if above[-1] == across.size - 1 else float(seen.time[above[-1]])
    return float(seen.time[above[0]]), over


def _cause(design: Design, of: Behaviour, on: float, cancelled: Callable[[], bool]) -> tuple[float, bool]:
    """When the event comes without which the load stays off, and whether it is that the supply is connected.

    The sequence is cut off after one event more each time, until the load comes on.
    """
    sequence = design.sequences[of.sequence]
    events = sorted(sequence.events, key=lambda event: read(event.at, "s"))
    before = [event for event in events if read(event.at, "s") <= on]
    first = next((k for k, event in enumerate(before) if event.event == "connect supply"), -1) + 1
    for count in range(first, len(before)):
        cut = sequence.model_copy(update={"events": tuple(before[:count])})
        document = design.dump()
        document["sequences"][of.sequence] = cut.model_dump(mode="json", by_alias=True, exclude_unset=True)
        came, _ = _times(Design.load(document), of, cancelled)
        if came is not None:
            return (read(before[count - 1].at, "s") if count else 0.0), count == first
    return (read(before[-1].at, "s") if before else 0.0), len(before) <= first
