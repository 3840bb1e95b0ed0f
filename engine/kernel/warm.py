"""Warm conductances: resistances with a temperature of their own, which is an unknown beside the voltages.

One law serves filaments, copper and thermistors: ln g = c0 + c1 ln(T - T_off) + c2 / T. The heat g v^2 flows into the
unknown of the temperature, whose balance is written like that of a net, in watts: thermal resistances and capacities
are conductances (W/K) and capacitances (J/K) from it to 0V, radiation s (T^4 - T_a^4) (Stefan 1879, Boltzmann 1884)
leaves it here. The unknown is the rise above the ambient T_a, so that everything begins at 0.
"""

from __future__ import annotations

from .compiled import leaf
from .layout import (
    CHANNEL,
    CHANNEL_SLOPES,
    E_A,
    E_B,
    E_C,
    E_PARAMETER,
    E_SLOT,
    JUNCTION,
    ONE,
    SLOPES,
    TRANSPORT,
    W_AMBIENT,
    W_BETA,
    W_LEVEL,
    W_OFFSET,
    W_POWER,
    W_RADIATION,
    WARM,
    WARM_SLOPES,
    Floats,
    Places,
)
from .vectors import Numbers, add, at, exp, greater, lesser, log, put, where

HOTTEST = 2e4  # K above the ambient: beyond it a conductance is taken as constant, so that no iterate can overflow
STEEPEST = 200.0  # the largest logarithm of a conductance


@leaf
def law(u: Numbers, p: Floats, t: int) -> tuple[Numbers, Numbers, Numbers, Numbers]:
    """Return conductance and radiated heat at a rise u above the ambient, and their derivatives by it.

    Half the way down to where the law ends, and at ``HOTTEST``, the conductance stays as it is and the radiation goes
    on by its tangent.
    """
    ambient = at(p, t + W_AMBIENT)
    offset = at(p, t + W_OFFSET)
    rise = lesser(greater(u, 0.5 * (offset - ambient)), HOTTEST)
    kelvin = ambient + rise
    above = kelvin - offset
    inverse = 1.0 / kelvin
    y = at(p, t + W_LEVEL) + at(p, t + W_POWER) * log(above) + at(p, t + W_BETA) * inverse
    g = exp(greater(lesser(y, STEEPEST), -STEEPEST))
    bends = at(p, t + W_POWER) / above - at(p, t + W_BETA) * inverse * inverse
    radiation = at(p, t + W_RADIATION)
    square = kelvin * kelvin
    cold = ambient * ambient
    per_kelvin = 4.0 * radiation * square * kelvin
    radiated = radiation * (square + cold) * (square - cold) + per_kelvin * (u - rise)
    return g, where(rise == u, g * bends, 0.0), radiated, per_kelvin


@leaf
def warm(
    element: Places,
    group: Places,
    p: Floats,
    ah: Numbers,
    x: Floats,
    i: Floats,
    a: Floats,
    seen: Floats,
    flow: Floats,
    slope: Floats,
) -> None:
    """Add all warm conductances at x, as :func:`.assemble.evaluate` does."""
    first = group[WARM]
    two_ended = group[TRANSPORT] - group[JUNCTION]
    transistors = group[CHANNEL] - group[TRANSPORT]
    channels = first - group[CHANNEL]
    for k in range(first, group[WARM + 1]):
        na = element[k, E_A]
        nt = element[k, E_B]
        nb = element[k, E_C]
        n = transistors + channels + (k - first)
        own = two_ended + n + n
        d = two_ended + two_ended + SLOPES * transistors + CHANNEL_SLOPES * channels + WARM_SLOPES * (k - first)
        v = at(x, na) - at(x, nb)
        u = at(x, nt)
        put(seen, own, v)
        put(seen, own + ONE, u)
        g, bends, radiated, per_kelvin = law(u, p, element[k, E_PARAMETER])
        current = g * v
        heat = radiated - current * v
        put(slope, d, g)
        put(slope, d + ONE, bends * v)
        put(slope, d + ONE + ONE, per_kelvin)
        put(flow, own, current)
        put(flow, own + ONE, heat)
        add(i, na, current)
        add(i, nb, -current)
        add(i, nt, heat)
        g = ah * g
        bends = ah * bends * v
        per_volt = 2.0 * g * v
        add(a, element[k, E_SLOT], g)
        add(a, element[k, E_SLOT + 1], bends)
        add(a, element[k, E_SLOT + 2], -g)
        add(a, element[k, E_SLOT + 3], -per_volt)
        add(a, element[k, E_SLOT + 4], ah * per_kelvin - bends * v)
        add(a, element[k, E_SLOT + 5], per_volt)
        add(a, element[k, E_SLOT + 6], -g)
        add(a, element[k, E_SLOT + 7], -bends)
        add(a, element[k, E_SLOT + 8], g)


@leaf
def extrapolate_warm(
    element: Places,
    group: Places,
    p: Floats,
    ah: Numbers,
    step: Floats,
    seen: Floats,
    slope: Floats,
    flow: Floats,
    di: Floats,
    bend: Floats,
) -> None:
    """Take currents and heats a step further by the tangents; add to bend by how much the law departs, exactly.

    See :func:`.tangents.extrapolate`.
    """
    first = group[WARM]
    two_ended = group[TRANSPORT] - group[JUNCTION]
    transistors = group[CHANNEL] - group[TRANSPORT]
    channels = first - group[CHANNEL]
    for k in range(first, group[WARM + 1]):
        na = element[k, E_A]
        nt = element[k, E_B]
        nb = element[k, E_C]
        n = transistors + channels + (k - first)
        own = two_ended + n + n
        d = two_ended + two_ended + SLOPES * transistors + CHANNEL_SLOPES * channels + WARM_SLOPES * (k - first)
        more_v = at(step, na) - at(step, nb)
        more_u = at(step, nt)
        v = at(seen, own)
        g = at(slope, d)
        more = g * more_v + at(slope, d + ONE) * more_u
        hotter = at(slope, d + ONE + ONE) * more_u - v * (g * more_v + more)
        there, _, radiated, _ = law(at(seen, own + ONE) + more_u, p, element[k, E_PARAMETER])
        v = v + more_v
        current = there * v
        spare = ah * (current - at(flow, own) - more)
        add(bend, na, spare)
        add(bend, nb, -spare)
        add(bend, nt, ah * (radiated - current * v - at(flow, own + ONE) - hotter))
        add(flow, own, more)
        add(flow, own + ONE, hotter)
        add(di, na, more)
        add(di, nb, -more)
        add(di, nt, hotter)
