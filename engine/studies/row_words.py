"""What an observation row looks at, in words: the signal, what of it is taken, and in which window."""

from __future__ import annotations

from ..circuit.circuit import Circuit
from ..kernel import layout
from ..primitives.signals import START, TEMPERATURE, Anchor, Row, Signal, voltage
from ..quantity import write_plain

_POWERS = (
    layout.S_CONDUCTANCE_POWER,
    layout.S_JUNCTION_POWER,
    layout.S_TRANSPORT_POWER,
    layout.S_CHANNEL_POWER,
    layout.S_WARM_POWER,
)
_TAKEN = {
    layout.R_MAXIMUM: "largest",
    layout.R_MINIMUM: "smallest",
    layout.R_INTEGRAL: "integral of the",
    layout.R_SLEW: "steepest slope of the",
    layout.R_LAGGED: "largest lagging",
}


def row_unit(row: Row) -> str:
    """The unit of what a row finds."""
    unit = signal_unit(row.signal)
    if row.kind == layout.R_CROSSING:
        return "s"
    if row.kind == layout.R_INTEGRAL:
        return {"A": "C", "W": "J"}.get(unit, f"{unit} s")
    return f"{unit}/s" if row.kind == layout.R_SLEW else unit


def signal_unit(signal: Signal) -> str:
    """Volts, amperes, watts, or kelvin."""
    kinds = {kind for kind, *_ in signal.terms}
    if kinds & set(_POWERS):
        return "W"
    if any(str(name).endswith(TEMPERATURE) for _, name, _ in signal.terms):
        return "K"
    return "V" if kinds <= {layout.S_UNKNOWN} else "A"


def row_words(circuit: Circuit, row: Row) -> str:
    """A row in words: ``largest voltage of base against 0V, from LS1 on to LS1 off``."""
    what = signal_words(circuit, row.signal)
    if row.kind == layout.R_CROSSING:
        return f"time of {event_words(circuit, row)}" + (f", {_window(circuit, row)}" if row.start != START else "")
    if row.kind == layout.R_LEVEL:
        return f"{what} {anchor_words(circuit, row.start)}"
    window = _window(circuit, row)
    return f"{_TAKEN[row.kind]} {what}" + (f", {window}" if window else "")


def signal_words(circuit: Circuit, signal: Signal) -> str:
    """A signal in words, by the pins of the parts where it is theirs."""
    if signal_unit(signal) == "V":
        plus = [str(net) for _, net, factor in signal.terms if factor > 0]
        minus = [str(net) for _, net, factor in signal.terms if factor < 0]
        return f"voltage of {' + '.join(plus) or '0V'}" + (f" against {' + '.join(minus)}" if minus else "")
    if signal_unit(signal) == "K":
        return " + ".join(f"{name} above the ambient" for _, name, _ in signal.terms)
    left, found = set(signal.terms), []
    for words, known in _known(circuit):
        for sign, turned in (("", known), ("reversed ", known.scaled(-1.0))):
            if turned.terms and left.issuperset(turned.terms):
                left -= set(turned.terms)
                found.append(sign + words)
    if left or not found:
        return "sum of currents" if signal_unit(signal) == "A" else "sum of powers"
    return " + ".join(found)


def _known(circuit: Circuit) -> list[tuple[str, Signal]]:
    """Currents and powers that parts have, those of the most terms first."""
    found = []
    for ref, bench in circuit.benches.items():
        if bench.power is not None:
            found.append((f"power of {ref}", bench.power))
        found += [(f"current into {ref} {pin}", current) for pin, current in bench.currents.items()]
    return sorted(found, key=lambda pair: -len(pair[1].terms))


def event_words(circuit: Circuit, row: Row) -> str:
    """What a crossing finds: ``LS1 on`` or ``voltage of tc above 2 V``."""
    for ref, bench in circuit.benches.items():
        if bench.on is not None and row.signal == voltage(*bench.on[:2]) and row.level == bench.on[2]:
            return f"{ref} {'on' if row.rising else 'off'}"
    side = "above" if row.rising else "below"
    return f"{signal_words(circuit, row.signal)} {side} {write_plain(row.level, signal_unit(row.signal))}"


def anchor_words(circuit: Circuit, anchor: Anchor) -> str:
    """An instant: ``at 9 s`` or ``0.5 s after LS1 on``."""
    by = write_plain(abs(anchor.by), "s")
    if anchor.row is None:
        return f"at {by}"
    event = event_words(circuit, anchor.row)
    if anchor.by == 0.0:
        return f"at {event}"
    return f"{by} {'after' if anchor.by > 0 else 'before'} {event}"


def _window(circuit: Circuit, row: Row) -> str:
    words = []
    if row.start != START:
        words.append("from " + anchor_words(circuit, row.start).removeprefix("at "))
    if row.end is not None:
        words.append("to " + anchor_words(circuit, row.end).removeprefix("at "))
    return " ".join(words)
