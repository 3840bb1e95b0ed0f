"""The nominal run of a sequence as voltages over time."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

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


@dataclass(frozen=True)
class Waves:
    """Voltages of nets over time: ``values`` has shape (times, nets). Seconds and volts; temperatures in deg C."""

    time: Floats
    nets: tuple[str, ...]
    values: Floats


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
    points = FIRST_POINTS
    while True:
        observed = run(
            circuit, lanes, program, (), start=starts, relative=relative, trace=points, cancelled=cancelled
        )  # fmt: skip
        if int(observed.results.ended[0, 0]) != layout.TRACE_FULL or points >= MOST_POINTS:
            break
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
    return Waves(time.copy(), wanted, np.ascontiguousarray(values))


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
