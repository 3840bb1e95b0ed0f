"""Lanes of a study: every combination of condition extremes, one column at a time, vertices, and random values."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import product

import numpy as np

from ..kernel.layout import Floats
from ..primitives.columns import AMBIENT, CONDITIONS, LEAKAGE_STATE, SOURCE_RESISTANCE, SUPPLY, Column, Group, Lanes

GAIN = (CONDITIONS, "gain")
"""The corner axis that moves the gain of all transistors together."""

_WORDS = {
    AMBIENT: ("cold", "hot"),
    SUPPLY: ("low supply", "high supply"),
    SOURCE_RESISTANCE: ("stiff source", "soft source"),
    LEAKAGE_STATE: ("conditioned capacitors", "leaky capacitors"),
    GAIN: ("weak h_FE", "strong h_FE"),
}


@dataclass(frozen=True)
class Setting:
    """One corner: per axis -1 (low), 0 (nominal) or +1 (high), and per part column the same."""

    axes: tuple[tuple[tuple[str, str], int], ...]
    parts: tuple[tuple[tuple[str, str], int], ...] = ()

    def words(self, only: Sequence[tuple[str, str]] | None = None) -> str:
        """The corner in words; ``only`` these keys, all that are not nominal by default."""
        said = []
        for key, side in self.axes:
            if side and (only is None or key in only):
                said.append(_WORDS[key][side > 0])
        for key, side in self.parts:
            if side and (only is None or key in only):
                datum = "" if key[1] == "value" else f" {key[1]}"
                said.append(f"{key[0]}{datum} {'high' if side > 0 else 'low'}")
        return ", ".join(said) or "nominal"

    def kept(self) -> tuple[tuple[str, str, int], ...]:
        """The setting as it is stored: everything that is not nominal."""
        return tuple((*key, side) for key, side in (*self.axes, *self.parts) if side)

    @classmethod
    def from_kept(cls, kept: Sequence[tuple[str, str, int]]) -> Setting:
        """The setting that :meth:`kept` stored."""
        pairs = [((ref, datum), side) for ref, datum, side in kept]
        axes = tuple(pair for pair in pairs if pair[0][0] == CONDITIONS)
        return cls(axes, tuple(pair for pair in pairs if pair[0][0] != CONDITIONS))


NOMINAL = Setting(())


def axes(columns: Sequence[Column]) -> dict[tuple[str, str], tuple[int, ...]]:
    """The corner axes of a design and the sides to try: supply and temperature also in the middle."""
    found: dict[tuple[str, str], tuple[int, ...]] = {}
    for column in columns:
        if column.group is Group.CONDITION and column.varies:
            found[column.key] = (-1, 0, 1) if column.key in (SUPPLY, AMBIENT) else (-1, 1)
        elif column.group is Group.LEAKAGE and column.varies:
            found[column.key] = (-1, 1)
        elif column.group is Group.GAIN and column.varies:
            found[GAIN] = (-1, 1)
    return found


def settings(columns: Sequence[Column]) -> list[Setting]:
    """Every combination of the sides of all axes."""
    sides = axes(columns)
    return [Setting(tuple(zip(sides, combination, strict=True))) for combination in product(*sides.values())]


def tolerances(columns: Sequence[Column]) -> list[Column]:
    """The part columns that have a tolerance of their own."""
    return [column for column in columns if column.group is Group.TOLERANCE and column.varies]


def lanes_of(columns: Sequence[Column], chosen: Sequence[Setting]) -> Lanes:
    """One lane for every setting."""
    ends = np.array([[c.low, c.nominal, c.high] for c in columns], dtype=float).reshape(-1, 3)
    values = np.repeat(ends[:, 1:2], len(chosen), axis=1)
    places = {column.key: [n] for n, column in enumerate(columns)}
    places[GAIN] = [n for n, column in enumerate(columns) if column.group is Group.GAIN]
    moved = [
        (row, lane, side + 1)
        for lane, setting in enumerate(chosen)
        for key, side in (*setting.axes, *setting.parts)
        for row in places[key]
    ]
    if moved:
        rows, lanes, sides = np.array(moved).T
        values[rows, lanes] = ends[rows, sides]
    return Lanes(columns, values)


def drawn(seed: int, column: Column, count: int) -> Floats:
    """Random numbers of one column, evenly in 0 .. 1, keyed by (seed, reference, datum): the same lane of another
    revision gets the same number, whatever else has changed."""
    digest = hashlib.sha256(f"{seed}|{column.ref}|{column.datum}".encode()).digest()
    generator = np.random.Generator(np.random.Philox(key=int.from_bytes(digest[:16], "little")))
    return generator.random(count)


def random_lanes(columns: Sequence[Column], count: int, seed: int) -> Lanes:
    """Lanes with every column drawn evenly between its extremes (evenly on a log scale for gains and leakages)."""
    values = np.empty((len(columns), count))
    for n, column in enumerate(columns):
        share = drawn(seed, column, count) if column.varies else np.zeros(count)
        if column.logarithmic and column.low > 0.0:
            values[n] = column.low * (column.high / column.low) ** share
        else:
            values[n] = column.low + (column.high - column.low) * share
    return Lanes(columns, values)


def conditions_of(lanes: Lanes, lane: int) -> Mapping[str, float | str]:
    """The conditions of one lane by name, SI (temperature in deg C)."""
    found: dict[str, float | str] = {}
    for key in (SUPPLY, AMBIENT, SOURCE_RESISTANCE):
        if key in lanes:
            found[key[1]] = float(lanes[key][lane])
    if LEAKAGE_STATE in lanes:
        state = float(lanes[LEAKAGE_STATE][lane])
        found["leakage"] = {0.0: "conditioned", 1.0: "specified"}.get(state, state)
    return found
