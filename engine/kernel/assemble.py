"""Currents, charges and the matrix C + a h G of a row of lanes, each at its own iterate and with its own step (charge
form of modified nodal analysis: Ho, Ruehli, Brennan, IEEE Trans. Circuits Syst. 22 (1975) 504)."""

from __future__ import annotations

from .channels import channels
from .compiled import leaf
from .laws import depletion, exponential, limited, side_currents
from .layout import (
    BRANCH,
    CAPACITANCE,
    CHANNEL,
    CONDUCTANCE,
    E_A,
    E_B,
    E_C,
    E_EXTRA,
    E_PARAMETER,
    E_SLOT,
    GUARD,
    J_PER_SLOPE,
    J_SATURATION,
    J_TRANSIT,
    JUNCTION,
    ONE,
    S_BASE_COLLECTOR,
    S_BASE_EMITTER,
    S_COLLECTOR_CHARGE,
    S_EMITTER_CHARGE,
    S_FORWARD,
    SLOPES,
    T_COLLECTOR,
    T_COLLECTOR_JUNCTION,
    T_EARLY,
    T_EMITTER_JUNCTION,
    T_GAIN_FORWARD,
    T_GAIN_REVERSE,
    T_PER_KNEE,
    TRANSPORT,
    WARM,
    Floats,
    Places,
)
from .vectors import Flags, Numbers, add, any_of, at, put, root, where
from .warm import warm


@leaf
def couple(matrix: Floats, element: Places, k: int, v: Numbers) -> None:
    """Add a conductance or a capacitance v between the two nets of element k."""
    add(matrix, element[k, E_SLOT], v)
    add(matrix, element[k, E_SLOT + 1], -v)
    add(matrix, element[k, E_SLOT + 2], -v)
    add(matrix, element[k, E_SLOT + 3], v)


@leaf
def linear_matrices(element: Places, group: Places, p: Floats, c: Floats, g: Floats) -> None:
    """Set c and g to what the linear primitives put into C and G."""
    for k in range(c.shape[0]):
        put(c, k, 0.0)
        put(g, k, 0.0)
    for k in range(group[CONDUCTANCE], group[CAPACITANCE]):
        couple(g, element, k, at(p, element[k, E_PARAMETER]))
    for k in range(group[CAPACITANCE], group[BRANCH]):
        couple(c, element, k, at(p, element[k, E_PARAMETER]))
    for k in range(group[BRANCH], group[JUNCTION]):
        own = element[k, E_PARAMETER]
        add(g, element[k, E_SLOT], -1.0)
        add(g, element[k, E_SLOT + 1], 1.0)
        add(c, element[k, E_SLOT + 2], at(p, own))
        add(g, element[k, E_SLOT + 2], at(p, own + ONE))
        add(g, element[k, E_SLOT + 3], 1.0)
        add(g, element[k, E_SLOT + 4], -1.0)


@leaf
def linear_flows(element: Places, group: Places, p: Floats, source: Floats, x: Floats, i: Floats, q: Floats) -> None:
    """Set i and q to currents and charges of the linear primitives at x."""
    for k in range(i.shape[0]):
        put(i, k, 0.0)
        put(q, k, 0.0)
    for k in range(group[CONDUCTANCE], group[CAPACITANCE]):
        a = element[k, E_A]
        b = element[k, E_B]
        flow = at(p, element[k, E_PARAMETER]) * (at(x, a) - at(x, b))
        add(i, a, flow)
        add(i, b, -flow)
    for k in range(group[CAPACITANCE], group[BRANCH]):
        a = element[k, E_A]
        b = element[k, E_B]
        flow = at(p, element[k, E_PARAMETER]) * (at(x, a) - at(x, b))
        add(q, a, flow)
        add(q, b, -flow)
    for k in range(group[BRANCH], group[JUNCTION]):
        a = element[k, E_A]
        b = element[k, E_B]
        row = element[k, E_C]
        own = element[k, E_PARAMETER]
        driven = element[k, E_EXTRA]
        carried = at(x, row)
        add(i, a, carried)
        add(i, b, -carried)
        add(i, row, at(p, own + ONE) * carried - (at(x, a) - at(x, b)))
        if driven > 0:
            add(i, row, at(source, driven - ONE))
        add(q, row, at(p, own) * carried)


@leaf
def junctions(
    element: Places,
    group: Places,
    p: Floats,
    ah: Numbers,
    x: Floats,
    i: Floats,
    q: Floats,
    a: Floats,
    seen: Floats,
    flow: Floats,
    slope: Floats,
    limits: Flags,
) -> Flags:
    """Add all two-terminal junctions; return ``limits`` and where one was linearised away from x."""
    first = group[JUNCTION]
    for k in range(first, group[TRANSPORT]):
        j = element[k, E_PARAMETER]
        na = element[k, E_A]
        nb = element[k, E_B]
        v = at(x, na) - at(x, nb)
        old = at(seen, k - first)
        u = limited(v, old, p, j)
        limits = limits | (u != v)
        put(seen, k - first, u)
        e, de = exponential(u * at(p, j + J_PER_SLOPE))
        current = at(p, j + J_SATURATION) * e
        g = at(p, j + J_SATURATION) * de * at(p, j + J_PER_SLOPE)
        charge, c = depletion(u, p, j)
        charge = charge + at(p, j + J_TRANSIT) * current
        c = c + at(p, j + J_TRANSIT) * g
        side, side_g = side_currents(u, p, j)
        current = current + side
        g = g + side_g
        put(flow, k - first, current)
        d = k - first + k - first
        put(slope, d, g)
        put(slope, d + ONE, c)
        off = v - u
        current = current + g * off
        charge = charge + c * off
        add(i, na, current)
        add(i, nb, -current)
        add(q, na, charge)
        add(q, nb, -charge)
        couple(a, element, k, c + ah * g)
    return limits


@leaf
def transports(
    element: Places,
    group: Places,
    p: Floats,
    ah: Numbers,
    x: Floats,
    i: Floats,
    q: Floats,
    a: Floats,
    seen: Floats,
    flow: Floats,
    slope: Floats,
    limits: Flags,
) -> Flags:
    """Add all bipolar transistors in transport form (Ebers, Moll, Proc. IRE 42 (1954) 1761, as rewritten by Gummel
    and Poon, Bell Syst. Tech. J. 49 (1970) 827, with the Early effect as a factor 1 - v_BC / V_A).

    Where a knee current is given the current between collector and emitter is divided by their base charge at high
    injection, q = 1/2 + sqrt(1/4 + i_F/i_K): then i_C = i_F/q, or i_F = i_C (1 + i_C/i_K).
    """
    first = group[TRANSPORT]
    junctions_before = first - group[JUNCTION]
    slopes_before = junctions_before + junctions_before
    for k in range(first, group[TRANSPORT + 1]):
        t = element[k, E_PARAMETER]
        pe = t + T_EMITTER_JUNCTION
        pc = t + T_COLLECTOR_JUNCTION
        nc = element[k, E_A]
        nb = element[k, E_B]
        ne = element[k, E_C]
        sign = 1.0 if element[k, E_EXTRA] == 1 else -1.0
        own = junctions_before + (k - first) + (k - first)
        vb = at(x, nb)

        vbe = sign * (vb - at(x, ne))
        old = at(seen, own)
        ve = limited(vbe, old, p, pe)
        limits = limits | (ve != vbe)
        put(seen, own, ve)
        saturation = at(p, pe + J_SATURATION)
        ee, de = exponential(ve * at(p, pe + J_PER_SLOPE))
        forward = saturation * ee
        gf = saturation * de * at(p, pe + J_PER_SLOPE)
        qe, ce = depletion(ve, p, pe)
        qe = qe + at(p, pe + J_TRANSIT) * forward
        ce = ce + at(p, pe + J_TRANSIT) * gf
        side, side_g = side_currents(ve, p, pe)
        ibe = forward * at(p, t + T_GAIN_FORWARD) + side
        gbe = gf * at(p, t + T_GAIN_FORWARD) + side_g

        # A law without a collector junction has all that follows multiplied by nothing.
        collects = at(p, t + T_COLLECTOR)
        vbc = sign * (vb - at(x, nc))
        old = at(seen, own + ONE)
        vc = where(collects != 0.0, limited(vbc, old, p, pc), vbc)
        limits = limits | (vc != vbc)
        put(seen, own + ONE, vc)
        ec, dc = exponential(vc * at(p, pc + J_PER_SLOPE))
        reverse = collects * saturation * ec
        gr = collects * saturation * dc * at(p, pc + J_PER_SLOPE)
        qc, cc = depletion(vc, p, pc)
        qc = qc + at(p, pc + J_TRANSIT) * reverse
        cc = cc + at(p, pc + J_TRANSIT) * gr
        side, side_g = side_currents(vc, p, pc)
        ibc = reverse * at(p, t + T_GAIN_REVERSE) + side
        gbc = gr * at(p, t + T_GAIN_REVERSE) + side_g

        early = 1.0 - vc * at(p, t + T_EARLY)
        net = forward - reverse
        over = net * early
        over_e = gf * early
        over_c = -gr * early - net * at(p, t + T_EARLY)
        stored = over_e
        per_knee = at(p, t + T_PER_KNEE)
        bends = per_knee != 0.0
        if any_of(bends):
            twice = root(1.0 + 4.0 * per_knee * forward)
            per_charge = 2.0 / (1.0 + twice)
            over = over * per_charge
            over_c = over_c * per_charge
            stored = where(bends, gf, over_e)
            over_e = over_e * per_charge - over * per_charge * per_knee * gf / twice

        d = slopes_before + SLOPES * (k - first)
        put(slope, d, over_e)
        put(slope, d + ONE, over_c)
        put(slope, d + S_BASE_EMITTER, gbe)
        put(slope, d + S_BASE_COLLECTOR, gbc)
        put(slope, d + S_EMITTER_CHARGE, ce)
        put(slope, d + S_COLLECTOR_CHARGE, cc)
        put(slope, d + S_FORWARD, stored)
        put(flow, own, sign * (over - ibc))
        put(flow, own + ONE, sign * (ibe + ibc))

        # Companion offsets: the laws were evaluated at ve, vc and are continued linearly to the iterate.
        off_e = vbe - ve
        off_c = vbc - vc
        over = over + over_e * off_e + over_c * off_c
        ibe = ibe + gbe * off_e
        ibc = ibc + gbc * off_c
        qe = qe + ce * off_e
        qc = qc + cc * off_c

        add(i, nc, sign * (over - ibc))
        add(i, nb, sign * (ibe + ibc))
        add(i, ne, -sign * (over + ibe))
        add(q, nc, -sign * qc)
        add(q, nb, sign * (qe + qc))
        add(q, ne, -sign * qe)

        me = ce + ah * gbe
        mc = cc + ah * gbc
        te = ah * over_e
        tc = ah * over_c
        add(a, element[k, E_SLOT], mc - tc)
        add(a, element[k, E_SLOT + 1], te + tc - mc)
        add(a, element[k, E_SLOT + 2], -te)
        add(a, element[k, E_SLOT + 3], -mc)
        add(a, element[k, E_SLOT + 4], me + mc)
        add(a, element[k, E_SLOT + 5], -me)
        add(a, element[k, E_SLOT + 6], tc)
        add(a, element[k, E_SLOT + 7], -(te + tc + me))
        add(a, element[k, E_SLOT + 8], te + me)
    return limits


@leaf
def evaluate(
    element: Places,
    group: Places,
    p: Floats,
    source: Floats,
    c: Floats,
    g: Floats,
    ah: Numbers,
    x: Floats,
    i: Floats,
    q: Floats,
    a: Floats,
    seen: Floats,
    flow: Floats,
    slope: Floats,
) -> Flags:
    """Set i, q and the matrix a at x; return where some junction was linearised away from x.

    ``seen`` are the junction voltages of the iterate before and become those of this one; ``flow`` the device currents;
    ``slope`` the conductances and capacitances of devices; ``c`` and ``g`` come from :func:`linear_matrices`.
    """
    linear_flows(element, group, p, source, x, i, q)
    for k in range(a.shape[0]):
        put(a, k, at(c, k) + ah * at(g, k))
    limits = ah != ah
    limits = junctions(element, group, p, ah, x, i, q, a, seen, flow, slope, limits)
    limits = transports(element, group, p, ah, x, i, q, a, seen, flow, slope, limits)
    # Handing over so many arrays takes 1 % of an iterate: families that a circuit does not have are not called.
    if group[CHANNEL] < group[WARM]:
        channels(element, group, p, ah, x, i, a, seen, flow, slope)
    if group[WARM] < group[GUARD]:
        warm(element, group, p, ah, x, i, a, seen, flow, slope)
    return limits
