"""Small designs and sheets, a clock that ticks a second a look, and child processes that use the store."""

from __future__ import annotations

import itertools
import json
import os
import subprocess
import sys
from collections.abc import Callable, Iterator
from contextlib import ExitStack
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import CheckResult, Depth, MarginSheet, Verdict
from stagebook.storage import Store

MakeDesign = Callable[..., Design]
MakeSheet = Callable[..., MarginSheet]
Child = Callable[..., "subprocess.Popen[str]"]


def document(r8: str = "10k", purpose: str = "sounds while S1 is closed") -> dict[str, Any]:
    """The example of the document format, with a choice of R8."""
    return {
        "stagebook": 1,
        "name": "example",
        "purpose": purpose,
        "conditions": {
            "supply": {"min": "4 V", "nominal": "6 V", "max": "6.4 V"},
            "ambient": {"min": "0 C", "nominal": "25 C", "max": "50 C"},
            "source_resistance": {"min": "0R1", "nominal": "0R5", "max": "2R"},
            "leakage": ["conditioned", "specified"],
        },
        "stages": [
            {
                "name": "driver",
                "kind": "free",
                "roles": {"driver": "Q3", "base_resistor": "R7", "load": "LS1"},
                "parts": [
                    {"ref": "S1", "kind": "contact", "pins": {"a": "supply", "b": "call"}},
                    {"ref": "R7", "kind": "resistor", "pins": {"a": "call", "b": "base"}, "value": "680R"},
                    {"ref": "R8", "kind": "resistor", "pins": {"a": "base", "b": "0V"}, "value": r8},
                    {
                        "ref": "Q3",
                        "kind": "npn",
                        "pins": {"collector": "low", "base": "base", "emitter": "0V"},
                        "class": "0.5 A driver npn",
                    },
                    {
                        "ref": "LS1",
                        "kind": "sounder",
                        "pins": {"plus": "supply", "minus": "low"},
                        "data": {
                            "current": {"typical": "150 mA", "max": "200 mA", "source": "datasheet"},
                            "operating_minimum": "3 V",
                        },
                    },
                ],
            }
        ],
        "sequences": {
            "alarm": {
                "events": [
                    {"at": "0 s", "event": "connect supply", "rise": "1 us"},
                    {"at": "1 s", "event": "close", "part": "S1"},
                ],
                "ends": "5 s",
                "moments": {"standby": "0.9 s"},
            }
        },
    }


@pytest.fixture(scope="session")
def design() -> MakeDesign:
    return lambda *args, **kwargs: Design.load(document(*args, **kwargs))


@pytest.fixture(scope="session")
def sheet() -> MakeSheet:
    """A sheet of margins for a design: ``sheet(design, driver=0.2)`` has one check of stage driver at 20 %."""

    def make(of: Design, **margins: float | None) -> MarginSheet:
        return MarginSheet(
            design="example",
            content=of.content,
            engine="1",
            seed=1,
            lanes=0,
            seconds=0.5,
            depth=Depth.CORNERS,
            checks=tuple(check_of(stage, margin) for stage, margin in margins.items()),
        )

    return make


def check_of(stage: str, margin: float | None) -> CheckResult:
    required = 0.1
    if margin is None:
        verdict = Verdict.UNKNOWN
    else:
        verdict = Verdict.PASS if margin >= required else Verdict.THIN if margin >= 0 else Verdict.FAIL
    return CheckResult(
        id=f"load-voltage:{stage}:LS1",
        number=2,
        title="load voltage",
        stage=stage,
        part="LS1",
        sequence="alarm",
        demand=3.0,
        capability=None if margin is None else 3.0 / (1 - margin),
        unit="V",
        limits=None,
        low=None,
        high=None,
        margin=margin,
        required=required,
        verdict=verdict,
        outcome=None,
        reason=None,
        corner="cold, low supply",
        conditions={"supply": 4.0, "leakage": "specified"},
        nominal=margin,
        hand=None,
        spread=None,
    )


@pytest.fixture
def clock() -> Callable[[], datetime]:
    ticks = itertools.count()
    return lambda: datetime(2026, 12, 1, 9, 0, tzinfo=UTC) + timedelta(seconds=next(ticks))


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "shelf" / "stagebook.sqlite3"


@pytest.fixture
def store(path: Path, clock: Callable[[], datetime]) -> Iterator[Store]:
    with Store.open(path, clock=clock) as opened:
        yield opened


@pytest.fixture
def flood(store: Store, design: MakeDesign) -> Store:
    """The store with one design on its shelf."""
    store.create("flood", design())
    return store


PREAMBLE = """
import json, os, sys
from dataclasses import replace
from pathlib import Path
from stagebook.engine.design.document import Design
from stagebook.engine.results import MarginSheet
from stagebook.storage import *
path = Path(sys.argv[1])
sheet = MarginSheet.from_json(json.loads(sys.argv[3]))
def design(r8="10k"):
    document = json.loads(sys.argv[2])
    document["stages"][0]["parts"][2]["value"] = r8
    return Design.load(document)
def sheet_of(design):
    return replace(sheet, content=design.content)
def say(*words):
    print(*words, flush=True)
"""
"""What a child's code can use: path, design(r8), sheet_of(design), say(...) and all of stagebook.storage."""


@pytest.fixture
def child(path: Path, sheet: MakeSheet) -> Iterator[Child]:
    """Starts a Python process that runs some code with the store's path."""
    with ExitStack() as processes:

        def start(code: str, at: Path = path) -> subprocess.Popen[str]:
            margins = sheet(Design.load(document()), driver=0.2).as_json()
            process = subprocess.Popen(
                [sys.executable, "-c", PREAMBLE + code, str(at), json.dumps(document()), json.dumps(margins)],
                stdin=subprocess.PIPE,
                stdout=subprocess.PIPE,
                text=True,
                env={**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)},
            )
            processes.enter_context(process)
            processes.callback(process.kill)
            return process

        yield start


@pytest.fixture(scope="session")
def next_line() -> Callable[[subprocess.Popen[str]], str]:
    """Waits for the next line that a child says."""

    def read(process: subprocess.Popen[str]) -> str:
        assert process.stdout is not None
        return process.stdout.readline().strip()

    return read


@pytest.fixture(scope="session")
def plain() -> Callable[[BaseException], str]:
    """The message of an error, after a look at its form: one line, a full stop, nothing of the machinery in it."""

    def message(error: BaseException) -> str:
        text = str(error)
        assert text.endswith((".", "?"))
        assert text[0].isupper() or text[0] in "'/"
        for foreign in ("\n", "Traceback", "sqlalchemy", "sqlite3.", "Errno", "SELECT", "INSERT"):
            assert foreign not in text.replace("stagebook.sqlite3", "")
        return text

    return message
