"""Trials as data: a short run with one knob that is bisected in lanes until the circuit just gives in."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..circuit.timeline import Timeline
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor, Row
from ..run import Observed

Mask = NDArray[np.bool_]


@dataclass(frozen=True)
class Trial:
    """A question with one knob, from ``safe`` (the circuit holds) to ``severe`` (it may give in), in ratio steps.

    ``start`` is the instant of ``sequence`` from whose state the trial goes on, None from the empty circuit. ``drive``
    adds to a timeline what happens for one knob value per lane, until ``ends``; ``gives_in`` reads it off.
    ``resolution`` is the ratio of neighbouring knob values at which the search may stop. ``key`` names the trial:
    checks that share it share its result. ``spare`` says how far from giving in a lane stayed that never did.
    ``unit`` is that of the knob. ``onward``: what the sequence does after ``start`` happens in the trial too. ``vary``:
    the knob moves a part, not what happens; the state to start from is that with the part as it is.
    """

    key: str
    sequence: str
    start: Anchor | None
    drive: Callable[[Timeline, Floats], None]
    ends: float
    safe: float
    severe: float
    rows: tuple[Row, ...]
    gives_in: Callable[[Lanes, Observed], Mask]
    resolution: float = 1.03
    spare: Callable[[Lanes, Observed], Floats] | None = None
    unit: str = ""
    onward: bool = False
    vary: Callable[[Lanes, Floats], Lanes] | None = None


@dataclass(frozen=True)
class Edge:
    """Where the circuit gives in, per lane: the last knob value at which it held, and what the rows showed there.

    ``never``: it held at the severest value; ``always``: it gave in at the safest. ``missing``: the state to start
    from never came. ``tried``: the lanes that were tried at all; the others hold NaN. ``spare``: the least of
    ``Trial.spare`` over the knob values that were looked at, found at ``spare_at``. ``values`` by ``Trial.rows``.
    """

    knob: Floats
    values: dict[Row, Floats]
    never: Mask
    always: Mask
    missing: Mask
    tried: Mask
    spare: Floats
    spare_at: Floats

    def scattered(self, index: Sequence[int], count: int) -> Edge:
        """The same among ``count`` lanes of which only those in ``index`` were tried."""
        at = np.asarray(index, dtype=np.int64)

        def spread(values: Floats) -> Floats:
            found = np.full(count, np.nan)
            found[at] = values
            return found

        def marked(mask: Mask) -> Mask:
            found = np.zeros(count, dtype=bool)
            found[at] = mask
            return found

        values = {row: spread(v) for row, v in self.values.items()}
        return Edge(
            spread(self.knob),
            values,
            marked(self.never),
            marked(self.always),
            marked(self.missing),
            marked(self.tried),
            spread(self.spare),
            spread(self.spare_at),
        )
