"""Programs and starting voltages of the sequences that a document names."""

from __future__ import annotations

import numpy as np

from ..circuit.circuit import Circuit
from ..circuit.timeline import Timeline, timeline
from ..kernel.layout import Floats, Program
from ..primitives.columns import Lanes
from ..quantity import read


def program_of(circuit: Circuit, lanes: Lanes, sequence: str, stops: Floats | None = None) -> tuple[Timeline, Program]:
    """The timeline of a sequence and its segments; ``stops`` are times that a step must hit."""
    document = circuit.design.sequences[sequence]
    line = timeline(circuit, lanes, document, starts=circuit.design.starts_of(sequence) is not None)
    return line, line.program(read(document.ends, "s"), stops)


def starts_of(circuit: Circuit, sequence: str, program: Program) -> Floats | None:
    """Voltages before t = 0, (lanes, n_all); None where the document gives none and all is at 0 V.

    Known nets stand at their value from the start, so that no capacitor to them sees a jump.
    """
    texts = circuit.design.starts_of(sequence)
    if texts is None:
        return None
    free, n_all = int(circuit.topology.size[1]), int(circuit.topology.size[2])
    start = np.zeros((program.length.shape[0], n_all))
    known = n_all - free - int(circuit.topology.size[4])
    sine = program.sine[:, :known]
    start[:, free : free + known] = program.source[:, 0, :known, 0] + sine[:, :, 0] * np.sin(sine[:, :, 2])
    for net, text in texts.items():
        if circuit.index(net) < free:
            start[:, circuit.index(net)] = read(text, "V")
    return start
