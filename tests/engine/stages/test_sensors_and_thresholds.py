"""Front ends, Schmitt trigger, end-of-line loop: where they trip (bridge and divider exact; junctions from memory)."""

from __future__ import annotations

import math

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import DesignError
from stagebook.engine.stages.row import Choice

from ..circuits import Json, Setup
from .made import PIEZO, at, begins, choice, made, passing, run, seconds, value

SCHMITT = choice("schmitt_trigger", "schmitt", threshold="0.4", hysteresis="0.12")


def ramped(front: Choice, part: str, rest: str, to: str, back: str) -> Design:
    """A front end whose quantity goes slowly beyond its trip point and back."""
    document = made(front, SCHMITT, PIEZO).dump()
    events: list[Json] = [
        {"at": "0 s", "event": "connect supply", "rise": "20 ms"},
        {"at": "0 s", "event": "set", "part": part, "to": rest},
        {"at": "1 s", "event": "ramp", "part": part, "to": to, "for": "10 s"},
        {"at": "12 s", "event": "ramp", "part": part, "to": back, "for": "10 s"},
    ]
    document["sequences"]["alarm"] = {"events": events, "ends": "23 s"}
    return Design.load(document)


def trips(design: Design, net: str) -> tuple[float, float]:
    """Volts of the front end where the trigger goes over and where it goes back."""
    over = passing("schmitt.out", 6.0, rising=True)
    back = passing("schmitt.out", 6.0, rising=False)
    seen = Setup(design).run(over, back)
    # A moment before: as it goes over it takes base current from its source.
    instants = [at(net, seconds(seen, row) - 0.01) for row in (over, back)]
    levels = Setup(design).run(*instants)
    return float(levels.value(instants[0])[0]), float(levels.value(instants[1])[0])


def test_the_schmitt_trigger_has_the_thresholds_that_were_asked_for() -> None:
    # 0.4 x 12 V = 4.8 V and 0.12 x 12 V = 1.44 V below it; junctions are taken as 0.65 V: within 4 % of the rail.
    water = choice("water_front_end", "water", wet="50k", dry="500k")
    upper, lower = trips(ramped(water, "B1", "5M", "20k", "5M"), "water.out")
    assert upper == pytest.approx(4.8, abs=0.48)
    assert upper - lower == pytest.approx(1.44, abs=0.4)


def test_a_hysteresis_below_the_output_s_own_is_refused() -> None:
    with pytest.raises(DesignError, match=r"stage schmitt, setting hysteresis: the output alone makes .* of the rail"):
        made(
            choice("light_front_end"), choice("schmitt_trigger", "schmitt", threshold="0.8", hysteresis="0.002"), PIEZO
        )


def test_the_water_front_end_trips_between_wet_and_dry() -> None:
    # R = sqrt(50k x 500k) p/(1-p) = 158k x 0.4/0.6 = 105k.
    design = made(choice("water_front_end", "water", wet="50k", dry="500k"), SCHMITT, PIEZO)
    assert value(design, "water", "bridge_resistor") == pytest.approx(158.1e3 * 0.4 / 0.6, rel=0.01)
    for ohms, wet in (("50k", True), ("500k", False)):
        document = design.dump()
        document["sequences"]["alarm"]["events"][1]["to"] = ohms
        seen = Setup(Design.load(document)).run(out := at("schmitt.out", begins(design) + 0.5))
        assert bool(seen.value(out)[0] > 6.0) is wet


@pytest.mark.parametrize(("active", "ratio"), [("cold", 0.6 / 0.4), ("heat", 0.4 / 0.6)])
def test_the_thermistor_s_resistor_puts_its_trip_point_at_the_threshold(active: str, ratio: float) -> None:
    # 10k exp(3950 (1/275.15 - 1/298.15)) = 30.28k at 2 C.
    front = choice("temperature_front_end", "frost", active=active, trip="2 C")
    design = made(front, SCHMITT, PIEZO)
    at_trip = 10e3 * math.exp(3950.0 * (1.0 / 275.15 - 1.0 / 298.15))
    assert value(design, "frost", "bridge_resistor") == pytest.approx(at_trip * ratio, rel=0.011)
    rests, alarm = at("schmitt.out", 0.9), at("schmitt.out", begins(design) + 1.0)
    seen = run(design, rests, alarm)
    assert seen.value(rests)[0] == pytest.approx(0.0, abs=0.05)
    assert seen.value(alarm)[0] == pytest.approx(12.0, abs=0.3)


def test_frost_trips_near_its_temperature() -> None:
    front = choice("temperature_front_end", "frost", trip="2 C")
    design = ramped(front, "frost sensor", "12 C", "-8 C", "12 C")
    seen = Setup(design).run(over := passing("schmitt.out", 6.0, rising=True))
    # 20 K in 10 s from 1 s on. 0.48 V of threshold are some 2.5 K of this bridge.
    assert 12.0 - 2.0 * (seconds(seen, over) - 1.0) == pytest.approx(2.0, abs=2.5)


@pytest.mark.parametrize("active", ["dark", "light"])
def test_light_trips_on_its_side(active: str) -> None:
    design = made(choice("light_front_end", "dusk", active=active, trip="10 lx"), SCHMITT, PIEZO)
    rests, alarm = at("schmitt.out", 0.9), at("schmitt.out", begins(design) + 1.0)
    seen = run(design, rests, alarm)
    assert seen.value(rests)[0] == pytest.approx(0.0, abs=0.05)
    assert seen.value(alarm)[0] == pytest.approx(12.0, abs=0.3)


LOOP = choice("end_of_line_loop", "loop", lead="0 m")


@pytest.mark.parametrize(
    ("ohms", "alarm"),
    [(4.7e3, False), (4.8e3, False), (4.3e3, False), (2.2e3, True), (1.0, True), (10e3, True), (1e6, True)],
)
def test_the_loop_tells_open_and_short_from_sound(ohms: float, alarm: bool) -> None:
    # 0.35 and 0.65 of the rail are 2.53k and 8.73k against a pull-up of 4.7k.
    document = made(LOOP, PIEZO).dump()
    for stage in document["stages"]:
        for part in stage["parts"]:
            if part["ref"] == stage["roles"].get("end_of_line"):
                part["value"] = f"{ohms!r}"
    seen = Setup(Design.load(document)).run(out := at("loop.out", 0.9))
    assert bool(seen.value(out)[0] > 6.0) is alarm


def test_the_opened_loop_sounds() -> None:
    design = made(LOOP, PIEZO)
    seen = run(design, sound := at("loop.out", 0.9), opened := at("loop.out", begins(design) + 1.0))
    assert seen.value(sound)[0] < 0.1
    assert seen.value(opened)[0] > 11.0
