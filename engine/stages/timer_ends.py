"""How early and how late a long timer comes out as it is put together: the closed form of its time at its corners.

T = R C/(1 + g) ln(V/(V - V_th (1 + g))) + T_x, V = V_rail + I_R R with the reverse currents I_R that help to charge it.
V_th is the divider at its tolerances, V_EB of the threshold transistor at the current that fires, its diode, and what
the bleed resistor lifts, each at the temperature; T_x is what these currents take from the last of the charging: of the
I that is left at the end, C V_EB^2/(2 R_bleed I^2) and C n V_T/I ln(1/(1 - I_E/I)). Both supplies and both ambients are
tried. Figures: classes, from memory; compared with simulated corners.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import product

from ..parts.capacitor import LEAKAGE_DOUBLING, LEAKAGE_REFERENCE
from ..parts.classes import CLASSES
from ..parts.diode import reverse_saturation
from ..parts.physics import REFERENCE, ZERO_CELSIUS, doubling
from ..quantity import read
from .plan import LARGEST_FILM, Plan, class_figure, part_of_class

V_EB, V_DIODE = 0.44, 0.25  # V at 1 uA and 25 C: of the threshold transistor, and of its diode (class)
SPREAD, DIODE_SPREAD = 0.06, 0.02  # V by which each differs from part to part (class)
EB_PER_KELVIN, DIODE_PER_KELVIN = (
    2.5e-3,
    3.1e-3,
)  # V that they fall by at 1 uA: (1.2 V - V)/T, and of a diode with n = 2
DIODE_SLOPE = 2.0  # how much flatter that diode is (class)
V_T = 0.0257  # kT/q at 25 C in V
RESISTOR = 0.01  # tolerance of the timing resistor and of the divider
BEGINS = (
    0.1  # of the current that is to be drawn at the end: with it the collector begins to fall, and the rest follows
)
LEAST_CURRENT = 0.05e-6  # A, no less than that is reckoned with where leakage alone would fire it


@dataclass(frozen=True)
class Built:
    """The parts of a timer: R, C, the divider as it acts in ohm, the bleed resistors of emitter and firing base.

    ``tolerance``, ``drift`` and ``leakage`` (S at 20 C) are those of C; ``draws`` A is what the firing collector draws
    at the end, ``gain`` its least gain, and ``lost`` V of the rail do not reach the divider. ``sinks`` S are taken from
    the divider at most by an output that its load draws below the rail and that is fed back.
    """

    ohms: float
    farads: float
    upper: float
    lower: float
    emitter_bleed: float
    fire_bleed: float
    tolerance: float
    drift: float
    leakage: float
    draws: float
    gain: float
    lost: float
    guarded: bool
    sinks: float = 0.0


def class_of(plan: Plan, farads: float, kind: str, share: float) -> tuple[float, float, float]:
    """Tolerance, drift and conductance in S of the leakage of a capacitor that leaks ``share`` of its class's limit."""
    name = kind if farads > LARGEST_FILM else "film"
    figures = CLASSES["capacitor"][name]
    usual = "10 %" if farads <= LARGEST_FILM or "drift" in figures else "20 %"
    drift = class_figure("capacitor", name, "drift", "%").high if "drift" in figures else 0.0
    if "leakage_per_cv" not in figures:
        return read(usual, "%"), drift, 0.0
    per_cv = class_figure("capacitor", name, "leakage_per_cv", "").high
    least = class_figure("capacitor", name, "leakage_least", "A").high
    rated = plan.rail.max / 0.8
    return read(usual, "%"), drift, share * max(per_cv * farads, least / rated)


def ends(plan: Plan, built: Built) -> tuple[float, float]:
    """The shortest and the longest time in s; infinite where it does not get there."""
    ambients = (plan.ambient.min, plan.ambient.max)
    # The rail is reckoned at its least for sizing: where little is drawn, half of that is lost.
    early_rails = (0.5 * (plan.supply.min + plan.rail.min), plan.rail.max)
    early = min(_time(built, celsius, rail - built.lost, -1) for celsius, rail in product(ambients, early_rails))
    late_rails = (plan.rail.min - _sags(plan), plan.rail.max)
    late = max(_time(built, celsius, rail - built.lost, +1) for celsius, rail in product(ambients, late_rails))
    return early, late


def _sags(plan: Plan) -> float:
    """What the supply's own resistance takes from the rail while the loads are on, V: an entry has reckoned with it,
    and before the end of a delay they are off."""
    if plan.fed < plan.supply.min or plan.text("mode") == "delay":
        return 0.0
    return plan.source * (plan.beyond.loads or 0.0)


def _time(built: Built, celsius: float, volts: float, side: int) -> float:
    """The time with all parts on the side of an early end, -1, or of a late one, +1."""
    ohms = built.ohms * (1.0 + side * RESISTOR)
    farads = built.farads * (1.0 + side * built.tolerance) * (1.0 + side * built.drift)
    warm = 2.0 ** ((celsius - LEAKAGE_REFERENCE) / LEAKAGE_DOUBLING)
    lost = 1.0 + (ohms * built.leakage * warm if side > 0 else 0.0)
    # Its diodes stand in reverse: the one to the rail nearly all the time, the one that guards the emitter until the
    # capacitor has come to where its bleed resistor holds the emitter.
    reverse = _reverse(celsius) + _saturation(celsius) if side < 0 else 0.0
    final, helped = volts + reverse * ohms, 0.0
    at_end = fires(built, celsius, volts, side)
    reached = at_end.volts * lost / final
    left = (final - at_end.volts * lost) / ohms
    if reached >= 1.0 or at_end.emitter >= left:
        return math.inf
    if built.guarded and side < 0:
        until = max(_divided(built, side) * volts - reverse * built.emitter_bleed, 0.0)
        helped = math.log1p(-until / final) - math.log1p(-until / (final + reverse * ohms))
    taken = farads * at_end.slope / left * -math.log1p(-at_end.emitter / left)
    if built.guarded:
        middle = left + 0.5 * at_end.v_eb / ohms
        taken += farads * at_end.v_eb**2 / (2.0 * built.emitter_bleed * middle**2)
    return ohms * farads / lost * (-math.log1p(-reached) + helped) + taken


@dataclass(frozen=True)
class Firing:
    """The instant at which it fires: V of the capacitor, V_EB, the emitter current in A, and V by which that grows e
    times."""

    volts: float
    v_eb: float
    emitter: float
    slope: float


def fires(built: Built, celsius: float, volts: float, side: int) -> Firing:
    """What the capacitor must come to, at its least or its largest."""
    share = _divided(built, side)
    parallel = share * built.upper * (1.0 - side * RESISTOR)
    thermal = V_T * (celsius + ZERO_CELSIUS) / (REFERENCE + ZERO_CELSIUS)
    warmer = celsius - REFERENCE
    draws = built.draws * (1.0 if side > 0 else BEGINS)
    base = V_EB + side * SPREAD - EB_PER_KELVIN * warmer
    firing = max(base + thermal * math.log(draws / 1e-6), 0.0)
    leak = _collector(celsius) if side < 0 else 0.0
    # Its own collector leakage does a part of it when hot, and draws its base down.
    emitter = max(firing / built.fire_bleed + draws / built.gain - leak, LEAST_CURRENT)
    v_eb = base + thermal * math.log(emitter / 1e-6)
    above = v_eb - (leak + (built.sinks * volts if side < 0 else 0.0)) * parallel
    if not built.guarded:
        return Firing(share * volts + above, v_eb, emitter, thermal)
    bled = max(v_eb, 0.0) / built.emitter_bleed
    # What that diode lets back when hot helps it forward, too.
    through = max(emitter + bled - (_reverse(celsius) if side < 0 else 0.0), LEAST_CURRENT)
    above += side * DIODE_SPREAD
    above += (
        V_DIODE
        + side * diode_spread()
        - DIODE_PER_KELVIN * warmer
        + DIODE_SLOPE * thermal * math.log(through / 1e-6)
        + bled * parallel
    )
    return Firing(share * volts + above, v_eb, emitter, (1.0 + DIODE_SLOPE) * thermal)


def diode_spread() -> float:
    """V by which the drop of a signal diode differs from part to part, at most."""
    figure = class_figure("diode", "signal diode", "forward_low", "V")
    return max(figure.high - figure.typical, figure.typical - figure.low)


def _divided(built: Built, side: int) -> float:
    """The share of the rail that the divider gives at its least or its largest."""
    upper, lower = built.upper * (1.0 - side * RESISTOR), built.lower * (1.0 + side * RESISTOR)
    return lower / (upper + lower)


def _saturation(celsius: float) -> float:
    """What a signal diode lets back beside that, A."""
    return reverse_saturation(part_of_class("diode", "signal diode"), celsius)


def _reverse(celsius: float) -> float:
    """What a signal diode lets back at most, A."""
    current, step = (
        class_figure("diode", "signal diode", key, unit)
        for key, unit in (("reverse_current", "A"), ("reverse_doubling", "K"))
    )
    return current.high * float(doubling(celsius, step.typical))


def _collector(celsius: float) -> float:
    """The collector leakage of a small transistor at most, A."""
    current, step = (
        class_figure("pnp", "small pnp", key, unit) for key, unit in (("i_cbo", "A"), ("i_cbo_doubling", "K"))
    )
    return current.high * float(doubling(celsius, step.typical))
