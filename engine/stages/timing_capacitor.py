"""The capacitor of a long timer: how far its class lets the time stray, and which class is good enough.

Both ends of the time in closed form: T = R C /(1 + g) ln(1/(1 - s (1 + g))) with the threshold s as a share of the rail
and g = R G_leak (RC charging law with leakage); tolerances of R and C, drift, V_EB from part to part and in heat, and
the leakage limit of the class when hot. Figures of the classes: from memory.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace

from ..parts.capacitor import LEAKAGE_DOUBLING, LEAKAGE_REFERENCE
from ..parts.classes import CLASSES
from ..parts.physics import REFERENCE
from ..quantity import read, write
from .plan import Plan, class_figure

V_FIRES, V_DIODE = 0.43, 0.25  # V of the threshold transistor and its diode where they fire, at 1 uA (class)
V_T, DIODE_SLOPE = 0.026, 2.0  # kT/q at 25 C in V, and how much flatter that diode is (class)
DIODE_SPREAD = 0.02  # V from part to part (class)
SPREAD, PER_KELVIN = 0.06, 2.3e-3  # V from part to part, and by which each falls with a kelvin at 1 uA, from memory
EMITTER_BLEED = 470e3  # ohm, keeps the emitter at the base while its diode blocks
DIVIDER = 330e3  # ohm, both resistors of the threshold together
RESISTOR = 0.01  # tolerance of the timing resistor
USUAL = 0.1  # tolerance of a class that says none
TENTH = 0.1  # of the limit of its class that a selected capacitor leaks at most
LEFT_OUT = 0.025  # of the time, by which simulated corners came out further apart than the closed form, at most
ASTRAY = 0.007  # of the time, by which each mostly did where it came out further
STEP, STEPS = 10.0 ** (1.0 / 96.0), 4  # of E96, and how many of them R C is tried to both sides
DURATION, ARRIVAL = 0.1, 0.3  # margins that are customarily asked for
LOW_DRIFT, SELECTED, ELECTROLYTIC, SUITABLE = "low drift", "selected", "electrolytic", "suitable"
_CLASSES = {LOW_DRIFT: "timing capacitor, low drift", SELECTED: "timing capacitor, low drift"}


@dataclass(frozen=True)
class Timing:
    """A class of capacitor in its timer: R C in s that puts the asked time in the middle of what comes out, the
    shortest and the longest time in s, and the largest threshold and the least final voltage as shares of the rail."""

    kind: str
    tau: float
    shortest: float
    longest: float
    threshold: float
    final: float

    @property
    def arrival(self) -> float:
        """The margin of check 12."""
        return 1.0 - self.threshold / self.final


Ends = Callable[[Timing], tuple[float, float]]
"""The shortest and the longest time in s of a timer that is built with it."""


@dataclass(frozen=True)
class Threshold:
    """What a timer waits for: ``share`` of its rail, V_EB at ``current`` A and, ``guarded``, a diode; ``lost`` V of
    what starts it do not reach its rail."""

    share: float
    guarded: bool
    current: float
    lost: float

    def at(self, plan: Plan, celsius: float, *, largest: bool) -> float:
        """The share of the rail at which it fires at a temperature, at its least or its largest."""
        lost = self.lost + (0.0 if plan.drive is None else plan.drive.drop)
        above, junctions = V_FIRES + V_T * math.log(self.current / 1e-6), 1
        if self.guarded:
            # Its bleed resistor draws through the diode too, and lifts the reference.
            bled = V_FIRES / EMITTER_BLEED
            above += V_DIODE + DIODE_SLOPE * V_T * math.log((self.current + bled) / 1e-6)
            above += bled * self.share * (1.0 - self.share) * DIVIDER
            junctions = 2
        above -= junctions * PER_KELVIN * (celsius - REFERENCE)
        rail = plan.rail.min if largest else plan.rail.max
        spread = SPREAD + (DIODE_SPREAD if self.guarded else 0.0)
        return self.share + (above + (spread if largest else -spread)) / (rail - lost)


def timing(plan: Plan, kind: str, time: float, wanted: Threshold) -> Timing:
    """How a class of capacitor times ``time`` s."""
    name = class_name(kind)
    figures = CLASSES["capacitor"][name]
    tolerance = class_figure("capacitor", name, "tolerance", "%").high if "tolerance" in figures else USUAL
    drift = class_figure("capacitor", name, "drift", "%").high if "drift" in figures else 0.0
    leak = class_figure("capacitor", name, "leakage_per_cv", "").high * (TENTH if kind == SELECTED else 1.0)
    low = wanted.at(plan, plan.ambient.max, largest=False)
    short = (1.0 - tolerance) * (1.0 - drift) * (1.0 - RESISTOR) * math.log(1.0 / (1.0 - low))
    long = (1.0 + tolerance) * (1.0 + drift) * (1.0 + RESISTOR)
    slow = [
        (wanted.at(plan, each, largest=True), leak * 2.0 ** ((each - LEAKAGE_REFERENCE) / LEAKAGE_DOUBLING))
        for each in (plan.ambient.min, plan.ambient.max)
    ]
    # Leakage only makes it longer: the middle of both ends is put where the time is asked for.
    tau = 0.7 * time / math.log(1.0 / (1.0 - low))
    longest, final = math.inf, 1.0
    for _ in range(40):
        ends = [(share, 1.0 + conductance * (1.0 + RESISTOR) * tau) for share, conductance in slow]
        final = min(1.0 / grown for _, grown in ends)
        if any(share * grown >= 1.0 for share, grown in ends):
            longest = math.inf
            break
        longest = max(long / grown * math.log(1.0 / (1.0 - share * grown)) for share, grown in ends)
        tau = 0.5 * (tau + 2.0 * time / (short + longest))
    return Timing(kind, tau, tau * short, tau * longest, slow[1][0], final)


def margin(ends: tuple[float, float], time: float, window: float) -> float:
    """The margin of check 11 with these ends of the time."""
    return min(time * (1.0 + window) - ends[1], ends[0] - time * (1.0 - window)) / (time * window)


def widened(ends: tuple[float, float]) -> tuple[float, float]:
    """These ends with room for what their closed form leaves out."""
    return ends[0] * (1.0 - LEFT_OUT), ends[1] * (1.0 + LEFT_OUT)


def _keeps(ends: tuple[float, float], time: float, window: float) -> bool:
    return margin((ends[0] * (1.0 - ASTRAY), ends[1] * (1.0 + ASTRAY)), time, window) >= DURATION


def chosen(plan: Plan, time: float, window: float, wanted: Threshold, ends: Ends) -> Timing:
    """The class that is asked for; where a suitable one is, the first that keeps the time within its window."""
    return _first(_offered(plan, time, wanted, ends), time, window)[0]


def _offered(plan: Plan, time: float, wanted: Threshold, ends: Ends) -> list[tuple[Timing, tuple[float, float]]]:
    """The classes that may be taken, the cheaper one first, each with its ends."""
    kind = plan.text("capacitor")
    return [
        _centred(plan, each, time, wanted, ends) for each in ((LOW_DRIFT, SELECTED) if kind == SUITABLE else (kind,))
    ]


def _first(
    offered: list[tuple[Timing, tuple[float, float]]], time: float, window: float
) -> tuple[Timing, tuple[float, float]]:
    """The first that keeps the time within its window, else the last."""
    good = ((each, came) for each, came in offered if each.arrival >= ARRIVAL and _keeps(came, time, window))
    return next(good, offered[-1])


def _centred(plan: Plan, kind: str, time: float, wanted: Threshold, ends: Ends) -> tuple[Timing, tuple[float, float]]:
    """A class with the R C for which the middle of both ends, as it is built, is nearest to the time that is asked."""
    found = timing(plan, kind, time, wanted)
    both = [(found, ends(found))]
    for n in sorted(range(-STEPS, STEPS + 1), key=abs)[1:]:
        each = replace(found, tau=found.tau * STEP**n)
        both.append((each, ends(each)))
    return min(both, key=lambda each: abs(sum(each[1]) - 2.0 * time))


def class_name(kind: str) -> str:
    """The generic class of a kind of capacitor."""
    return _CLASSES.get(kind, kind)


def add_timing_capacitor(plan: Plan, farads: float, net: str, back: str, kind: str) -> float:
    """The capacitor, next higher preferred value; returns it in farad."""
    value = plan.capacitor(
        farads, net, back, "timing_capacitor", snap="up", low_drift=kind != ELECTROLYTIC, times="time"
    )
    part = plan.parts[-1]
    if kind == SELECTED and "plus" in part["pins"]:
        name = _CLASSES[kind]
        per_cv, least = (class_figure("capacitor", name, key, unit).high for key, unit in _LEAKAGE)
        limit = TENTH * max(per_cv * value * read(part["voltage"], "V"), least)
        part["leakage"] = {"specified": {"max": write(limit, "A", digits=2), "source": "memory"}}
    return value


_LEAKAGE = (("leakage_per_cv", ""), ("leakage_least", "A"))


def doubts(plan: Plan, found: Timing, time: float, window: float, wanted: Threshold, ends: Ends) -> list[str]:
    """What will not hold, with the requirement that says so and what to change; nothing where all does."""
    better = "" if found.kind == SELECTED else f", capacitor {SELECTED}"
    if found.arrival < ARRIVAL:
        return [
            f"arrival: hot, with the leakage of its capacitor, it charges to {found.final:.0%} of the rail and must"
            f" pass {found.threshold:.0%}; write a shorter time{better}"
        ]
    came = ends(found)
    if _keeps(came, time, window):
        return []
    came = widened(came)
    between = f"{write(came[0], 's', digits=3)} to {write(came[1], 's', digits=3)}"
    percent = _enough(plan, time, window, wanted, ends)
    advice = "a shorter time" if percent is None else f"window {percent} %"
    if better and margin(widened(_centred(plan, SELECTED, time, wanted, ends)[1]), time, window) >= DURATION:
        advice += f" or capacitor {SELECTED}"
    return [f"duration: tolerances and leakage let its time come out at {between}; write {advice}"]


def _enough(plan: Plan, time: float, window: float, wanted: Threshold, ends: Ends) -> int | None:
    """The least window in whole percent with which the time keeps to it, the customary margin included: a wider one
    may bring another capacitor, which strays further."""
    offered = _offered(plan, time, wanted, ends)
    for percent in range(math.floor(100.0 * window) + 1, 100):
        wide = 0.01 * percent
        if margin(widened(_first(offered, time, wide)[1]), time, wide) >= DURATION:
            return percent
    return None
