"""Why a lane could not be brought to its end, in words for the bench: reason, time, nets and what cures it."""

from __future__ import annotations

import numpy as np

from ..circuit.circuit import Circuit, build
from ..circuit.linearised import matrices, parameters_at
from ..circuit.timeline import Timeline
from ..design.document import Design
from ..kernel import layout
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..quantity import write
from ..run import MOST_STEPS, Observed, run
from .sequences import program_of, starts_of

GLANCE = 8000  # steps of the look at what a lane does that took too many
VISIBLE = 0.05  # V, swing of a net that counts as an oscillation
CYCLES = 3
STEADY_CYCLES, STEADY_SPREAD, STEADY_DRIFT = 10, 0.2, 0.01  # periods seen, and how far those of a steady one differ
BARE = 1e-14  # F: a net with less has no capacitance worth the name
MOST_NETS = 3  # that are named
STRAY, STRAY_WORDS = "1p", "1 pF"


def diagnosed(observed: Observed, lanes: Lanes, sequence: str, lane: int) -> str | None:
    """Why lane ``lane`` of a run ended early; None for a lane that was solved."""
    how = int(observed.results.ended[lane, 0])
    if how in (layout.DONE, layout.STOPPED):
        return None
    circuit, own = observed.circuit, lanes.take([lane])
    at, state = float(observed.results.ended_at[lane]), observed.results.final[lane : lane + 1]
    if how == layout.OVERWORKED:
        return _overworked(circuit, own, sequence, at, state, int(observed.results.work[lane, 0]))
    if how == layout.UNSOLVED:
        worst = _place(circuit, int(observed.results.ended[lane, 1]))
        return _unsolved(circuit, own, sequence, at, state, worst)
    return observed.failure(lane)


def _overworked(circuit: Circuit, lane: Lanes, sequence: str, at: float, state: Floats, steps: int) -> str:
    """What a lane does that takes so many steps: a look at how it would go on."""
    before, _ = program_of(circuit, lane, sequence)
    line = Timeline.resumed(before, np.array([at]))
    seen = run(circuit, lane, line.program(max(1.0, 10.0 * at)), (), start=np.ascontiguousarray(state), trace=GLANCE)
    used = int(seen.results.trace_used[0])
    time, values = seen.results.trace_time[0, :used], seen.results.trace_value[0, :used]
    found: tuple[Floats, float, str] | None = None
    for k in range(int(circuit.topology.size[0])):
        periods = _periods(time, values[:, k])
        size = float(np.ptp(values[:, k]))
        if len(periods) >= CYCLES and (found is None or size > found[1]):
            found = periods, size, circuit.unknown_name(k)
    begin = f"took too many steps by {write(at, 's', 4)}"
    if steps < MOST_STEPS:
        begin += f" ({steps} are all that its time allows in a circuit of {int(circuit.topology.size[0])} nets)"
    if found is not None:
        periods, _, net = found
        steadily = f", steadily ({len(periods)} periods alike)" if _steady(periods) else ""
        return (
            f"{begin}: it goes on oscillating near net {net} at about {write(1.0 / float(np.median(periods)), 'Hz')}"
            f"{steadily}, not evenly enough in all nets to be carried forward; end the sequence sooner, or look at the "
            f"oscillation in a short sequence of its own"
        )
    moving = np.argsort(-np.ptp(values[:, : int(circuit.topology.size[0])], axis=0))[:MOST_NETS]
    return f"{begin}, busy near {_nets([circuit.unknown_name(int(k)) for k in moving])}"


def _periods(time: Floats, value: Floats) -> Floats:
    """Periods in s of what swings to and fro across its own middle; none where it does not."""
    low, high = float(value.min()), float(value.max())
    if high - low < VISIBLE:
        return np.zeros(0)
    above = value > low + 0.7 * (high - low)
    below = value < low + 0.3 * (high - low)
    state, rises = None, []
    for t, up, down in zip(time, above, below, strict=True):
        if up and state is False:
            rises.append(float(t))
        state = True if up else False if down else state
    return np.diff(rises)


def _steady(periods: Floats) -> bool:
    """Whether an oscillation is the same at the end of the look as at its beginning, one period like the other."""
    if len(periods) < STEADY_CYCLES:
        return False
    usual, third = float(np.median(periods)), len(periods) // 3
    low, high = np.quantile(periods, [0.1, 0.9])
    drift = np.median(periods[-third:]) / np.median(periods[:third]) - 1.0
    return bool(high - low < STEADY_SPREAD * usual and abs(drift) < STEADY_DRIFT)


def _unsolved(circuit: Circuit, lane: Lanes, sequence: str, at: float, state: Floats, worst: str) -> str:
    """Names the nets that switch over with no capacitance, where there are such, and the strays that were tried."""
    begin = f"could not be solved at {write(at, 's', 4)}"
    bare = bare_nets(circuit, lane, sequence, at, state)
    if not bare:
        return f"{begin} near {worst}"
    many = len(bare) > 1
    shown = bare[:MOST_NETS]
    begin = (
        f"{begin}: {_nets(shown)} {'switch' if many else 'switches'} over with no capacitance to slow "
        f"{'them' if many else 'it'}"
    )
    for tried in (*([net] for net in shown), *([shown] if many else [])):
        if _cured(circuit, lane, sequence, tried):
            every = " each" if len(tried) > 1 else ""
            return f"{begin}; a stray of {STRAY_WORDS}{every} from {_nets(tried)} to 0V, as wiring has it, cures it"
    if _cured(circuit, lane, sequence, _transistor_nets(circuit)):
        return f"{begin}; a stray of {STRAY_WORDS} from every base and collector to 0V, as wiring has it, cures it"
    return f"{begin}; write the capacitances of its transistors and diodes, strays of {STRAY_WORDS} do not cure it"


def _transistor_nets(circuit: Circuit) -> list[str]:
    """Nets of the document at bases and collectors, without those that are driven."""
    free, drawn = int(circuit.topology.size[1]), {net for part in circuit.design.parts for net in part.pins.values()}
    nets = dict.fromkeys(net for c, b, *_ in circuit.builder.transports for net in (b, c))
    return [net for net in nets if net in drawn and circuit.index(net) < free]


def _cured(circuit: Circuit, lane: Lanes, sequence: str, nets: list[str]) -> bool:
    """Whether the lane comes to its end with a stray at each of these nets."""
    strays = [{"between": [net, "0V"], "value": STRAY} for net in nets]
    document = circuit.design.dump()
    with_strays = build(Design.load({**document, "strays": [*document.get("strays", []), *strays]}))
    _, program = program_of(with_strays, lane, sequence)
    return not run(with_strays, lane, program, (), start=starts_of(with_strays, sequence, program)).failed[0]


def bare_nets(circuit: Circuit, lane: Lanes, sequence: str, at: float, state: Floats) -> list[str]:
    """Nets without capacitance that transistors drive, those first that drive each other hardest."""
    _, program = program_of(circuit, lane, sequence)
    parameters = parameters_at(circuit, circuit.table(lane), program, 0, np.array([at]))
    conductance, capacitance = (m[0] for m in matrices(circuit, parameters, state))
    nets = int(circuit.topology.size[0])
    bases = {circuit.index(net) for _, net, *_ in circuit.builder.transports}
    drawn = {circuit.index(net) for net in _transistor_nets(circuit)}
    own = np.maximum(np.abs(conductance.diagonal()), 1e-15)
    found = []
    for k in sorted(bases & drawn):
        if capacitance[k, k] < BARE:
            pull = max((abs(conductance[j, k]) / own[j] for j in range(nets) if j != k), default=0.0)
            found.append((-pull, circuit.unknown_name(k)))
    return [name for _, name in sorted(found)]


def _place(circuit: Circuit, unknown: int) -> str:
    """An unknown in words: a net, or what stands between two nets."""
    nets = int(circuit.topology.size[0])
    if unknown < nets or unknown >= int(circuit.topology.size[1]):
        return f"net {circuit.unknown_name(unknown)}"
    name = circuit.unknown_name(unknown)
    if name in circuit.builder.temperatures:
        return f"the {name}"
    first, second, *_ = circuit.builder.branches[unknown - nets]
    between = [
        part.ref for part in circuit.design.parts if {*map(circuit.builder.net, part.pins.values())} == {first, second}
    ]
    return f"{between[0] if between else 'the branch'} between nets {first} and {second}"


def _nets(names: list[str]) -> str:
    return f"net {names[0]}" if len(names) == 1 else f"nets {', '.join(names[:-1])} and {names[-1]}"
