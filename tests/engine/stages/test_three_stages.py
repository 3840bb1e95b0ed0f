"""The margins of a design of three catalogue stages: entry, long RC timer, low-side driver with its sounder.

A start delay: 60 s +/- 40 % after the supply comes it sounds, at least 80 dB at 1 m. What passes and what fails has its
reason on the sheet; the worked figures are by hand.
"""

from __future__ import annotations

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import CheckResult, Verdict
from stagebook.engine.studies.margins import study

from .made import choice, made


def delay(**timer: str) -> Design:
    heard = choice("low_side_driver", "driver", heard="80 dB")
    return made(choice("entry"), choice("long_timer", "timer", time="60 s", **timer), heard)


@pytest.fixture(scope="module")
def sheet() -> dict[str, CheckResult]:
    return {check.id: check for check in study(delay()).checks}


def test_it_holds_every_margin(sheet: dict[str, CheckResult]) -> None:
    assert {name: check.reason for name, check in sheet.items() if check.verdict is not Verdict.PASS} == {}
    slugs = {name.split(":")[0] for name in sheet}
    assert {
        "duration",
        "arrival",
        "base_overdrive",
        "reversal",
        "sound_level",
        "load_voltage",
        "resistor_power",
    } <= slugs


def test_its_worst_time_is_what_the_tolerances_make_of_it(sheet: dict[str, CheckResult]) -> None:
    # C 10 % and 5 % drift, R 1 %: 0.9 x 0.95 x 0.99 = 0.85 and 1.17 times; threshold and leakage take some more.
    found = sheet["duration:timer:C2"]
    assert found.low is not None
    assert found.high is not None
    assert 0.6 * 60.0 < found.low < 0.87 * 60.0
    assert 1.15 * 60.0 < found.high < 1.4 * 60.0


def test_an_electrolytic_never_gets_there_and_the_sheet_says_so() -> None:
    # 0.01 C V leaks C/100 s, twice as much at 50 C: with R C = 130 s it rests at V/(1 + 2.3), below 0.3 V + 1 V.
    found = {check.id: check for check in study(delay(capacitor="electrolytic")).checks}
    arrival = next(check for name, check in found.items() if name.startswith("arrival:timer"))
    assert arrival.verdict is Verdict.FAIL
    assert arrival.corner is not None
    assert "hot" in arrival.corner
    assert "leaky capacitors" in arrival.corner
