"""Without a compiler the same functions run as plain Python, and give the same numbers."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from .circuits import Setup, capacitor, mosfet, resistor, setup, sine, steps, transistor, two
from .run_documents import results

SCRIPT = Path(__file__).with_name("run_documents.py")

# Each family of primitives at least once, small and short: plain Python is some hundred times slower.
CASES: dict[str, Setup] = {
    "conductance and capacitance": setup(
        resistor("R1", "supply", "n", "1k"), capacitor("C1", "n", "0V", "1 uF"), supply="5 V", ends=3e-3
    ),
    "branch": setup(
        sine("G1", "a", "b", 2.0, 100.0),
        resistor("R1", "a", "0V", "1k"),
        resistor("R2", "b", "0V", "1k"),
        capacitor("C1", "b", "0V", "100 nF"),
        supply=None,
        ends=12e-3,
    ),
    "inductance": setup(
        resistor("R1", "supply", "n", "100R"),
        two("inductor", "L1", "n", "0V", inductance="10 mH", resistance="10 ohm"),
        supply="5 V",
        ends=300e-6,
    ),
    "junction": setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-6, 5.0), (1e-3, 5.0), (1.001e-3, -12.0)),
        resistor("R1", "in", "d", "1k"),
        two(
            "diode",
            "D1",
            "d",
            "0V",
            law={
                "saturation_current": "2e-9 A",
                "ideality": 1.8,
                "capacitance": "10 pF",
                "transit_time": "1 us",
                "breakdown_voltage": "9 V",
            },
        ),
        supply=None,
        ends=2e-3,
    ),
    "zener with leakage": setup(
        resistor("R1", "supply", "z", "1k"),
        two("zener", "D1", "0V", "z", "3.3 V", **{"class": "zener 0.5 W"}),
        supply="5 V",
        ends=1e-3,
    ),
    "transport": setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-6, 3.0), (100e-6, 3.0), (101e-6, 0.0)),
        resistor("R1", "in", "b", "10k"),
        transistor("Q1", "c", "b", "0V", **{"class": "small npn"}),
        resistor("R2", "supply", "c", "1k"),
        transistor("Q2", "d", "c", "supply", "pnp", **{"class": "small pnp"}),
        resistor("R3", "d", "0V", "1k"),
        supply="5 V",
        ends=200e-6,
    ),
    "transport whose gain falls off": setup(
        resistor("R1", "supply", "b", "10k"),
        transistor(
            "Q1",
            "c",
            "b",
            "0V",
            law={
                "saturation_current": "1e-14 A",
                "forward_gain": 100,
                "knee_current": "1 mA",
                "recombination_current": "1e-12 A",
                "forward_transit_time": "2 ns",
            },
        ),
        resistor("R2", "supply", "c", "1k"),
        supply="9 V",
        ends=100e-6,
    ),
    "channel": setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-6, 6.0), (100e-6, 6.0), (101e-6, 0.0)),
        resistor("R1", "in", "g", "10k"),
        mosfet("Q1", "d", "g", "0V", **{"class": "small n-channel"}),
        resistor("R2", "supply", "d", "1k"),
        mosfet("Q2", "e", "d", "supply", "mosfet_p", **{"class": "p-channel switch"}),
        resistor("R3", "e", "0V", "1k"),
        supply="9 V",
        ends=200e-6,
    ),
    "warm conductance": setup(
        resistor("R1", "supply", "n", "4R"),
        two("lamp", "E1", "n", "0V", **{"class": "12 V 2 W lamp"}),
        supply="12 V",
        ends=30e-3,
    ),
    "fuse that melts": setup(
        two("fuse", "F1", "supply", "n", **{"class": "1 A slow"}),
        two("thermistor", "RT1", "n", "0V", "1R", data={"beta": "3000 K", "thermal_resistance": "1 K/W"}),
        supply="100 V",
        ends=1e-3,
    ),
    "pair in one case": setup(
        resistor("R1", "supply", "b", "1M"),
        transistor("Q1", "c", "b", "0V", "darlington_npn", **{"class": "power Darlington"}),
        resistor("R2", "supply", "c", "1k"),
        supply="5 V",
        ends=100e-6,
    ),
    "conductance that moves": setup(
        resistor("R1", "supply", "n", "10k"),
        two("thermistor", "RT1", "n", "0V", "10k", **{"class": "ntc"}),
        capacitor("C1", "n", "0V", "10 nF"),
        supply="5 V",
        events=[{"at": "0.5 ms", "event": "ramp", "part": "RT1", "to": "60 C", "for": "1 ms"}],
        ends=2e-3,
    ),
    "coil and operated contact": setup(
        two("coil", "K1", "supply", "0V", **{"class": "relay 12 V"}),
        two("contact", "S1", "supply", "out", operated_by="K1", bounce={"for": "1 ms", "times": 1}),
        resistor("R1", "out", "0V", "1k"),
        supply="12 V",
        ends=12e-3,
    ),
    "coil that heats itself": setup(
        two("coil", "K1", "supply", "0V", **{"class": "relay 12 V"}, data={"thermal_resistance": "60 K/W"}),
        supply="12 V",
        ends=10e-3,
    ),
    "supply that comes back to a charged rail, and charge put in": setup(
        resistor("R1", "supply", "0V", "1k"),
        capacitor("C1", "supply", "0V", "10 uF"),
        supply="5 V",
        source="1R",
        events=[
            {"at": "0 s", "event": "connect supply", "rise": "1 us"},
            {"at": "1 ms", "event": "disconnect supply"},
            {"at": "2 ms", "event": "inject", "net": "supply", "charge": "1 uC", "width": "1 us"},
            {"at": "3 ms", "event": "connect supply", "rise": "2 ms"},
        ],
        ends=6e-3,
    ),
    "switch": setup(
        resistor("R1", "supply", "n", "10k"),
        two("contact", "S1", "n", "0V"),
        capacitor("C1", "n", "0V", "10 nF"),
        supply="5 V",
        source="1R",
        events=[
            {"at": "0 s", "event": "connect supply", "rise": "1 us"},
            {"at": "1 ms", "event": "close", "part": "S1", "bounce": {"for": "1 ms", "times": 2}},
        ],
        ends=3e-3,
    ),
}


@pytest.fixture(scope="module")
def uncompiled() -> dict[str, Any]:
    documents = [case.design.dump() for case in CASES.values()]
    child = subprocess.run(
        [sys.executable, str(SCRIPT)],
        input=json.dumps(documents),
        capture_output=True,
        text=True,
        env={**os.environ, "STAGEBOOK_UNCOMPILED": "1"},
        timeout=120,
        check=False,
    )
    assert child.returncode == 0, child.stderr
    answer = json.loads(child.stdout)
    assert answer["compiled"] is False
    return dict(zip(CASES, answer["results"], strict=True))


@pytest.mark.parametrize("name", CASES)
def test_the_uncompiled_kernel_gives_the_same_numbers(uncompiled: dict[str, Any], name: str) -> None:
    here, there = results(CASES[name].design.dump()), uncompiled[name]
    assert here["failure"] is None
    assert there["failure"] is None
    assert there["work"] == here["work"]
    assert there["status"] == here["status"]
    numbers, others = ([float.fromhex(text) for text in side["numbers"]] for side in (here, there))
    # Compiled, a product and a sum are rounded once where the processor can: a part in 1e9, or what round-off leaves of
    # a voltage that has died away (tens of nanovolts beside volts).
    assert others == pytest.approx(numbers, rel=1e-9, abs=1e-8)


def test_every_family_of_primitives_has_a_case() -> None:
    families = np.array([np.diff(case.circuit.topology.group.astype(np.int64)) > 0 for case in CASES.values()])
    assert families.any(axis=0).all()
