"""Check 9, junction temperature: P R_th against T_limit - T_A, and what a slow edge adds at most.

Common practice, no source; transient part after Carslaw, Jaeger (1959), section 2.9 (surface ~ square root of time).
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from stagebook.engine.checks.junction_temperature import transient
from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, steps, transistor, two
from .sheets import design, exact, margin

LAW: Json = {"saturation_current": "1e-14 A", "forward_gain": 200, "reverse_gain": 1}


def follower(data: Json, volts: tuple[tuple[float, float], ...] = ((0.0, 0.0), (1e-3, 5.7)), **more: Any) -> Design:
    """An emitter follower at 9 V that holds 100 ohm at about 5 V: 50 mA and 4 V across it, 0.2 W."""
    more = {"events": (), "ambient": {"min": "0 C", "nominal": "25 C", "max": "50 C"}, **more}
    return design(
        steps("G1", "drive", "0V", *volts),
        steps("G2", "rail", "0V", (0.0, 9.0), (1.0, 9.0)),
        transistor("Q1", "rail", "drive", "out", law=LAW, data=data),
        exact(resistor("R1", "out", "0V", "100R")),
        **more,
    )


@pytest.mark.parametrize(("kelvin", "verdict"), [("200 K/W", Verdict.PASS), ("700 K/W", Verdict.FAIL)])
def test_steady_power_by_hand(kelvin: str, verdict: Verdict) -> None:
    # V_BE at 50 mA is 26 mV ln(5e12) = 0.75 V at 25 C: (9 - 4.95) x 49.5 mA = 0.2 W, 40 K of 150 - 50 K.
    found = margin(follower({"thermal_resistance": kelvin}), "junction_temperature", "Q1")
    watts = (9.0 - (5.7 - 0.72)) * (5.7 - 0.72) / 100.0
    rise = watts * float(kelvin.split()[0])
    assert found.demand == pytest.approx(rise, rel=0.02)
    assert (found.capability, found.verdict) == (pytest.approx(100.0), verdict)
    assert "hot" in found.corner
    assert found.hand == pytest.approx(found.margin, abs=0.02)


def test_the_rated_power_stands_for_the_resistance() -> None:
    # (150 - 25) K / 0.5 W = 250 K/W; with a limit of 125 C 200 K/W of 75 K.
    one = margin(follower({"power": "0.5 W"}), "junction_temperature", "Q1")
    same = margin(follower({"thermal_resistance": "250 K/W"}), "junction_temperature", "Q1")
    assert one.margin == pytest.approx(same.margin)
    found = margin(follower({"power": "0.5 W", "t_j_max": "125 C"}), "junction_temperature", "Q1")
    assert found.capability == pytest.approx(75.0)
    other = margin(follower({"thermal_resistance": "200 K/W", "t_j_max": "125 C"}), "junction_temperature", "Q1")
    assert found.margin == pytest.approx(other.margin)


def test_without_any_figure_it_is_unknown() -> None:
    found = margin(follower({}), "junction_temperature", "Q1")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, "missing: thermal_resistance of Q1")


@pytest.mark.parametrize(
    ("seconds", "share"), [(0.0, 0.0), (1e-4, 0.01), (0.01, 0.1), (0.25, 0.5), (1.0, 1.0), (9.0, 1.0)]
)
def test_transient_resistance(seconds: float, share: float) -> None:
    assert transient(np.array([seconds]), 1.0)[0] == pytest.approx(share)


def test_a_pulse_between_the_moments() -> None:
    # 10 ms of 0.2 W, seen by no moment: at most 0.1 of 200 K/W x 0.2 W = 4 K; for ever it would be 40 K.
    pulse = ((0.0, 0.0), (0.1, 0.0), (0.1001, 5.7), (0.11, 5.7), (0.1101, 0.0))
    found = margin(follower({"thermal_resistance": "200 K/W"}, pulse), "junction_temperature", "Q1")
    assert found.demand == pytest.approx(4.0, rel=0.1)
    # A slow package feels less of it.
    slow = margin(
        follower({"thermal_resistance": "200 K/W", "thermal_time": "25 s"}, pulse), "junction_temperature", "Q1"
    )
    assert slow.demand == pytest.approx(0.8, rel=0.1)


def test_a_thermal_capacity_follows_the_loss() -> None:
    # 0.1 s of 0.2 W into 200 K/W and 5 mJ/K: tau = 1 s, rise 40 K (1 - exp(-0.1)) = 3.8 K; for ever it would be 40 K.
    pulse = ((0.0, 0.0), (0.1, 0.0), (0.1001, 5.7), (0.2, 5.7), (0.2001, 0.0))
    data = {"thermal_resistance": "200 K/W", "thermal_capacity": "5 mJ/K"}
    found = margin(follower(data, pulse), "junction_temperature", "Q1")
    assert found.demand == pytest.approx(40.0 * (1.0 - math.exp(-0.1)), rel=0.03)
    # What still flows at the end of the sequence is taken to last.
    lasting = margin(follower(data, ((0.0, 0.0), (0.5, 0.0), (0.501, 5.7))), "junction_temperature", "Q1")
    assert lasting.demand == pytest.approx(40.0, rel=0.03)


def test_a_loss_in_standby_counts_once() -> None:
    # 0.2 W at the moment stand-by and at all times: 40 K, however short the sequence is beside 100 s.
    data = {"thermal_resistance": "200 K/W", "thermal_capacity": "0.5 J/K"}
    found = margin(follower(data, moments={"standby": "0.5 s"}), "junction_temperature", "Q1")
    assert found.demand == pytest.approx(40.0, rel=0.03)


def test_a_zener_has_its_heat_too() -> None:
    # 5 V, 20 mA: 0.1 W and (150 - 25)/0.5 = 250 K/W: 25 K.
    of = design(
        exact(resistor("R1", "supply", "z", "200R")),
        exact(two("zener", "D1", "0V", "z", "5 V", **{"class": "zener 0.5 W"})),
        ambient="25 C",
    )
    found = margin(of, "junction_temperature", "D1")
    assert found.demand == pytest.approx(25.0, rel=0.05)
    assert math.isclose(found.capability or 0.0, 125.0)
