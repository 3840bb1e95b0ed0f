"""Voltages over time as lines of text: a strip for each net, time stretched around events, a column per moment. Pure.

A cell of a strip has two by four dots (Braille patterns, ISO/IEC 10646), or one of four signs where only ASCII is
shown. In a column the whole range between the lowest and the highest voltage is drawn, so that no spike is lost.
"""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from ..engine.design.document import Design
from ..engine.quantity import read, write

if TYPE_CHECKING:
    from ..engine.studies.waves import Waves

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

LABEL = 14  # cells of name and scale before each strip
LEAST_ROWS, MOST_ROWS = 2, 10  # of a strip
_DOTS = ((0x01, 0x02, 0x04, 0x40), (0x08, 0x10, 0x20, 0x80))  # by column, from the top down
_BLANK = 0x2800
_LEVELS = "^-._"  # ASCII signs from the top of a cell down
_STRETCHED = 0.4  # share of a segment's columns that are spaced logarithmically behind its event
_FINEST, _LOG_END = 1e-7, 0.05  # s behind the event of the first column; share of the segment where evenness begins
CLOSEST = 1e-12  # of the time in sight, between two events
_LEAST_COLUMNS = 6  # of a segment that has a place of its own


@dataclass(frozen=True, slots=True)
class Mark:
    """An event on the axis: when, in s, and what."""

    at: float
    words: str


@dataclass(frozen=True)
class Scale:
    """Bounds of the columns in s, (columns + 1,), rising; ``marks`` are (column, mark) of events in sight."""

    edges: Floats
    marks: tuple[tuple[int, Mark], ...]

    @property
    def columns(self) -> int:
        """Number of columns."""
        return int(self.edges.size) - 1

    def moment(self, column: int) -> float:
        """The middle of a column, s."""
        return float(0.5 * (self.edges[column] + self.edges[column + 1]))

    def column(self, moment: float) -> int:
        """The column that holds a moment, or the nearest."""
        place = int(np.searchsorted(self.edges, moment, side="right")) - 1
        return max(0, min(place, self.columns - 1))


def marks_of(design: Design, sequence: str) -> tuple[Mark, ...]:
    """The events of a sequence in order of time, those at one instant in one mark."""
    found: dict[float, list[str]] = {}
    for event in design.sequences[sequence].events:
        words = " ".join(
            str(part) for part in (event.event, getattr(event, "part", ""), getattr(event, "to", "")) if part
        )
        found.setdefault(read(event.at, "s"), []).append(words)
    return tuple(Mark(at, ", ".join(words)) for at, words in sorted(found.items()))


def scale_of(start: float, end: float, marks: Sequence[Mark], columns: int, *, stretched: bool) -> Scale:
    """Columns from ``start`` to ``end``: even, or with a logarithmic stretch behind every event in sight."""
    inside = [mark for mark in marks if start <= mark.at < end]
    bounds: list[float] = [start]
    events: set[float] = set()
    for at in sorted(mark.at for mark in inside):
        # What lies closer together than numbers can be told apart has no columns of its own.
        if min(at - bounds[-1], end - at) > CLOSEST * (end - start):
            bounds.append(at)
        events.add(bounds[-1])
    bounds.append(end)
    if not stretched or columns < _LEAST_COLUMNS * (len(bounds) - 1):
        edges = np.linspace(start, end, columns + 1)
    else:
        edges = _stretched_edges(bounds, events, columns)
    scale = Scale(edges, ())
    return Scale(edges, tuple((scale.column(mark.at), mark) for mark in inside))


def _stretched_edges(bounds: Sequence[float], events: Collection[float], columns: int) -> Floats:
    spans = np.diff(bounds)
    weights = 1.0 + np.log10(np.maximum(spans / _FINEST, 1.0))
    spare = columns - _LEAST_COLUMNS * len(spans)
    counts = _LEAST_COLUMNS + np.floor(spare * weights / weights.sum()).astype(int)
    counts[-1] += columns - counts.sum()
    pieces = [np.array([bounds[0]])]
    for begin, span, count in zip(bounds, spans, counts, strict=False):
        stretch = int(_STRETCHED * count) if begin in events and span * _LOG_END > _FINEST else 0
        behind = np.geomspace(_FINEST, span * _LOG_END, stretch) if stretch else np.zeros(0)
        even = np.linspace(span * _LOG_END if stretch else 0.0, span, int(count) - stretch + 1)[1:]
        pieces.append(begin + np.concatenate([behind, even]))
    edges = np.concatenate(pieces)
    edges[-1] = bounds[-1]
    return edges


@dataclass(frozen=True)
class Strip:
    """One net as rows of text, all of the scale's width; ``low`` and ``high`` are the voltages of its edges."""

    net: str
    low: float
    high: float
    rows: tuple[str, ...]


def strip_of(waves: Waves, net: str, scale: Scale, rows: int, *, ascii_only: bool) -> Strip:
    """The picture of one net."""
    values = waves.values[:, waves.nets.index(net)]
    across = 1 if ascii_only else 2
    places = np.arange(scale.columns * across + 1) / across
    edges = np.interp(places, np.arange(scale.columns + 1), scale.edges)
    least, most = _reach(waves.time, values, edges)
    low, high = min(0.0, float(least.min())), max(0.0, float(most.max()))
    if high - low < 1e-9:
        high = low + 1.0
    levels = 4 * rows - 1
    top, bottom = (np.rint((high - each) / (high - low) * levels).astype(int) for each in (most, least))
    drawn = _ascii_rows(top, bottom, rows) if ascii_only else _dotted_rows(top, bottom, rows)
    return Strip(net, low, high, drawn)


def _reach(time: Floats, values: Floats, edges: Floats) -> tuple[Floats, Floats]:
    """Lowest and highest voltage between neighbouring edges, those at the edges included."""
    at = np.interp(edges, time, values)
    least, most = np.minimum(at[:-1], at[1:]), np.maximum(at[:-1], at[1:])
    places = np.searchsorted(edges, time, side="right") - 1
    inside = (places >= 0) & (places < least.size)
    np.minimum.at(least, places[inside], values[inside])
    np.maximum.at(most, places[inside], values[inside])
    return least, most


def _dotted_rows(top: Ints, bottom: Ints, rows: int) -> tuple[str, ...]:
    codes = np.full((rows, top.size // 2), _BLANK)
    for row in range(rows):
        for side in range(2):
            for dot in range(4):
                level = 4 * row + dot
                drawn = (top[side::2] <= level) & (level <= bottom[side::2])
                codes[row] |= np.where(drawn, _DOTS[side][dot], 0)
    return tuple("".join(map(chr, line)).replace(chr(_BLANK), " ") for line in codes)


def _ascii_rows(top: Ints, bottom: Ints, rows: int) -> tuple[str, ...]:
    lines = []
    for row in range(rows):
        cells = []
        for high, low in zip(top, bottom, strict=True):
            first, last = max(int(high), 4 * row), min(int(low), 4 * row + 3)
            inside = last - first
            cells.append(" " if inside < 0 else "|" if inside > 1 else _LEVELS[first - 4 * row])
        lines.append("".join(cells))
    return tuple(lines)


def axis_lines(scale: Scale) -> tuple[str, str]:
    """Two lines below the strips: when each event in sight is, and what it is; labels that do not fit give way."""
    when, what = [" "] * scale.columns, [" "] * scale.columns
    starts = [column for column, _ in scale.marks]
    if 0 not in starts:
        begin = f"({seconds(float(scale.edges[0]))})"
        when[: len(begin)] = begin
    for column in sorted(set(starts)):
        # Events that fall into one column share its label.
        here = [mark for other, mark in scale.marks if other == column]
        words = ", ".join(dict.fromkeys(mark.words for mark in here))
        room = min([other for other in starts if other > column], default=scale.columns) - column
        for line, text in ((when, f"|{seconds(here[0].at)}"), (what, words)):
            shown = text if len(text) < room or column + room == scale.columns else text[: max(1, room - 2)]
            for place, character in enumerate(shown[:room]):
                line[column + place] = character
    return "".join(when[: scale.columns]), "".join(what)


def reading(waves: Waves, net: str, moment: float) -> float:
    """The voltage of a net at a moment, joined linearly between the solver's steps."""
    return float(np.interp(moment, waves.time, waves.values[:, waves.nets.index(net)]))


def moment_words(scale: Scale, marks: Sequence[Mark], column: int) -> str:
    """The moment of a column: in the sequence, and behind the event before it."""
    moment = scale.moment(column)
    before = [mark for mark in marks if mark.at <= moment]
    behind = f", {seconds(moment - before[-1].at)} after {before[-1].words}" if before else ""
    return f"{seconds(moment)}{behind}"


def seconds(value: float) -> str:
    """A time in four digits."""
    return write(value, "s", 4) if value > 0.0 else "0 s"


def volts(value: float, digits: int = 4) -> str:
    """A voltage in so many digits; what is below a microvolt is none."""
    return "0 V" if abs(value) < 1e-6 else write(value, "V", digits)
