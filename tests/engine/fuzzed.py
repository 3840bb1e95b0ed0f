"""Hostile design documents for hypothesis: good documents with anything anywhere, and broken JSON texts."""

from __future__ import annotations

import copy
import json
import re
from pathlib import Path
from typing import Any

from hypothesis import strategies as st

_TESTS = Path(__file__).parents[1]
GOOD: tuple[dict[str, Any], ...] = tuple(
    json.loads(file.read_text("utf-8"))
    for file in (
        _TESTS / "engine" / "example.json",
        _TESTS / "tui" / "commands" / "bell.json",
        _TESTS.parent / "tui" / "demo" / "flood.json",
    )
)
"""Documents that can be computed, from which the hostile ones are made."""

STEERING = (
    "\x1b[2J",
    "\x1b]0;owned\x07",
    "\x9b31m",
    "\x07",
    "\x00",
    "\r",
    "\n",
    "\u202e",
    "\u2028",
    "\ufeff",
    "\ud800",
)
"""What would steer a terminal, break a line, turn text round, or is no character at all."""

FORMULAS = ("=1+1", "+9V", "-x", "@sum", '=cmd|" /c calc"!A0', "\t=1")
"""What a spreadsheet would run."""

texts = st.one_of(
    st.sampled_from(STEERING + FORMULAS + ("", " ", "0V", "supply", "[b]x[/b]", "../../x", "x" * 5000, "%s%n", "{0}")),
    st.text(max_size=12),
    st.builds("{}{}{}".format, st.text(max_size=4), st.sampled_from(STEERING), st.text(max_size=4)),
)
quantities = st.one_of(
    st.builds(
        "{}{} {}".format,
        st.sampled_from(["0", "-1", "1", "1e-40", "1e20", "9e19", "1e999", "-273", ".5", "1e-12", "33", "0.1"]),
        st.sampled_from(["", "", "k", "M", "u", "n", "p"]),
        st.sampled_from(["", "V", "A", "s", "ohm", "F", "H", "Hz", "%", "C", "K", "W", "ppm/K", "V/us", "A2s", "year"]),
    ),
    st.sampled_from(
        ["4k7", "0R", "1M0", "R001", "100k", "10u", "1e20 s", "1 year", "1 fs", "\u0663 V", "1\u00b5", "1,5 V"]
    ),
)
numbers = st.one_of(
    st.sampled_from([0, -1, 1, 2**31, 2**63, 10**30, 10**39, -(10**31), 1e-300, 1e30, 1e308, -0.0, 5e-324]),
    st.integers(-(10**6), 10**6),
    st.floats(allow_nan=False, allow_infinity=False),
)
atoms = st.none() | st.booleans() | numbers | texts | quantities
keys = st.one_of(
    texts,
    st.sampled_from(
        ["min", "typical", "max", "nominal", "source", "a", "b", "value", "at", "event", "ref", "data", "for"]
    ),
)
values = st.recursive(
    atoms, lambda inner: st.lists(inner, max_size=4) | st.dictionaries(keys, inner, max_size=4), max_leaves=8
)


@st.composite
def documents(draw: st.DrawFn) -> dict[str, Any]:
    """A good document with one to six changes: anything anywhere, or only what may stand there."""
    document = copy.deepcopy(draw(st.sampled_from(GOOD)))
    change = draw(st.sampled_from([_change, _gentle, _gentle, _gentle]))
    for _ in range(draw(st.integers(1, 6))):
        change(draw, document)
    return document


_SIZES = ("0", "-1", "1e-40", "1e-15", "1e-9", "1e-3", "0.5", "1", "3", "47", "1000", "1e9", "1e20", "-273.15")
_QUANTITY = re.compile(r"[+-]?[\d.]+(?:[RkMunp]\d*)?( ?[A-Za-z%][A-Za-z%/0-9]*)?")
_KINDS = (
    "resistor",
    "capacitor",
    "inductor",
    "diode",
    "zener",
    "led",
    "contact",
    "lamp",
    "fuse",
    "probe",
    "npn",
    "pnp",
)
_EVENTS: tuple[dict[str, Any], ...] = (
    {"event": "disconnect supply"},
    {"event": "connect supply", "rise": "1 ms"},
    {"event": "reverse supply"},
    {"event": "dip", "to": "0 V", "for": "10 ms"},
    {"event": "surge", "to": "1000 V", "for": "1 us", "edge": "1 us", "impedance": "0R5"},
    {"event": "inject", "net": "0V", "charge": "1 C", "width": "1 fs"},
    {"event": "inject", "net": "supply", "charge": "-1 uC", "width": "1 us"},
)


def _gentle(draw: st.DrawFn, document: dict[str, Any]) -> None:
    """A change that leaves every text of a kind that may stand there: it reaches the circuit, and often its run."""
    parts = [(stage["parts"], n) for stage in document["stages"] for n in range(len(stage["parts"]))]
    what = draw(st.sampled_from(["size", "size", "size", "net", "kind", "out", "copy", "event", "order"]))
    if what == "size" or not parts:
        sized = [(h, k) for h, k in _places(document) if isinstance(h[k], str) and _QUANTITY.fullmatch(h[k])]
        holder, step = sized[draw(st.integers(0, len(sized) - 1))]
        found = _QUANTITY.fullmatch(holder[step])
        holder[step] = draw(st.sampled_from(_SIZES)) + ((found and found[1]) or "")
        return
    of, n = parts[draw(st.integers(0, len(parts) - 1))]
    nets = sorted({net for many, k in parts for net in many[k]["pins"].values()} | {"supply", "0V"})
    events = document["sequences"]["alarm"]["events"]
    match what:
        case "net":
            of[n]["pins"][draw(st.sampled_from(sorted(of[n]["pins"])))] = draw(st.sampled_from(nets))
        case "kind":
            of[n]["kind"] = draw(st.sampled_from(_KINDS))
        case "out":
            del of[n]
        case "copy":
            twin = copy.deepcopy(of[n])
            twin["ref"] = f"X{draw(st.integers(1, 10**6))}"
            twin["pins"] = {pin: draw(st.sampled_from(nets)) for pin in twin["pins"]}
            of.append(twin)
        case "event":
            at = f"{draw(st.integers(0, 4000))} ms"
            events.append({"at": at, **copy.deepcopy(draw(st.sampled_from(_EVENTS)))})
        case _:
            events.reverse()


def _change(draw: st.DrawFn, document: dict[str, Any]) -> None:
    places = list(_places(document))
    holder, step = places[draw(st.integers(0, len(places) - 1))]
    match draw(st.sampled_from(["value", "alike", "alike", "alike", "out", "key", "double", "exchange", "deep"])):
        case "value":
            holder[step] = draw(values)
        case "alike":  # what reaches furthest: another text or number in the place of a text or number
            old = holder[step]
            holder[step] = draw(
                quantities if isinstance(old, str) else numbers if isinstance(old, int | float) else atoms
            )
        case "out":
            del holder[step]
        case "key" if isinstance(holder, dict):
            holder[draw(keys)] = copy.deepcopy(holder[step])
        case "double" if isinstance(holder, list):
            holder.extend(copy.deepcopy(holder[step]) for _ in range(draw(st.sampled_from([1, 3, 70, 450]))))
        case "exchange":
            other, there = places[draw(st.integers(0, len(places) - 1))]
            holder[step] = copy.deepcopy(other[there])
        case _:
            for _ in range(draw(st.sampled_from([1, 4, 30]))):
                holder[step] = {"x": holder[step]} if draw(st.booleans()) else [holder[step]]


def _places(value: Any) -> list[tuple[Any, Any]]:
    """Every place of a document that can be changed: what holds it, and the key or number in it."""
    found: list[tuple[Any, Any]] = []
    level = [value]
    while level:
        holder = level.pop()
        steps = list(holder) if isinstance(holder, dict) else list(range(len(holder)))
        for step in steps:
            found.append((holder, step))
            if isinstance(holder[step], dict | list):
                level.append(holder[step])
    return found[:20_000]


@st.composite
def sources(draw: st.DrawFn) -> bytes:
    """A document as bytes; one in four has a few of its bytes changed, cut or put in."""
    data = json.dumps(draw(documents()), ensure_ascii=draw(st.booleans())).encode("utf-8", "surrogatepass")
    if draw(st.integers(0, 3)):
        return data
    broken = bytearray(data)
    for _ in range(draw(st.integers(1, 4))):
        at = draw(st.integers(0, max(0, len(broken) - 1)))
        match draw(st.sampled_from(["byte", "cut", "in", "number"])):
            case "byte":
                broken[at : at + 1] = draw(st.binary(min_size=1, max_size=2))
            case "cut":
                del broken[at : at + draw(st.sampled_from([1, 10, 10_000]))]
            case "in":
                broken[at:at] = draw(
                    st.sampled_from([b"[" * 5000, b'{"a":' * 5000, b"\xff", b"\x00", b" " * 1_000_001])
                )
            case _:
                broken[at:at] = draw(
                    st.sampled_from([b"1e999", b"NaN", b"-Infinity", b"9" * 5000, b"\\ud800", b"\\u0000"])
                )
    return bytes(broken)
