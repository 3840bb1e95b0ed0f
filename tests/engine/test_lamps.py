"""Filament lamps: rated point, inrush, steady law, and the kernel's warm conductance beside an independent solution.

Laws and sources: ``engine/parts/lamp.py``. Independent: Radau of SciPy on the same two equations, written out here.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from stagebook.engine.errors import CircuitError
from stagebook.engine.kernel.linearised import linearised
from stagebook.engine.kernel.vectors import WIDTH
from stagebook.engine.primitives.signals import Anchor, crossing, integral, level, maximum, voltage
from stagebook.engine.studies.waves import waves

from .circuits import Setup, resistor, setup, two

LAMP = {"current": "0.8 A", "data": {"rated_voltage": "12 V", "cold_ratio": "12", "inrush_time": "20 ms"}}
TEMPERATURE = "E1 temperature"


def lit(volts: str = "12 V", ends: float = 1.0, source: str = "0R", ohms: str = "1uR", **more: object) -> Setup:
    """A lamp of 12 V and 0.8 A (9.6 W) on a supply that comes at once, behind a resistor."""
    series = resistor("R1", "supply", "n", "0.001" if ohms == "1uR" else ohms)
    return setup(series, two("lamp", "E1", "n", "0V", **{**LAMP, **more}), supply=volts, ends=ends, source=source)


def test_rated_point_inrush_and_its_time() -> None:
    # 12 times the rated current cold, twice at 20 ms by definition of the figure, once at the end; 2365 K = 298.15 K
    # x 12^(1/1.2). The supply rises within 100 ns, the resistor takes 0.1 %.
    case = lit()
    current = case.circuit.benches["E1"].currents["a"]
    rows = (
        maximum(current),
        crossing(current, 1.6, False),
        level(current, Anchor(0.99)),
        level(voltage(TEMPERATURE), Anchor(0.99)),
    )
    seen = case.run(*rows)
    inrush, half, steady, rise = (float(seen.value(row)[0]) for row in rows)
    assert inrush == pytest.approx(9.6, rel=0.01)
    assert half == pytest.approx(20e-3, rel=0.01)
    assert steady == pytest.approx(0.8, rel=1e-3)
    assert rise == pytest.approx(298.15 * 12 ** (1 / 1.2) - 298.15, rel=2e-3)


@pytest.mark.parametrize("volts", [9.0, 15.0])
def test_the_steady_current_goes_as_tables_say(volts: float) -> None:
    # I ~ V^0.55 of incandescent lamps near their rating (lighting handbooks, from memory); the law has 0.538.
    case = lit(f"{volts} V", ends=2.0)
    current = level(case.circuit.benches["E1"].currents["a"], Anchor(1.99))
    found = float(case.run(current).value(current)[0])
    assert found == pytest.approx(0.8 * (volts / 12.0) ** 0.55, rel=0.01)
    draw = case.circuit.benches["E1"].draw
    assert draw is not None
    assert draw(case.lanes(), np.array([volts]))[0] == pytest.approx(found, rel=2e-3)


def test_an_independent_solution_through_a_resistor() -> None:
    # The lamp behind 5 ohm, 12 V at once: C dT/dt = g(T) v^2 - s (T^4 - T_a^4), v = 12 V / (1 + 5 ohm g).
    case = lit(ohms="5R", ends=0.3)
    hot, cold, watts = 298.15 * 12 ** (1 / 1.2), 298.15, 9.6
    capacity = float(case.circuit.table(case.lanes())[0, case.circuit.parameter(1, 0)])

    def g(kelvin: float) -> float:
        return 0.8 / 12.0 * (hot / kelvin) ** 1.2

    def slope(_: float, rise: np.ndarray) -> np.ndarray:
        kelvin = rise[0] + cold
        v = 12.0 / (1.0 + 5.0 * g(kelvin))
        return np.array([(g(kelvin) * v * v - watts * (kelvin**4 - cold**4) / (hot**4 - cold**4)) / capacity])

    times = [0.003, 0.01, 0.03, 0.1, 0.29]
    other = solve_ivp(slope, (0.0, 0.3), [0.0], "Radau", t_eval=times, rtol=1e-9, atol=1e-6).y[0]
    rows = [level(voltage(TEMPERATURE), Anchor(t)) for t in times]
    energy = integral(case.circuit.benches["E1"].power)  # type: ignore[arg-type]
    seen = case.run(*rows, energy)
    assert [float(seen.value(row)[0]) for row in rows] == pytest.approx(other, rel=2e-3)
    # All heat is either stored or radiated; at the end it is hardly stored any more.
    assert float(seen.value(energy)[0]) > capacity * other[-1]


@pytest.mark.parametrize("rise", [0.0, 300.0, 1900.0])
def test_the_matrix_is_the_derivative_at_any_temperature(rise: float) -> None:
    # Central differences of what the kernel itself says flows (mathematics, no source).
    circuit = lit().circuit
    parameters = circuit.table(circuit.nominal())
    state = np.zeros(int(circuit.topology.size[2]))
    state[circuit.index("n")], state[circuit.index(TEMPERATURE)] = 8.0, rise
    free = int(circuit.topology.size[1])

    def flows(x: np.ndarray) -> np.ndarray:
        return linearised(circuit.topology, parameters, len(circuit.source_names), x[None]).current[0][:free]

    matrix = linearised(circuit.topology, parameters, len(circuit.source_names), state[None]).conductance[0]
    for column, step in ((circuit.index("n"), 1e-4), (circuit.index(TEMPERATURE), 1e-2)):
        moved = np.zeros_like(state)
        moved[column] = step
        slopes = (flows(state + moved) - flows(state - moved)) / (2 * step)
        assert slopes == pytest.approx(matrix[:, column], rel=1e-6, abs=1e-12)


def test_eight_lanes_are_as_one_alone() -> None:
    changes = {("E1", "current"): np.linspace(0.7, 0.9, WIDTH + 1)}
    case = lit(ends=0.05)
    together = case.run(changes=changes).final
    alone = case.run(changes={("E1", "current"): changes["E1", "current"][3:4]}).final
    assert np.array_equal(together[3], alone[0])


def test_waves_tell_the_temperature_in_degrees_when_asked() -> None:
    design = lit(ends=0.5).design
    assert waves(design).nets == ("n", "supply")
    asked = waves(design, nets=[TEMPERATURE], at=[0.0, 0.5])
    assert asked.values[:, 0] == pytest.approx([25.0, 298.15 * 12 ** (1 / 1.2) - 273.15], rel=2e-3)


@pytest.mark.parametrize(("ratio", "words"), [("1.5", "10 to 14 times"), ("40", "10 to 14 times")])
def test_a_ratio_that_no_filament_has_is_refused(ratio: str, words: str) -> None:
    with pytest.raises(CircuitError, match=words):
        lit(data={"rated_voltage": "12 V", "cold_ratio": ratio}).circuit  # noqa: B018
