"""The current gain at both ends: Gummel and Poon, Bell Syst. Tech. J. 49 (1970) 827; recombination after Sah, Noyce,
Shockley, Proc. IRE 45 (1957) 1228."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import constants, optimize

from stagebook.engine.errors import CircuitError
from stagebook.engine.kernel.linearised import linearised
from stagebook.engine.parts.gain import gain_law
from stagebook.engine.primitives.signals import Anchor, level

from .circuits import Json, Setup, resistor, setup, transistor

VT = constants.k * 298.15 / constants.e
LAW: Json = {
    "saturation_current": "1e-14 A",
    "forward_gain": 100,
    "reverse_gain": 1,
    "knee_current": "20 mA",
    "recombination_current": "1e-12 A",
}
CURRENTS = [1e-6, 1e-4, 2e-3, 20e-3, 100e-3]


def active(collector: float, kind: str = "npn", **fields: object) -> Setup:
    """About this collector current: base and collector joined, fed from 1000 V; with no voltage across the collector
    junction the reverse current is nothing."""
    far, near = ("supply", "0V") if kind == "npn" else ("0V", "supply")
    return setup(
        resistor("R1", far, "b", 1000.0 / collector),
        transistor("Q1", "b", "b", near, kind, **fields),
        supply="1000 V",
        ends=1e-3,
    )


def currents(circuit: Setup, **options: object) -> tuple[np.ndarray, np.ndarray]:
    bench = circuit.circuit.benches["Q1"]
    rows = [level(bench.currents[pin], Anchor(1e-3)) for pin in ("collector", "base")]
    seen = circuit.run(*rows, relative=1e-7, **options)
    return np.abs(seen.value(rows[0])), np.abs(seen.value(rows[1]))


@pytest.mark.parametrize("kind", ["npn", "pnp"])
@pytest.mark.parametrize("wanted", CURRENTS)
def test_currents_are_those_of_the_published_base_charge(wanted: float, kind: str) -> None:
    # q = 1/2 + sqrt(1/4 + i_F/i_K), i_C = i_F/q, i_B = i_F/B + I_SE (e^(v/2V_T) - 1), all solved by SciPy's brentq.
    def parts(v: float) -> tuple[float, float]:
        forward = 1e-14 * math.expm1(v / VT)
        q = 0.5 + math.sqrt(0.25 + forward / 20e-3)
        return forward / q, forward / 100.0 + 1e-12 * math.expm1(v / (2.0 * VT))

    v = optimize.brentq(lambda v: sum(parts(v)) - (1000.0 - v) / (1000.0 / wanted), 0.1, 1.2, xtol=1e-14)
    circuit = active(wanted, kind, law=LAW)
    collector, base = currents(circuit)
    assert (collector[0], base[0]) == (pytest.approx(parts(v)[0], rel=2e-5), pytest.approx(parts(v)[1], rel=2e-5))
    bench = circuit.circuit.benches["Q1"]
    assert bench.gain_at is not None
    assert bench.base_voltage is not None
    lanes = circuit.circuit.nominal()
    assert bench.gain_at(lanes, collector)[0] == pytest.approx(collector[0] / base[0], rel=1e-4)
    assert bench.base_voltage(lanes, collector)[0] == pytest.approx(v, abs=1e-6)


def test_at_the_knee_current_the_gain_is_half() -> None:
    law = {key: value for key, value in LAW.items() if key != "recombination_current"}
    bench = active(20e-3, law=law).circuit.benches["Q1"]
    assert bench.gain_at is not None
    assert bench.gain_at(active(20e-3, law=law).circuit.nominal(), np.array([20e-3]))[0] == pytest.approx(50.0)


@given(st.floats(0.3, 0.95), st.floats(-5.0, 0.9))
@settings(max_examples=40, deadline=None)
def test_conductances_are_the_derivatives_of_currents(emitter: float, collector: float) -> None:
    made = DRIVEN.circuit
    parameters = made.table(made.nominal())
    free = int(made.topology.size[1])
    x = np.zeros(int(made.topology.size[2]))
    x[made.index("b")], x[made.index("c")] = emitter, emitter - collector
    here = linearised(made.topology, parameters, 0, x[None, :]).conductance[0]
    step = 1e-6
    for column in range(free):
        moved = np.repeat(x[None, :], 2, axis=0)
        moved[:, column] += [step, -step]
        sides = linearised(made.topology, np.repeat(parameters, 2, axis=0), 0, moved).current[:, :free]
        numeric = (sides[0] - sides[1]) / (2 * step)
        scale = np.max(np.abs(here[:, column]))
        assert numeric == pytest.approx(here[:, column], abs=1e-6 * scale + 1e-15 * np.max(np.abs(sides)) / step)


DRIVEN = setup(
    *(resistor(f"R{net}", net, "0V", "1M") for net in "bc"),
    resistor("R9", "supply", "0V", "1k"),
    transistor("Q1", "c", "b", "0V", law={**LAW, "early_voltage": "50 V", "reverse_gain": 3}),
    supply="1 V",
    ends=1e-3,
)

POINTS = [(0.1e-3, 120.0), (2e-3, 200.0), (100e-3, 70.0)]
DATA: Json = {
    "gain": {"min": "200", "typical": "300", "max": "450"},
    "gain_current": "2 mA",
    "gain_points": [["0.1 mA", "120"], ["100 mA", "70"]],
    "v_be": "0.64 V",
    "v_be_current": "2 mA",
}


@pytest.mark.parametrize(("current", "gain"), POINTS)
def test_a_transistor_has_the_guaranteed_gain_at_every_current(current: float, gain: float) -> None:
    circuit = active(current * (1.0 + 1.0 / gain), data=DATA)
    collector, base = currents(circuit, changes={("Q1", "gain"): np.array([200.0, 300.0])})
    assert collector / base == pytest.approx(np.array([gain, 1.5 * gain]), rel=3e-3)
    assert collector == pytest.approx(current, rel=6e-3)
    if current == 2e-3:
        assert circuit.final("b", relative=1e-7) == pytest.approx(0.64, abs=2e-4)
        bench = circuit.circuit.benches["Q1"]
        assert bench.gain is not None
        assert np.asarray(bench.gain(circuit.circuit.nominal()))[0] == pytest.approx(300.0, rel=1e-6)


def test_a_law_passes_three_points_and_comes_near_to_more() -> None:
    law = gain_law(POINTS, 2e-3)
    for current, gain in POINTS:
        assert 200.0 * law.share(current) == pytest.approx(gain, rel=1e-9)
    more = gain_law([*POINTS, (10e-3, 190.0)], 2e-3)
    assert more.share(2e-3) == pytest.approx(1.0)
    assert 200.0 * more.share(10e-3) == pytest.approx(180.0, rel=0.1)


def test_an_end_that_does_not_fall_off_stays_flat() -> None:
    law = gain_law([(0.1e-3, 210.0), (2e-3, 200.0), (100e-3, 70.0)], 2e-3)
    assert law.recombination == 0.0
    assert law.per_knee > 0.0
    assert float(law.share(1e-6)) == pytest.approx(law.mid**-1, rel=1e-4)


@pytest.mark.parametrize(("points", "words"), [([], "two currents"), ([["1 mA", "0"]], "above zero")])
def test_points_that_say_nothing_are_refused(points: list[list[str]], words: str) -> None:
    with pytest.raises(CircuitError, match=words):
        gain_law([(2e-3, 200.0), *((1e-3, float(gain)) for _, gain in points)], 2e-3)


def test_the_current_of_the_gain_figure_is_needed() -> None:
    data = {key: value for key, value in DATA.items() if key != "gain_current"}
    with pytest.raises(CircuitError, match="Q1, gain_current: missing"):
        active(1e-3, data=data).circuit  # noqa: B018


@pytest.mark.parametrize("kind", ["npn", "pnp"])
@pytest.mark.parametrize(("amperes", "least"), [(0.1, 100.0), (0.3, 60.0)])
def test_a_class_goes_through_its_points(kind: str, amperes: float, least: float) -> None:
    # "h_FE >= 100 at 100 mA, >= 60 at 300 mA" of a 0.5 A driver (from memory), met by the weakest one.
    case = active(amperes, kind, **{"class": f"0.5 A driver {kind}"})
    collector, base = currents(case, changes={("Q1", "gain"): 100.0})
    assert collector[0] / base[0] == pytest.approx(least, rel=0.02)
    assert case.circuit.benches["Q1"].gain_given == (0.1, 0.3)
