"""Where one margin comes from: formula with the values put in, what was observed and when, data with their sources.

The lane of its corner is computed once more, and everything that the check reads is noted.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import asdict, dataclass, replace
from math import floor
from typing import Any

import numpy as np

from ..checks import catalogue
from ..checks.check import Ask, Judged
from ..checks.ledger import Ledger, noted
from ..checks.view import View
from ..circuit.circuit import Circuit, build
from ..design.document import Design
from ..design.part import Part
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..parts import kinds
from ..parts.figures import class_figures, figure
from ..parts.kind import TEXT
from ..primitives.columns import CONDITIONS, Column, Lanes
from ..quantity import write_plain
from ..results import SAME_MARGIN, CheckResult
from ..run import never
from .evaluate import judge, look
from .lanes import Setting, lanes_of
from .row_words import row_unit, row_words

_LAW = {"gain": "forward_gain"}
"""Columns whose entry in a law has another name."""
_CONDITION_UNITS = {"supply": "V", "ambient": "degC", "source_resistance": "ohm", "leakage": ""}


@dataclass(frozen=True, slots=True)
class Observation:
    """Something read off the simulation: ``value`` in ``unit`` at ``at`` seconds of ``sequence``; None: never seen."""

    what: str
    value: float | None
    unit: str
    sequence: str
    at: float | None


@dataclass(frozen=True, slots=True)
class Used:
    """A number that was put in. ``low`` and ``high`` are its limits, None where it has none."""

    what: str
    value: float
    unit: str
    low: float | None
    high: float | None
    source: str


@dataclass(frozen=True, slots=True)
class Explanation:
    """A margin taken apart. ``put_in`` is the formula with its values, ``margin`` what it makes here and now;
    ``carried`` tells of oscillations that were not stepped all the way."""

    id: str
    formula: str
    put_in: str
    margin: float | None
    by_hand: str
    hand_source: str
    required: Used
    usual_worst: str
    observed: tuple[Observation, ...]
    used: tuple[Used, ...]
    carried: tuple[str, ...] = ()

    def as_json(self) -> dict[str, Any]:
        """Plain JSON values."""
        return asdict(self)


def explain(design: Design, result: CheckResult, *, cancelled: Callable[[], bool] = never) -> Explanation:
    """Where a margin of this design comes from, at the corner that ``result`` names.

    Raises CircuitError where the design does not ask for it, or Cancelled.
    """
    circuit = build(design)
    ledger = Ledger()
    ask = _asked(circuit, result.id, ledger)
    lanes = lanes_of(circuit.columns, [Setting.from_kept(result.setting)])
    if ask.missing is not None:
        return _explanation(circuit, ask, ledger, None, lanes, (), result)
    trials = None if ask.trial is None else {ask.trial.key: [0]}
    seen = look(circuit, (ask,), lanes, trials=trials, cancelled=cancelled)
    judged, _ = judge(ask, noted(seen, ledger))
    rows = ledger.rows or {(row, name): None for name in ask.sequences for row in ask.rows}
    observed = [
        Observation(
            row_words(circuit, row), *_both(seen.value(row, name), row_unit(row)), name, _one(seen.time(row, name))
        )
        for row, name in rows
    ]
    if ask.trial is not None:
        edge = seen.edges[ask.trial.key]
        what = f"trial {ask.trial.key}: knob at which it just held"
        observed.append(Observation(what, _one(edge.knob), ask.trial.unit, ask.trial.sequence, None))
        observed += [
            Observation(
                f"in the trial: {row_words(circuit, row)}", _one(value), row_unit(row), ask.trial.sequence, None
            )
            for row, value in edge.values.items()
        ]
    told = {name: seen.observed[name].carried_forward(0) for name in ask.sequences if name in seen.observed}
    carried = tuple(f"sequence {name}: {words}" for name, words in told.items() if words)
    return replace(_explanation(circuit, ask, ledger, judged, lanes, tuple(observed), result), carried=carried)


def _asked(circuit: Circuit, name: str, ledger: Ledger) -> Ask:
    slug = name.split(":")[0]
    check = catalogue().get(slug)
    if check is not None:
        for ask in check.asks(check, View(circuit.design, circuit, ledger)):
            if ask.id == name:
                return ask
            ledger.clear()
    raise CircuitError(f"the design has no margin {name}; write the id of one that it has")


def _explanation(
    circuit: Circuit,
    ask: Ask,
    ledger: Ledger,
    judged: Judged | None,
    lanes: Lanes,
    observed: tuple[Observation, ...],
    known: CheckResult,
) -> Explanation:
    check = ask.check
    unit = check.unit if ask.unit is None else ask.unit
    said = ledger.settings.pop("required", None)
    source = f"customary: {check.source}" if said is None or not said.source else said.source
    used = [Used(each.name, each.value, each.unit, None, None, each.source) for each in ledger.settings.values()]
    columns = {column.key: column for column in circuit.columns}
    for key in ledger.columns:
        used += _column(circuit, columns[key], float(lanes[key][0]))
    told = {each.what for each in used}
    for datum in ledger.data.values():
        part, found = circuit.design.part(datum.ref), datum.figure
        what = f"{datum.ref} {datum.key.replace('_', ' ')}"
        if what not in told:
            used.append(Used(what, found.typical, datum.unit, found.low, found.high, data_source(part, datum.key)))
    return Explanation(
        id=ask.id,
        formula=check.formula,
        put_in="" if judged is None else _put_in(judged, unit, known),
        margin=None if judged is None else _one(judged.margin),
        by_hand=check.by_hand,
        hand_source=check.hand_source,
        required=Used("required margin", ask.required, "%", None, None, source),
        usual_worst=check.worst,
        observed=observed,
        used=tuple(used),
    )


def _put_in(judged: Judged, unit: str, known: CheckResult) -> str:
    """The margin's own formula with numbers: those that are ``known`` of it where it is the same margin."""
    margin, words = _one(judged.margin), judged.outcome(0)
    same = margin is not None and known.margin is not None and abs(known.margin - margin) <= SAME_MARGIN
    margin = known.margin if same else margin
    result = "not known" if margin is None else _percent(margin)
    if words is not None:
        if margin is not None and abs(margin) == 1.0:
            return f"m = {result}, which stands for: {words}"
        result += f" ({words})"
    if judged.value is not None and judged.limits is not None:
        value = _one(judged.value)
        if value is None:
            return f"m = {result}"
        low, high, here = (write_plain(each, unit) for each in (*judged.limits, value))
        return f"m = min({high} - {here}, {here} - {low}) / (({high} - {low})/2) = {result}"
    demand, capability = (None if each is None else _one(each) for each in (judged.demand, judged.capability))
    if demand is None or capability is None:
        return f"m = {result}"
    if same and known.demand is not None and known.capability is not None:
        demand, capability = known.demand, known.capability
    there, can = write_plain(demand, unit), write_plain(capability, unit)
    if capability > 0.0 and margin is not None and abs(1.0 - demand / capability - margin) > 1e-6:
        return f"D = {there}, C = {can}, m = {result}"
    return f"m = 1 - D/C = 1 - {there} / {can} = {result}"


def _percent(margin: float) -> str:
    """In whole percent, rounded towards the worse as wherever a margin is shown."""
    return f"{floor(margin * 100.0 + 1e-9):+d} %"


def _column(circuit: Circuit, column: Column, value: float) -> Iterator[Used]:
    low, high = (column.low, column.high) if column.varies else (None, None)
    if column.ref == CONDITIONS:
        name = column.datum.replace("_", " ")
        yield Used(name, value, _CONDITION_UNITS.get(column.datum, ""), low, high, "conditions of the design")
        return
    part = circuit.design.part(column.ref.split("/")[0])
    if column.datum == "leakage_share":
        yield from _leakage(part)
    kind = kinds()[part.kind]
    entry = {**kind.data, **kind.fields, **kind.law}.get(column.datum)
    if entry is not None and entry.unit != TEXT:
        what = f"{column.ref} {column.datum.replace('_', ' ')}"
        yield Used(what, value, entry.unit, low, high, data_source(part, column.datum))


def _leakage(part: Part) -> Iterator[Used]:
    """The figures behind a capacitor's leakage: the currents that are given, or the rule of its class."""
    given = False
    for state in ("specified", "conditioned"):
        found = part.limits("leakage", "A", state)
        value = None if found is None else found.typical if found.max is None else found.max
        if value is not None:
            given = True
            datum = part.datum("leakage", state)
            said = (datum.source if datum is not None else None) or "the part's own figure, source not said"
            yield Used(f"{part.ref} leakage {state}, at rated voltage and 20 C", value, "A", None, None, said)
    rule = None if given else figure(part, "leakage_per_cv", "")
    if rule is not None:
        source = data_source(part, "leakage_per_cv")
        yield Used(f"{part.ref} leakage per C V", rule.typical, "", None, None, source)
    rated = figure(part, "voltage", "V")
    if rated is not None:
        yield Used(f"{part.ref} voltage", rated.typical, "V", None, None, data_source(part, "voltage"))


def data_source(part: Part, key: str) -> str:
    """Who says a datum of a part: its own figure with source and test condition, or its class."""
    datum = part.datum(key)
    if datum is None and (key in part.law or _LAW.get(key) in part.law):
        return "the law that the part gives"
    if datum is None:
        named = part.entry("class")
        if named is None:
            return "customary for the kind, from memory"
        given = class_figures(part).get(key)
        condition = f", {given.at}" if given is not None and given.at else ""
        return f"class {named}, from memory{condition}"
    if key == "value":
        return "the part's value" + (f", {part.tolerance}" if part.tolerance else ", customary tolerance")
    said = datum.source or "the part's own figure, source not said"
    return said if datum.condition is None else f"{said}, {datum.condition}"


def _both(values: Floats, unit: str) -> tuple[float | None, str]:
    return _one(values), unit


def _one(values: Floats) -> float | None:
    found = float(np.asarray(values).ravel()[0])
    return found if np.isfinite(found) else None
