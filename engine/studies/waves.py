"""The nominal run of a sequence as voltages over time."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from ..circuit.circuit import SUPPLY_SOURCE, Circuit, build
from ..design.document import Design
from ..errors import CircuitError
from ..kernel import layout
from ..kernel.layout import Floats
from ..quantity import read
from ..run import RELATIVE, never, run
from .diagnosis import diagnosed
from .sequences import program_of, starts_of

FIRST_POINTS, MOST_POINTS = 4096, 4_000_000
REPEATED, MOST_COPIES = 500, 40  # steps before a gap, and how often they are drawn in it


@dataclass(frozen=True)
class Waves:
    """Voltages of nets over time: ``values`` has shape (times, nets). Seconds and volts; temperatures in deg C."""

    time: Floats
    nets: tuple[str, ...]
    values: Floats
    gaps: tuple[tuple[float, float], ...] = ()
    """From when to when an oscillation was carried forward; between there are no times."""
    carried: str | None = None
    """The same in words."""

    def filled(self) -> Waves:
        """The same for a picture: where an oscillation was carried forward its last steps before the gap are repeated
        in it, drawn out where they are too short, on the way to where it goes on behind the gap."""
        times, values = [self.time], [self.values]
        for begin, end in self.gaps:
            last, next_ = int(np.searchsorted(self.time, begin, side="right")), int(np.searchsorted(self.time, end))
            first = max(0, last - REPEATED)
            if next_ >= len(self.time) or last - first < 2:
                continue
            # Repeated as it is, or drawn out where that would be too many points.
            copies = int(np.clip((end - begin) / max(begin - self.time[first], 1e-300), 1, MOST_COPIES))
            share = (self.time[first:last] - self.time[first]) / (self.time[last - 1] - self.time[first])
            all_shares = ((np.arange(copies)[:, None] + 0.999 * share) / copies).ravel()
            drift = self.values[next_] - self.values[last - 1]
            times.append(begin + (end - begin) * all_shares)
            values.append(np.tile(self.values[first:last], (copies, 1)) + all_shares[:, None] * drift)
        time = np.concatenate(times)
        order = np.argsort(time, kind="stable")
        return replace(self, time=time[order], values=np.ascontiguousarray(np.concatenate(values)[order]), gaps=())


def waves(
    design: Design,
    sequence: str = "alarm",
    nets: Sequence[str] | None = None,
    at: Sequence[float] | None = None,
    relative: float = RELATIVE,
    cancelled: Callable[[], bool] = never,
) -> Waves:
    """Voltages of ``nets`` (all by default) at every step, or at just the times ``at``.

    A part that heats itself has its temperature as well, under a name such as ``E1 temperature``, when asked for.
    ``relative`` scales all tolerances. Raises CircuitError for an unknown sequence or net, a time outside of the
    sequence, and a run that could not be solved.
    """
    circuit = build(design)
    hidden = {SUPPLY_SOURCE, "0V", *circuit.builder.injectors, *circuit.builder.hidden}
    wanted = tuple(nets) if nets else tuple(n for n in circuit.nets if n not in hidden)
    check_question(circuit, sequence, wanted, at)
    places = [circuit.index(net) for net in wanted]
    stops = None if at is None else np.array(sorted(set(at)), dtype=float)
    lanes = circuit.nominal()
    _, program = program_of(circuit, lanes, sequence, stops)
    starts = starts_of(circuit, sequence, program)
    points, carry = FIRST_POINTS, False
    while True:
        observed = run(
            circuit, lanes, program, (), start=starts, relative=relative, trace=points, carry=carry, cancelled=cancelled
        )  # fmt: skip
        how = int(observed.results.ended[0, 0])
        if how == layout.OVERWORKED and not carry:
            carry = True
        elif how != layout.TRACE_FULL or points >= MOST_POINTS:
            break
        else:
            points *= 8
    failure = diagnosed(observed, lanes, sequence, 0)
    if failure is not None:
        raise CircuitError(f"sequence '{sequence}': {failure}")
    used = int(observed.results.trace_used[0])
    time = observed.results.trace_time[0, :used]
    values = observed.results.trace_value[0, :used][:, places]
    values[:, [net in circuit.builder.temperatures for net in wanted]] += lanes.ambient
    if stops is not None:
        # A step ends at every stop; where an event jumps there, the value before the jump is meant.
        index = np.array([int(np.argmin(np.abs(time - t))) for t in stops])
        order = [index[int(np.searchsorted(stops, t))] for t in at or ()]
        time, values = np.array(at, dtype=float), values[order]
    carried = observed.carried
    return Waves(time.copy(), wanted, np.ascontiguousarray(values), carried.gaps, observed.carried_forward(0))


def check_question(circuit: Circuit, sequence: str, nets: Sequence[str], at: Sequence[float] | None) -> None:
    """Refuse what :func:`waves` cannot answer, before anything is computed.

    Raises CircuitError for an unknown sequence or net and for times outside of the sequence.
    """
    known = circuit.design.sequences
    if sequence not in known:
        raise CircuitError(f"there is no sequence '{sequence}'; write one of {', '.join(known)}")
    for net in nets:
        circuit.index(net)
    ends = read(known[sequence].ends, "s")
    if at is not None and not (at and min(at) >= 0.0 and max(at) <= ends):
        raise CircuitError(f"times must lie between 0 s and {ends:g} s, the end of the sequence '{sequence}'")
