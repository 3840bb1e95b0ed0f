"""The emitter-coupled trigger: thresholds of a real transistor law against those that SciPy finds on the same law.

Design from the open textbook-companion data set of the FOSSEE project, 863/6/6.1, recomputed: upper threshold 5 V,
I_C 2 mA, h_FE 100, 12 V: Re 2150, Rc 3750, R2 25 000, R1 28 068.182 ohm. It takes V_BE as 0.7 V at any current.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import optimize

from stagebook.engine.primitives.signals import Anchor, crossing, level, voltage

from .circuits import Setup, resistor, setup, steps, transistor

VT = 0.025692579121493725  # kT/q at 25 C
SATURATION = 2e-3 / math.exp(0.7 / VT)
FORWARD, REVERSE = 100.0, 1.0
EMITTER, COLLECTOR, LOWER, UPPER, SUPPLY = 2150.0, 3750.0, 25e3, 28068.182, 12.0


def test_the_design_is_the_printed_one() -> None:
    current = 2e-3
    assert (5.0 - 0.7) / current == pytest.approx(EMITTER)
    assert (SUPPLY - 4.3 - 0.2) / current == pytest.approx(COLLECTOR)
    divider = 0.1 * current
    assert 5.0 / divider == pytest.approx(LOWER)
    assert (SUPPLY - 5.0) / (divider + current / FORWARD) - COLLECTOR == pytest.approx(UPPER, abs=1e-3)


def trigger(slow: float) -> Setup:
    """The input rises to 8 V and falls again, each within ``slow`` seconds."""
    law = {
        "saturation_current": SATURATION,
        "forward_gain": FORWARD,
        "reverse_gain": REVERSE,
        "base_emitter_capacitance": "10 pF",
        "base_collector_capacitance": "5 pF",
    }
    return setup(
        steps("G1", "in", "0V", (0.0, 0.0), (slow, 8.0), (2 * slow, 0.0)),
        transistor("Q1", "c1", "in", "e", law=law),
        transistor("Q2", "c2", "b2", "e", law=law),
        resistor("R1", "c1", "b2", UPPER),
        resistor("R2", "b2", "0V", LOWER),
        resistor("R3", "supply", "c1", COLLECTOR),
        resistor("R4", "supply", "c2", COLLECTOR),
        resistor("R5", "e", "0V", EMITTER),
        supply="12 V",
        ends=2 * slow,
    )


def residual(x: np.ndarray, first: float) -> list[float]:
    """Kirchhoff's law at c1, b2, c2, e for the base-emitter voltage ``first`` of Q1 (Ebers, Moll 1954)."""
    c1, b2, c2, e = x

    def currents(vbe: float, vbc: float) -> tuple[float, float]:
        forward, reverse = (SATURATION * math.expm1(min(v, 1.2) / VT) for v in (vbe, vbc))
        return forward - reverse - reverse / REVERSE, forward / FORWARD + reverse / REVERSE

    i1, base1 = currents(first, e + first - c1)
    i2, base2 = currents(b2 - e, b2 - c2)
    return [
        1e3 * ((SUPPLY - c1) / COLLECTOR - i1 - (c1 - b2) / UPPER),
        1e3 * ((c1 - b2) / UPPER - b2 / LOWER - base2),
        1e3 * ((SUPPLY - c2) / COLLECTOR - i2),
        1e3 * (i1 + base1 + i2 + base2 - e / EMITTER),
    ]


def thresholds() -> tuple[float, float]:
    """Turning points of the input voltage over the base-emitter voltage of Q1: where the trigger must flip."""
    state = np.array([11.0, 5.0, 4.6, 4.3])
    inputs = []
    for first in np.arange(0.45, 0.70, 2e-4):
        found = optimize.root(residual, state, args=(first,), method="lm", tol=1e-13)
        assert np.max(np.abs(found.fun)) < 1e-9  # mA
        state = found.x
        inputs.append(state[3] + first)
    top = int(np.argmax(inputs[:800]))  # up to 0.61 V; beyond the fold the curve rises again
    return float(inputs[top]), float(np.min(inputs[top:]))


def test_thresholds_are_the_turning_points_of_the_static_characteristic() -> None:
    slow = 0.2
    up = crossing(voltage("c2"), 9.0, rising=True)
    down = crossing(voltage("c2"), 9.0, rising=False, start=Anchor(0.0, up))
    at_up, at_down = level(voltage("in"), Anchor(0.0, up)), level(voltage("in"), Anchor(0.0, down))
    seen = trigger(slow).run(up, down, at_up, at_down)
    upper, lower = thresholds()
    assert seen.value(at_up)[0] == pytest.approx(upper, abs=5e-3)
    assert seen.value(at_down)[0] == pytest.approx(lower, abs=5e-3)
    # Q1 takes over from some ten microamperes on, at less than the 0.7 V of the design: some 0.1 V below 5 V.
    assert 4.8 < upper < 4.95
    assert lower < upper - 1.0
