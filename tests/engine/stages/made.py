"""Designs made of catalogue stages, and the nominal run of their alarm."""

from __future__ import annotations

from collections.abc import Mapping

from stagebook.engine.design.document import Design
from stagebook.engine.primitives.signals import Anchor, Row, crossing, level, voltage
from stagebook.engine.quantity import read
from stagebook.engine.run import Observed
from stagebook.engine.stages.making import new_design
from stagebook.engine.stages.row import Choice

from ..circuits import Json, Setup

PIEZO = Choice("low_side_driver", "driver", {"load": "piezo", "current": "12 mA"})


def conditions(low: str = "11 V", nominal: str = "12 V", high: str = "14 V") -> Json:
    return {
        "supply": {"min": low, "nominal": nominal, "max": high},
        "ambient": {"min": "0 C", "nominal": "25 C", "max": "45 C"},
        "source_resistance": {"min": "0R1", "nominal": "0R5", "max": "2R"},
    }


def made(*row: Choice, supply: tuple[str, str, str] = ("11 V", "12 V", "14 V")) -> Design:
    """A design of these stages."""
    return new_design("test", "a row of stages", conditions(*supply), row)


def choice(kind: str, name: str = "", **settings: str) -> Choice:
    return Choice(kind, name, settings)


def value(design: Design, stage: str, role: str, unit: str = "ohm") -> float:
    """The value of the part that fills a role of a stage."""
    text = design.part(design.stage(stage).roles[role]).value
    assert text is not None
    return read(text, unit)


def run(design: Design, *rows: Row, changes: Mapping[tuple[str, str], float] | None = None) -> Observed:
    """The nominal alarm, or one with some columns set."""
    return Setup(design).run(*rows, changes=changes)


def seconds(seen: Observed, row: Row) -> float:
    """The instant that a crossing found, nan where it never came."""
    return float(seen.value(row)[0])


def passing(net: str, volts: float, *, rising: bool, start: Anchor | None = None, nth: int = 1) -> Row:
    return crossing(voltage(net), volts, rising, start or Anchor(), nth=nth)


def at(net: str, second: float) -> Row:
    return level(voltage(net), Anchor(second))


def load_goes(on: bool, start: Anchor | None = None, net: str = "driver.low", supply: float = 12.0) -> Row:
    """The instant at which a load between the supply and a net comes on or goes off, at half of the supply."""
    return crossing(voltage("supply", net), 0.5 * supply, on, start or Anchor())


def begins(design: Design) -> float:
    """The instant at which the alarm of a design begins, s."""
    moment = design.sequences["alarm"].moments["begins"]
    assert isinstance(moment, str)
    return read(moment, "s")
