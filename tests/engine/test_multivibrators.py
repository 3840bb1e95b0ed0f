"""Astable and monostable against the closed forms of the textbooks, with what real junctions take off explained.

Millman, Taub, Pulse, Digital and Switching Waveforms (1965), from memory; worked examples from the open
textbook-companion data set of the FOSSEE project (Scilab Textbook Companion; book / chapter / example), recomputed.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.primitives.signals import Anchor, Row, crossing, minimum, voltage

from .circuits import Json, Setup, capacitor, resistor, setup, steps, transistor, two

VT = 0.025692579121493725  # kT/q at 25 C
GAIN = 300.0
BASE_OHMS, COLLECTOR_OHMS, FARADS = 47e3, 1e3, 10e-9


def sharp_law(supply: float, slope: float, **more: object) -> Json:
    """A transistor with V_BE 0.7 V and V_CE(sat) 0.2 V when it is on, whatever the thermal voltage ``slope``."""
    collector = (supply - 0.2) / COLLECTOR_OHMS
    forced = collector / ((supply - 0.7) / BASE_OHMS)
    reverse = (forced + 1.0) / (math.exp(0.2 / slope) * (1.0 - forced / GAIN) - 1.0)
    return {
        "saturation_current": collector / math.exp(0.7 / slope),
        "forward_gain": GAIN,
        "reverse_gain": reverse,
        "thermal_voltage": f"{slope} V",
        "base_emitter_capacitance": "2 pF",
        "base_collector_capacitance": "1 pF",
        **more,
    }


def period(supply: float, law: Json, **options: float) -> float:
    """Period of a symmetrical astable in parts of 2 ln(2) R C, over three periods after three to settle."""
    third, sixth = (crossing(voltage("c1"), 0.5 * supply, rising=True, nth=n) for n in (3, 6))
    flasher = setup(
        resistor("R1", "supply", "c1", COLLECTOR_OHMS),
        resistor("R2", "supply", "b1", BASE_OHMS),
        resistor("R3", "supply", "b2", BASE_OHMS),
        resistor("R4", "supply", "c2", COLLECTOR_OHMS),
        capacitor("C1", "c1", "b2", FARADS),
        capacitor("C2", "c2", "b1", FARADS),
        transistor("Q1", "c1", "b1", "0V", law=law),
        transistor("Q2", "c2", "b2", "0V", law=law),
        supply=f"{supply} V",
        starts={"b1": "0.6 V", "b2": "-1 V", "c2": f"{supply} V"},
        roles={"timing_capacitor_1": "C1", "timing_capacitor_2": "C2"},
        ends=7 * 1.6 * BASE_OHMS * FARADS,
    )
    seen = flasher.run(third, sixth, stop=sixth, **options)
    return float(seen.value(sixth)[0] - seen.value(third)[0]) / 3 / (2 * math.log(2.0) * BASE_OHMS * FARADS)


# Half period R C ln((V + Vcc - V_BE - V_sat) / (V - V_BE)) in parts of R C ln 2, V = Vcc, V_BE 0.7 V, V_sat 0.2 V.
RATIOS = [(9.0, 1.0428, 1e-3), (3.0, 1.1489, 3e-3)]


@pytest.mark.parametrize(("supply", "ratio", "accuracy"), RATIOS)
def test_the_astable_of_sharp_transistors_has_the_closed_form_period(
    supply: float, ratio: float, accuracy: float
) -> None:
    # A base conducts before it has its full V_BE: switching begins where g_m R_C = 1, at V_T / R_C, that is
    # V_T ln(g_m0 R_C) below the V_BE of the conducting side. The period is therefore short by a share that goes with
    # V_T; the closed form knows one V_BE only and is met in the limit of vanishing V_T.
    slopes = np.array([0.010, 0.015, 0.020])
    ratios = np.array([period(supply, sharp_law(supply, slope)) for slope in slopes])
    limit = np.polyfit(slopes, ratios, 2)[2]
    assert limit == pytest.approx(ratio, rel=accuracy)
    assert np.all(np.diff(ratios) < 0.0)


def test_the_astable_of_real_junctions_switches_at_unit_loop_gain() -> None:
    law = sharp_law(9.0, 0.0257)
    threshold = 0.0257 * math.log(0.0257 / COLLECTOR_OHMS / float(law["saturation_current"]))
    exact = math.log((18.0 - 0.7 - 0.2) / (9.0 - threshold)) / math.log(2.0)
    assert period(9.0, law) == pytest.approx(exact, rel=3e-3)
    assert period(9.0, law) < 1.0428


def test_the_period_hardly_depends_on_the_tolerance() -> None:
    law = sharp_law(9.0, 0.0257)
    assert period(9.0, law) == pytest.approx(period(9.0, law, relative=1e-5), rel=5e-4)


def test_reverse_breakdown_of_the_bases_shortens_the_period() -> None:
    # R C ln((V + BV) / (V - V_BE)): 12 V would take the base to -11 V. The junction holds 6 V at 10 uA and 50 mV more
    # per e-fold; what counts is its voltage where it carries the current of the base resistor.
    law = sharp_law(12.0, 0.010, base_emitter_breakdown="6 V")
    held = 6.0
    for _ in range(20):
        held = 6.0 + 0.05 * math.log((12.0 + held) / BASE_OHMS / 10e-6)
    threshold = 0.010 * math.log(0.010 / COLLECTOR_OHMS / float(law["saturation_current"]))
    exact = math.log((12.0 + held) / (12.0 - threshold)) / math.log(2.0)
    free = math.log((24.0 - 0.9) / (12.0 - threshold)) / math.log(2.0)
    assert period(12.0, law) == pytest.approx(exact, rel=0.01)
    assert period(12.0, law) < 0.8 * free


def saturating(gain: float, collector: float, base: float, supply: float, base_supply: float, drop: float) -> Setup:
    """A transistor that is fed base current by a resistor; its V_BE is ``drop`` at the full collector current."""
    full = supply / collector
    law = {"saturation_current": full / math.exp(drop / VT), "forward_gain": gain, "reverse_gain": 1.0}
    return setup(
        steps("G1", "vbb", "0V", (0.0, base_supply)),
        resistor("R1", "vbb", "b", base),
        resistor("R2", "supply", "c", collector),
        transistor("Q1", "c", "b", "0V", law=law),
        supply=f"{supply} V",
        ends=1e-3,
    )


def test_the_least_gain_of_the_worked_astable() -> None:
    # 2444/10/10.1: R 5k, R_C 0.4k: h_FE must be at least 5k / 0.4k = 12.5 for saturation.
    assert saturating(15.0, 400.0, 5e3, 12.0, 12.0, 0.7).final("c") < 0.2
    assert saturating(10.0, 400.0, 5e3, 12.0, 12.0, 0.7).final("c") > 2.0


def test_the_period_of_the_worked_astable() -> None:
    # 2444/10/10.1: R 5k, C 0.02 uF: T = 1.386 R C = 138.6 us, junction drops neglected: at 30 V they are small.
    supply = 30.0
    law = {
        "saturation_current": supply / 400.0 / math.exp(0.8 / VT),
        "forward_gain": 50,
        "base_emitter_capacitance": "5 pF",
        "base_collector_capacitance": "5 pF",
    }
    third, sixth = (crossing(voltage("c1"), 0.5 * supply, rising=True, nth=n) for n in (3, 6))
    flasher = setup(
        resistor("R1", "supply", "c1", "400R"),
        resistor("R2", "supply", "b1", "5k"),
        resistor("R3", "supply", "b2", "5k"),
        resistor("R4", "supply", "c2", "400R"),
        capacitor("C1", "c1", "b2", "20 nF"),
        capacitor("C2", "c2", "b1", "20 nF"),
        transistor("Q1", "c1", "b1", "0V", law=law),
        transistor("Q2", "c2", "b2", "0V", law=law),
        supply=f"{supply} V",
        starts={"b1": "0.6 V", "b2": "-1 V", "c2": f"{supply} V"},
        ends=1.1e-3,
    )
    seen = flasher.run(third, sixth)
    assert (seen.value(sixth)[0] - seen.value(third)[0]) / 3 == pytest.approx(138.6e-6, rel=0.02)


def monostable() -> tuple[Setup, tuple[Row, Row, Row]]:
    """2444/10/10.3: Q2 conducts through R 20k; a pulse into the base of Q1 starts the time of R 20k and C 0.1 uF."""
    law = {
        "saturation_current": 5.9e-3 / math.exp(0.8 / VT),
        "forward_gain": 50,
        "base_emitter_capacitance": "10 pF",
        "base_collector_capacitance": "5 pF",
    }
    shot = setup(
        resistor("R1", "supply", "c1", "2k"),
        resistor("R2", "supply", "b2", "20k"),
        resistor("R3", "supply", "c2", "2k"),
        resistor("R4", "c2", "b1", "20k"),
        resistor("R5", "b1", "0V", "100k"),
        capacitor("C1", "c1", "b2", "0.1 uF"),
        transistor("Q1", "c1", "b1", "0V", law=law),
        transistor("Q2", "c2", "b2", "0V", law=law),
        steps("G1", "push", "0V", (0.0, 0.0), (5e-3, 0.0), (5.000001e-3, 5.0), (5.02e-3, 5.0), (5.020001e-3, 0.0)),
        two("diode", "D1", "push", "kick", law={"saturation_current": "1e-14 A"}),
        resistor("R6", "kick", "b1", "1k"),
        supply="12 V",
        ends=9e-3,
        roles={"timing_capacitor": "C1"},
    )
    begins = crossing(voltage("c2"), 6.0, rising=True, start=Anchor(1e-3))
    ends = crossing(voltage("c2"), 6.0, rising=False, start=Anchor(0.0, begins))
    return shot, (begins, ends, minimum(voltage("b2"), Anchor(0.0, begins)))


def test_the_width_of_the_worked_monostable() -> None:
    shot, (begins, ends, lowest) = monostable()
    seen = shot.run(begins, ends, lowest)
    width = float(seen.value(ends)[0] - seen.value(begins)[0])
    # Printed: R C ln((2 Vcc - V_BE) / (Vcc - V_BE)) = 1.456 ms with V_BE 0.8 V throughout.
    assert 20e3 * 0.1e-6 * math.log((24 - 0.8) / (12 - 0.8)) == pytest.approx(1.456e-3, rel=1e-3)
    assert width == pytest.approx(1.456e-3, rel=0.02)
    # With the base where the swing leaves it, the time ends between two thresholds: where Q2 first has g_m R_C = 1,
    # and where it takes so much collector current that Q1 keeps just its least base current, 0.118 mA.
    drive = 5.9e-3 / 50 + 0.8 / 100e3
    collector = 0.8 + 20e3 * drive
    early = 0.8 + VT * math.log(VT / 2e3 / 5.9e-3)
    late = 0.8 + VT * math.log(((12.0 - collector) / 2e3 - drive) / 5.9e-3)
    swing = 12.0 - float(seen.value(lowest)[0])
    assert 2e-3 * math.log(swing / (12.0 - early)) < width < 2e-3 * math.log(swing / (12.0 - late))


def test_currents_of_the_worked_monostable_at_rest() -> None:
    # 2444/10/10.3: I_C,sat 5.9 mA, least I_B 0.118 mA at h_FE 50, available 0.56 mA.
    rest = saturating(50.0, 2e3, 20e3, 12.0, 12.0, 0.8)
    seen = rest.run()
    collector, base = (float(seen.final[0, rest.circuit.index(net)]) for net in ("c", "b"))
    assert (12.0 - collector) / 2e3 == pytest.approx(5.9e-3, rel=0.02)
    assert (12.0 - base) / 20e3 == pytest.approx(0.56e-3, rel=0.01)
    assert saturating(50.0, 2e3, 20e3 * 0.56 / 0.118, 12.0, 12.0, 0.8).final("c") == pytest.approx(0.2, abs=0.1)


def test_ten_times_the_least_base_current() -> None:
    # 135/4/4.5: V_BB 5 V, V_CC 10 V, R_C 1k, h_FE 50, V_BE 0.8, V_CE 0.2: R_B 2143 ohm for ten times the least I_B.
    least = (10.0 - 0.2) / 1e3 / 50.0
    assert (5.0 - 0.8) / (10.0 * least) == pytest.approx(2143.0, abs=0.5)
    driver = saturating(50.0, 1e3, 2143.0, 10.0, 5.0, 0.8)
    seen = driver.run()
    collector, base = (float(seen.final[0, driver.circuit.index(net)]) for net in ("c", "b"))
    forced = ((10.0 - collector) / 1e3) / ((5.0 - base) / 2143.0)
    assert 50.0 / forced == pytest.approx(10.0, rel=0.02)
