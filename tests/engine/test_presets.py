"""Presets: the resistance at a setting, its limits, and settings moved by events. Expected values by Ohm's law."""

from __future__ import annotations

import numpy as np
import pytest

from stagebook.engine.errors import CircuitError
from stagebook.engine.primitives.signals import Anchor, level, voltage

from .circuits import Json, Setup, resistor, setup, two


def divided(*events: Json, ends: float = 1e-3, **fields: object) -> Setup:
    """The preset from a net to 0V, fed by 100k from 6 V."""
    fields = {"range": "100k", **fields}
    return setup(
        resistor("R1", "supply", "n", "100k"),
        two("preset", "R2", "n", "0V", **fields),
        events=[{"at": "0 s", "event": "connect supply", "rise": "1 us"}, *events],
        ends=ends,
    )


def volts_of(ohms: float) -> float:
    return 6.0 * ohms / (100e3 + ohms)


@pytest.mark.parametrize(
    ("fields", "ohms"),
    [
        ({"setting": "25 %"}, 25e3),
        ({"setting": "100 %"}, 100e3),
        ({"setting": 0.5}, 50e3),
        ({"value": "10k"}, 10e3),
        ({}, 50e3),
        ({"range": {"min": "20k", "max": "70k"}, "setting": "50 %"}, 45e3),
        ({"setting": "0 %", "data": {"end_resistance": "50R"}}, 50.0),
    ],
)
def test_the_setting_is_a_share_of_the_range(fields: dict[str, object], ohms: float) -> None:
    assert divided(**fields).final("n", relative=1e-6) == pytest.approx(volts_of(ohms), rel=1e-6)


def test_the_tolerance_is_that_of_the_track() -> None:
    circuit = divided(setting="25 %", tolerance="20 %")
    column = next(column for column in circuit.circuit.columns if column.key == ("R2", "range"))
    seen = circuit.run(changes={column.key: np.array([column.low, column.high])})
    ends = [volts_of(25e3 * 0.8), volts_of(25e3 * 1.2)]
    assert seen.final[:, circuit.circuit.index("n")] == pytest.approx(ends, rel=1e-6)


def test_events_set_and_ramp_the_setting() -> None:
    circuit = divided(
        {"at": "1 s", "event": "set", "part": "R2", "to": "20 %"},
        {"at": "2 s", "event": "ramp", "part": "R2", "to": "80 %", "for": "6 s"},
        setting="50 %",
        ends=10.0,
    )
    times = [0.5, 1.5, 3.5, 5.0, 6.5, 9.0]
    rows = [level(voltage("n"), Anchor(t)) for t in times]
    seen = circuit.run(*rows)
    settings = np.interp(times, [1.0, 1.0 + 1e-9, 2.0, 8.0], [0.5, 0.2, 0.2, 0.8])
    exact = [volts_of(100e3 * each) for each in settings]
    assert [seen.value(row)[0] for row in rows] == pytest.approx(exact, rel=2e-3)


@pytest.mark.parametrize(
    ("fields", "words"),
    [
        ({"setting": "120 %"}, "from 0 % to 100 %"),
        ({"value": "200k"}, "outside of its range"),
        ({"range": None}, "range: missing"),
        ({"tolerance": "100 %"}, "cannot be"),
    ],
)
def test_a_preset_that_cannot_be_is_refused(fields: dict[str, object], words: str) -> None:
    with pytest.raises(CircuitError, match=words):
        divided(**fields).run()
