"""A circuit linearised at a state, as dense matrices, and its natural modes.

For small deviations v from a state, C dv/dt + G v = 0 (charge form: Ho, Ruehli, Brennan, IEEE Trans. Circuits Syst. 22
(1975) 504). A mode v exp(s t) solves (s C + G) v = 0; it grows where the real part of s is above zero.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..kernel import layout
from ..kernel.layout import Floats, Program
from ..kernel.linearised import linearised
from .circuit import Circuit

Complexes = NDArray[np.complex128]

SHIFT = 1.0  # 1/s: modes are found through (G + SHIFT C)^-1 C, which nets without capacitance do not spoil
FASTEST = 1e9  # 1/s: a quicker mode is one of round-off, in nets that have no capacitance
ITERATIONS, EXACT = 6, 1e-4  # of inverse iteration, and the share by which the last one may still move a mode


def matrices(circuit: Circuit, parameters: Floats, states: Floats) -> tuple[Floats, Floats]:
    """G in siemens and C in farad (rows of branches: volts), both (states, n_free, n_free).

    ``parameters`` (states, parameters) are rows of the lane table with the switches where they stand, ``states``
    (states, n_all); contacts stand where the states of their guards say.
    """
    moved = _as_guards_say(circuit, parameters, states)
    made = linearised(circuit.topology, moved, len(circuit.source_names), states)
    return made.conductance, made.capacitance


def _as_guards_say(circuit: Circuit, parameters: Floats, states: Floats) -> Floats:
    """The parameters with all contacts where the guards in the states have them."""
    topology = circuit.topology
    contacts = topology.element[topology.group[layout.CONTACT] : topology.group[layout.FAMILIES]].astype(np.int64)
    if not len(contacts):
        return parameters
    found = parameters.copy()
    guards = topology.element[topology.group[layout.GUARD] : topology.group[layout.CONTACT]].astype(np.int64)
    for contact in contacts:
        pulled = states[:, guards[contact[layout.E_A], layout.E_C]] > 0.5
        own = contact[layout.E_PARAMETER]
        closed, opened = (parameters[:, own + int(end)] for end in (layout.CT_CLOSED, layout.CT_OPEN))
        found[:, contact[layout.E_SLOT]] = np.where(pulled == bool(contact[layout.E_B]), closed, opened)
    return found


def parameters_at(circuit: Circuit, table: Floats, program: Program, lane: int, times: Floats) -> Floats:
    """Rows of the lane table of one lane, (times, parameters), with all switches where they stand at these instants.

    An instant at which an event happens is still before it.
    """
    ends = np.cumsum(program.length[lane])
    segment = np.minimum(np.searchsorted(ends * (1.0 + 1e-12), times), ends.size - 1)
    since = times - (ends - program.length[lane])[segment]
    rows = np.repeat(table[lane][None, :], len(times), axis=0)
    moved = program.switch[lane, segment]
    rows[:, program.switched] = moved[:, :, 0] + moved[:, :, 1] * since[:, None]
    return np.ascontiguousarray(rows)


@dataclass(frozen=True)
class Mode:
    """One growing mode: s in 1/s (imaginary part >= 0) and its shape over the free unknowns, largest 1."""

    s: complex
    shape: Complexes


def growing(conductance: Floats, capacitance: Floats) -> list[list[Mode]]:
    """The growing modes at every state, one of each conjugate pair, each confirmed by inverse iteration."""
    shifted = conductance + SHIFT * capacitance
    scale = 1.0 / np.sqrt(np.maximum(np.abs(shifted.diagonal(axis1=1, axis2=2)), 1e-15))
    both = scale[:, :, None] * scale[:, None, :]
    try:
        values = np.linalg.eigvals(np.linalg.solve(shifted * both, capacitance * both))
    except np.linalg.LinAlgError:
        # One of them is singular, or its iteration did not end: it is left out, the others are not.
        if len(shifted) == 1:
            return [[]]
        middle = len(shifted) // 2
        return [
            *growing(conductance[:middle], capacitance[:middle]),
            *growing(conductance[middle:], capacitance[middle:]),
        ]
    values = np.where(np.abs(values) * FASTEST < 1.0, np.inf, values)
    found: list[list[Mode]] = []
    for n, s in enumerate(SHIFT - 1.0 / values.astype(np.complex128)):
        slow = np.isfinite(values[n]) & (s.real > 0.0) & (s.imag >= 0.0)
        modes = [_confirmed(conductance[n], capacitance[n], complex(each)) for each in s[slow]]
        found.append([mode for mode in modes if mode is not None])
    return found


def _confirmed(conductance: Floats, capacitance: Floats, s: complex) -> Mode | None:
    """A mode after inverse iteration on (s C + G) v = 0; None where it leads elsewhere."""
    s *= 1.0 + 1e-9  # not at the mode to the last digit, where the matrix cannot be solved
    v = np.cos(np.arange(1.0, len(conductance) + 1.0)).astype(np.complex128)  # none of its entries is zero
    moved = math.inf
    for _ in range(ITERATIONS):
        matrix = conductance + s * capacitance
        size = 1.0 / np.maximum(np.abs(matrix).max(axis=1), 1e-300)
        try:
            w = np.linalg.solve(matrix * size[:, None], (capacitance @ v) * size)
        except np.linalg.LinAlgError:
            return None
        k = int(np.argmax(np.abs(w)))
        if not np.isfinite(w[k]) or w[k] == 0.0:
            return None
        step = v[k] / w[k]
        s, v, moved = s - step, w / w[k], abs(step) / abs(s)
        if moved < EXACT:
            break
    if moved > EXACT or s.real <= 0.0:
        return None
    if abs(s.imag) < 1e-6 * abs(s):
        s = complex(s.real)
    return Mode(s, v)
