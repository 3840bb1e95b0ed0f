"""Device laws at one operating point: currents, conductances, charges and capacitances of junctions.

Diode law with ideality (Shockley, Bell Syst. Tech. J. 28 (1949) 435); depletion charge with grading coefficient and a
linear capacitance beyond half the built-in potential (textbook form); reverse breakdown as a mirrored exponential.
The exponential continues as its tangent above 80 slopes so that no iterate can overflow; a working junction in the cold
comes to more than 40. ``p[at:]`` are the parameters of the junction.
"""

from __future__ import annotations

import math

from .compiled import leaf
from .layout import (
    J_BREAKDOWN,
    J_BREAKDOWN_CURRENT,
    J_BREAKDOWN_KNEE,
    J_BREAKDOWN_SLOPE,
    J_CAPACITANCE,
    J_GRADING,
    J_KNEE,
    J_LEAKAGE,
    J_PER_BREAKDOWN_SLOPE,
    J_PER_POTENTIAL,
    J_PER_SLOPE,
    J_POTENTIAL,
    J_SLOPE,
    J_STORED,
    Floats,
)

TOP = 80.0
EXP_TOP = math.exp(TOP)
FLOOR = -40.0
CONDUCTING = 14.0  # slopes below its knee a junction conducts half a microsiemens
LEAKAGE_KNEE = 0.01  # V; generation and surface leakage is nearly constant beyond a tenth of a volt


@leaf
def exponential(y: float) -> tuple[float, float]:
    """Return exp(y) - 1 and its derivative, continued as a straight line above ``TOP``."""
    if y > TOP:
        return EXP_TOP * (1.0 + y - TOP) - 1.0, EXP_TOP
    if y < FLOOR:
        return -1.0, 0.0
    e = math.exp(y)
    return e - 1.0, e


@leaf
def limited(v: float, old: float, p: Floats, at: int) -> float:
    """Return the voltage at which to linearise a junction: logarithmic steps into conduction and into breakdown.

    A full Newton step on an exponential overshoots by orders of magnitude; stepping by the logarithm of the asked
    step keeps the linearised current at the point where the exponential would carry the asked current.
    """
    if v > p[at + J_KNEE]:
        slope = p[at + J_SLOPE]
        base = max(old, p[at + J_KNEE])
        if v > base + 2.0 * slope:
            v = base + slope * math.log(1.0 + (v - base) / slope)
    elif p[at + J_BREAKDOWN] > 0.0 and -v - p[at + J_BREAKDOWN] > p[at + J_BREAKDOWN_KNEE]:
        slope = p[at + J_BREAKDOWN_SLOPE]
        beyond = -v - p[at + J_BREAKDOWN]
        base = max(-old - p[at + J_BREAKDOWN], p[at + J_BREAKDOWN_KNEE])
        if beyond > base + 2.0 * slope:
            v = -(base + slope * math.log(1.0 + (beyond - base) / slope)) - p[at + J_BREAKDOWN]
    return v


@leaf
def move(u: float, old: float, asked: float, p: Floats, at: int) -> float:
    """Return how many slopes a junction moved from ``old`` to ``u``: its conductance changed by so many powers of e.

    Infinite where it was linearised away from the voltage asked for, 0 where it conducts next to nothing.
    """
    if u != asked:
        return math.inf
    moved = 0.0
    slope = p[at + J_SLOPE]
    if max(u, old) > p[at + J_KNEE] - CONDUCTING * slope:
        moved = abs(u - old) * p[at + J_PER_SLOPE]
    elif p[at + J_BREAKDOWN] > 0.0:
        slope = p[at + J_BREAKDOWN_SLOPE]
        if -min(u, old) - p[at + J_BREAKDOWN] > p[at + J_BREAKDOWN_KNEE] - CONDUCTING * slope:
            moved = abs(u - old) / slope
    return moved


@leaf
def side_currents(v: float, p: Floats, at: int) -> tuple[float, float]:
    """Return the current and conductance of leakage and breakdown, the parts that carry no stored charge."""
    i = 0.0
    g = 0.0
    leakage = p[at + J_LEAKAGE]
    if leakage > 0.0:
        share = 1.0 / (abs(v) + LEAKAGE_KNEE)
        i = leakage * v * share
        g = leakage * LEAKAGE_KNEE * share * share
    if p[at + J_BREAKDOWN] > 0.0:
        y = -(v + p[at + J_BREAKDOWN]) * p[at + J_PER_BREAKDOWN_SLOPE]
        if y > FLOOR:
            e, d = exponential(y)
            i -= p[at + J_BREAKDOWN_CURRENT] * (e + 1.0)
            g += p[at + J_BREAKDOWN_CURRENT] * d * p[at + J_PER_BREAKDOWN_SLOPE]
    return i, g


@leaf
def depletion(v: float, p: Floats, at: int) -> tuple[float, float]:
    """Return charge and capacitance of the depletion layer at junction voltage v."""
    c0 = p[at + J_CAPACITANCE]
    if c0 == 0.0:
        return 0.0, 0.0
    m = p[at + J_GRADING]
    if m == 0.0:
        return c0 * v, c0
    half = 0.5 * p[at + J_POTENTIAL]
    s = 1.0 - min(v, half) * p[at + J_PER_POTENTIAL]
    power = 1.0 / math.sqrt(s) if m == 0.5 else math.exp(-m * math.log(s))
    c = c0 * power
    q = p[at + J_STORED] * (1.0 - s * power)
    if v > half:
        rise = c * m / half
        d = v - half
        q += d * (c + 0.5 * rise * d)
        c += rise * d
    return q, c
