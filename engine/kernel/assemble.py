"""Currents, charges and the matrix C + a h G of one lane at one iterate (charge form of modified nodal analysis:
Ho, Ruehli, Brennan, IEEE Trans. Circuits Syst. 22 (1975) 504)."""

from __future__ import annotations

from .compiled import leaf
from .elimination import copy
from .laws import depletion, exponential, limited, move, side_currents
from .layout import (
    BRANCH,
    CAPACITANCE,
    CONDUCTANCE,
    E_A,
    E_B,
    E_C,
    E_EXTRA,
    E_PARAMETER,
    E_SLOT,
    FAMILIES,
    J_PER_SLOPE,
    J_SATURATION,
    J_TRANSIT,
    JUNCTION,
    ONE,
    T_COLLECTOR,
    T_COLLECTOR_JUNCTION,
    T_EARLY,
    T_EMITTER_JUNCTION,
    T_GAIN_FORWARD,
    T_GAIN_REVERSE,
    TRANSPORT,
    Floats,
    Places,
)


@leaf
def linear_matrix(element: Places, group: Places, p: Floats, ah: float, a: Floats) -> None:
    """Set a to the part of C + a h G that no iterate changes."""
    a[:] = 0.0
    for k in range(group[CONDUCTANCE], group[BRANCH]):
        v = p[element[k, E_PARAMETER]]
        if k < group[CAPACITANCE]:
            v *= ah
        a[element[k, E_SLOT]] += v
        a[element[k, E_SLOT + 1]] -= v
        a[element[k, E_SLOT + 2]] -= v
        a[element[k, E_SLOT + 3]] += v
    for k in range(group[BRANCH], group[JUNCTION]):
        at = element[k, E_PARAMETER]
        a[element[k, E_SLOT]] -= ah
        a[element[k, E_SLOT + 1]] += ah
        a[element[k, E_SLOT + 2]] += p[at] + ah * p[at + ONE]
        a[element[k, E_SLOT + 3]] += ah
        a[element[k, E_SLOT + 4]] -= ah


@leaf
def linear_flows(element: Places, group: Places, p: Floats, source: Floats, x: Floats, i: Floats, q: Floats) -> None:
    """Set i and q to currents and charges of the linear primitives at x."""
    i[:] = 0.0
    q[:] = 0.0
    for k in range(group[CONDUCTANCE], group[CAPACITANCE]):
        a = element[k, E_A]
        b = element[k, E_B]
        flow = p[element[k, E_PARAMETER]] * (x[a] - x[b])
        i[a] += flow
        i[b] -= flow
    for k in range(group[CAPACITANCE], group[BRANCH]):
        a = element[k, E_A]
        b = element[k, E_B]
        flow = p[element[k, E_PARAMETER]] * (x[a] - x[b])
        q[a] += flow
        q[b] -= flow
    for k in range(group[BRANCH], group[JUNCTION]):
        a = element[k, E_A]
        b = element[k, E_B]
        row = element[k, E_C]
        at = element[k, E_PARAMETER]
        own = element[k, E_EXTRA]
        drive = source[own - ONE] if own > 0 else 0.0
        i[a] += x[row]
        i[b] -= x[row]
        i[row] += p[at + ONE] * x[row] - (x[a] - x[b]) + drive
        q[row] += p[at] * x[row]


@leaf
def junctions(
    element: Places,
    group: Places,
    p: Floats,
    ah: float,
    x: Floats,
    i: Floats,
    q: Floats,
    a: Floats,
    seen: Floats,
    flow: Floats,
    build: bool,
) -> float:
    """Add all two-terminal junctions; return the largest :func:`move`, infinite where one was linearised elsewhere."""
    moved = 0.0
    first = group[JUNCTION]
    for k in range(first, group[TRANSPORT]):
        at = element[k, E_PARAMETER]
        na = element[k, E_A]
        nb = element[k, E_B]
        v = x[na] - x[nb]
        u = limited(v, seen[k - first], p, at)
        moved = max(moved, move(u, seen[k - first], v, p, at))
        seen[k - first] = u
        e, d = exponential(u * p[at + J_PER_SLOPE])
        current = p[at + J_SATURATION] * e
        g = p[at + J_SATURATION] * d * p[at + J_PER_SLOPE]
        charge, c = depletion(u, p, at)
        charge += p[at + J_TRANSIT] * current
        c += p[at + J_TRANSIT] * g
        side, side_g = side_currents(u, p, at)
        current += side
        g += side_g
        flow[k - first] = current
        current += g * (v - u)
        charge += c * (v - u)
        i[na] += current
        i[nb] -= current
        q[na] += charge
        q[nb] -= charge
        if build:
            m = c + ah * g
            a[element[k, E_SLOT]] += m
            a[element[k, E_SLOT + 1]] -= m
            a[element[k, E_SLOT + 2]] -= m
            a[element[k, E_SLOT + 3]] += m
    return moved


@leaf
def transports(
    element: Places,
    group: Places,
    p: Floats,
    ah: float,
    x: Floats,
    i: Floats,
    q: Floats,
    a: Floats,
    seen: Floats,
    flow: Floats,
    build: bool,
) -> float:
    """Add all bipolar transistors in transport form (Ebers, Moll, Proc. IRE 42 (1954) 1761, as rewritten by Gummel
    and Poon, Bell Syst. Tech. J. 49 (1970) 827, with the Early effect as a factor 1 - v_BC / V_A)."""
    moved = 0.0
    first = group[TRANSPORT]
    junctions_before = first - group[JUNCTION]
    for k in range(first, group[FAMILIES]):
        at = element[k, E_PARAMETER]
        pe = at + T_EMITTER_JUNCTION
        pc = at + T_COLLECTOR_JUNCTION
        nc = element[k, E_A]
        nb = element[k, E_B]
        ne = element[k, E_C]
        sign = 1.0 if element[k, E_EXTRA] == 1 else -1.0
        own = junctions_before + (k - first) + (k - first)

        vbe = sign * (x[nb] - x[ne])
        ve = limited(vbe, seen[own], p, pe)
        moved = max(moved, move(ve, seen[own], vbe, p, pe))
        seen[own] = ve
        saturation = p[pe + J_SATURATION]
        ee, de = exponential(ve * p[pe + J_PER_SLOPE])
        forward = saturation * ee
        gf = saturation * de * p[pe + J_PER_SLOPE]
        qe, ce = depletion(ve, p, pe)
        qe += p[pe + J_TRANSIT] * forward
        ce += p[pe + J_TRANSIT] * gf
        side, side_g = side_currents(ve, p, pe)
        ibe = forward * p[at + T_GAIN_FORWARD] + side
        gbe = gf * p[at + T_GAIN_FORWARD] + side_g

        vbc = sign * (x[nb] - x[nc])
        vc = vbc
        reverse = 0.0
        gr = 0.0
        qc = 0.0
        cc = 0.0
        ibc = 0.0
        gbc = 0.0
        if p[at + T_COLLECTOR] != 0.0:
            vc = limited(vbc, seen[own + ONE], p, pc)
            moved = max(moved, move(vc, seen[own + ONE], vbc, p, pc))
            ec, dc = exponential(vc * p[pc + J_PER_SLOPE])
            reverse = saturation * ec
            gr = saturation * dc * p[pc + J_PER_SLOPE]
            qc, cc = depletion(vc, p, pc)
            qc += p[pc + J_TRANSIT] * reverse
            cc += p[pc + J_TRANSIT] * gr
            side, side_g = side_currents(vc, p, pc)
            ibc = reverse * p[at + T_GAIN_REVERSE] + side
            gbc = gr * p[at + T_GAIN_REVERSE] + side_g
        seen[own + ONE] = vc

        early = 1.0 - vc * p[at + T_EARLY]
        over = (forward - reverse) * early
        over_e = gf * early
        over_c = -gr * early - (forward - reverse) * p[at + T_EARLY]

        flow[own] = sign * (over - ibc)
        flow[own + ONE] = sign * (ibe + ibc)

        # Companion offsets: the laws were evaluated at ve, vc and are continued linearly to the iterate.
        off_e = vbe - ve
        off_c = vbc - vc
        over += over_e * off_e + over_c * off_c
        ibe += gbe * off_e
        ibc += gbc * off_c
        qe += ce * off_e
        qc += cc * off_c

        i[nc] += sign * (over - ibc)
        i[nb] += sign * (ibe + ibc)
        i[ne] -= sign * (over + ibe)
        q[nc] -= sign * qc
        q[nb] += sign * (qe + qc)
        q[ne] -= sign * qe

        if build:
            me = ce + ah * gbe
            mc = cc + ah * gbc
            te = ah * over_e
            tc = ah * over_c
            a[element[k, E_SLOT]] += mc - tc
            a[element[k, E_SLOT + 1]] += te + tc - mc
            a[element[k, E_SLOT + 2]] -= te
            a[element[k, E_SLOT + 3]] -= mc
            a[element[k, E_SLOT + 4]] += me + mc
            a[element[k, E_SLOT + 5]] -= me
            a[element[k, E_SLOT + 6]] += tc
            a[element[k, E_SLOT + 7]] -= te + tc + me
            a[element[k, E_SLOT + 8]] += te + me
    return moved


@leaf
def evaluate(
    element: Places,
    group: Places,
    p: Floats,
    source: Floats,
    linear: Floats,
    ah: float,
    x: Floats,
    i: Floats,
    q: Floats,
    a: Floats,
    seen: Floats,
    flow: Floats,
    build: bool,
) -> float:
    """Set i, q and the matrix a at x; return how far junctions moved, infinite where linearised away from x.

    ``seen`` are the junction voltages of the iterate before and become those of this one; ``flow`` the device currents.
    Without ``build`` the matrix stays that of an earlier iterate.
    """
    linear_flows(element, group, p, source, x, i, q)
    if build:
        copy(linear, a)
    moved = junctions(element, group, p, ah, x, i, q, a, seen, flow, build)
    return max(moved, transports(element, group, p, ah, x, i, q, a, seen, flow, build))
