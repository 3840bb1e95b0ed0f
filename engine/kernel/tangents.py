"""From an iterate to the next by the tangents of all laws, and by how much the laws bend away from them on the way."""

from __future__ import annotations

from .assemble import linear_flows
from .channels import extrapolate_channels
from .compiled import leaf
from .laws import bent, leaked
from .layout import (
    CHANNEL,
    E_A,
    E_B,
    E_C,
    E_EXTRA,
    E_PARAMETER,
    GUARD,
    J_PER_POTENTIAL,
    J_TRANSIT,
    JUNCTION,
    ONE,
    S_BASE_COLLECTOR,
    S_BASE_EMITTER,
    S_COLLECTOR_CHARGE,
    S_EMITTER_CHARGE,
    S_FORWARD,
    SLOPES,
    T_COLLECTOR_JUNCTION,
    T_EMITTER_JUNCTION,
    TRANSPORT,
    WARM,
    Floats,
    Places,
)
from .vectors import Flags, Numbers, add, at, put
from .warm import extrapolate_warm


@leaf
def extrapolate(
    element: Places,
    group: Places,
    p: Floats,
    ah: Numbers,
    nothing: Floats,
    step: Floats,
    seen: Floats,
    slope: Floats,
    i: Floats,
    q: Floats,
    flow: Floats,
    di: Floats,
    dq: Floats,
    bend: Floats,
) -> Flags:
    """Take i, q and flow from an iterate to the next by the tangents, and set bend to the charge by which the laws
    depart from their tangents there: what the next iterate will leave over. Return where a junction went far.

    ``step`` (n_all, WIDTH) is Newton's step, 0 at known nets; ``di`` and ``dq`` are room to work in, ``nothing`` are
    sources of 0.
    """
    far = ah != ah
    linear_flows(element, group, p, nothing, step, di, dq)
    for k in range(bend.shape[0]):
        put(bend, k, 0.0)
    first = group[JUNCTION]
    for k in range(first, group[TRANSPORT]):
        j = element[k, E_PARAMETER]
        na = element[k, E_A]
        nb = element[k, E_B]
        v = at(step, na) - at(step, nb)
        d = k - first + k - first
        g = at(slope, d)
        c = at(slope, d + ONE)
        more, away = bent(at(seen, k - first), v, p, j)
        more = more * g
        far = far | away
        spare = (ah + at(p, j + J_TRANSIT)) * more + 0.5 * c * at(p, j + J_PER_POTENTIAL) * v * v
        spare = spare + ah * leaked(at(seen, k - first), v, p, j)
        add(flow, k - first, g * v)
        add(di, na, g * v)
        add(di, nb, -g * v)
        add(dq, na, c * v)
        add(dq, nb, -c * v)
        add(bend, na, spare)
        add(bend, nb, -spare)
    junctions_before = group[TRANSPORT] - first
    first = group[TRANSPORT]
    for k in range(first, group[TRANSPORT + 1]):
        t = element[k, E_PARAMETER]
        pe = t + T_EMITTER_JUNCTION
        pc = t + T_COLLECTOR_JUNCTION
        nc = element[k, E_A]
        nb = element[k, E_B]
        ne = element[k, E_C]
        sign = 1.0 if element[k, E_EXTRA] == 1 else -1.0
        own = junctions_before + (k - first) + (k - first)
        d = junctions_before + junctions_before + SLOPES * (k - first)
        ve = sign * (at(step, nb) - at(step, ne))
        vc = sign * (at(step, nb) - at(step, nc))
        over_e = at(slope, d)
        over_c = at(slope, d + ONE)
        gbe = at(slope, d + S_BASE_EMITTER)
        gbc = at(slope, d + S_BASE_COLLECTOR)
        ce = at(slope, d + S_EMITTER_CHARGE)
        cc = at(slope, d + S_COLLECTOR_CHARGE)
        over = sign * (over_e * ve + over_c * vc)
        ibe = sign * gbe * ve
        ibc = sign * gbc * vc
        qe = sign * ce * ve
        qc = sign * cc * vc
        add(flow, own, over - ibc)
        add(flow, own + ONE, ibe + ibc)
        add(di, nc, over - ibc)
        add(di, nb, ibe + ibc)
        add(di, ne, -(over + ibe))
        add(dq, nc, -qc)
        add(dq, nb, qe + qc)
        add(dq, ne, -qe)

        more_e, away = bent(at(seen, own), ve, p, pe)
        far = far | away
        more_c, away = bent(at(seen, own + ONE), vc, p, pc)
        far = far | away
        over = ah * (over_e * more_e + over_c * more_c)
        ibe = (ah * gbe + at(p, pe + J_TRANSIT) * at(slope, d + S_FORWARD)) * more_e + 0.5 * ce * at(
            p, pe + J_PER_POTENTIAL
        ) * ve * ve
        ibc = (ah * gbc - at(p, pc + J_TRANSIT) * over_c) * more_c + 0.5 * cc * at(p, pc + J_PER_POTENTIAL) * vc * vc
        add(bend, nc, sign * (over - ibc))
        add(bend, nb, sign * (ibe + ibc))
        add(bend, ne, -sign * (over + ibe))
    if group[CHANNEL] < group[WARM]:
        extrapolate_channels(element, group, p, ah, step, seen, slope, flow, di, bend)
    if group[WARM] < group[GUARD]:
        extrapolate_warm(element, group, p, ah, step, seen, slope, flow, di, bend)
    for k in range(i.shape[0]):
        add(i, k, at(di, k))
        add(q, k, at(dq, k))
    return far
