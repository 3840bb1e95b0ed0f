"""The single-fault study on small units whose outcome with each fault can be said by reasoning alone.

Limits of heat: Ohm's law. No published case exists for whole units; outcomes are argued beside each.
"""

from __future__ import annotations

import re
from functools import cache

import pytest

from stagebook.engine import edit
from stagebook.engine.checks.view import View
from stagebook.engine.circuit.circuit import build
from stagebook.engine.design.document import Design
from stagebook.engine.errors import Cancelled, CircuitError
from stagebook.engine.run import never
from stagebook.engine.studies.fault_lanes import FaultLanes
from stagebook.engine.studies.fault_list import faults_of
from stagebook.engine.studies.fault_outcomes import FaultResult, FaultSheet, Outcome
from stagebook.engine.studies.faulted import faulted
from stagebook.engine.studies.faults import _notes, study
from stagebook.engine.studies.healthy import Behaviour, behaviours

from ..checks.sheets import design, sounder
from ..circuits import Json, astable, capacitor, resistor, transistor, two

CONNECT: Json = {"at": "0 s", "event": "connect supply", "rise": "1 us"}


def event(at: str, what: str, part: str) -> Json:
    return {"at": at, "event": what, "part": part}


def buzzer(*parts: Json, **more: object) -> Design:
    """S1 feeds Q1, which switches LS1: on at 0.1 s, off at 0.3 s. W1 is the lead to S1."""
    return design(
        two("lead", "W1", "supply", "far", length="10 m", resistance="40 mohm/m"),
        two("contact", "S1", "far", "call"),
        resistor("R1", "call", "base", "1k", rating="0.25 W"),
        resistor("R2", "base", "0V", "10k", rating="0.25 W"),
        transistor("Q1", "low", "base", "0V", **{"class": "0.5 A driver npn"}),
        sounder("LS1", "supply", "low", "30 mA", "3 V", rated="6 V"),
        *parts,
        supply={"min": "4 V", "nominal": "6 V", "max": "6.4 V"},
        source={"min": "0R1", "nominal": "0R5", "max": "2R"},
        roles={"load": "LS1"},
        events=[CONNECT, event("0.1 s", "close", "S1"), event("0.3 s", "open", "S1")],
        ends="0.5 s",
        moments={"standby": "0.09 s"},
        **more,
    )


@cache
def of_buzzer() -> FaultSheet:
    return study(buzzer())


def outcome(sheet: FaultSheet, part: str, fault: str) -> FaultResult:
    return next(found for found in sheet.faults if (found.part, found.fault) == (part, fault))


@pytest.mark.parametrize(
    ("part", "fault", "expected"),
    [
        ("W1", "cut", Outcome.SILENT),  # S1 is fed no more
        ("W1", "shorted to 0V", Outcome.SILENT),  # S1 is fed 0 V
        ("S1", "stuck open", Outcome.SILENT),
        ("S1", "stuck closed", Outcome.RUNS_ON),  # LS1 is on from the connection to the end
        ("R1", "open", Outcome.SILENT),
        ("R2", "open", Outcome.STILL_ALARMS),  # R1 drives the base alone
        ("R2", "short", Outcome.SILENT),
        ("Q1", "collector open", Outcome.SILENT),
        ("Q1", "base open", Outcome.SILENT),
        ("Q1", "emitter open", Outcome.SILENT),
        ("Q1", "base to emitter short", Outcome.SILENT),
        ("Q1", "collector to emitter short", Outcome.RUNS_ON),
        ("LS1", "open", Outcome.SILENT),
        ("LS1", "short", Outcome.SILENT),
        ("supply", "weak cells", Outcome.STILL_ALARMS),  # 3.6 V behind 8 ohm leave 3.4 V to 18 mA
    ],
)
def test_a_fault_does_what_reasoning_says(part: str, fault: str, expected: Outcome) -> None:
    assert outcome(of_buzzer(), part, fault).outcome is expected


def test_what_a_fault_does_beside_its_worst_is_said_too() -> None:
    sheet = of_buzzer()
    # Stuck closed: LS1 is also on before S1 is meant to close; stand-by draws what LS1 does, 30 mA at 6 V.
    stuck = outcome(sheet, "S1", "stuck closed")
    assert stuck.words == "alarm never ends; alarms without cause"
    assert stuck.standby == pytest.approx(0.030 + 5.3e-3, rel=0.05)  # and R1 some 5.3 mA
    assert stuck.drains
    assert "in stand-by instead of" in stuck.detail
    # Without R1 the supply drives the base through half an ohm and more: amperes.
    assert outcome(sheet, "R1", "short").overheats[0] == "Q1"


def test_silent_faults_come_first_and_alarms_last() -> None:
    ranks = [found.outcome for found in of_buzzer().faults]
    assert ranks == sorted(ranks)
    assert ranks[0] is Outcome.SILENT
    assert ranks[-1] is Outcome.STILL_ALARMS
    assert len(ranks) == len(faults_of(buzzer()))


def test_the_sound_unit_is_known_and_gaps_do_not_change_it() -> None:
    sheet = of_buzzer()
    (behaviour,) = sheet.healthy
    assert (behaviour.load, behaviour.cause) == ("LS1", 0.1)
    assert behaviour.on == pytest.approx(0.1, abs=1e-4)
    assert behaviour.over == pytest.approx(0.3, abs=1e-3)
    # A fault that changes nothing leaves the times of the sound unit.
    spared = outcome(sheet, "R2", "open")
    assert (spared.on, spared.off) == (pytest.approx(0.1, abs=1e-4), pytest.approx(0.3, abs=1e-3))
    assert (spared.words, spared.detail) == ("still alarms", "")


def test_a_fault_is_the_same_as_the_document_edited_by_hand() -> None:
    # A timing capacitor of 100k and 1 uF at the base of a follower: its short and its loss, against edited documents.
    unit = buzzer(capacitor("C1", "base", "0V", "10u"))
    short, lost = (outcome(study(unit), "C1", fault) for fault in ("short", "open"))
    assert short.outcome is Outcome.SILENT
    without = study(edit.without_part(unit, "C1")).healthy[0]
    assert lost.on == pytest.approx(without.on, abs=1e-6)
    assert lost.off == pytest.approx(without.over, abs=1e-4)
    sound = study(unit).healthy[0]
    assert sound.on is not None
    assert lost.on is not None
    assert sound.on > lost.on + 1e-3


def test_a_fuse_that_a_fault_blows_is_named() -> None:
    # 6 V behind 0.5 + 0.1 ohm drive 10 A into R9's short: 2 A2s are over after 20 ms, and LS1 has the supply again.
    branch = two("fuse", "F1", "supply", "f", **{"class": "1 A slow"}), resistor("R9", "f", "0V", "12R", rating="10 W")
    found = outcome(study(buzzer(*branch)), "R9", "short")
    assert (found.outcome, found.words) == (Outcome.STILL_ALARMS, "still alarms; blows F1")


def test_a_resistor_overheats_by_ohms_law() -> None:
    # 2 x 100 ohm at 6 V: 0.09 W each; one shorted leaves 0.36 W to the other, 1.44 times 0.25 W.
    pair = (
        resistor("R8", "supply", "half", "100R", rating="0.25 W"),
        resistor("R9", "half", "0V", "100R", rating="0.25 W"),
    )
    found = outcome(study(buzzer(*pair)), "R8", "short")
    assert (found.outcome, found.overheats) == (Outcome.OVERHEATS, ("R9",))
    assert "R9 at 1.4 times its power" in found.detail
    spared = outcome(study(buzzer(*pair)), "R8", "open")
    assert (spared.outcome, spared.overheats) == (Outcome.STILL_ALARMS, ())


def test_an_alarm_before_its_cause_is_a_false_one() -> None:
    # S2 arms at 0.1 s, S1 calls at 0.2 s; with S1 stuck closed LS1 sounds as soon as it is armed, and stops as usual.
    unit = design(
        two("contact", "S2", "supply", "armed"),
        two("contact", "S1", "armed", "fed"),
        sounder("LS1", "fed", "0V", "30 mA", "3 V", rated="6 V"),
        supply="6 V",
        roles={"load": "LS1"},
        events=[
            CONNECT,
            event("0.1 s", "close", "S2"),
            event("0.2 s", "close", "S1"),
            event("0.3 s", "open", "S2"),
        ],
        ends="0.5 s",
    )
    sheet = study(unit)
    assert sheet.healthy[0].cause == 0.2
    assert outcome(sheet, "S1", "stuck closed").outcome is Outcome.FALSE_ALARM
    assert outcome(sheet, "S2", "stuck closed").outcome is Outcome.RUNS_ON
    assert outcome(sheet, "S2", "stuck open").outcome is Outcome.SILENT


def test_a_blip_within_the_bounce_of_a_contact_is_no_alarm() -> None:
    # With R1 lost, C1 passes each edge of S1 to the base for some 10n x 10k = 0.1 ms; the bounce lasts 5 ms.
    unit = buzzer(capacitor("C1", "call", "base", "10n")).dump()
    unit["sequences"]["alarm"]["events"][1]["bounce"] = {"for": "5 ms", "times": 3}
    sheet = study(Design.load(unit))
    assert sheet.healthy[0].lasts == pytest.approx(0.2, abs=0.01)
    assert outcome(sheet, "R1", "open").outcome is Outcome.SILENT
    assert outcome(sheet, "C1", "open").words == "still alarms"


def test_a_battery_has_its_own_faults() -> None:
    unit = design(
        {"ref": "G1", "kind": "battery", "pins": {"plus": "cells", "minus": "0V"}, "class": "9 V block"},
        two("contact", "S1", "cells", "fed"),
        sounder("LS1", "fed", "0V", "20 mA", "6.5 V"),
        roles={"load": "LS1"},
        events=[event("0.1 s", "close", "S1")],
        ends="0.5 s",
        conditions={"ambient": "25 C"},
    )
    sheet = study(unit)
    # A tenth of the charge: 7.0 V behind 10 ohm leave 6.8 V to 16 mA, more than 6.5 V.
    assert outcome(sheet, "G1", "weak cells").outcome is Outcome.STILL_ALARMS
    assert outcome(sheet, "G1", "open").outcome is Outcome.SILENT
    assert outcome(sheet, "G1", "short").outcome is Outcome.SILENT
    assert sheet.notes == ("LS1 is still on where its sequences end: whether it runs on for ever cannot be told",)
    assert not any(found.part == "supply" for found in sheet.faults)


def test_a_unit_without_a_load_is_refused_in_words() -> None:
    with pytest.raises(CircuitError, match="operating_minimum"):
        study(design(resistor("R1", "supply", "0V", "1k")))


def test_it_stops_when_asked_to() -> None:
    with pytest.raises(Cancelled):
        study(buzzer(), cancelled=lambda: True)


def test_json_says_outcomes_in_words_and_counts_them() -> None:
    found = of_buzzer().as_json()
    assert found["faults"][0]["outcome"] == "silent"
    assert sum(found["counts"].values()) == len(found["faults"])
    assert found["counts"]["silent"] == sum(fault["outcome"] == "silent" for fault in found["faults"])


def without_r9(*parts: Json) -> FaultResult:
    """What becomes of the unit with these parts when R9, which holds an astable still, is open."""
    held = buzzer(*parts, resistor("R9", "b1", "0V", "100R"))
    gone = next(fault for fault in faults_of(held) if (fault.part, fault.words) == ("R9", "open"))
    view = View(held, build(held))
    (found,) = FaultLanes(faulted(held, (gone,)), behaviours(view, never), lambda done: None, never).results()
    return found


# 0.69 x (47k + 33k) x 220 pF, some 80 kHz, for the half second of the sequence.
ASTABLE = astable(21, "2k2", ("47k", "33k"), ("220p", "220p"))


def test_a_fault_that_sets_a_unit_oscillating_is_told_with_net_and_frequency() -> None:
    found = without_r9(*ASTABLE)
    assert found.outcome is Outcome.STILL_ALARMS
    said = re.search(r"oscillates near net \w+ at ([\d.]+) kHz", found.detail)
    assert said is not None, found.detail
    assert 30.0 < float(said[1]) < 300.0


def test_a_fault_that_no_run_can_follow_is_unknown_with_net_and_frequency(monkeypatch: pytest.MonkeyPatch) -> None:
    # Its swings are not alike, as it would seem.
    monkeypatch.setattr("stagebook.engine.carry.follower.Follower._found", lambda *_: None)
    found = without_r9(*ASTABLE)
    assert found.outcome is Outcome.UNKNOWN
    said = re.fullmatch(
        r"not known: took too many steps .* oscillating near net \w+ at about (\d+)\S* kHz.*", found.words
    )
    assert said is not None, found.words
    assert 30.0 < float(said[1]) < 300.0
    assert "end the sequence sooner" not in found.words


@pytest.mark.parametrize(("over", "notes"), [(3e-6, 0), (0.5, 1)])
def test_only_an_alarm_with_the_supply_is_worth_a_note(over: float, notes: int) -> None:
    # A sounder does nothing in a microsecond; half a second is heard.
    alarm = Behaviour("LS1", "alarm", "supply", "0V", 3.0, 1.0, cause=0.1, on=0.1, over=0.3)
    snap = Behaviour("LS1", "snap", "supply", "0V", 3.0, 1.0, cause=0.0, on=1e-6, over=over, by_supply=True)
    assert len(_notes((alarm, snap))) == notes
