"""The JSON Schema of the document: complete, closed, and in the document's own words."""

from __future__ import annotations

import json
from collections.abc import Iterator
from typing import Any

from stagebook.engine.design.document import Design
from stagebook.engine.design.part import Part
from stagebook.engine.design.schema import schema


def inside(value: Any) -> Iterator[dict[str, Any]]:
    """Every object in a JSON value."""
    for inner in value.values() if isinstance(value, dict) else value if isinstance(value, list) else ():
        yield from inside(inner)
    if isinstance(value, dict):
        yield value


def test_every_reference_leads_to_a_definition() -> None:
    made = schema()
    names = {f"#/$defs/{name}" for name in made["$defs"]}
    references = {each["$ref"] for each in inside(made) if "$ref" in each}
    assert references
    assert references <= names
    assert {"#/$defs/Entry", "#/$defs/Text"} <= references


def test_the_fields_are_those_of_the_document() -> None:
    made = schema()
    assert set(made["properties"]) == set(Design.model_fields)
    assert made["required"] == ["stagebook", "name", "sequences"]
    assert made["additionalProperties"] is False
    fields = made["$defs"]["Part"]["properties"]
    assert len(fields) == len(Part.model_fields)
    assert {"class", "value", "operated_by", "waveform"} <= set(fields)
    assert {"from", "to", "required", "reason"} <= set(made["$defs"]["Requirement"]["properties"])
    assert "for" in made["$defs"]["Dip"]["required"]


def test_nothing_of_the_program_shows() -> None:
    text = json.dumps(schema())
    for inner_name in ("class_", "from_", "for_", "``", '"null"', "oneOf", "discriminator"):
        assert inner_name not in text
