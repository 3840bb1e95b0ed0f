"""What an iterate of the kernel costs: evaluating the laws, eliminating, watching rows of observations.

Measured in December 2026 on one core of a small server (about 2.5 GHz, eight lanes abreast, so that a lane alone costs
as much as eight), in us an iterate, for an astable with more and more around it:

====================================  =====  ============  ===========  ========  ========
circuit                               nets   transistors   multiplying  measured  by rule
====================================  =====  ============  ===========  ========  ========
the astable alone                         5             2           23         4         4
a line of common-emitter stages          25            12          100        10        11
the same                                105            52          420        38        40
the same, 205 nets                      205           102          820        73        76
380 resistors among all nets             55             2       17,289       104       142
the same                                205             2       77,416       384       570
380 parts, transistors among all nets    55           286       31,501       373       370
the same                                105           286      143,338     1,242     1,154
the same                                205           286      459,993     3,604     3,377
====================================  =====  ============  ===========  ========  ========

"Multiplying" is what the elimination does: sparse lines stay sparse, whatever their length; it is the fill of nets
that are joined crosswise that makes a circuit dear. A row of observations that is watched adds some 0.08 us.
"""

from __future__ import annotations

from ..kernel import layout
from ..kernel.layout import Topology

ABREAST = 8  # lanes
ALWAYS = 2e-6  # s
OF_A_LAW = {layout.JUNCTION: 0.3e-6, layout.TRANSPORT: 0.45e-6, layout.CHANNEL: 0.3e-6}
OF_AN_ELEMENT, OF_AN_UNKNOWN, OF_AN_UPDATE, OF_A_ROW = 0.04e-6, 0.05e-6, 7e-9, 0.08e-6


def iterate_cost(topology: Topology, rows: int = 0) -> float:
    """About how many seconds one iterate of eight lanes takes on one core, with so many rows watched."""
    group = topology.group.astype(int)
    laws = sum(each * float(group[family + 1] - group[family]) for family, each in OF_A_LAW.items())
    return (
        ALWAYS
        + laws
        + OF_AN_ELEMENT * float(group[-1])
        + OF_AN_UNKNOWN * float(topology.size[1])
        + OF_AN_UPDATE * float(topology.update.shape[0])
        + OF_A_ROW * rows
    )
