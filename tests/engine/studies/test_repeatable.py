"""The same numbers whatever the number of threads, and the same margins whatever things are called and listed."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest

from stagebook.engine import run as running
from stagebook.engine.results import CheckResult, MarginSheet
from stagebook.engine.studies.margins import study

from ..circuits import Json
from .units import latch, load, timer

UNITS = {"timer": timer(), "latch": latch()}
ROUNDING = 2e-3  # another order of elimination rounds otherwise, and every step is then another one


@pytest.fixture(params=UNITS)
def document(request: pytest.FixtureRequest) -> Json:
    return UNITS[request.param]


def sheet(document: Json, lanes: int = 40) -> MarginSheet:
    return replace(study(load(document), lanes=lanes), seconds=0.0)


def test_threads_change_no_bit(document: Json, monkeypatch: pytest.MonkeyPatch) -> None:
    found = []
    for workers in (1, 2, 5):
        monkeypatch.setattr(running.os, "cpu_count", lambda workers=workers: workers)
        found.append(sheet(document))
    assert found[0] == found[1] == found[2]


def test_a_stored_sheet_comes_back_as_it_was(document: Json) -> None:
    found = sheet(document)
    assert MarginSheet.from_json(json.loads(json.dumps(found.as_json()))) == found


def alike(one: dict[str, CheckResult], other: dict[str, CheckResult]) -> None:
    assert one.keys() == other.keys()
    for name, check in one.items():
        again = other[name]
        assert again.verdict is check.verdict, name
        assert again.outcome == check.outcome, name
        if check.margin is None:
            assert again.margin is None, name
            continue
        # Of what is used of the capability: a trial ends at the same step of its knob or a neighbouring one.
        trial = 0.04 if name.startswith(("latch", "supply_slew")) else 0.0
        scale = max(1.0, 1.0 - check.margin)
        assert again.margin == pytest.approx(check.margin, abs=(ROUNDING + trial) * scale), name


def by_id(document: Json) -> dict[str, CheckResult]:
    return {check.id: check for check in study(load(document)).checks}


def test_margins_do_not_depend_on_the_names_of_nets(document: Json) -> None:
    names = {net: f"n{n}" for n, net in enumerate(sorted(load(document).nets)) if net not in ("supply", "0V")}
    renamed: Json = json.loads(json.dumps(document))
    for stage in renamed["stages"]:
        for part in stage["parts"]:
            part["pins"] = {pin: names.get(net, net) for pin, net in part["pins"].items()}
    for stray in renamed.get("strays", ()):
        stray["between"] = [names.get(net, net) for net in stray["between"]]
    assert not set(load(renamed).nets) & set(names)
    alike(by_id(document), by_id(renamed))


def test_margins_do_not_depend_on_the_order_of_parts_and_stages(document: Json) -> None:
    stages = [{**stage, "parts": stage["parts"][::-1]} for stage in document["stages"][::-1]]
    alike(by_id(document), by_id(document | {"stages": stages}))
