"""The JSON Schema of the design document, as it is printed for editors and other programs."""

from __future__ import annotations

from typing import Any

from pydantic import TypeAdapter

from .clause import Text
from .datum import Entry
from .document import Design


def schema() -> dict[str, Any]:
    """JSON Schema (draft 2020-12) of the document: what each field holds, in the document's own words."""
    made = Design.model_json_schema(by_alias=True)
    shared = {"Text": TypeAdapter(Text).json_schema(), "Entry": TypeAdapter(Entry).json_schema()}
    names = {"Text": _tidy(shared["Text"]), "Entry": {"anyOf": _tidy(shared["Entry"])["anyOf"]}}
    tidy = _named(_tidy(made), names)
    described = {
        "Text": {"description": "One line of visible text, a value with its unit as typed.", **names["Text"]},
        "Entry": {
            "description": "A datum: a text, a number in SI units, limits, a group of data or a list of points.",
            "anyOf": _named(names["Entry"]["anyOf"], {"Text": names["Text"]}),
        },
    }
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        **tidy,
        "title": "Stagebook design document",
        "$defs": {**described, **tidy["$defs"]},
    }


def _tidy(value: Any, fields: bool = False) -> Any:
    """Without titles made from field names and without nulls; ``fields`` where the keys are names of fields.

    A value that several shapes admit is fine, so ``oneOf`` becomes ``anyOf``.
    """
    if isinstance(value, list):
        return [_tidy(each) for each in value if each != {"type": "null"}]
    if not isinstance(value, dict):
        return value
    if fields:
        return {key: _tidy(inner) for key, inner in value.items()}
    kept: dict[str, Any] = {}
    for key, inner in value.items():
        if key in ("title", "discriminator") or (key == "default" and (not inner or isinstance(inner, dict))):
            continue
        if key in ("const", "enum", "examples", "default", "required"):
            kept[key] = inner
        elif key == "description":
            kept[key] = " ".join(inner.split("\n\n")[0].replace("``", "'").split())
        else:
            kept["anyOf" if key == "oneOf" else key] = _tidy(inner, key in ("properties", "$defs", "patternProperties"))
    if "patternProperties" in kept:
        kept["additionalProperties"] = False
    if len(kept.get("anyOf", ())) == 1:
        return {**kept.pop("anyOf")[0], **kept}
    return kept


def _named(value: Any, names: dict[str, dict[str, Any]]) -> Any:
    """With a reference wherever one of the named schemas stands in full; what stands beside it stays."""
    if isinstance(value, list):
        return [_named(each, names) for each in value]
    if not isinstance(value, dict):
        return value
    for name, named in names.items():
        if all(value.get(key) == inner for key, inner in named.items()):
            return {"$ref": f"#/$defs/{name}", **{key: inner for key, inner in value.items() if key not in named}}
    return {key: _named(inner, names) for key, inner in value.items()}
