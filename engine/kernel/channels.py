"""Field-effect channels: the square law of Shichman and Hodges, written alike for drain and source.

Shichman, Hodges, IEEE J. Solid-State Circuits SC-3 (1968) 285: no current up to the threshold, K [(v_GS - V_T) v_DS -
v_DS^2/2] (1 + l v_DS) up to pinch-off and K/2 (v_GS - V_T)^2 (1 + l v_DS) beyond. With f(u) = max(u - V_T, 0) all of
it is K/2 [f(v_GS)^2 - f(v_GD)^2] (1 + l |v_DS|), of either sign: current and conductances are continuous everywhere.
The law bends so little that Newton's iteration needs no limits.
"""

from __future__ import annotations

from .compiled import leaf
from .layout import (
    C_MODULATION,
    C_THRESHOLD,
    C_TRANSCONDUCTANCE,
    CHANNEL,
    CHANNEL_SLOPES,
    E_A,
    E_B,
    E_C,
    E_EXTRA,
    E_PARAMETER,
    E_SLOT,
    JUNCTION,
    ONE,
    SLOPES,
    TRANSPORT,
    Floats,
    Places,
)
from .vectors import Numbers, add, at, greater, put


@leaf
def square_law(vs: Numbers, vd: Numbers, p: Floats, t: int) -> tuple[Numbers, Numbers, Numbers]:
    """Return the drain current at gate-source and gate-drain voltages, and its derivatives by both."""
    threshold = at(p, t + C_THRESHOLD)
    k = at(p, t + C_TRANSCONDUCTANCE)
    fs = greater(vs - threshold, 0.0)
    fd = greater(vd - threshold, 0.0)
    across = vs - vd
    modulation = at(p, t + C_MODULATION)
    factor = 1.0 + modulation * abs(across)
    plain = 0.5 * k * (fs - fd) * (fs + fd)
    steeper = modulation * abs(plain)  # the current has the sign of the voltage across
    return plain * factor, k * fs * factor + steeper, -(k * fd * factor) - steeper


@leaf
def channels(
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
    """Add all channels at x, as :func:`.assemble.evaluate` does."""
    first = group[CHANNEL]
    two_ended = group[TRANSPORT] - group[JUNCTION]
    transistors = first - group[TRANSPORT]
    for k in range(first, group[CHANNEL + 1]):
        t = element[k, E_PARAMETER]
        nd = element[k, E_A]
        ng = element[k, E_B]
        ns = element[k, E_C]
        sign = 1.0 if element[k, E_EXTRA] == 1 else -1.0
        own = two_ended + transistors + transistors + (k - first) + (k - first)
        d = two_ended + two_ended + SLOPES * transistors + CHANNEL_SLOPES * (k - first)
        vs = sign * (at(x, ng) - at(x, ns))
        vd = sign * (at(x, ng) - at(x, nd))
        put(seen, own, vs)
        put(seen, own + ONE, vd)
        current, gs, gd = square_law(vs, vd, p, t)
        put(slope, d, gs)
        put(slope, d + ONE, gd)
        put(flow, own, sign * current)
        add(i, nd, sign * current)
        add(i, ns, -sign * current)
        gs = ah * gs
        gd = ah * gd
        add(a, element[k, E_SLOT], -gd)
        add(a, element[k, E_SLOT + 1], gs + gd)
        add(a, element[k, E_SLOT + 2], -gs)
        add(a, element[k, E_SLOT + 6], gd)
        add(a, element[k, E_SLOT + 7], -(gs + gd))
        add(a, element[k, E_SLOT + 8], gs)


@leaf
def extrapolate_channels(
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
    """Take the currents of channels a step further by the tangents; add to bend by how much the law departs, exactly.

    See :func:`.tangents.extrapolate`.
    """
    first = group[CHANNEL]
    two_ended = group[TRANSPORT] - group[JUNCTION]
    transistors = first - group[TRANSPORT]
    for k in range(first, group[CHANNEL + 1]):
        t = element[k, E_PARAMETER]
        nd = element[k, E_A]
        ng = element[k, E_B]
        ns = element[k, E_C]
        sign = 1.0 if element[k, E_EXTRA] == 1 else -1.0
        own = two_ended + transistors + transistors + (k - first) + (k - first)
        d = two_ended + two_ended + SLOPES * transistors + CHANNEL_SLOPES * (k - first)
        vs = sign * (at(step, ng) - at(step, ns))
        vd = sign * (at(step, ng) - at(step, nd))
        more = sign * (at(slope, d) * vs + at(slope, d + ONE) * vd)
        current, _, _ = square_law(at(seen, own) + vs, at(seen, own + ONE) + vd, p, t)
        spare = ah * (sign * current - at(flow, own) - more)
        add(bend, nd, spare)
        add(bend, ns, -spare)
        add(flow, own, more)
        add(di, nd, more)
        add(di, ns, -more)
