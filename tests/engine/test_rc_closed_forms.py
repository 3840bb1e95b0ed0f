"""Resistors and capacitors against closed forms (linear circuit theory), among them the worked timer of the margins.

Nets of timing capacitors are computed to 1e-4; over a whole charge that adds up to two to three ten thousandths of the
swing in volts. In time that is 6e-4 up to two thirds of the way, and more beyond, as the curve flattens.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from stagebook.engine.primitives.signals import Anchor, crossing, level, maximum, voltage

from .circuits import Json, Setup, capacitor, resistor, setup, two

ACCURACY = 6e-4
TIMER = {"timing_resistor": "R1", "timing_capacitor": "C1"}


def charging(ohms: str | float, part: Json, ends: float, supply: str = "9 V", **conditions: str) -> Setup:
    return setup(
        resistor("R1", "supply", "t", ohms),
        part,
        supply=supply,
        starts={"t": "0 V"},
        ends=ends,
        roles=TIMER,
        **conditions,
    )


def electrolytic(farads: str, **fields: object) -> Json:
    part = capacitor("C1", "t", "0V", farads, voltage="16 V", **fields)
    return {**part, "pins": {"plus": "t", "minus": "0V"}}


@given(
    st.floats(2.0, 7.0).map(lambda e: round(10.0**e, 3)),
    st.floats(-11.0, -3.0).map(lambda e: 10.0**e),
    st.floats(0.1, 0.95),
)
@settings(max_examples=40, deadline=None)
def test_any_rc_reaches_its_threshold_when_the_exponential_does(ohms: float, farads: float, share: float) -> None:
    tau = ohms * farads
    exact = -tau * math.log(1.0 - share)
    row = crossing(voltage("t"), 9.0 * share, rising=True)
    seen = charging(ohms, capacitor("C1", "t", "0V", farads), ends=5 * tau).run(row)
    flatter = max(1.0, 1.0 / (2.3 * (1.0 - share) * -math.log1p(-share)))  # 1 at a share of two thirds
    assert seen.value(row)[0] == pytest.approx(exact, rel=ACCURACY * flatter)


def test_discharge_and_the_sign_of_a_falling_crossing() -> None:
    falls, rises = (crossing(voltage("t"), 3.0, rising) for rising in (False, True))
    discharged = setup(
        resistor("R1", "t", "0V", "1M"),
        capacitor("C1", "t", "0V", "1 uF"),
        resistor("R2", "supply", "0V", "1k"),
        starts={"t": "9 V"},
        ends=4.0,
        roles=TIMER,
    )
    seen = discharged.run(falls, rises)
    assert seen.value(falls)[0] == pytest.approx(1.0 * math.log(3.0), rel=ACCURACY)
    assert not seen.seen(rises)[0]


# Margins, worked by hand: 220 uF / 16 V through 470k from 9 V to 6 V; leakage as a conductance I_spec / V_R at 20 C.
WORKED = [
    # part, final value in V, time to 6 V in s
    (capacitor("C1", "t", "0V", "220u"), 9.0, 113.6),
    (electrolytic("220u", leakage={"specified": "2 uA"}), 8.50, 119.5),
    (electrolytic("220u"), 4.42, None),
]


@pytest.mark.parametrize(("part", "final", "seconds"), WORKED)
def test_the_worked_timer_with_and_without_leakage(part: Json, final: float, seconds: float | None) -> None:
    row = crossing(voltage("t"), 6.0, rising=True)
    timer = charging("470k", part, ends=2000.0, ambient="20 C")
    seen = timer.run(row)
    assert seen.final[0, timer.circuit.index("t")] == pytest.approx(final, abs=0.005)
    if seconds is None:
        assert not seen.seen(row)[0]
        assert math.isnan(seen.value(row)[0])
    else:
        assert seen.value(row)[0] == pytest.approx(seconds, abs=0.06)


def leaky(current: float, volts: float = 9.0) -> tuple[float, float]:
    """Final value and time constant: Vinf = Vs R_L / (R + R_L), tau = (R || R_L) C with R_L = 16 V / I."""
    leak = 16.0 / current
    return volts * leak / (470e3 + leak), 470e3 * leak / (470e3 + leak) * 220e-6


@pytest.mark.parametrize(
    ("state", "ambient", "current"),
    [
        ("specified", "20 C", 2e-6),
        ("specified", "50 C", 4e-6),  # class figure, from memory: twice from 20 to 50 C
        ("conditioned", "20 C", 0.1e-6),  # a twentieth, class figure, from memory
        ("conditioned", "-10 C", 0.05e-6),
    ],
)
def test_leakage_follows_state_and_temperature(state: str, ambient: str, current: float) -> None:
    row = crossing(voltage("t"), 6.0, rising=True)
    part = electrolytic("220u", leakage={"specified": "2 uA"})
    seen = charging("470k", part, ends=400.0, ambient=ambient, leakage=state).run(row)
    final, tau = leaky(current)
    assert seen.value(row)[0] == pytest.approx(tau * math.log(final / (final - 6.0)), rel=ACCURACY)


def test_the_leakage_limit_of_a_small_electrolytic_is_three_microamperes() -> None:
    # max(0.01 C V, 3 uA) of rated values, in the manner of IEC 60384-4: 0.01 * 4.7 * 16 = 0.75 uA is below 3 uA.
    timer = charging("470k", electrolytic("4u7"), ends=100.0, ambient="20 C")
    leak = 16.0 / 3e-6
    assert timer.final("t") == pytest.approx(9.0 * leak / (leak + 470e3), rel=1e-3)


def test_two_cascaded_sections_follow_the_two_exponentials() -> None:
    # C v' = -G v + g with G and C by hand; v = vinf + sum of eigenvectors exp(lambda t) (linear circuit theory).
    r1, c1, r2, c2 = 100e3, 1e-6, 470e3, 2.2e-6
    conductances = np.array([[1 / r1 + 1 / r2, -1 / r2], [-1 / r2, 1 / r2]])
    rates, vectors = np.linalg.eig(-conductances / np.array([[c1], [c2]]))
    weights = np.linalg.solve(vectors, np.array([-9.0, -9.0]))
    times = (0.05, 0.3, 1.0, 2.0, 4.0)
    rows = {(net, t): level(voltage(net), Anchor(t)) for net in ("p", "q") for t in times}
    sections = setup(
        resistor("R1", "supply", "p", r1),
        capacitor("C1", "p", "0V", c1),
        resistor("R2", "p", "q", r2),
        capacitor("C2", "q", "0V", c2),
        supply="9 V",
        starts={"p": "0 V", "q": "0 V"},
        ends=5.0,
        roles={"timing_capacitor": "C1"},
    )
    seen = sections.run(*rows.values(), relative=1e-4)
    for t in times:
        exact = 9.0 + vectors @ (weights * np.exp(rates * t))
        assert [seen.value(rows[net, t])[0] for net in ("p", "q")] == pytest.approx(exact, abs=2.5e-4 * 9.0)


@pytest.mark.parametrize("slope", [1e3, 38e3, 1e6])
def test_a_rising_supply_lifts_the_base_through_the_coupling_capacitance(slope: float) -> None:
    # v = s R C (1 - exp(-t/RC)); margins, by hand: 10 pF and 1 M pass 0.38 V at 0.038 V/us.
    tau = 1e6 * 10e-12
    rise = 9.0 / slope
    early, late = level(voltage("base"), Anchor(0.3 * rise)), level(voltage("base"), Anchor(0.9 * rise))
    highest = maximum(voltage("base"))
    coupled = setup(
        resistor("R1", "base", "0V", "2M"),
        resistor("R2", "base", "0V", "2M"),
        resistor("R3", "supply", "0V", "1k"),
        supply="9 V",
        events=[{"at": "0 s", "event": "connect supply", "rise": f"{rise!r} s"}],
        strays=[("supply", "base", "10 pF")],
        ends=2 * rise,
    )
    seen = coupled.run(early, late, highest, relative=1e-4)
    for row, t in ((early, 0.3 * rise), (late, 0.9 * rise), (highest, rise)):
        exact = slope * tau * -math.expm1(-t / tau)
        assert seen.value(row)[0] == pytest.approx(exact, rel=1e-3, abs=1e-4)


def test_series_resistance_of_a_capacitor_takes_the_first_jump() -> None:
    part = capacitor("C1", "t", "0V", "100u", series_resistance="10R")
    jump = level(voltage("t"), Anchor(1e-6))
    charged = crossing(voltage("t"), 5.0, rising=True)
    seen = charging("90R", part, ends=0.05).run(jump, charged)
    assert seen.value(jump)[0] == pytest.approx(0.9, rel=1e-3)  # 9 V * 10 / (10 + 90)
    # v(t) = 9 - 8.1 exp(-t/tau), tau = (90 + 10) ohm * 100 uF
    assert seen.value(charged)[0] == pytest.approx(10e-3 * math.log(8.1 / 4.0), rel=ACCURACY)


def test_a_temperature_coefficient_moves_the_time() -> None:
    row = crossing(voltage("t"), 4.5, rising=True)
    warm = setup(
        resistor("R1", "supply", "t", "1M", tempco="2000 ppm/K"),
        capacitor("C1", "t", "0V", "1 uF"),
        supply="9 V",
        ambient="75 C",
        starts={"t": "0 V"},
        ends=3.0,
        roles=TIMER,
    )
    assert warm.run(row).value(row)[0] == pytest.approx(1.1 * math.log(2.0), rel=ACCURACY)  # 1 + 50 K * 0.002 / K


def test_a_sounder_draws_its_rated_current_at_its_rated_voltage() -> None:
    loaded = setup(
        two("sounder", "LS1", "supply", "low", data={"current": "200 mA", "rated_voltage": "12 V"}),
        resistor("R1", "low", "0V", "60R"),
        supply="12 V",
        ends=1e-3,
    )
    assert loaded.final("low") == pytest.approx(6.0, rel=1e-6)  # 12 V / 200 mA = 60 ohm


def test_lanes_carry_their_own_values() -> None:
    row = crossing(voltage("t"), 4.5, rising=True)
    timer = charging("1M", capacitor("C1", "t", "0V", "1 uF"), ends=5.0)
    ohms = np.array([0.5e6, 1e6, 2e6, 3e6])
    supplies = np.array([9.0, 6.0, 12.0, 9.0])
    seen = timer.run(row, changes={("R1", "value"): ohms, ("conditions", "supply"): supplies})
    assert seen.value(row) == pytest.approx(ohms * 1e-6 * np.log(supplies / (supplies - 4.5)), rel=ACCURACY)


def test_a_capacitor_that_loses_half_at_voltage_is_half_as_slow() -> None:
    # Class figures of X7R (from memory): 0 .. -50 % of the value up to its rated voltage.
    row = crossing(voltage("t"), 4.5, rising=True)
    timer = charging("1M", capacitor("C1", "t", "0V", "1 uF", **{"class": "X7R"}), ends=5.0)
    drift = next(column for column in timer.circuit.columns if column.key == ("C1", "drift"))
    assert (drift.low, drift.high) == (-0.5, 0.0)
    seen = timer.run(row, changes={drift.key: np.array([drift.low, drift.high])})
    assert seen.value(row) == pytest.approx(np.array([0.5, 1.0]) * math.log(2.0), rel=ACCURACY)
