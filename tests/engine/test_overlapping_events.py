"""An event that comes before an earlier one is over: it overrides what of that was still to happen.

Expected courses are those of the events' definitions in the design document.
"""

from __future__ import annotations

import numpy as np
import pytest

from stagebook.engine.circuit.wave import Wave
from stagebook.engine.primitives.signals import Anchor, level, voltage

from .circuits import Json, resistor, setup, two

BOUNCE: Json = {"for": "8 ms", "times": 2}


def course(*events: Json, instants: list[float]) -> list[float]:
    """Volts across a resistor of 1k that S1 connects to 6 V, and across 3k in series with the probe B1."""
    circuit = setup(
        two("contact", "S1", "supply", "fed"),
        resistor("R1", "fed", "0V", "1k"),
        two("probe", "B1", "supply", "wet", "3k"),
        resistor("R2", "wet", "0V", "3k"),
        events=[{"at": "0 s", "event": "connect supply", "rise": "1 us"}, *events],
        ends=0.1,
    )
    net = "fed" if any(event["part"] == "S1" for event in events) else "wet"
    rows = [level(voltage(net), Anchor(instant)) for instant in instants]
    seen = circuit.run(*rows)
    return [float(seen.value(row)[0]) for row in rows]


def test_a_contact_opened_while_it_bounces_stays_open() -> None:
    # Touches at 10 .. 12 ms and would touch again at 14 ms; opened for good at 13 ms.
    closing: Json = {"at": "10 ms", "event": "close", "part": "S1", "bounce": BOUNCE}
    opening: Json = {"at": "13 ms", "event": "open", "part": "S1"}
    volts = course(closing, opening, instants=[9e-3, 11e-3, 12.5e-3, 14.5e-3, 19e-3, 90e-3])
    assert volts == pytest.approx([0.0, 6.0, 0.0, 0.0, 0.0, 0.0], abs=2e-3)


def test_a_contact_closed_while_it_bounces_open_stays_closed() -> None:
    events: list[Json] = [
        {"at": "1 ms", "event": "close", "part": "S1"},
        {"at": "10 ms", "event": "open", "part": "S1", "bounce": BOUNCE},
        {"at": "13 ms", "event": "close", "part": "S1"},
    ]
    volts = course(*events, instants=[9e-3, 11e-3, 13.5e-3, 15e-3, 19e-3, 90e-3])
    assert volts == pytest.approx([6.0, 0.0, 6.0, 6.0, 6.0, 6.0], abs=2e-3)


def test_a_ramp_that_is_overtaken_goes_on_from_where_it_stood() -> None:
    # 3k towards 9k within 40 ms, half-way at 6k; from there to 3k within 10 ms. Volts 6 * 3k / (3k + R).
    events: list[Json] = [
        {"at": "10 ms", "event": "ramp", "part": "B1", "to": "9k", "for": "40 ms"},
        {"at": "30 ms", "event": "ramp", "part": "B1", "to": "3k", "for": "10 ms"},
    ]
    volts = course(*events, instants=[9e-3, 30e-3, 40.5e-3, 60e-3])
    assert volts == pytest.approx([3.0, 2.0, 3.0, 3.0], rel=5e-3)


def test_a_set_ends_a_ramp() -> None:
    events: list[Json] = [
        {"at": "10 ms", "event": "ramp", "part": "B1", "to": "9k", "for": "40 ms"},
        {"at": "20 ms", "event": "set", "part": "B1", "to": "1k"},
    ]
    assert course(*events, instants=[21e-3, 49e-3, 90e-3]) == pytest.approx([4.5, 4.5, 4.5], rel=1e-3)


def test_waves_of_several_lanes_are_cut_lane_by_lane() -> None:
    wave = Wave(0.0)
    wave.ramp(0.0, np.array([1.0, 4.0]), 8.0)
    wave.step(2.0, 1.0)
    at = np.array([[0.5, 1.5, 3.0]])
    assert wave.pieces(at, at)[0].tolist() == [[4.0, 8.0, 1.0], [1.0, 3.0, 1.0]]
