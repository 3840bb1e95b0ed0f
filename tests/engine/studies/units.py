"""Two small units that the studies are tried on: a timer with a driver, and a latch."""

from __future__ import annotations

from typing import Any

from stagebook.engine.design.document import Design

from ..checks.sheets import sounder
from ..circuits import Json, resistor, transistor, two

CONDITIONS: Json = {
    "supply": {"min": "4.5 V", "nominal": "6 V", "max": "6.4 V"},
    "ambient": {"min": "0 C", "nominal": "25 C", "max": "50 C"},
    "source_resistance": {"min": "0R1", "nominal": "0R5", "max": "2R"},
    "leakage": ["conditioned", "specified"],
}


def _document(stages: list[Json], sequences: Json, **more: Any) -> Json:
    document: Json = {
        "stagebook": 1,
        "name": "unit",
        "conditions": CONDITIONS,
        "stages": stages,
        "sequences": sequences,
    }
    return document | more


def timer(**more: Any) -> Json:
    """A contact closes at 0.2 s: LS1 sounds through Q3; LS2 is on until C1 has come to 3 V below the supply."""
    driver: Json = {
        "name": "driver",
        "roles": {"driver": "Q3", "base_resistor": "R7", "load": "LS1", "base_emitter_resistor": "R8"},
        "parts": [
            two("contact", "S1", "supply", "call"),
            resistor("R7", "call", "base", "680R", tolerance="5 %", rating="0.25 W"),
            resistor("R8", "base", "0V", "10k", tolerance="5 %", rating="0.25 W"),
            transistor("Q3", "low", "base", "0V", **{"class": "0.5 A driver npn"}),
            {
                "ref": "LS1",
                "kind": "sounder",
                "pins": {"plus": "supply", "minus": "low"},
                "data": {
                    "current": {"typical": "150 mA", "max": "200 mA"},
                    "operating_minimum": "3 V",
                    "surge": "0.3 A",
                },
            },
        ],
    }
    timing: Json = {
        "name": "timer",
        "roles": {"timing_resistor": "R1", "timing_capacitor": "C1", "load": "LS2"},
        "parts": [
            resistor("R1", "supply", "tc", "470k", tolerance="5 %", rating="0.25 W"),
            {
                "ref": "C1",
                "kind": "capacitor",
                "pins": {"plus": "tc", "minus": "0V"},
                "value": "10u",
                "tolerance": "20 %",
                "voltage": "16 V",
                "leakage": {"specified": "1 uA", "conditioned": "0.1 uA"},
            },
            sounder("LS2", "supply", "tc", "1 pA", "3 V"),
        ],
    }
    events: list[Json] = [
        {"at": "0 s", "event": "connect supply", "rise": "1 us"},
        {"at": "0.2 s", "event": "close", "part": "S1"},
    ]
    requirements: list[Json] = [
        {"check": "duration", "of": "LS2", "min": "2 s", "max": "12 s"},
        {"check": "standby_energy", "of": "LS1", "capacity": "2 Ah", "standby_time": "1000 h"},
    ]
    sequences: Json = {
        "alarm": {
            "events": events,
            "ends": "30 s",
            "moments": {"standby": "0.1 s", "sounding": {"after": "LS1 on", "by": "0.1 s"}},
        }
    }
    return _document([driver, timing], sequences, requirements=requirements) | more


def latch(**more: Any) -> Json:
    """A latch that S1 fires and S2 shorts, with 10 pF of strays at its npn's base."""
    stage: Json = {
        "name": "latch",
        "roles": {
            "latch_npn": "Q2",
            "latch_pnp": "Q1",
            "base_emitter_resistor_npn": "R2",
            "base_emitter_resistor_pnp": "R1",
        },
        "parts": [
            transistor("Q1", "on", "high", "supply", "pnp", **{"class": "small pnp"}),
            transistor("Q2", "low", "base", "0V", **{"class": "small npn"}),
            resistor("R1", "supply", "high", "100k", tolerance="5 %"),
            resistor("R2", "base", "0V", "220k", tolerance="5 %"),
            resistor("R3", "on", "base", "100k", tolerance="5 %"),
            resistor("R4", "high", "low", "10k", tolerance="5 %"),
            resistor("R5", "on", "0V", "47k", tolerance="5 %"),
            two("contact", "S1", "on", "pulse", data={"insulation": "1000G"}),
            resistor("R6", "supply", "pulse", "10k", tolerance="5 %"),
            two("contact", "S2", "base", "0V", data={"insulation": "1000G"}),
        ],
    }
    events: list[Json] = [
        {"at": "0 s", "event": "connect supply", "rise": "20 ms"},
        {"at": "0.2 s", "event": "close", "part": "S1"},
        {"at": "0.3 s", "event": "open", "part": "S1"},
        {"at": "1 s", "event": "close", "part": "S2"},
    ]
    sequences: Json = {
        "alarm": {
            "events": events,
            "ends": "2 s",
            "moments": {"standby": "0.1 s", "latched": "0.5 s", "reset": "1.5 s"},
        },
        "snap": {"events": [{"at": "0 s", "event": "connect supply", "rise": "0.6 us"}], "ends": "0.5 s"},
    }
    return _document([stage], sequences, strays=[{"between": ["supply", "base"], "value": "10 pF"}]) | more


def changed(document: Json, **values: str) -> Json:
    """The document with the values of some parts replaced."""
    stages = [
        {
            **stage,
            "parts": [
                part | ({"value": values[part["ref"]]} if part["ref"] in values else {}) for part in stage["parts"]
            ],
        }
        for stage in document["stages"]
    ]
    return document | {"stages": stages}


def load(document: Json) -> Design:
    return Design.load(document)
