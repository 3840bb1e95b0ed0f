"""The single-fault study: what does a unit do in which one part has failed? One lane for each fault.

Every sequence of the document is run at nominal values with one fault at a time, present from the beginning, and
compared with the unit without a fault. An alarm is on time when it comes after the event that causes it in the sound
unit; before that event, or in a sequence without an alarm, it is a false one.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from itertools import groupby

from ..checks.view import View
from ..circuit.circuit import build
from ..design.document import Design
from ..errors import CircuitError
from ..results import ENGINE
from ..run import never, silent
from .effort import faults_beyond
from .evaluate import Progress, observe
from .fault_lanes import FaultLanes
from .fault_list import faults_of
from .fault_outcomes import FaultResult, FaultSheet
from .faulted import faulted
from .healthy import CLICK, Behaviour, alarm_loads, behaviours


def study(
    design: Design,
    *,
    report: Callable[[FaultSheet], None] | None = None,
    progress: Progress = silent,
    cancelled: Callable[[], bool] = never,
) -> FaultSheet:
    """All single faults of a design; ``report`` gets the sheet so far after each stage, ``progress`` counts faults.

    Raises CircuitError where the design cannot be computed, no load tells of an alarm or there is too much to compute,
    and Cancelled.
    """
    began = time.perf_counter()
    circuit = build(design)
    view = View(design, circuit)
    loads = len(alarm_loads(view))
    faults = faults_of(design)
    # One circuit a stage: gaps in all parts at once would make each lane several times as slow.
    made = [faulted(design, tuple(group)) for _, group in groupby(faults, key=lambda fault: fault.stage)]
    nominal = {name: observe(circuit, circuit.nominal(), name, (), cancelled=cancelled) for name in design.sequences}
    too_large = faults_beyond(circuit, nominal, loads, [(each.circuit, each.lanes.count) for each in made])
    if too_large is not None:
        raise CircuitError(too_large)
    healthy = behaviours(view, cancelled)
    found: list[FaultResult] = []
    standby: float | None = None

    def sheet() -> FaultSheet:
        ranked = tuple(sorted(found, key=lambda result: result.rank))
        taken = time.perf_counter() - began
        return FaultSheet(design.name, design.content, ENGINE, taken, healthy, standby, ranked, _notes(healthy))

    def portion(done: int) -> None:
        progress(len(found) + done, len(faults))

    for each in made:
        lanes = FaultLanes(each, healthy, portion, cancelled)
        standby = lanes.standby()
        found += lanes.results()
        if report is not None:
            report(sheet())
    return sheet()


def _notes(healthy: Sequence[Behaviour]) -> tuple[str, ...]:
    """What the study cannot tell of this design."""
    notes = []
    for load in dict.fromkeys(each.load for each in healthy):
        own = [each for each in healthy if each.load == load]
        alarms = [each for each in own if each.alarms]
        notes += [
            f"the sound unit itself gives an alarm in {each.sequence}: {load} comes on with the supply"
            for each in own
            if each.lasts > CLICK and not each.alarms
        ]
        if not alarms:
            notes.append(f"{load} is not called for in any sequence: whether a fault silences it cannot be told")
        elif all(each.over is None for each in alarms):
            notes.append(f"{load} is still on where its sequences end: whether it runs on for ever cannot be told")
    return tuple(notes)
