"""Waves as text: columns of time, strips of dots, readings. The way of drawing is the project's own.

Dots of a cell: Braille patterns, ISO/IEC 10646 block 2800.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from stagebook.engine.studies.waves import Waves
from stagebook.tui.wave_picture import (
    Mark,
    axis_lines,
    marks_of,
    moment_words,
    reading,
    scale_of,
    strip_of,
)
from stagebook.tui.widgets.wave_plot import net_cell

from .conftest import flood

EVENTS = (Mark(0.0, "connect supply"), Mark(10.0, "close S1"), Mark(250.0, "open S1"))


def ramp(ends: float = 1.0) -> Waves:
    """0 V to 3 V evenly."""
    return Waves(np.array([0.0, ends]), ("a",), np.array([[0.0], [3.0]]))


@given(
    st.lists(st.floats(0.0, 1e5), max_size=8),
    st.floats(1e-6, 1e5),
    st.integers(1, 200),
    st.booleans(),
)
@example([5e-324], 1.0, 12, True)
def test_columns_rise_and_fill_the_window(moments: list[float], span: float, columns: int, stretched: bool) -> None:
    marks = [Mark(at, "x") for at in moments]
    scale = scale_of(0.0, span, marks, columns, stretched=stretched)
    assert scale.columns == columns
    assert np.all(np.diff(scale.edges) > 0.0)
    assert (scale.edges[0], scale.edges[-1]) == (0.0, span)
    assert all(scale.column(scale.moment(column)) == column for column in range(columns))


def test_both_a_microsecond_and_a_minute_have_columns_of_their_own() -> None:
    scale = scale_of(0.0, 300.0, EVENTS, 68, stretched=True)
    behind = [scale.column(10.0 + t) for t in (0.0, 1e-6, 1e-3, 1.0, 60.0, 120.0)]
    assert behind == sorted(set(behind))
    even = scale_of(0.0, 300.0, EVENTS, 68, stretched=False)
    assert even.column(10.0) == even.column(10.001)


def test_without_an_event_in_sight_time_is_even() -> None:
    scale = scale_of(100.0, 200.0, EVENTS, 50, stretched=True)
    assert np.diff(scale.edges) == pytest.approx(np.full(50, 2.0))
    assert axis_lines(scale)[0].startswith("(100 s)")


def test_a_ramp_climbs_from_corner_to_corner() -> None:
    scale = scale_of(0.0, 1.0, (), 8, stretched=False)
    plain = strip_of(ramp(), "a", scale, 2, ascii_only=True)
    assert (plain.low, plain.high) == (0.0, 3.0)
    assert [row.rstrip() for row in plain.rows] == ["    _.-^", "_.-^"] or plain.rows[0].strip() != ""
    assert plain.rows[1][0] in "_."
    assert plain.rows[0][-1] in "^-"
    dots = strip_of(ramp(), "a", scale, 2, ascii_only=False)
    # The lowest dot of the first cell on the left, the highest of the last on the right.
    assert ord(dots.rows[1][0]) - 0x2800 & 0x40
    assert ord(dots.rows[0][-1]) - 0x2800 & 0x08


def test_no_spike_is_lost_between_columns() -> None:
    time = np.array([0.0, 0.5, 0.5 + 1e-9, 0.5 + 2e-9, 1.0])
    spike = Waves(time, ("a",), np.array([[0.0], [0.0], [5.0], [0.0], [0.0]]))
    scale = scale_of(0.0, 1.0, (), 11, stretched=False)
    drawn = strip_of(spike, "a", scale, 2, ascii_only=True)
    assert drawn.high == 5.0
    assert drawn.rows == ("     |     ", "_____|_____")


def test_a_negative_voltage_hangs_below_the_line_of_0_v() -> None:
    wave = Waves(np.array([0.0, 1.0]), ("a",), np.array([[-2.0], [-2.0]]))
    drawn = strip_of(wave, "a", scale_of(0.0, 1.0, (), 4, stretched=False), 1, ascii_only=True)
    assert (drawn.low, drawn.high, drawn.rows) == (-2.0, 0.0, ("____",))


def test_readings_are_joined_linearly_and_moments_named_after_events() -> None:
    assert reading(ramp(), "a", 0.25) == pytest.approx(0.75)
    scale = scale_of(0.0, 300.0, EVENTS, 300, stretched=False)
    assert moment_words(scale, EVENTS, 20) == "20.5 s, 10.5 s after close S1"


def test_the_axis_names_events_where_they_are() -> None:
    when, what = axis_lines(scale_of(0.0, 300.0, EVENTS, 60, stretched=True))
    assert [when.index(text) for text in ("|0 s", "|10 s", "|250 s")] == [
        what.index(text) for text in ("connect", "close", "open")
    ]
    # Where there is no room, a label gives way to its neighbour.
    crowded = axis_lines(scale_of(0.0, 300.0, EVENTS, 30, stretched=False))
    assert crowded[0].startswith("||10 s")
    assert len(crowded[0]) == 30


def test_events_in_one_column_share_its_label() -> None:
    marks = (Mark(10.0, "connect supply"), Mark(10.6, "open S1"), Mark(50.0, "close S1"))
    when, what = axis_lines(scale_of(0.0, 100.0, marks, 70, stretched=False))
    assert "connect supply, open S1" in what
    assert when.index("|10 s") == what.index("connect")


def test_events_at_one_instant_are_one_mark() -> None:
    found = marks_of(flood(), "alarm")
    assert len({mark.at for mark in found}) == len(found)


def test_long_names_of_nets_are_cut_so_that_they_differ() -> None:
    nets = ["entry.power", "entry.load", "base", "a.long_sensor", "b.long_sensor"]
    assert [net_cell(net, nets, 6) for net in nets[:3]] == [".power", ".load ", "base  "]
    # These end alike, so their ends tell nothing.
    assert [net_cell(net, nets, 6) for net in nets[3:]] == ["a.lon.", "b.lon."]
    assert [net_cell(net, nets, 11) for net in nets[:2]] == ["entry.power", "entry.load "]
