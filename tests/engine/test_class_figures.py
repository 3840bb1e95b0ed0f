"""Every figure of every generic class says what it is. The figures themselves are from memory, common practice."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pytest

from stagebook.engine.design.part import Part
from stagebook.engine.parts import kinds
from stagebook.engine.parts.class_figure import SOURCE, ClassFigure, at_least, at_most, spread, where
from stagebook.engine.parts.classes import CLASSES, POINTS, is_condition
from stagebook.engine.parts.figures import figure
from stagebook.engine.parts.kind import TEXT
from stagebook.engine.parts.made import as_design, resolved, tried
from stagebook.engine.parts.part_data import part_data
from stagebook.engine.primitives.builder import Builder
from stagebook.engine.quantity import read

READ_BY_CHECKS = {"capacity", "self_discharge", "sound_level"}
"""Spreads that no law reads: checks 29 and 28 take the worse end."""
SCREEN = 80
"""Columns of the smallest screen that shows everything."""
IN_ITS_VALUE = {"tempco"}
"""Spreads that move another column: a resistor's value."""


def of_classes() -> Iterator[tuple[str, str, str, ClassFigure]]:
    """Kind, class, datum and figure of all there are."""
    for kind, classes in CLASSES.items():
        for name, figures in classes.items():
            for key, given in figures.items():
                yield kind, name, key, given


def unit_of(kind: str, key: str) -> str:
    """The unit in which a kind reads a datum."""
    return {**kinds()[kind].data, **kinds()[kind].fields}[key].unit


def lacks(kind: str, given: ClassFigure, unit: str) -> str:
    """What a figure does not say of itself; '' where it says all."""
    ends = (given.minimum, given.typical, given.maximum)
    if given.source != SOURCE:
        return "a source mark"
    if given.of is not None:
        return "" if ends == (None, given.typical, None) and given.typical else "one number that is a condition"
    if not given.at:
        return "a test condition"
    low, typical, high = (None if text is None else read(text, unit) for text in ends)
    if typical is None:
        return "" if (low is None) != (high is None) else "one end, or min, typical and max"
    if low is None or high is None:
        return "min or max beside its typical value"
    return "" if low <= typical <= high and low < high else "ends in order that differ"


def test_every_figure_is_a_spread_a_limit_or_a_condition() -> None:
    missing = {
        f"{kind}, {name}, {key}": found
        for kind, name, key, given in of_classes()
        if (found := lacks(kind, given, unit_of(kind, key)))
    }
    assert missing == {}
    assert all(points.at and points.source == SOURCE for found in POINTS.values() for points in found.values())


@pytest.mark.parametrize(
    ("given", "says"),
    [
        (ClassFigure(None, "200", None, "2 mA"), "min or max"),
        (ClassFigure("200", "300", "450", ""), "a test condition"),
        (ClassFigure("200", "300", "450", "2 mA", source=""), "a source mark"),
        (ClassFigure("200", "200", "200", "2 mA"), "differ"),
        (ClassFigure("200", None, "450", "2 mA"), "one end"),
        (ClassFigure(None, None, None, "2 mA"), "one end"),
        (ClassFigure("1", "2", None, "", of="gain"), "one number"),
    ],
)
def test_what_a_figure_may_lack_is_found(given: ClassFigure, says: str) -> None:
    assert says in lacks("npn", given, "")


def test_a_condition_is_of_a_figure_that_says_it_too() -> None:
    for kind, name, key, given in of_classes():
        if given.of is None:
            continue
        conditioned = CLASSES[kind][name][given.of]
        assert conditioned.of is None, (kind, name, key)
        if key == "forced_gain":
            collector, base = (read(text, "A") for text in conditioned.at.split(" / "))
            assert collector / base == pytest.approx(read(given.typical or "", "")), (kind, name)
        else:
            assert given.typical in conditioned.at, (kind, name, key)
        assert is_condition(kind, key)
    assert not is_condition("npn", "gain")


def made(kind: str, name: str) -> Part:
    """A part of a class, with what it needs besides."""
    more: dict[str, Any] = {"capacitor": {"voltage": "16 V"}}.get(kind, {})
    return as_design({"kind": kind, "class": name, **more}).parts[0]


@pytest.mark.parametrize(("kind", "name"), [(kind, name) for kind in CLASSES for name in CLASSES[kind]])
def test_corners_move_what_spreads_and_nothing_else(kind: str, name: str) -> None:
    part = made(kind, name)
    build = Builder(12.0)
    kinds()[kind].expand(part, build)
    moved = {column.datum for column in build.columns if column.varies}
    for key, given in CLASSES[kind][name].items():
        spreads = given.of is None and given.typical is not None
        if key in READ_BY_CHECKS | IN_ITS_VALUE:
            assert spreads
        elif spreads:
            assert (key in moved) != bool(given.held), key
        else:
            assert key not in moved, key


def test_what_a_law_reads_of_a_limit_is_the_limit() -> None:
    assert at_most("45 V", "25 C").texts == ("45 V", "45 V", "45 V")
    assert at_least("10 uA", "closed").texts == ("10 uA", "10 uA", "10 uA")
    assert spread("1", "2", "3", "25 C").texts == ("1", "2", "3")
    assert where("gain", "2 mA").texts == ("2 mA", "2 mA", "2 mA")


@pytest.mark.parametrize(("kind", "name"), [(kind, name) for kind in CLASSES for name in CLASSES[kind]])
def test_a_copy_keeps_ends_condition_and_source(kind: str, name: str) -> None:
    copy = tried(resolved({"kind": kind, "class": name, **({"voltage": "16 V"} if kind == "capacitor" else {})}))
    of_class = made(kind, name)
    for key, given in CLASSES[kind][name].items():
        unit = unit_of(kind, key)
        if key in ("value", "tolerance") or unit == TEXT:
            continue
        datum = copy.datum(key)
        assert datum is not None
        assert (datum.min, datum.typical, datum.max) == (given.minimum, given.typical, given.maximum)
        assert (datum.condition or "", datum.source) == (given.at, SOURCE)
        there, here = figure(copy, key, unit), figure(of_class, key, unit)
        assert there is not None
        assert here is not None
        assert there.limits == here.limits


@pytest.mark.parametrize(("kind", "name"), [(kind, name) for kind in CLASSES for name in CLASSES[kind]])
def test_the_data_page_shows_all_of_it(kind: str, name: str) -> None:
    rows = {row.name: row for row in part_data(made(kind, name))}
    for key, given in CLASSES[kind][name].items():
        row = rows[key]
        if row.own:  # a value that stands in
            continue
        assert (row.minimum, row.typical, row.maximum) == tuple(
            text or "" for text in (given.minimum, given.typical, given.maximum)
        )
        assert row.condition == (f"for {given.of.replace('_', ' ')}" if given.of else given.at)
        assert row.source == f"memory, class {name}"
        assert row.beside == (f"corners keep it typical: {given.held}" if given.held else "")
        assert len(row.beside) < SCREEN
    for key, points in POINTS.get(name, {}).items():
        assert rows[key].typical == f"{len(points.points)} points"
        assert all(x in rows[key].beside and y in rows[key].beside for x, y in points.points)
        assert rows[key].condition == points.at
        assert rows[key].source == f"memory, class {name}"
