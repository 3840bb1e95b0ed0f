"""Laws made of datasheet points give back the points they were made of."""

from __future__ import annotations

import math

import pytest
from scipy import constants, optimize

from stagebook.engine.errors import CircuitError
from stagebook.engine.parts.points import (
    beta_of,
    forward_law,
    forward_law_of_three,
    resistance_of_loads,
    saturation_law,
    saturation_voltage,
)
from stagebook.engine.primitives.signals import Anchor, level

from .circuits import Setup, resistor, setup, steps, transistor

UNIT = constants.k * 298.15 / constants.e


def exact_current(volts: float, saturation: float, ideality: float, series: float) -> float:
    """Current of i = I_S (exp((v - i r)/(n V_T)) - 1) by SciPy's root finder."""

    def excess(i: float) -> float:
        return volts - i * series - ideality * UNIT * math.log1p(i / saturation)

    return float(optimize.brentq(excess, 0.0, 10.0, xtol=1e-15, rtol=1e-12))


@pytest.mark.parametrize("series", [None, 0.0, 2.0])
@pytest.mark.parametrize(
    ("low", "high"), [((0.58, 1e-3), (0.75, 20e-3)), ((0.25, 1e-6), (0.62, 10e-3)), ((0.05, 1e-5), (0.9, 30e-3))]
)
def test_a_junction_passes_both_forward_points(
    low: tuple[float, float], high: tuple[float, float], series: float | None
) -> None:
    law = forward_law(low, high, series=series)
    for volts, amperes in (low, high):
        assert exact_current(volts, law.saturation, law.ideality, law.series) == pytest.approx(amperes, rel=1e-9)
        assert law.voltage(amperes) == pytest.approx(volts, rel=1e-9)
    assert law.ideality == 1.0 if series is None else law.series == series


@pytest.mark.parametrize(("saturation", "ideality", "series"), [(1e-14, 1.0, 0.5), (2e-9, 1.8, 0.05), (1e-6, 1.1, 3.0)])
def test_three_points_give_back_the_law_they_were_taken_from(saturation: float, ideality: float, series: float) -> None:
    def point(amperes: float) -> tuple[float, float]:
        return ideality * UNIT * math.log1p(amperes / saturation) + amperes * series, amperes

    law = forward_law_of_three(point(1e-4), point(3e-3), point(0.1))
    assert (law.saturation, law.ideality, law.series) == pytest.approx((saturation, ideality, series), rel=1e-6)


@pytest.mark.parametrize(
    ("low", "high", "series"),
    [
        ((0.6, 1e-3), (0.61, 10e-3), None),  # less than kT/q ln 10: a series resistance below zero
        ((0.6, 1e-3), (0.7, 10e-3), 12.0),  # the series resistance alone drops more
        ((0.7, 1e-3), (0.6, 10e-3), 0.0),
        ((0.6, 10e-3), (0.7, 1e-3), 0.0),
    ],
)
def test_points_that_no_junction_passes_are_refused(
    low: tuple[float, float], high: tuple[float, float], series: float | None
) -> None:
    with pytest.raises(CircuitError, match=r"no junction|must rise"):
        forward_law(low, high, series=series)


# Published closed form (Ebers, Moll, Proc. IRE 42 (1954) 1761, from memory), by hand for B_F 100, B_R 1 at 300 K.
@pytest.mark.parametrize(("forced", "millivolts"), [(1, 28.7), (5, 51.6), (10, 67.0), (20, 85.7), (50, 120.1)])
def test_the_saturation_voltage_of_ebers_and_moll(forced: float, millivolts: float) -> None:
    warmed = saturation_voltage(forced, 100.0, 1.0) * 300.0 / 298.15
    assert 1e3 * warmed == pytest.approx(millivolts, abs=0.05)


@pytest.mark.parametrize(
    ("low", "high"),
    [
        ((0.09, 10e-3, 20.0), (0.30, 100e-3, 20.0)),
        ((0.07, 10e-3, 20.0), (0.25, 100e-3, 10.0)),
        ((0.08, 10e-3, 10.0), (0.40, 500e-3, 10.0)),
    ],
)
def test_reverse_gain_and_resistance_meet_both_saturation_points(
    low: tuple[float, float, float], high: tuple[float, float, float]
) -> None:
    reverse, ohms = saturation_law(low, high, 160.0)
    assert ohms > 0.0
    for volts, amperes, forced in (low, high):
        inner = UNIT * math.log((1.0 + (forced + 1.0) / reverse) / (1.0 - forced / 160.0))
        assert inner + amperes * ohms == pytest.approx(volts, rel=1e-9)


def test_saturation_points_that_no_transistor_meets_are_refused() -> None:
    with pytest.raises(CircuitError, match="below the current gain"):
        saturation_law((0.1, 10e-3, 20.0), (0.3, 100e-3, 20.0), 15.0)
    with pytest.raises(CircuitError, match="write one of them"):
        saturation_law((0.2, 10e-3, 20.0), (0.1, 100e-3, 20.0), 160.0)


def test_resistance_of_two_loads() -> None:
    # Ohm's law: 9.1 V at 10 mA, 8.65 V at 100 mA.
    assert resistance_of_loads((0.01, 9.1), (0.1, 8.65)) == pytest.approx(5.0)


def test_beta_of_two_points() -> None:
    # R25 exp(B (1/T - 1/298.15)) turned round: it must give back the second point.
    beta = beta_of((25.0, 10e3), (85.0, 1.07e3))
    assert 10e3 * math.exp(beta * (1.0 / 358.15 - 1.0 / 298.15)) == pytest.approx(1.07e3, rel=1e-12)
    with pytest.raises(CircuitError, match="hotter"):
        beta_of((25.0, 10e3), (85.0, 20e3))


DATA = {
    "gain": {"min": 160, "typical": 160, "max": 160},
    "v_be": "0.66 V",
    "v_be_current": "10 mA",
    "early_voltage": "1000000 V",
}


def currents(circuit: Setup) -> tuple[float, float]:
    bench = circuit.circuit.benches["Q1"]
    rows = [level(bench.currents[pin], Anchor(1e-3)) for pin in ("collector", "base")]
    seen = circuit.run(*rows, relative=1e-6)
    return float(seen.value(rows[0])[0]), float(seen.value(rows[1])[0])


@pytest.mark.parametrize(("volts", "amperes"), [(0.66, 10e-3), (0.78, 100e-3)])
def test_a_transistor_has_both_base_emitter_points(volts: float, amperes: float) -> None:
    data = {**DATA, "v_be_high": "0.78 V", "v_be_high_current": "100 mA"}
    circuit = setup(
        steps("G1", "b", "0V", (0.0, 0.0), (1e-6, volts), (1.0, volts)),
        steps("G2", "c", "0V", (0.0, 0.0), (1e-6, 5.0), (1.0, 5.0)),
        transistor("Q1", "c", "b", "0V", data=data),
        supply=None,
        ends=1e-3,
    )
    assert currents(circuit)[0] == pytest.approx(amperes, rel=1e-3)


@pytest.mark.parametrize(("volts", "amperes"), [(0.08, 10e-3), (0.40, 500e-3)])
def test_a_transistor_has_both_saturation_points(volts: float, amperes: float) -> None:
    data = {
        **DATA,
        "v_ce_sat": "0.08 V",
        "saturation_current_at": "10 mA",
        "forced_gain": 10,
        "v_ce_sat_high": "0.40 V",
        "saturation_current_high": "500 mA",
    }
    far = 1000.0
    circuit = setup(
        resistor("R1", "supply", "b", 10.0 * far / amperes),
        resistor("R2", "supply", "c", far / amperes),
        transistor("Q1", "c", "b", "0V", data=data),
        supply=f"{far} V",
        ends=1e-3,
    )
    assert circuit.final("c", relative=1e-6) == pytest.approx(volts, rel=5e-3)


def test_resistances_of_a_law_drop_what_ohm_says_and_heat() -> None:
    law = {"saturation_current": "1e-14 A", "forward_gain": 100, "reverse_gain": 1}
    with_ohms = {**law, "base_resistance": "100R", "collector_resistance": "5R"}

    def made(own: dict[str, object], *outside: dict[str, object]) -> Setup:
        base, collector = ("b", "c") if not outside else ("bi", "ci")
        return setup(
            resistor("R1", "supply", "b", "1k"),
            resistor("R2", "supply", "c", "100R"),
            *outside,
            transistor("Q1", collector, base, "0V", law=own),
            supply="10 V",
            ends=1e-3,
        )

    inside = made(with_ohms)
    apart = made(law, resistor("R3", "b", "bi", "100R"), resistor("R4", "c", "ci", "5R"))
    for net in ("b", "c"):
        assert inside.final(net, relative=1e-6) == pytest.approx(apart.final(net, relative=1e-6), rel=1e-9)
    power = inside.circuit.benches["Q1"].power
    assert power is not None
    row = level(power, Anchor(1e-3))
    volts = {net: inside.final(net, relative=1e-6) for net in ("b", "c")}
    taken = volts["c"] * (10.0 - volts["c"]) / 100.0 + volts["b"] * (10.0 - volts["b"]) / 1000.0
    assert inside.run(row, relative=1e-6).value(row)[0] == pytest.approx(taken, rel=1e-5)


def test_the_base_voltage_that_hand_formulas_use_is_the_figure() -> None:
    data = {**DATA, "v_be_high": "0.78 V", "v_be_high_current": "100 mA"}
    circuit = setup(
        resistor("R1", "supply", "b", "1k"),
        resistor("R2", "supply", "c", "1k"),
        transistor("Q1", "c", "b", "0V", data=data),
        ends=1e-3,
    )
    by_hand = circuit.circuit.benches["Q1"].base_voltage
    assert by_hand is not None
    for volts, amperes in ((0.66, 10e-3), (0.78, 100e-3)):
        assert float(by_hand(circuit.lanes(), amperes)[0]) == pytest.approx(volts, rel=1e-6)


def test_a_base_resistance_that_drops_more_than_the_figure_is_refused() -> None:
    parts = (resistor("R1", "supply", "b", "1k"), resistor("R2", "supply", "c", "1k"))
    part = transistor("Q1", "c", "b", "0V", data={**DATA, "base_resistance": "20k"})
    with pytest.raises(CircuitError, match="it alone drops more"):
        setup(*parts, part, ends=1e-3).run()
