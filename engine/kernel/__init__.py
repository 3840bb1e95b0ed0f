"""The numerical kernel: device laws, elimination, time stepping and observation of lanes."""

from __future__ import annotations


def compile_all() -> None:
    """Compile the whole kernel, or load it from the cache, by running a smallest circuit: one conductance."""
    import numpy as np

    from . import layout
    from .elimination import Pattern
    from .linearised import linearised
    from .march import march

    plan = Pattern(1)
    plan.couple((0,))
    lists = plan.plan()
    row = [0, 1, 0, 0, 0, lists.slot(0, 0), 1, 1, 1, *[0] * 5]
    top = layout.Topology(
        layout.ints([1, 1, 2, 1, 0]),
        layout.places([row], 1, layout.ELEMENT_WIDTH),
        layout.places([0, *[1] * layout.FAMILIES]),
        **lists.lists(),
    )
    linearised(top, np.ones((1, 1)), 1, np.zeros((1, 2)))
    march(
        top,
        np.ones((1, 1)),
        np.zeros((1, 2)),
        layout.Program(
            np.full((1, 1), 1e-6),
            layout.ints([1]),
            np.zeros((1, 1, 1, 2)),
            np.zeros((1, 1, 3)),
            layout.ints([]),
            np.zeros((1, 1, 0, 2)),
        ),
        layout.Rows(
            term=layout.places([], 0, 4),
            factor=np.zeros(0),
            signal=layout.places([0]),
            row=layout.ints([], 0, 7),
            lasting=layout.ints([]),
            level=np.zeros(0),
            offset=np.zeros((0, 2)),
            stop_row=layout.ints([-1]),
            keep_row=layout.ints([]),
        ),
        layout.Control(np.full(1, 1e-3), np.full(1, 1e-4), layout.ints([1000, 12, 200, 100_000])),
        layout.Results(
            np.zeros((1, 0)),
            np.zeros((1, 0)),
            np.zeros((1, 0), dtype=np.int64),
            np.zeros((1, 2), dtype=np.int64),
            np.zeros(1),
            np.zeros((1, 4), dtype=np.int64),
            np.zeros((1, 2)),
            np.zeros((1, 0, 2)),
            np.zeros((1, 0)),
            np.zeros(0),
            np.zeros((0, 2)),
            layout.ints([0]),
        ),
        0,
        1,
        np.zeros(1, dtype=np.uint8),
    )
