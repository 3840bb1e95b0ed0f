"""Corners that differ in weak parts only share a lane. The rules are our own."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from stagebook.engine.studies.lanes import Setting
from stagebook.engine.studies.vertices import Vertices, sides, weak

PARTS = [(f"R{k}", "value") for k in range(6)]
SINGLE = [Setting((), ((key, side),)) for key in PARTS for side in (-1, 1)]
COLD, HOT = (((("conditions", "ambient"), side),) for side in (-1, 1))


def ends(*changes: float) -> np.ndarray:
    """A slope that each part changes by so much, evenly to both sides."""
    return np.ravel([(-change / 2.0, change / 2.0) for change in changes])


def test_weak_parts_change_less_than_a_thousandth_together() -> None:
    slope = ends(1.0, -0.5, 0.0006, 0.0006, 0.0003, 0.0)
    # 0, 0.0003 and both of 0.0006 are 0.0015, and all together 1.5015.
    assert weak(slope, SINGLE) == {PARTS[5], PARTS[4], PARTS[3], PARTS[2]}
    slope = ends(1.0, -0.5, 0.0007, 0.0007, 0.0003, 0.0)
    assert weak(slope, SINGLE) == {PARTS[5], PARTS[4], PARTS[2]}


def test_nothing_is_weak_where_an_event_may_fail_to_happen() -> None:
    slope = ends(1.0, 1.0, 1e-6, 0.0, 0.0, 0.0)
    slope[1] = np.nan
    assert weak(slope, SINGLE) == frozenset()
    assert dict(sides(slope, SINGLE))[PARTS[0]] == 1


def test_a_weak_part_keeps_its_own_side_where_nobody_else_asks() -> None:
    vertices = Vertices(SINGLE)
    vertices.add(COLD, ((PARTS[0], 1), (PARTS[1], -1)), frozenset({PARTS[1]}))
    vertices.add(COLD, ((PARTS[1], 1), (PARTS[2], 1)), frozenset())
    assert vertices.settings() == [Setting(COLD, ((PARTS[0], 1), (PARTS[1], 1), (PARTS[2], 1)))]
    vertices.add(COLD, ((PARTS[1], -1),), frozenset())
    vertices.add(HOT, ((PARTS[1], -1),), frozenset({PARTS[1]}))
    assert vertices.settings()[1:] == [Setting(COLD, ((PARTS[1], -1),)), Setting(HOT, ((PARTS[1], -1),))]


asked = st.tuples(
    st.sampled_from([COLD, HOT]),
    st.dictionaries(st.sampled_from(PARTS), st.sampled_from([-1, 1])),
    st.frozensets(st.sampled_from(PARTS)),
)


@given(st.lists(asked, max_size=12))
def test_all_that_is_asked_of_strong_parts_is_tried(asks: list[tuple[tuple, dict, frozenset]]) -> None:
    vertices = Vertices(SINGLE)
    for axes, parts, indifferent in asks:
        vertices.add(axes, tuple(parts.items()), indifferent)
    found = vertices.settings()
    assert len(found) == len(set(found)) <= len(asks)
    for axes, parts, indifferent in asks:
        wanted = {(key, side) for key, side in parts.items() if key not in indifferent}
        assert any(setting.axes == axes and wanted <= set(setting.parts) for setting in found)
