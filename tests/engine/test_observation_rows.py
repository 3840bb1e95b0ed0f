"""Every kind of observation row against closed forms, with windows that wait for other rows."""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.primitives.signals import (
    Anchor,
    Row,
    Signal,
    crossing,
    integral,
    lagged,
    level,
    maximum,
    minimum,
    slew,
    voltage,
)

from .circuits import Setup, capacitor, resistor, setup, sine, steps

PERIOD, OFFSET, AMPLITUDE = 10e-3, 1.0, 2.0


@pytest.fixture(scope="module")
def wave() -> Setup:
    """A net that follows 1 V + 2 V sin(2 pi t / 10 ms) behind a resistor divider of one half."""
    return setup(
        sine("G1", "in", "0V", AMPLITUDE, 1 / PERIOD, OFFSET),
        resistor("R1", "in", "mid", "1k"),
        resistor("R2", "mid", "0V", "1k"),
        supply=None,
        ends=5 * PERIOD,
    )


def observed(circuit: Setup, row: Row, **options: object) -> float:
    return float(circuit.run(row, **options).value(row)[0])


@pytest.mark.parametrize("nth", [1, 2, 5])
@pytest.mark.parametrize("rising", [True, False])
def test_the_nth_crossing_of_a_sine(wave: Setup, nth: int, rising: bool) -> None:
    # 1 + 2 sin(x) = 2 at x = 30 and 150 degrees.
    first = PERIOD * (30.0 if rising else 150.0) / 360.0
    row = crossing(voltage("in"), 2.0, rising, nth=nth)
    seen = wave.run(row)
    # Between points a twentieth of a period apart a sine is a parabola to 1e-4 of its amplitude.
    assert seen.value(row)[0] == pytest.approx(first + (nth - 1) * PERIOD, abs=2e-4 * PERIOD)
    assert seen.time(row)[0] == seen.value(row)[0]


def test_a_crossing_that_does_not_come_that_often_is_not_seen(wave: Setup) -> None:
    often, never = crossing(voltage("in"), 2.0, True, nth=6), crossing(voltage("in"), 3.5, True)
    seen = wave.run(often, never)
    for row in (often, never):
        assert not seen.seen(row)[0]
        assert math.isnan(seen.value(row)[0])
        assert math.isnan(seen.time(row)[0])


def test_being_above_a_level_is_not_a_crossing(wave: Setup) -> None:
    # The window opens while the signal is above 2 V: the next rise counts, not the level.
    row = crossing(voltage("in"), 2.0, True, start=Anchor(0.25 * PERIOD))
    assert observed(wave, row) == pytest.approx(PERIOD * (1 + 30 / 360), abs=2e-4 * PERIOD)


def test_a_window_keeps_crossings_out(wave: Setup) -> None:
    row = crossing(voltage("in"), 2.0, True, start=Anchor(0.25 * PERIOD), end=Anchor(0.9 * PERIOD))
    assert not wave.run(row).seen(row)[0]


@pytest.mark.parametrize("phase", [0.0, 0.1, 0.31, 0.77, 2.45])
def test_levels_at_any_instant(wave: Setup, phase: float) -> None:
    row = level(voltage("mid"), Anchor(phase * PERIOD))
    exact = 0.5 * (OFFSET + AMPLITUDE * math.sin(2 * math.pi * phase))
    # At 0 s a level is what stood before anything happened: nothing, without starting voltages.
    assert observed(wave, row) == pytest.approx(exact if phase else 0.0, abs=1e-3)


def test_a_level_after_the_end_is_not_seen(wave: Setup) -> None:
    row = level(voltage("mid"), Anchor(6 * PERIOD))
    assert not wave.run(row).seen(row)[0]


def test_extremes_and_when_they_are(wave: Setup) -> None:
    highest, lowest = maximum(voltage("in")), minimum(voltage("in"))
    seen = wave.run(highest, lowest)
    # A sine is looked at twice in a twentieth of its period: its top is met within 1 - cos(9 degrees) / 2 of the swing.
    assert seen.value(highest)[0] == pytest.approx(3.0, abs=0.012 * AMPLITUDE)
    assert seen.value(lowest)[0] == pytest.approx(-1.0, abs=0.012 * AMPLITUDE)
    assert seen.time(highest)[0] / PERIOD % 1.0 == pytest.approx(0.25, abs=0.03)
    assert seen.time(lowest)[0] / PERIOD % 1.0 == pytest.approx(0.75, abs=0.03)


def test_extremes_of_a_monotonous_window_are_its_ends(wave: Setup) -> None:
    window = Anchor(0.30 * PERIOD), Anchor(0.62 * PERIOD)
    highest, lowest = maximum(voltage("in"), *window), minimum(voltage("in"), *window)
    seen = wave.run(highest, lowest)
    for row, phase in ((highest, 0.30), (lowest, 0.62)):
        assert seen.value(row)[0] == pytest.approx(OFFSET + AMPLITUDE * math.sin(2 * math.pi * phase), abs=2e-3)
        assert seen.time(row)[0] == pytest.approx(phase * PERIOD, rel=1e-6)


@pytest.mark.parametrize("seconds", [1e-4, 3e-3, 1.0])
def test_what_lags_is_what_a_filter_would_show(seconds: float) -> None:
    # y' = (s - y) / tau is a resistance and a capacitance: the same circuit has one of the same time constant.
    pulses = [(0.0, 0.0), (2e-3, 4.0), (3e-3, 4.0), (3.1e-3, 0.0), (8e-3, 0.0), (8.1e-3, 3.0), (9e-3, 1.0)]
    case = setup(
        steps("G1", "in", "0V", *pulses),
        resistor("R1", "in", "n", "1k"),
        capacitor("C1", "n", "0V", seconds / 1e3),
        supply=None,
        ends=12e-3,
    )
    lag, filtered = lagged(voltage("in"), seconds), maximum(voltage("n"))
    seen = case.run(lag, filtered, relative=1e-5)
    assert seen.value(lag)[0] == pytest.approx(seen.value(filtered)[0], rel=1e-3)
    assert seen.time(lag)[0] == pytest.approx(seen.time(filtered)[0], abs=0.2e-3)


def test_what_lags_in_a_window_begins_at_nothing(wave: Setup) -> None:
    # From the top of the sine on, 3 V falling: y of a lag of one second is the integral from there, at most where the
    # window ends with the signal still above y.
    window = Anchor(0.25 * PERIOD), Anchor(0.5 * PERIOD)
    whole = OFFSET * 0.25 * PERIOD + AMPLITUDE * PERIOD / (2 * math.pi)
    assert observed(wave, lagged(voltage("in"), 1.0, *window)) == pytest.approx(whole, rel=3e-3)


@pytest.mark.parametrize("window", [(0.0, 1.0), (0.0, 0.5), (0.13, 0.21), (0.4, 3.7)])
def test_integrals_over_windows(wave: Setup, window: tuple[float, float]) -> None:
    low, high = window
    row = integral(voltage("in"), Anchor(low * PERIOD), Anchor(high * PERIOD))
    turn = 2 * math.pi
    exact = PERIOD * (OFFSET * (high - low) - AMPLITUDE / turn * (math.cos(turn * high) - math.cos(turn * low)))
    assert observed(wave, row) == pytest.approx(exact, abs=3e-4 * PERIOD)


def test_an_integral_without_an_end_goes_to_the_end(wave: Setup) -> None:
    assert observed(wave, integral(voltage("in"))) == pytest.approx(5 * PERIOD * OFFSET, rel=1e-3)


def test_charge_through_a_resistor_is_that_on_the_capacitor() -> None:
    circuit = setup(resistor("R1", "supply", "t", "10k"), capacitor("C1", "t", "0V", "1 uF"), supply="9 V", ends=50e-3)
    bench = circuit.circuit.benches["R1"]
    charge, heat = integral(bench.currents["a"]), integral(bench.power)
    seen = circuit.run(charge, heat, relative=1e-4)
    assert seen.value(charge)[0] == pytest.approx(9e-6 * (1 - math.exp(-5)), rel=1e-3)
    # Half of the energy is lost, whatever the resistor: C V^2 / 2 (1 - exp(-2 t / RC)).
    assert seen.value(heat)[0] == pytest.approx(0.5 * 1e-6 * 81.0 * (1 - math.exp(-10)), rel=1e-3)


def test_the_steepest_slope_of_a_ramp_and_of_a_charge() -> None:
    circuit = setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-3, 5.0), (2e-3, 5.0), (4e-3, 2.0)),
        resistor("R1", "in", "t", "10k"),
        capacitor("C1", "t", "0V", "10 nF"),
        supply=None,
        ends=4e-3,
    )
    straight, falling = slew(voltage("in")), slew(voltage("in"), Anchor(2.1e-3))
    filtered = slew(voltage("t"))
    seen = circuit.run(straight, falling, filtered)
    assert seen.value(straight)[0] == pytest.approx(5e3, rel=1e-6)
    assert seen.value(falling)[0] == pytest.approx(1.5e3, rel=1e-6)
    assert seen.value(filtered)[0] == pytest.approx(5e3 * (1 - math.exp(-10)), rel=0.01)  # tau 0.1 ms


def test_rows_that_wait_for_others(wave: Setup) -> None:
    rise = crossing(voltage("in"), 2.0, True, nth=2)
    fall = crossing(voltage("in"), 2.0, False, start=Anchor(0.0, rise))
    after = level(voltage("in"), Anchor(0.1 * PERIOD, fall))
    highest = maximum(voltage("in"), Anchor(0.0, fall), Anchor(0.3 * PERIOD, fall))
    above = integral(voltage("in"), Anchor(0.0, rise), Anchor(0.0, fall))
    seen = wave.run(after, highest, above, fall)
    start = PERIOD * (1 + 30 / 360)
    assert seen.value(rise)[0] == pytest.approx(start, abs=2e-4 * PERIOD)
    assert seen.value(fall)[0] == pytest.approx(start + PERIOD / 3, abs=3e-4 * PERIOD)
    turn = 2 * math.pi
    assert seen.value(after)[0] == pytest.approx(1 + 2 * math.sin(turn * (150 / 360 + 0.1)), abs=5e-3)
    assert seen.value(highest)[0] == pytest.approx(2.0, abs=5e-3)
    exact = PERIOD * (1 / 3 + 2 / turn * 2 * math.cos(math.pi / 6))
    assert seen.value(above)[0] == pytest.approx(exact, rel=2e-3)


def test_what_waits_for_a_row_that_never_comes_is_not_seen(wave: Setup) -> None:
    never = crossing(voltage("in"), 3.5, True)
    rows = [
        level(voltage("in"), Anchor(1e-3, never)),
        maximum(voltage("in"), Anchor(0.0, never)),
        integral(voltage("in"), Anchor(0.0), Anchor(0.0, never)),
        crossing(voltage("in"), 1.5, True, start=Anchor(0.0, never)),
    ]
    seen = wave.run(*rows)
    assert [bool(seen.seen(row)[0]) for row in rows] == [False] * 4


def test_the_stop_row_ends_the_lane_and_completes_what_ended_with_it(wave: Setup) -> None:
    stop = crossing(voltage("in"), 2.0, False)
    until = maximum(voltage("in"), Anchor(0.0), Anchor(0.0, stop))
    total = integral(voltage("in"), Anchor(0.0), Anchor(0.0, stop))
    later = level(voltage("in"), Anchor(2 * PERIOD))
    whole = wave.run(until, total, later)
    seen = wave.run(until, total, later, stop=stop)
    assert seen.results.ended_at[0] == pytest.approx(PERIOD * 150 / 360, abs=0.06 * PERIOD)
    assert seen.results.ended_at[0] < whole.results.ended_at[0]
    assert not seen.seen(later)[0]
    for row in (until, total):
        assert seen.value(row)[0] == whole.value(row)[0]


def test_a_window_that_closes_with_the_sequence_is_complete(wave: Setup) -> None:
    rise = crossing(voltage("in"), 2.0, True, nth=5)
    end = Anchor(5 * PERIOD - PERIOD * (4 + 30 / 360), rise)  # about the end of the sequence
    just, beyond = (
        maximum(voltage("in"), Anchor(0.0), Anchor(end.by + shift, rise)) for shift in (-1e-3 * PERIOD, 1e-3 * PERIOD)
    )
    seen = wave.run(just, beyond)
    assert seen.value(just)[0] == pytest.approx(3.0, abs=0.03)
    assert not seen.seen(beyond)[0]


def test_signals_add_and_scale(wave: Setup) -> None:
    total = voltage("in").scaled(2.0) + voltage("mid", "in")
    at = Anchor(0.1 * PERIOD)
    parts = [level(voltage("in"), at), level(voltage("mid"), at)]
    whole = level(total, at)
    seen = wave.run(whole, *parts)
    into, mid = (seen.value(row)[0] for row in parts)
    assert seen.value(whole)[0] == pytest.approx(2 * into + mid - into, rel=1e-12)
    assert isinstance(total, Signal)


def test_the_same_row_twice_is_one_row(wave: Setup) -> None:
    rows = [level(voltage("in"), Anchor(1e-3)), level(voltage("in"), Anchor(1e-3))]
    assert wave.run(*rows).results.value.shape == (1, 1)


def test_each_lane_has_rows_of_its_own() -> None:
    circuit = setup(resistor("R1", "supply", "t", "1k"), capacitor("C1", "t", "0V", "1 uF"), supply="9 V", ends=20e-3)
    half = crossing(voltage("t"), 4.5, True)
    late = level(voltage("t"), Anchor(1e-3, half))
    ohms = np.array([1e3, 2e3, 5e3, 50e3])
    seen = circuit.run(late, changes={("R1", "value"): ohms})
    assert seen.seen(half).tolist() == [True, True, True, False]
    assert seen.value(late)[:3] == pytest.approx(9 - 4.5 * np.exp(-1e-3 / (ohms[:3] * 1e-6)), abs=0.03)
    assert math.isnan(seen.value(late)[3])
