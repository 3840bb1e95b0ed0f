"""A circuit that holds the faults of one stage: closed gaps before the pins, open bridges between the nets.

Gaps and bridges are resistors whose values are columns, so that every fault is a lane of one circuit and no law or
topology is special to it. Only the parts of one stage get them at a time: the others add no unknowns.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from ..circuit.circuit import Circuit, build
from ..design.document import Design
from ..primitives.columns import SOURCE_RESISTANCE, SUPPLY, Column, Lanes
from .fault_list import SUPPLY_PART, WEAK_AGE, WEAK_CHARGE, WEAK_RESISTANCE, WEAK_VOLTAGE, Fault

OPEN, CLOSED, SHORT = 1e12, 1e-3, 1e-2  # ohm


@dataclass(frozen=True)
class Faulted:
    """The circuit and its lanes: the first is the design without a fault, then one for each of ``faults``."""

    circuit: Circuit
    faults: tuple[Fault, ...]
    lanes: Lanes


def faulted(design: Design, faults: Sequence[Fault]) -> Faulted:
    """The design with a gap or bridge for each fault, and the lanes in which one after the other is there.

    Raises CircuitError where the design cannot be computed.
    """
    document = design.dump()
    parts = {part["ref"]: part for stage in document["stages"] for part in stage.get("parts", [])}
    gaps: dict[tuple[str, str], str] = {}
    bridges: dict[frozenset[str], str] = {}
    added: list[dict[str, Any]] = []
    names = _free_names(design)

    def add(a: str, b: str, ohms: float) -> str:
        name = next(names)
        added.append({"ref": name, "kind": "resistor", "pins": {"a": a, "b": b}, "value": f"{ohms:g} ohm"})
        return name

    for fault in faults:
        if fault.cut is not None and (fault.part, fault.cut) not in gaps:
            pins = parts[fault.part]["pins"]
            outside, inside = pins[fault.cut], f"{fault.part}#{fault.cut}"
            pins[fault.cut] = inside
            gaps[fault.part, fault.cut] = add(outside, inside, CLOSED)
        if fault.bridged is not None and frozenset(fault.bridged) not in bridges:
            bridges[frozenset(fault.bridged)] = add(*fault.bridged, OPEN)
    if added:
        document["stages"].append({"name": _free_stage(design), "parts": added})
    circuit = build(Design.load(document))
    lanes = circuit.nominal(len(faults) + 1)
    values = lanes.values.copy()
    for lane, fault in enumerate(faults, 1):
        if fault.cut is not None:
            values[lanes.place((gaps[fault.part, fault.cut], "value")), lane] = OPEN
        if fault.bridged is not None:
            values[lanes.place((bridges[frozenset(fault.bridged)], "value")), lane] = SHORT
        for key, value in _weak(fault, circuit.columns) if fault.weak else ():
            values[lanes.place(key), lane] = value
    return Faulted(circuit, tuple(faults), Lanes(circuit.columns, values))


def _weak(fault: Fault, columns: Iterable[Column]) -> Iterable[tuple[tuple[str, str], float]]:
    """The columns of cells that are run down, with their values."""
    for column in columns:
        if fault.part == SUPPLY_PART:
            if column.key == SUPPLY:
                yield column.key, WEAK_VOLTAGE * column.low
            elif column.key == SOURCE_RESISTANCE:
                yield column.key, WEAK_RESISTANCE * column.high
        elif column.key == (fault.part, "charge_state"):
            yield column.key, WEAK_CHARGE
        elif column.key == (fault.part, "age"):
            yield column.key, WEAK_AGE


def _free_names(design: Design) -> Iterator[str]:
    taken = {part.ref for part in design.parts}
    return (name for name in (f"R.fault{n}" for n in range(1, 100_000)) if name not in taken)


def _free_stage(design: Design) -> str:
    name = "faults"
    while any(stage.name == name for stage in design.stages):
        name += "."
    return name
