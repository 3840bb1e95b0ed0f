"""Runs design documents and tells every number of the results as hexadecimal text; also a script: JSON in, JSON out.

As a script it is the other half of the test that the kernel gives the same compiled and uncompiled.
"""

from __future__ import annotations

import json
import sys
from typing import Any

import numpy as np

from stagebook.engine.circuit.circuit import build
from stagebook.engine.circuit.timeline import timeline
from stagebook.engine.design.document import Design
from stagebook.engine.kernel.compiled import COMPILED
from stagebook.engine.primitives.signals import (
    Anchor,
    crossing,
    integral,
    lagged,
    level,
    maximum,
    minimum,
    slew,
    voltage,
)
from stagebook.engine.quantity import read
from stagebook.engine.run import run


def results(document: dict[str, Any]) -> dict[str, Any]:
    """Final voltages, observations of every kind on every net, and the work, of the nominal lane."""
    design = Design.load(document)
    circuit = build(design)
    sequence = design.sequences["alarm"]
    ends = read(sequence.ends, "s")
    lanes = circuit.nominal()
    rows = []
    for net in design.nets:
        signal = voltage(net)
        rows += [level(signal, Anchor(0.5 * ends)), crossing(signal, 1.0, True), crossing(signal, 1.0, False)]
        rows += [maximum(signal), minimum(signal), integral(signal), slew(signal), lagged(signal, 0.1 * ends)]
    for bench in circuit.benches.values():
        rows += [maximum(current) for current in bench.currents.values()]
        rows += [] if bench.power is None else [integral(bench.power)]
    seen = run(circuit, lanes, timeline(circuit, lanes, sequence).program(ends), rows)
    numbers = np.concatenate([seen.final[0], seen.results.value[0], seen.results.time[0]])
    return {
        "failure": seen.failure(0),
        "work": seen.results.work[0].tolist(),
        "status": seen.results.status[0].tolist(),
        "numbers": [float(v).hex() for v in numbers],
    }


if __name__ == "__main__":
    answers = [results(document) for document in json.load(sys.stdin)]
    json.dump({"compiled": COMPILED, "results": answers}, sys.stdout)
