"""Device laws at one operating point: currents, conductances, charges and capacitances of junctions.

Diode law with ideality (Shockley, Bell Syst. Tech. J. 28 (1949) 435); depletion charge with grading coefficient and a
linear capacitance beyond half the built-in potential (textbook form); reverse breakdown as a mirrored exponential.
The exponential continues as its tangent above 80 slopes so that no iterate can overflow; a working junction in the cold
comes to more than 40. ``p[j:]`` are the parameters of the junction; numbers are those of all lanes of a row.
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
    J_RISE,
    J_SLOPE,
    J_STORED,
    Floats,
)
from .vectors import Flags, Numbers, any_of, at, exp, greater, lesser, log, root, where

TOP = 80.0
EXP_TOP = math.exp(TOP)
FLOOR = -40.0
NEAR = 0.3  # slopes that a junction may be from where its law was last evaluated
DEAD = 24.0  # slopes below its knee a junction carries less than a picoampere
LEAKAGE_KNEE = 0.01  # V; generation and surface leakage is nearly constant beyond a tenth of a volt


@leaf
def exponential(y: Numbers) -> tuple[Numbers, Numbers]:
    """Return exp(y) - 1 and its derivative, continued as a straight line above ``TOP``."""
    e = exp(greater(lesser(y, TOP), FLOOR))
    return e * (1.0 + greater(y - TOP, 0.0)) - 1.0, e


@leaf
def stepped(asked: Numbers, base: Numbers, slope: Numbers) -> Numbers:
    """Return where the tangent at ``base`` of an exponential meets the value the exponential has at ``asked``."""
    return base + slope * log(1.0 + greater(asked - base, 0.0) / slope)


@leaf
def limited(v: Numbers, old: Numbers, p: Floats, j: int) -> Numbers:
    """Return the voltage at which to linearise a junction: logarithmic steps into conduction and into breakdown.

    A full Newton step on an exponential overshoots by orders of magnitude; stepping by the logarithm of the asked
    step keeps the linearised current at the point where the exponential would carry the asked current.
    """
    u = v
    knee = at(p, j + J_KNEE)
    slope = at(p, j + J_SLOPE)
    base = greater(old, knee)
    far = v > base + 2.0 * slope
    if any_of(far):
        u = where(far, stepped(v, base, slope), u)
    breakdown = at(p, j + J_BREAKDOWN)
    knee = at(p, j + J_BREAKDOWN_KNEE)
    slope = at(p, j + J_BREAKDOWN_SLOPE)
    beyond = -v - breakdown
    base = greater(-old - breakdown, knee)
    far = (breakdown > 0.0) & (beyond > base + 2.0 * slope)
    if any_of(far):
        u = where(far, -stepped(beyond, base, slope) - breakdown, u)
    return u


@leaf
def exceeded(u: Numbers) -> Numbers:
    """Return by what e^u exceeds its tangent at 0: a few terms of its series, right to 1e-5 of it within ``NEAR``.

    Beyond that nothing is accepted anyway.
    """
    return u * u * (0.5 + u * (1.0 / 6.0 + u * (1.0 / 24.0 + u * (1.0 / 120.0 + u * (1.0 / 720.0)))))


@leaf
def bent(v: Numbers, step: Numbers, p: Floats, j: int) -> tuple[Numbers, Flags]:
    """Return by how many volts a junction's law departs from its tangent at v a step further, and where it went far.

    Times the conductance at v the volts are the current that a Newton step leaves over; 0 where next to nothing flows
    at both ends. Far is where currents and charges by the tangent are no longer nearly those of the law.
    """
    slope = at(p, j + J_SLOPE)
    alive = greater(v, v + step) > at(p, j + J_KNEE) - DEAD * slope
    u = step * at(p, j + J_PER_SLOPE)
    more = where(alive, exceeded(u) * slope, 0.0)
    far = alive & (abs(u) > NEAR)
    breakdown = at(p, j + J_BREAKDOWN)
    slope = at(p, j + J_BREAKDOWN_SLOPE)
    edge = at(p, j + J_BREAKDOWN_KNEE) - DEAD * slope
    breaks = (breakdown > 0.0) & (-lesser(v, v + step) - breakdown > edge)
    if any_of(breaks):
        u = -step * at(p, j + J_PER_BREAKDOWN_SLOPE)
        more = where(breaks, more - exceeded(u) * slope, more)
        far = far | breaks & (abs(u) > NEAR)
    return more, far


@leaf
def leaked(v: Numbers, step: Numbers, p: Floats, j: int) -> Numbers:
    """Return by how much the leakage departs from its tangent at v a step further, in A."""
    leakage = at(p, j + J_LEAKAGE)
    away = v + step
    share = 1.0 / (abs(v) + LEAKAGE_KNEE)
    return leakage * (away / (abs(away) + LEAKAGE_KNEE) - v * share - LEAKAGE_KNEE * share * share * step)


@leaf
def side_currents(v: Numbers, p: Floats, j: int) -> tuple[Numbers, Numbers]:
    """Return the current and conductance of leakage and breakdown, the parts that carry no stored charge."""
    i = 0.0 * v
    g = i
    leakage = at(p, j + J_LEAKAGE)
    if any_of(leakage != 0.0):
        share = 1.0 / (abs(v) + LEAKAGE_KNEE)
        i = leakage * v * share
        g = leakage * LEAKAGE_KNEE * share * share
    breakdown = at(p, j + J_BREAKDOWN)
    y = -(v + breakdown) * at(p, j + J_PER_BREAKDOWN_SLOPE)
    broken = (breakdown > 0.0) & (y > FLOOR)
    if any_of(broken):
        e, d = exponential(y)
        carried = where(broken, at(p, j + J_BREAKDOWN_CURRENT), 0.0)
        i = i - carried * (e + 1.0)
        g = g + carried * d * at(p, j + J_PER_BREAKDOWN_SLOPE)
    return i, g


@leaf
def depletion(v: Numbers, p: Floats, j: int) -> tuple[Numbers, Numbers]:
    """Return charge and capacitance of the depletion layer at junction voltage v; grading 0 is a plain capacitance."""
    m = at(p, j + J_GRADING)
    half = 0.5 * at(p, j + J_POTENTIAL)
    over = greater(v - half, 0.0)
    s = 1.0 - (v - over) * at(p, j + J_PER_POTENTIAL)
    power = 1.0 / root(s)
    other: Flags = m != 0.5
    if any_of(other):
        power = where(other, exp(-m * log(s)), power)
    c = at(p, j + J_CAPACITANCE) * power
    rise = c * at(p, j + J_RISE)
    plain = m == 0.0
    q = where(plain, at(p, j + J_CAPACITANCE) * (v - over), at(p, j + J_STORED) * (1.0 - s * power))
    return q + over * (c + 0.5 * rise * over), c + rise * over
