"""Small designs with requirements, and the margins that a study makes of them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from stagebook.engine.design.document import Design
from stagebook.engine.results import CheckResult
from stagebook.engine.studies.margins import study

from ..circuits import Json, two

CONNECT: Json = {"at": "0 s", "event": "connect supply", "rise": "1 us"}


def design(
    *parts: Json,
    supply: str | Json = "9 V",
    ambient: str | Json = "20 C",
    source: str | Json = "0R",
    leakage: Sequence[str] = ("specified",),
    roles: Mapping[str, str] | None = None,
    events: Sequence[Json] = (CONNECT,),
    ends: str = "1 s",
    moments: Mapping[str, str | Json] | None = None,
    strays: Sequence[tuple[str, str, str]] = (),
    requirements: Sequence[Json] = (),
    **more: Any,
) -> Design:
    """A design of one stage ``unit`` with the sequence ``alarm``; all conditions stand still unless given as ranges."""
    document: Json = {
        "stagebook": 1,
        "name": "test",
        "conditions": {
            "supply": supply,
            "ambient": ambient,
            "source_resistance": source,
            "leakage": list(leakage),
        },
        "stages": [{"name": "unit", "parts": list(parts), "roles": dict(roles or {})}],
        "strays": [{"between": [a, b], "value": value} for a, b, value in strays],
        "sequences": {"alarm": {"ends": ends, "events": list(events), "moments": dict(moments or {})}},
        "requirements": list(requirements),
        **more,
    }
    return Design.load(document)


def exact(part: Json) -> Json:
    """The part without a tolerance."""
    return {**part, "tolerance": "0 %"}


def sounder(ref: str, plus: str, minus: str, current: str, least: str | None, rated: str = "9 V") -> Json:
    """A load that draws ``current`` at ``rated`` and is on above ``least``."""
    minimum = {} if least is None else {"operating_minimum": least}
    return two("sounder", ref, plus, minus, data={"current": current, "rated_voltage": rated, **minimum})


def margin(of: Design, slug: str, part: str) -> CheckResult:
    """One margin of a design at its worst corner."""
    found = {check.id: check for check in study(of).checks}
    name = f"{slug}:unit:{part}"
    assert name in found, f"{name} is not among {', '.join(found)}"
    return found[name]
