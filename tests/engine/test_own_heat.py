"""Parts that heat themselves: relay coils of copper, thermistors, and fuses that melt.

Copper (234.5 + T)/254.5 and R25 exp(B (1/T - 1/298.15)): common forms. One thermal resistance and one time constant:
rise = P R_th (1 - exp(-t/tau)) at constant power (Newton's law of cooling, textbook). I2t of fuses: common practice.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from stagebook.engine.errors import CircuitError
from stagebook.engine.parts.fuse import BEARS, blown
from stagebook.engine.primitives.signals import Anchor, crossing, level, voltage
from stagebook.engine.studies.waves import waves

from .circuits import Setup, capacitor, resistor, setup, two

COIL = {"inductance": "1 H", "resistance": "400 ohm", "pick_up": "7.8 V"}
HEATED = {"drop_out": "2.4 V", "thermal_resistance": "60 K/W", "thermal_time": "200 s"}


def test_a_coil_grows_warm_and_draws_less() -> None:
    # 16 V: 400 ohm (234.5 + T)/254.5 with T = 25 C + 60 K/W V^2/R and 200 s, beside Radau of SciPy.
    case = setup(two("coil", "K1", "supply", "0V", **COIL, data=HEATED), supply="16 V", ends=1000.0)

    def ohms(rise: float) -> float:
        return 400.0 * (234.5 + 25.0 + rise) / 254.5

    other = solve_ivp(
        lambda _, rise: [(16.0**2 / ohms(rise[0]) * 60.0 - rise[0]) / 200.0], (0.0, 1000.0), [0.0], "Radau",
        t_eval=[100.0, 300.0, 990.0], rtol=1e-9, atol=1e-9,
    ).y[0]  # fmt: skip
    rows = [level(voltage("K1 temperature"), Anchor(t)) for t in (100.0, 300.0, 990.0)]
    current = level(case.circuit.benches["K1"].currents["a"], Anchor(990.0))
    seen = case.run(*rows, current)
    assert [float(seen.value(row)[0]) for row in rows] == pytest.approx(other, rel=2e-3)
    assert float(seen.value(current)[0]) == pytest.approx(16.0 / ohms(other[-1]), rel=2e-3)


def test_a_coil_without_a_thermal_resistance_stays_as_it_is() -> None:
    plain = setup(two("coil", "K1", "supply", "0V", **COIL, data={"drop_out": "2.4 V"}), supply="12 V", ends=1.0)
    assert plain.circuit.builder.warms == []
    assert plain.circuit.builder.temperatures == {}


@pytest.mark.parametrize("follows", [None, "tunnel"])
def test_a_thermistor_is_warmer_than_what_it_follows(follows: str | None) -> None:
    # 1 kohm at 25 C, B 3950 K, 200 K/W, 5 V through 1 kohm: some 6 mW; at the end what it follows is at 60 C, where
    # rise = 200 K/W x power by bisection.
    name = {"follows": follows} if follows else {}
    heat = {"beta": "3950 K", "thermal_resistance": "200 K/W", "thermal_time": "10 s"}
    case = setup(
        resistor("R1", "supply", "n", "1k"),
        two("thermistor", "RT1", "n", "0V", "1k", tolerance="1 %", data=heat, **name),
        supply="5 V",
        events=[
            {"at": "0 s", "event": "connect supply", "rise": "1 us"},
            {"at": "100 s", "event": "ramp", "part": follows or "RT1", "to": "60 C", "for": "20 s"},
        ],
        ends=400.0,
        source="0R1",
    )

    def beyond(rise: float, celsius: float) -> float:
        ohms = 1000.0 * math.exp(3950.0 * (1.0 / (273.15 + celsius + rise) - 1.0 / 298.15))
        return 200.0 * ohms * (5.0 / (1000.1 + ohms)) ** 2 - rise

    rows = [level(voltage("RT1 temperature"), Anchor(t)) for t in (99.0, 399.0)]
    seen = case.run(*rows)
    expected = [brentq(beyond, 0.0, 50.0, args=(celsius,)) for celsius in (25.0, 60.0)]
    assert [float(seen.value(row)[0]) for row in rows] == pytest.approx(expected, rel=5e-3)


def fused(amperes: float, ends: float, **more: object) -> Setup:
    """A fuse of 1 A and 2 A2s, 0.1 ohm, on a hard supply that drives a current through it."""
    return setup(
        two("fuse", "F1", "supply", "n", **{"class": "1 A slow", **more}),
        resistor("R1", "n", "0V", 100.0 / amperes - 0.1),
        supply="100 V",
        ends=ends,
    )


@pytest.mark.parametrize("amperes", [2.0, 5.0, 50.0])
def test_a_fuse_melts_when_its_wire_is_hot_enough(amperes: float) -> None:
    # tau = I2t / (1.77 I_N)^2 and t = -tau ln(1 - (1.77 I_N / I)^2): 0.98 s at 2 A, 0.8 ms (I2t / I^2) at 50 A.
    tau = 2.0 / BEARS**2
    expected = -tau * math.log(1.0 - (BEARS / amperes) ** 2)
    case = fused(amperes, 3.0 * expected)
    gone = crossing(voltage(blown("F1")), 0.5, True)
    rest = level(voltage("n"), Anchor(2.9 * expected))
    seen = case.run(gone, rest)
    assert float(seen.time(gone)[0]) == pytest.approx(expected, rel=3e-3)
    assert float(seen.value(rest)[0]) < 1e-4


def test_short_pulses_melt_at_the_stated_i2t() -> None:
    tau = 2.0 / BEARS**2
    assert -tau * math.log(1.0 - (BEARS / 50.0) ** 2) * 50.0**2 == pytest.approx(2.0, rel=1e-3)


def test_a_fuse_bears_one_and_a_half_times_its_rating() -> None:
    # The gate of IEC 60127-2 (from memory): 1.5 I_N for an hour.
    seen = fused(1.5, 3600.0).run()
    assert float(seen.final[0, fused(1.5, 1.0).circuit.index(blown("F1"))]) == 0.0


def test_a_blown_fuse_stays_open_though_it_cools() -> None:
    case = setup(
        two("fuse", "F1", "supply", "n", **{"class": "1 A slow"}),
        two("contact", "S1", "n", "0V"),
        resistor("R1", "n", "0V", "1k"),
        capacitor("C1", "n", "0V", "1 uF"),
        supply="12 V",
        source="0R5",
        events=[
            {"at": "0 s", "event": "connect supply", "rise": "1 us"},
            {"at": "1 s", "event": "close", "part": "S1"},
            {"at": "2 s", "event": "open", "part": "S1"},
        ],
        ends=20.0,
    )
    rows = [level(voltage("n"), Anchor(t)) for t in (0.9, 1.9, 19.9)]
    cold = level(voltage("F1 temperature"), Anchor(19.9))
    seen = case.run(*rows, cold)
    before, shorted, after = (float(seen.value(row)[0]) for row in rows)
    assert before == pytest.approx(12.0, rel=1e-2)
    assert shorted == pytest.approx(0.0, abs=1e-3)
    assert after == pytest.approx(0.0, abs=1e-3)
    assert float(seen.value(cold)[0]) < 1.0


def test_a_fuse_without_figures_never_melts_and_lists_name_nets_only() -> None:
    case = fused(50.0, 1e-3)
    assert waves(case.design).nets == ("n", "supply")
    bare = setup(two("fuse", "F1", "supply", "n", resistance="0R1"), resistor("R1", "n", "0V", "1R"), ends=1e-3)
    assert bare.circuit.builder.guards == {}
    with pytest.raises(CircuitError, match="melting: it must be above zero"):
        fused(50.0, 1e-3, melting="0 A2s").run()


def test_lanes_melt_each_at_its_own_time() -> None:
    pulses = np.array([1.0, 2.0, 4.0])
    gone = crossing(voltage(blown("F1")), 0.5, True)
    seen = fused(50.0, 5e-3).run(gone, changes={("F1", "melting"): pulses})
    assert seen.time(gone) == pytest.approx(pulses / 2500.0, rel=5e-3)
