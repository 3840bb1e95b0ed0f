"""The figures of the accuracy table in README that need no peer: published digits and closed forms, with the work.

Sources stand in the tests whose circuits these are.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.primitives.signals import Anchor, crossing, level, voltage

from ..engine import test_multivibrators as multivibrators
from ..engine import test_schmitt_trigger as schmitt
from ..engine import test_transistor_amplifier as published

pytestmark = pytest.mark.benchmark


def test_the_published_amplifier_over_tolerances() -> None:
    amplifier = published.amplifier.__wrapped__()
    for relative in (1e-3, 1e-4, 1e-5, 1e-6):
        worst = float(np.max(np.abs(published.errors(amplifier, relative))))
        work = amplifier.run(relative=relative).results.work[0]
        print(
            f"\nfigure: amplifier_error_at_{relative:g} = {worst:.2e} V ({work[0]} steps, {work[2]} iterations)", end=""
        )
        assert worst < published.LARGEST_ERROR[relative]


def test_the_astable_against_its_closed_forms() -> None:
    law = multivibrators.sharp_law(9.0, 0.0257)
    constant = math.log((18.0 - 0.7 - 0.2) / (9.0 - 0.7)) / math.log(2.0)
    saturation = float(law["saturation_current"])
    threshold = 0.0257 * math.log(0.0257 / multivibrators.COLLECTOR_OHMS / saturation)
    early = math.log((18.0 - 0.7 - 0.2) / (9.0 - threshold)) / math.log(2.0)
    found = multivibrators.period(9.0, law)
    print(f"\nfigure: astable_period_against_constant_v_be = {100 * (found / constant - 1):+.2f} %", end="")
    print(f"\nfigure: astable_period_against_unit_loop_gain = {100 * (found / early - 1):+.2f} %", end="")
    assert found == pytest.approx(early, rel=3e-3)


def test_the_thresholds_of_the_schmitt_trigger() -> None:
    up = crossing(voltage("c2"), 9.0, rising=True)
    down = crossing(voltage("c2"), 9.0, rising=False, start=Anchor(0.0, up))
    rows = level(voltage("in"), Anchor(0.0, up)), level(voltage("in"), Anchor(0.0, down))
    seen = schmitt.trigger(0.2).run(up, down, *rows)
    upper, lower = schmitt.thresholds()
    found = [float(seen.value(row)[0]) for row in rows]
    print(f"\nfigure: schmitt_upper_threshold_against_design = {1e3 * (found[0] - 5.0):+.0f} mV", end="")
    for name, each, exact in zip(("upper", "lower"), found, (upper, lower), strict=True):
        print(f"\nfigure: schmitt_{name}_threshold_against_turning_point = {1e3 * (each - exact):+.1f} mV", end="")
        assert each == pytest.approx(exact, abs=5e-3)
