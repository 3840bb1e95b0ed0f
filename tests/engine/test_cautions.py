"""Cautions come with the parts and stages that call for them (usual practice, no source)."""

from __future__ import annotations

import pytest

from stagebook.engine.cautions import cautions_of
from stagebook.engine.design.document import Design

from .circuits import Json, capacitor, resistor, setup, two


def keys(*parts: Json) -> dict[str, tuple[str, ...]]:
    design = setup(*parts, ends=1.0).design
    return {caution.key: caution.about for caution in cautions_of(design)}


def test_every_design_is_told_what_it_is_not_for() -> None:
    assert keys(resistor("R1", "supply", "0V", "1k")) == {"purpose": ()}


@pytest.mark.parametrize(
    ("part", "key"),
    [
        ({"ref": "C1", "kind": "capacitor", "pins": {"plus": "supply", "minus": "0V"}, "value": "1u"}, "electrolytic"),
        (two("battery", "G1", "supply", "0V"), "battery"),
        (two("sounder", "LS1", "supply", "0V"), "sounder"),
        (two("probe", "B1", "supply", "0V", "1M"), "probe"),
        (two("clamp", "D1", "0V", "supply"), "safety_part"),
        (resistor("R1", "supply", "0V", "10R", rating="5 W"), "hot"),
        (two("contact", "K1", "supply", "0V", operated_by="K2"), "mains"),
    ],
)
def test_a_part_brings_its_caution(part: Json, key: str) -> None:
    assert keys(part)[key] == (part["ref"],)


def test_what_needs_no_caution_brings_none() -> None:
    small = resistor("R1", "supply", "n", "1k", rating="0.25 W")
    assert set(keys(small, capacitor("C1", "n", "0V", "100n"))) == {"purpose"}


@pytest.mark.parametrize(("period", "warned"), [("0.3 s", True), ("2 s", False), (None, True)])
def test_a_fast_flasher_is_warned_of(period: str | None, warned: bool) -> None:
    document = setup(resistor("R1", "supply", "0V", "1k"), ends=1.0).design.dump()
    document["stages"][0] |= {"kind": "astable", "settings": {} if period is None else {"period": period}}
    assert ("flashing" in {caution.key for caution in cautions_of(Design.load(document))}) is warned
