"""The surge of a sounder: what it draws at once, how it falls, and how it dips a soft supply.

Exponentials of one resistance and one capacitance (mathematics); surges of twice the current: parts from memory.
"""

from __future__ import annotations

import math

import pytest

from stagebook.engine.errors import CircuitError
from stagebook.engine.primitives.signals import Anchor, crossing, level, voltage

from .circuits import Setup, resistor, setup, steps, two

SIREN = {"current": "0.5 A", "surge": "1.5 A", "data": {"rated_voltage": "12 V", "surge_time": "30 ms"}}


def siren(source: str = "0.001", **data: str) -> Setup:
    """A siren of 0.5 A and 1.5 A at 12 V that is on from 0.1 ms to 0.5 s."""
    return setup(
        steps("G1", "in", "0V", (0.0, 0.0), (0.1e-3, 12.0), (0.5, 12.0)),
        resistor("R1", "in", "n", source),
        two("sounder", "LS1", "n", "0V", **{**SIREN, "data": {**SIREN["data"], **data}}),  # type: ignore[dict-item]
        supply=None,
        ends=0.5,
    )


def test_it_falls_from_the_surge_to_the_current() -> None:
    # 0.5 A + 1 A exp(-t / 30 ms), from the middle of the rise on.
    case = siren()
    times = (0.3e-3, 10e-3, 30e-3, 0.1, 0.4)
    rows = [level(case.circuit.benches["LS1"].currents["plus"], Anchor(t)) for t in times]
    seen = case.run(*rows)
    expected = [0.5 + math.exp(-(t - 0.05e-3) / 30e-3) for t in times]
    assert [float(seen.value(row)[0]) for row in rows] == pytest.approx(expected, rel=2e-3)


def test_it_dips_a_soft_supply() -> None:
    # 1.5 A at 12 V are 8 ohm at once, 24 ohm for long: behind 2 ohm 9.6 V and 11.08 V.
    case = siren("2R")
    early, late = level(voltage("n"), Anchor(0.11e-3)), level(voltage("n"), Anchor(0.49))
    seen = case.run(early, late)
    assert float(seen.value(early)[0]) == pytest.approx(9.6, rel=5e-3)
    assert float(seen.value(late)[0]) == pytest.approx(12.0 * 24.0 / 26.0, rel=1e-3)


@pytest.mark.parametrize(
    ("data", "words"), [({"surge": "0.4 A"}, "is not above its current"), ({"surge_time": "0 s"}, "above zero")]
)
def test_what_cannot_be_is_refused(data: dict[str, str], words: str) -> None:
    document = siren().design.dump()
    part = document["stages"][0]["parts"][2]
    part.update({key: text for key, text in data.items() if key == "surge"})
    part["data"].update({key: text for key, text in data.items() if key != "surge"})
    with pytest.raises(CircuitError, match=words):
        Setup(type(siren().design).load(document)).run()


def test_a_piezo_element_has_its_capacitance() -> None:
    # 1k at 12 V and 12 mA, 20 nF, behind 1k: half of 12 V with R C = 500 ohm x 20 nF.
    data = {"rated_voltage": "12 V"}
    case = setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-9, 12.0), (1.0, 12.0)),
        resistor("R1", "in", "n", "1k"),
        two("piezo", "LS1", "n", "0V", current="12 mA", capacitance="20 nF", data=data),
        supply=None,
        ends=100e-6,
    )
    half, end = crossing(voltage("n"), 3.0, True), level(voltage("n"), Anchor(99e-6))
    seen = case.run(half, end)
    assert float(seen.value(half)[0]) == pytest.approx(10e-6 * math.log(2.0), rel=2e-3)
    assert float(seen.value(end)[0]) == pytest.approx(6.0, rel=1e-3)
