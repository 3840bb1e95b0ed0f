"""Dips, surges, reversal and return of the supply, levels of generators. Expected values: Ohm's law and RC courses."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
import pytest
from scipy import optimize

from stagebook.engine.errors import CircuitError
from stagebook.engine.primitives.signals import Anchor, crossing, integral, level, maximum, minimum, voltage

from .circuits import Json, Setup, capacitor, resistor, setup, sine, steps


def event(at: float, what: str, **fields: object) -> Json:
    return {"at": f"{at!r} s", "event": what, **fields}


def rail(*events: Json, ends: float, load: str = "9R", source: str = "1R", farads: str | None = None) -> Setup:
    return setup(
        resistor("R1", "supply", "0V", load),
        *([] if farads is None else [capacitor("C1", "supply", "0V", farads)]),
        supply="10 V",
        source=source,
        events=[event(0.0, "connect supply", rise="1 us"), *events],
        ends=ends,
    )


def seen_at(circuit: Setup, times: Sequence[float], net: str = "supply") -> list[float]:
    rows = [level(voltage(net), Anchor(t)) for t in times]
    seen = circuit.run(*rows, relative=1e-5)
    return [float(seen.value(row)[0]) for row in rows]


def test_a_dip_has_edges_and_a_width() -> None:
    dip = event(0.01, "dip", to="4 V", edge="2 ms", **{"for": "20 ms"})
    times = [9e-3, 11e-3, 13e-3, 29e-3, 31e-3, 33e-3]
    exact = [0.9 * v for v in (10.0, 7.0, 4.0, 4.0, 7.0, 10.0)]
    circuit = rail(dip, ends=0.04)
    assert seen_at(circuit, times) == pytest.approx(exact, rel=1e-6)
    # From half level to half level it is as long as it says.
    falls, rises = crossing(voltage("supply"), 6.3, False), crossing(voltage("supply"), 6.3, True, start=Anchor(5e-3))
    seen = circuit.run(falls, rises)
    assert seen.value(rises)[0] - seen.value(falls)[0] == pytest.approx(20e-3, rel=1e-6)


def test_a_dip_draws_the_charge_out_of_the_rail() -> None:
    # tau = C (R_source || R_load) = 100 uF * 0.9 ohm.
    dip = event(0.01, "dip", to="4 V", **{"for": "0.2 ms"})
    circuit = rail(dip, ends=0.02, farads="100 uF")
    lowest = minimum(voltage("supply"), Anchor(5e-3))
    exact = 3.6 + (9.0 - 3.6) * math.exp(-0.2e-3 / 90e-6)
    seen = circuit.run(lowest)
    assert seen.value(lowest)[0] == pytest.approx(exact, rel=0.01)
    assert seen.time(lowest)[0] == pytest.approx(0.0102, abs=2e-6)
    assert seen_at(circuit, [0.0199]) == pytest.approx([9.0], rel=1e-3)


def test_a_surge_comes_through_its_own_impedance() -> None:
    surge = event(0.01, "surge", to="40 V", edge="10 us", impedance="3R", **{"for": "5 ms"})
    circuit = rail(surge, ends=0.03)
    assert seen_at(circuit, [9e-3, 12e-3, 14e-3, 20e-3]) == pytest.approx([9.0, 30.0, 30.0, 9.0], rel=1e-6)


def test_without_an_impedance_a_surge_comes_through_the_source_resistance() -> None:
    surge = event(0.01, "surge", to="20 V", **{"for": "5 ms"})
    circuit = rail(surge, ends=0.03)
    peak, area = maximum(voltage("supply")), integral(voltage("supply"), Anchor(0.01), Anchor(0.02))
    seen = circuit.run(peak, area)
    assert seen.value(peak)[0] == pytest.approx(18.0, rel=1e-6)
    assert seen.value(area)[0] == pytest.approx(18.0 * 5e-3 + 9.0 * 5e-3, rel=1e-4)


def test_an_ideal_supply_dips_and_surges_too() -> None:
    circuit = rail(
        event(0.01, "dip", to="4 V", **{"for": "5 ms"}),
        event(0.02, "surge", to="20 V", **{"for": "5 ms"}),
        source="0R",
        ends=0.03,
    )
    assert seen_at(circuit, [9e-3, 12e-3, 17e-3, 22e-3, 29e-3]) == pytest.approx([10.0, 4.0, 10.0, 20.0, 10.0])


def test_a_supply_is_connected_the_wrong_way_round_and_right_again() -> None:
    circuit = rail(
        event(0.01, "disconnect supply"),
        event(0.02, "reverse supply"),
        event(0.03, "disconnect supply"),
        event(0.04, "connect supply"),
        ends=0.05,
    )
    times = [9e-3, 15e-3, 25e-3, 35e-3, 45e-3]
    assert seen_at(circuit, times) == pytest.approx([9.0, 0.0, -9.0, 0.0, 9.0], abs=1e-6)


def test_a_dip_of_a_reversed_supply_comes_back_to_it() -> None:
    circuit = setup(
        resistor("R1", "supply", "0V", "9R"),
        supply="10 V",
        source="1R",
        events=[event(0.0, "reverse supply"), event(0.01, "dip", to="-5 V", **{"for": "5 ms"})],
        ends=0.02,
    )
    assert seen_at(circuit, [5e-3, 12e-3, 19e-3]) == pytest.approx([-9.0, -4.5, -9.0], abs=1e-6)


@pytest.mark.parametrize(("load", "rise"), [("10k", 1.0), ("2k", 0.2), ("10k", 1e-3)])
def test_a_supply_that_comes_back_does_not_drain_the_rail(load: str, rise: float) -> None:
    # 100 uF decays through the load from 10 V until the rising supply meets it: v = 10 exp(-t/tau) = 10 (t - 0.4)/rise.
    tau = 100e-6 * float(load[:-1]) * 1e3
    circuit = rail(
        event(0.1, "disconnect supply"),
        event(0.5, "connect supply", rise=f"{rise!r} s"),
        load=load,
        farads="100 uF",
        ends=2.0,
    )

    def gap(t: float) -> float:
        return 10.0 * math.exp(-(t - 0.1) / tau) - 10.0 * (t - 0.5) / rise

    met = optimize.brentq(gap, 0.5, 0.5 + rise)
    lowest = minimum(voltage("supply"), Anchor(0.05))
    seen = circuit.run(lowest, relative=1e-5)
    assert seen.value(lowest)[0] == pytest.approx(10.0 * math.exp(-(met - 0.1) / tau), abs=2e-3)
    times = [0.5 * (0.1 + met), met - 0.02 * rise, 1.9]
    exact = [10.0 * math.exp(-(t - 0.1) / tau) for t in times[:2]]
    assert seen_at(circuit, times) == pytest.approx([*exact, 10.0], rel=3e-3)


def test_a_rail_that_starts_charged_is_not_drained_by_the_first_rise() -> None:
    circuit = setup(
        resistor("R1", "supply", "0V", "1M"),
        capacitor("C1", "supply", "0V", "10 uF"),
        supply="10 V",
        source="1R",
        starts={"supply": "5 V"},
        events=[event(0.1, "connect supply", rise="1 s")],
        ends=1.5,
    )
    assert seen_at(circuit, [0.05, 0.5, 0.55]) == pytest.approx(
        [5.0 * math.exp(-t / 10.0) for t in (0.05, 0.5, 0.55)], rel=4e-3
    )
    assert seen_at(circuit, [0.8]) == pytest.approx([7.0], rel=1e-3)
    assert seen_at(circuit, [1.4]) == pytest.approx([10.0], abs=1e-3)


def test_a_generator_is_set_and_ramped() -> None:
    circuit = setup(
        steps("G1", "in", "0V", (0.0, 1.0)),
        resistor("R1", "in", "0V", "1k"),
        supply=None,
        events=[
            event(1.0, "set", part="G1", to="3 V"),
            event(2.0, "ramp", part="G1", to="-1 V", **{"for": "4 s"}),
        ],
        ends=8.0,
    )
    assert seen_at(circuit, [0.5, 1.5, 3.0, 5.0, 7.0], "in") == pytest.approx([1.0, 3.0, 2.0, 0.0, -1.0], abs=1e-6)


def test_a_sine_swings_about_the_level_that_is_set() -> None:
    circuit = setup(
        sine("G1", "in", "0V", 1.0, 50.0),
        resistor("R1", "in", "0V", "1k"),
        supply=None,
        events=[event(0.1, "set", part="G1", to="5 V")],
        ends=0.2,
    )
    rows = [maximum(voltage("in"), Anchor(0.0), Anchor(0.09)), minimum(voltage("in"), Anchor(0.11))]
    seen = circuit.run(*rows)
    assert [seen.value(row)[0] for row in rows] == pytest.approx([1.0, 4.0], abs=5e-3)


def test_lanes_dip_from_their_own_supply() -> None:
    circuit = rail(event(0.01, "dip", to="4 V", **{"for": "5 ms"}), ends=0.02)
    rows = [level(voltage("supply"), Anchor(t)) for t in (9e-3, 12e-3, 19e-3)]
    seen = circuit.run(*rows, changes={("conditions", "supply"): np.array([8.0, 12.0])})
    assert np.stack([seen.value(row) for row in rows]) == pytest.approx(
        0.9 * np.array([[8, 12], [4, 4], [8, 12]]), rel=1e-6
    )


@pytest.mark.parametrize(
    ("events", "source", "words"),
    [
        ([event(0.01, "disconnect supply"), event(0.02, "dip", to="4 V", **{"for": "5 ms"})], "1R", "not connected"),
        ([event(0.01, "dip", to="4 V", edge="6 ms", **{"for": "5 ms"})], "1R", "longer than"),
        ([event(0.01, "surge", to="40 V", impedance="1R", **{"for": "5 ms"})], "0R", "takes no impedance"),
        ([event(0.01, "surge", to="40 V", impedance="0R", **{"for": "5 ms"})], "1R", "cannot be"),
        ([event(0.01, "set", part="R1", to="4k")], "1R", "R1 is a resistor, and has no level"),
    ],
)
def test_an_event_that_cannot_be_is_refused(events: list[Json], source: str, words: str) -> None:
    with pytest.raises(CircuitError, match=words):
        rail(*events, source=source, ends=0.05).run()
