"""The arrays that the kernel works on. Everything is a C-contiguous int64 or float64 array, one row per lane.

Unknowns come first in the vector x: free nets 0 .. n_nets-1, then branch currents, then temperatures (kelvin above the
ambient) up to n_free-1; known nets follow, the last of them being the return 0V, and then the states of guards, up to
n_all-1. A matrix slot equal to the number of
stored entries is a dump: rows and columns of known nets are added there and never read. Arrays are passed to the inner
functions one by one: a tuple of arrays costs more to hand over than the arithmetic of a small circuit. What is used as
an index is unsigned (``Places``): a signed one is tested for counting from the end at every access. While lanes are
stepped, arrays are turned: a row holds one number of ``WIDTH`` lanes (:mod:`.vectors`).
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

Ints = NDArray[np.int64]
Floats = NDArray[np.float64]
Bytes = NDArray[np.uint8]
Places = NDArray[np.uint32]

# Families of primitives, in the order in which they stand in ``Topology.element``.
CONDUCTANCE, CAPACITANCE, BRANCH, JUNCTION, TRANSPORT, CHANNEL, WARM = 0, 1, 2, 3, 4, 5, 6
GUARD, CONTACT = 7, 8
FAMILIES = 9

# Columns of ``Topology.element``.
E_A, E_B, E_C = 0, 1, 2  # nets; anode, cathode; collector, base, emitter; drain, gate, source; of a warm one a, its
#                          temperature, b; of a branch a, b and its row; of a guard two unknowns and the row of its
#                          state; of a contact its guard, 1 = make
E_EXTRA = 3  # 1 npn or n-channel, 0 pnp or p-channel; of a branch its source from 1, 0 = none; guard: 1 = either sign
E_PARAMETER = 4  # first of its parameters in a lane's row
E_SLOT = (
    5  # matrix slots: aa ab ba bb; branch: row-a row-b row-row a-row b-row; three nets: 3 by 3; contact: parameter set
)
ELEMENT_WIDTH = 14

ONE = np.uint32(1)

# A junction's parameters. Offsets are unsigned like the places they are added to: mixed signs would add up to a float.
J_SATURATION, J_SLOPE, J_CAPACITANCE = np.uint32(0), np.uint32(1), np.uint32(2)
J_POTENTIAL, J_GRADING, J_TRANSIT = np.uint32(3), np.uint32(4), np.uint32(5)
J_BREAKDOWN, J_BREAKDOWN_SLOPE, J_BREAKDOWN_CURRENT = np.uint32(6), np.uint32(7), np.uint32(8)
J_LEAKAGE = np.uint32(9)
J_KNEE, J_BREAKDOWN_KNEE = (
    np.uint32(10),
    np.uint32(11),
)  # where a Newton step into conduction, into breakdown begins to be limited
# What the laws would else divide out.
J_PER_SLOPE, J_PER_BREAKDOWN_SLOPE, J_PER_POTENTIAL = np.uint32(12), np.uint32(13), np.uint32(14)
J_STORED = np.uint32(15)
J_RISE = np.uint32(16)  # grading over half the potential: how the capacitance rises beyond it
JUNCTION_WIDTH = 17

# A transistor's parameters: its own, then the emitter and the collector junction laid out as above.
T_GAIN_FORWARD, T_GAIN_REVERSE = np.uint32(0), np.uint32(1)
T_EARLY, T_COLLECTOR = np.uint32(2), np.uint32(3)
T_PER_KNEE = np.uint32(4)  # 1/A, 0 = no fall-off at high currents
T_EMITTER_JUNCTION = np.uint32(5)
T_COLLECTOR_JUNCTION = np.uint32(5 + JUNCTION_WIDTH)
TRANSPORT_WIDTH = 5 + 2 * JUNCTION_WIDTH

# What is kept of a transistor's slopes at an iterate; of a junction its conductance and its capacitance.
SLOPES = np.uint32(7)  # of the current from collector to emitter by v_BE and v_BC first
S_BASE_EMITTER, S_BASE_COLLECTOR = np.uint32(2), np.uint32(3)  # conductances
S_EMITTER_CHARGE, S_COLLECTOR_CHARGE = np.uint32(4), np.uint32(5)  # capacitances
S_FORWARD = np.uint32(6)  # of the forward current, which is stored

# A channel's parameters; it keeps its conductances by v_GS and by v_GD.
C_THRESHOLD, C_TRANSCONDUCTANCE = np.uint32(0), np.uint32(1)  # V, A/V2
C_MODULATION = np.uint32(2)  # 1/V
CHANNEL_WIDTH = 3
CHANNEL_SLOPES = np.uint32(2)

# A warm conductance's parameters: ln g = W_LEVEL + W_POWER ln(T - W_OFFSET) + W_BETA / T, T = W_AMBIENT + rise; it
# keeps its conductance, how the current rises with temperature, and how the radiated heat does.
W_LEVEL, W_POWER, W_BETA = np.uint32(0), np.uint32(1), np.uint32(2)  # g in S, T in K
W_OFFSET, W_AMBIENT = np.uint32(3), np.uint32(4)  # K
W_RADIATION = np.uint32(5)  # W/K4
WARM_WIDTH = 6
WARM_SLOPES = np.uint32(3)

G_ON, G_OFF, G_ON_DELAY, G_OFF_DELAY = np.uint32(0), np.uint32(1), np.uint32(2), np.uint32(3)
CT_CLOSED, CT_OPEN, CT_DELAY = np.uint32(0), np.uint32(1), np.uint32(2)  # S, S, s behind the armature
CT_BOUNCE, CT_TIMES = np.uint32(3), np.uint32(4)  # s, how often it opens again

PARAMETERS = (1, 1, 2, JUNCTION_WIDTH, TRANSPORT_WIDTH, CHANNEL_WIDTH, WARM_WIDTH, 4, 5)
"""How many parameters a primitive of each family has; a branch has henry and ohm."""

# Kinds of signal terms; the index is that of a net, or of a primitive in its family.
S_UNKNOWN, S_CONDUCTANCE_CURRENT, S_CONDUCTANCE_POWER = 0, 1, 2
S_COLLECTOR_CURRENT, S_BASE_CURRENT, S_TRANSPORT_POWER = 3, 4, 5
S_JUNCTION_CURRENT, S_JUNCTION_POWER = 6, 7
S_DRAIN_CURRENT, S_CHANNEL_POWER = 8, 9
S_WARM_CURRENT, S_WARM_POWER = 10, 11

# How the kernel reads a term (kind, a, b, place): x[a]; flow[place], and times x[a] - x[b]; p[place] (x[a] - x[b]), and
# times x[a] - x[b] again.
READ_LEVEL, READ_FLOW, READ_FLOW_POWER, READ_CONDUCTANCE, READ_CONDUCTANCE_POWER = 0, 1, 2, 3, 4

# Kinds of observation rows.
R_CROSSING, R_LEVEL, R_MAXIMUM, R_MINIMUM, R_INTEGRAL, R_SLEW, R_LAGGED = 0, 1, 2, 3, 4, 5, 6

# Columns of ``Rows.row``.
ROW_KIND, ROW_SIGNAL, ROW_DIRECTION, ROW_NTH, ROW_FROM, ROW_TO, ROW_LASTING = 0, 1, 2, 3, 4, 5, 6

# Status of an observation row.
NOT_YET, SEEN, OPEN = 0, 1, 2

# How a lane ended.
DONE, UNSOLVED, OVERWORKED, TRACE_FULL, STOPPED = 0, 1, 2, 3, 4


class Topology(NamedTuple):
    """What is connected to what; the same for every lane."""

    size: Ints  # n_nets, n_free, n_all, stored matrix entries, states of guards among n_all
    element: Places  # (elements, ELEMENT_WIDTH), family after family
    group: Places  # (FAMILIES + 1,) where each family begins
    pivot: Places  # (n_free + 1, 4) unknown, slot of its diagonal, first of its entries, first of its lefts
    entry: Places  # (entries + 1, 4) later unknown, slot below the diagonal, slot right of it, first of its updates
    update: Places  # (updates, 2) slot to change, slot right of the pivot
    left: Places  # (lefts, 2) earlier unknown, slot left of the diagonal


class Program(NamedTuple):
    """The sequence as segments between events. Within a segment every source is linear (plus its sine)."""

    length: Floats  # (lanes, segments) s
    restart: Ints  # (segments,) 1 where a segment begins with a jump
    source: Floats  # (lanes, segments, sources, 2) value at the start, slope per second
    sine: Floats  # (lanes, sources, 3) amplitude, frequency, phase
    switched: Ints  # (n,) parameters (of conductances) that events set
    switch: Floats  # (lanes, segments, n, 2) siemens at the start, slope per second


class Rows(NamedTuple):
    """Signals and the observation rows made of them."""

    term: Places  # (terms, 4) how it is read, two unknowns, a place
    factor: Floats  # (terms,)
    signal: Places  # (signals + 1,) range of terms
    row: Ints  # (rows, 7) kind, signal, direction, n-th, from-row (-1 = start), to-row (-1 = end), place in lasting
    lasting: Ints  # (n,) rows that are extremes or integrals, or lag: these twice
    level: Floats  # (rows,) of a crossing; time constant in s of what lags
    offset: Floats  # (rows, 2) s added to from, to
    stop_row: Ints  # (1,) end the lane once this row is seen, -1 = never
    keep_row: Ints  # (kept,) keep the state once such a row is seen


class Control(NamedTuple):
    """Tolerances and bounds."""

    relative: Floats  # (n_free,)
    absolute: Floats  # (n_free,)
    bounds: Ints  # most steps of a lane, Newton iterations of a stage, of a jump, of the lane in all; steps since an
    #               event after which a lane is paused


class Results(NamedTuple):
    """What a run fills in."""

    value: Floats  # (lanes, rows)
    time: Floats  # (lanes, rows)
    status: Ints  # (lanes, rows)
    ended: Ints  # (lanes, 2) how, unknown with the largest residual
    ended_at: Floats  # (lanes,) s
    work: Ints  # (lanes, 4) steps, rejected steps, Newton iterations, Newton failures
    final: Floats  # (lanes, n_all)
    kept: Floats  # (lanes, kept, n_all) states that were asked for
    kept_at: Floats  # (lanes, kept) s, -1 where the state never came
    trace_time: Floats  # (columns, points) one column for a lane alone, or as many as a row has lanes
    trace_value: Floats  # (columns, points, n_all), and behind them signals, extremes and integrals so far and when
    trace_used: Ints  # (columns,)


def zeros(*shape: int) -> Floats:
    """A C-contiguous float64 array of zeros."""
    return np.zeros(shape, dtype=np.float64)


def ints(values: Any, *shape: int) -> Ints:
    """A C-contiguous int64 array, reshaped when a shape is given (also for empty lists)."""
    array = np.ascontiguousarray(np.asarray(values, dtype=np.int64))
    return np.ascontiguousarray(array.reshape(shape)) if shape else array


def places(values: Any, *shape: int) -> Places:
    """As :func:`ints`, for what is used as an index."""
    return ints(values, *shape).astype(np.uint32)
