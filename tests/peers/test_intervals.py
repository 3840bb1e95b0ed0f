"""Timed intervals of three units against SUNDIALS IDA and SciPy's Radau on the same equations at tight tolerance.

The equations of the peers are those of :mod:`.network`, written from the published laws. Requirement of the project:
intervals within 5e-4 at the engine's own tolerance; triggers at the edge of firing as at tight tolerance in at least
99.5 % of 1,000 lanes.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

pytest.importorskip("sksundae", reason="the peer SUNDIALS comes with scikit-sundae")

from stagebook.engine.primitives.columns import Lanes
from stagebook.engine.primitives.signals import Anchor, level, voltage
from stagebook.engine.run import run

from .lanes import lanes_of
from .network import Network, jacobian, residual
from .solvers import ida, radau
from .units import Unit, flasher, latch_alarm, relay_timer

BAR = 5e-4
UNITS = [latch_alarm, flasher, relay_timer]


def engine_interval(unit: Unit, **options: float) -> float:
    seen = unit.setup.run(*unit.rows, **options)
    begin, end = (float(seen.value(row)[0]) for row in unit.rows)
    return end - begin


@pytest.mark.parametrize("make", UNITS)
def test_timed_intervals_are_those_of_ida(make: Callable[[], Unit]) -> None:
    unit = make()
    exact = unit.interval(ida(Network.of(unit.document), unit.watches, 1e-7, 1e-9))
    assert engine_interval(unit) == pytest.approx(exact, rel=BAR)
    assert engine_interval(unit, relative=1e-5) == pytest.approx(exact, rel=BAR / 10)


@pytest.mark.benchmark
@pytest.mark.parametrize("make", UNITS)
def test_both_peers_agree_and_the_engine_comes_to_them(make: Callable[[], Unit]) -> None:
    unit = make()
    network = Network.of(unit.document)
    exact = unit.interval(radau(network, unit.watches, 1e-7, 1e-9))
    by_ida = unit.interval(ida(network, unit.watches, 1e-8, 1e-9))
    print(f"\n{make.__name__}: Radau {exact:.8g} s, IDA {by_ida / exact - 1:+.1e}")
    for relative in (1e-3, 1e-4, 1e-5, 1e-6):
        work = unit.setup.run(relative=relative).results.work[0]
        error = engine_interval(unit, relative=relative) / exact - 1
        print(f"figure: {make.__name__}_error_at_{relative:g} = {error:+.2e} 1 ({work[0]} steps, {work[2]} iterations)")
    assert by_ida == pytest.approx(exact, rel=1e-6)
    assert engine_interval(unit, relative=1e-6) == pytest.approx(exact, rel=1e-5)


@pytest.mark.parametrize("make", UNITS)
def test_the_jacobian_of_the_peers_is_the_derivative_of_their_residual(make: Callable[[], Unit]) -> None:
    network = Network.of(make().document)
    random = np.random.default_rng(3)
    n, cj, step = len(network.names), 1e3, 1e-6
    y, yp, p = random.uniform(-0.5, 0.5, n), random.uniform(-1e3, 1e3, n), network.p.copy()
    made = np.empty((n, n))
    y.flags.writeable = yp.flags.writeable = False
    jacobian(0.0, y, yp, cj, 1.0, made, network.rows, p)
    for k in range(n):
        sides = []
        for sign in (1.0, -1.0):
            moved = np.zeros(n)
            moved[k] = sign * step
            out = np.empty(n)
            at, rate = y + moved, yp + cj * moved
            at.flags.writeable = rate.flags.writeable = False
            residual(0.0, at, rate, out, network.rows, p)
            sides.append(out)
        numeric = (sides[0] - sides[1]) / (2 * step)
        # A difference of currents of up to an ampere keeps some nine digits.
        assert numeric == pytest.approx(made[:, k], rel=1e-6, abs=1e-9 + 1e-6 * np.max(np.abs(made[:, k])))


def test_triggers_at_the_edge_of_firing_are_judged_as_at_tight_tolerance() -> None:
    # The kick of C3 decides. With the capacitor that just fires the nominal unit, half of 3,000 random units fire.
    unit = latch_alarm(ends=5.03)
    circuit, fired = unit.setup.circuit, level(voltage("on"), Anchor(5.029))

    def fires(lanes: Lanes, relative: float) -> np.ndarray:
        seen = run(circuit, lanes, unit.setup.program(lanes), [fired], relative=relative)
        assert not seen.failed.any()
        return seen.value(fired) > 3.0

    def edge(relative: float) -> float:
        low, high = 1e-11, 1e-8
        for _ in range(3):  # 64 capacitors in a row narrow the bounds three times, to a thousandth of a percent
            tried = np.geomspace(low, high, 64)
            first = int(np.argmax(fires(unit.setup.lanes({("C3", "value"): tried}), relative)))
            low, high = tried[first - 1], tried[first]
        return float(np.sqrt(low * high))

    exact = edge(1e-5)
    print(f"\nfigure: trigger_threshold_error = {edge(1e-3) / exact - 1:+.1e} 1")
    assert edge(1e-3) == pytest.approx(exact, rel=2.5e-3)
    lanes = lanes_of(unit, 3000)
    lanes = lanes.replaced({("C3", "value"): lanes["C3", "value"] * exact / 10e-9})
    tight = fires(lanes, 1e-5)
    assert 900 < np.count_nonzero(tight) < 2100
    agree = float(np.mean(fires(lanes, 1e-3) == tight))
    print(f"figure: marginal_triggers_as_at_tight_tolerance = {100 * agree:.1f} %")
    assert agree >= 0.995
