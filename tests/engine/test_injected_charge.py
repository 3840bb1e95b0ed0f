"""Charge put into a net. Expected values: Q = C v and the closed form of a current into R and C."""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.errors import CircuitError
from stagebook.engine.primitives.signals import Anchor, Row, level, maximum, minimum, voltage
from stagebook.engine.run import run

from .circuits import Json, Setup, capacitor, resistor, setup


def pulse(charge: str, width: str, net: str = "n", at: str = "10 ms") -> Json:
    return {"at": at, "event": "inject", "net": net, "charge": charge, "width": width}


def tank(*events: Json, ohms: str = "100k", farads: str = "1n", supply: str = "6 V") -> Setup:
    """R1 from the supply and C1 to 0V on net ``n``, charged long before 10 ms."""
    parts = (resistor("R1", "supply", "n", ohms), capacitor("C1", "n", "0V", farads))
    return setup(*parts, events=[{"at": "0 s", "event": "connect supply"}, *events], supply=supply, ends=20e-3)


def shift(circuit: Setup, row: Row) -> float:
    """Against the voltage just before the pulse."""
    before = level(voltage("n"), Anchor(9.9e-3))
    seen = circuit.run(row, before, relative=1e-5)
    return float(seen.value(row)[0] - seen.value(before)[0])


@pytest.mark.parametrize(("charge", "expected"), [("1 pC", 1e-3), ("1 nC", 1.0), ("-1 nC", -1.0), ("100 nC", 100.0)])
def test_a_short_pulse_moves_a_capacitor_by_q_over_c(charge: str, expected: float) -> None:
    # 100 ns against R C = 100 us: within that the resistor takes back half of a thousandth.
    found = shift(tank(pulse(charge, "100 ns")), level(voltage("n"), Anchor(10e-3 + 100e-9)))
    assert found == pytest.approx(expected, rel=1e-3)


def test_a_long_pulse_is_a_current() -> None:
    # 2 uC within 2 ms is 1 mA into 1k and 100 nF: I R (1 - exp(-t/RC)), and back the same way.
    circuit = tank(pulse("2 uC", "2 ms"), ohms="1k", farads="100n")
    for after in (0.05e-3, 0.2e-3, 1.9e-3):
        assert shift(circuit, level(voltage("n"), Anchor(10e-3 + after))) == pytest.approx(
            1.0 - math.exp(-after / 1e-4), abs=3e-4
        )
    late = shift(circuit, level(voltage("n"), Anchor(12.1e-3)))
    assert late == pytest.approx(math.exp(-1.0), rel=1e-3)


def test_pulses_of_both_signs_come_one_after_the_other() -> None:
    circuit = tank(pulse("1 nC", "1 us"), pulse("-2 nC", "1 us", at="10.001 ms"))
    assert shift(circuit, maximum(voltage("n"), Anchor(9.9e-3))) == pytest.approx(1.0, rel=0.01)
    assert shift(circuit, minimum(voltage("n"), Anchor(9.9e-3))) == pytest.approx(-1.0, rel=0.02)


def test_an_injector_that_rests_takes_nothing() -> None:
    # 1 G from 6 V: an injector of 1e-15 S draws 6 fA and 6 uV, a hundredth of a millionth of that.
    quiet, plain = tank(pulse("0 C", "1 us"), ohms="1G", farads="1p"), tank(ohms="1G", farads="1p")
    at = level(voltage("n"), Anchor(19e-3))
    seen, bare = quiet.run(at, relative=1e-6), plain.run(at, relative=1e-6)
    assert seen.value(at)[0] == pytest.approx(bare.value(at)[0], rel=3e-6)


def test_every_lane_may_have_a_charge_of_its_own() -> None:
    circuit = tank(pulse("1 nC", "1 us"))
    lanes = circuit.lanes(count=3)
    line = circuit.timeline(lanes)
    line.inject(15e-3, "n", np.array([1e-9, 2e-9, -1e-9]), 1e-6)
    rows = before, after = level(voltage("n"), Anchor(14.9e-3)), level(voltage("n"), Anchor(15e-3 + 1e-6))
    seen = run(circuit.circuit, lanes, line.program(circuit.ends), rows)
    assert seen.value(after) - seen.value(before) == pytest.approx([1.0, 2.0, -1.0], rel=0.01)


def test_a_net_that_a_source_holds_does_not_move() -> None:
    circuit = tank(pulse("1 uC", "1 us", net="supply"))
    assert shift(circuit, maximum(voltage("n"), Anchor(9.9e-3))) == pytest.approx(0.0, abs=1e-6)


def test_a_pulse_of_no_width_is_refused() -> None:
    with pytest.raises(CircuitError, match=r"field width: a pulse of 0 s cannot be; write it like '100 ns'"):
        _ = tank(pulse("1 nC", "0 s")).circuit
