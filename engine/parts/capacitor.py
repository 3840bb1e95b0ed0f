"""Capacitor with leakage and series resistance.

Leakage is a conductance, I = I_spec V/V_R at the rated voltage, twice as large at 50 C as at 20 C; ``conditioned`` is a
twentieth of ``specified`` unless given (common practice, from memory). The default limit of a polarised capacitor is
that of aluminium electrolytics, max(0.01 C V, 3 uA) in the manner of IEC 60384-4.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from .figures import class_figures, figure, typical, valued
from .kind import TEXT, Entry, Kind

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder, Law
    from ..primitives.columns import Lanes

TOLERANCE = 0.20  # customary where none is written, from memory
CONDITIONED = 1.0 / 20.0
LEAKAGE_DOUBLING = 30.0  # K, twice from 20 C to 50 C
LEAKAGE_REFERENCE = 20.0  # deg C
ELECTROLYTIC_PER_CV, ELECTROLYTIC_LEAST = 0.01, 3e-6


def leakage_currents(part: Part, farads: float) -> tuple[float, float, float] | None:
    """(specified, conditioned, rated voltage) in ampere and volt at 20 C; None for a capacitor without leakage."""
    specified = part.limits("leakage", "A", "specified")
    voltage = figure(part, "voltage", "V")
    polarised = "plus" in part.pins
    named = class_figures(part)
    if specified is None and not polarised and "leakage_per_cv" not in named:
        return None
    if voltage is None:
        raise CircuitError(
            f'part {part.ref}, voltage: missing, its leakage depends on it; write it like "voltage": "16 V"'
        )
    rated = voltage.typical
    if rated <= 0.0:
        raise CircuitError(f"part {part.ref}, voltage: a rating of {rated:g} V cannot be; write it like '16 V'")
    if specified is not None:
        limit = specified.max if specified.max is not None else specified.typical
        assert limit is not None
    else:
        per_cv = typical(part, "leakage_per_cv", "", ELECTROLYTIC_PER_CV)
        limit = max(per_cv * farads * rated, typical(part, "leakage_least", "A", ELECTROLYTIC_LEAST))
    conditioned = part.limits("leakage", "A", "conditioned")
    low = limit * CONDITIONED
    if conditioned is not None:
        low = conditioned.max if conditioned.max is not None else conditioned.typical or low
    return limit, low, rated


def expand(part: Part, build: Builder) -> None:
    """Add capacitance, leakage and, when given, series resistance."""
    plus, minus = (part.pins[pin] for pin in (("plus", "minus") if "plus" in part.pins else ("a", "b")))
    value = valued(part, "F", TOLERANCE)
    key = build.column(part.ref, "value", *value.limits)
    farads: Law = lambda lanes: lanes[key]  # noqa: E731
    drift = figure(part, "drift", "%")
    if drift is not None and drift.low != drift.high:
        drift_key = build.column(part.ref, "drift", *drift.limits)
        farads = lambda lanes: lanes[key] * (1.0 + lanes[drift_key])  # noqa: E731
    inner = plus
    series = figure(part, "series_resistance", "ohm")
    if series is not None and series.typical > 0.0:
        inner = f"{part.ref}/plate"
        series_key = build.column(part.ref, "series_resistance", *series.limits)
        plate = build.conductance(plus, inner, lambda lanes: 1.0 / lanes[series_key])
        build.bench(part.ref).currents["plus" if "plus" in part.pins else "a"] = plate.current
        build.bench(part.ref).power = plate.power
    build.capacitance(inner, minus, farads)
    leakage = leakage_currents(part, value.typical)
    if leakage is not None:
        specified, conditioned, rated = leakage
        state = ("conditions", "leakage")
        # Always 1, but checks may set it to nothing to read what the capacitor would do without its leakage.
        share = build.column(part.ref, "leakage_share", 1.0)

        def leak(lanes: Lanes) -> Floats:
            current = conditioned * (specified / conditioned) ** lanes[state]
            warm = 2.0 ** ((lanes.ambient - LEAKAGE_REFERENCE) / LEAKAGE_DOUBLING)
            return np.asarray(lanes[share] * current / rated * warm)

        handle = build.conductance(inner, minus, leak)
        bench = build.bench(part.ref)
        bench.currents["leakage"] = handle.current
        bench.leak_conductance = leak


KIND = Kind(
    name="capacitor",
    letters=("C",),
    pins=(("a", "b"), ("plus", "minus")),
    paths=(),
    expand=expand,
    fields={
        "value": Entry("F", needed=True, about="capacitance"),
        "tolerance": Entry("%", about="largest deviation of the value; 20 % where none is written"),
        "voltage": Entry("V", about="rated voltage"),
        "leakage": Entry("A", about="current at rated voltage and 20 C: specified, conditioned"),
        "series_resistance": Entry("ohm", about="equivalent series resistance"),
        "ripple_rating": Entry("A", about="permitted ripple current"),
        "class": Entry(TEXT, about="generic class"),
    },
    data={
        "drift": Entry("%", about="change of the value over temperature"),
        "leakage_per_cv": Entry("", about="leakage limit per C V"),
        "leakage_least": Entry("A", about="least leakage limit"),
    },
)
