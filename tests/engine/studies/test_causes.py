"""Causes of a change of margins: shares per change that sum to it, on small designs."""

from __future__ import annotations

from dataclasses import replace
from math import fsum

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import Cancelled
from stagebook.engine.results import MarginSheet
from stagebook.engine.studies.causes import Cause, CausesSheet, causes
from stagebook.engine.studies.margins import study

from ..circuits import Json, capacitor, resistor, transistor
from .units import changed, latch, load, timer

OVERDRIVE, DURATION, SLEW = "base_overdrive:driver:Q3", "duration:timer:LS2", "supply_slew:latch:Q2"


def between(old: Json, new: Json, stored: MarginSheet | None = None, seed: int = 1) -> dict[str, Cause]:
    return {cause.id: cause for cause in causes(load(old), load(new), stored=stored, seed=seed).checks}


def with_parts(document: Json, *parts: Json, **roles: str) -> Json:
    first, *rest = document["stages"]
    grown = {**first, "parts": [*first["parts"], *parts], "roles": first["roles"] | roles}
    return document | {"stages": [grown, *rest]}


def clamped(design: Design) -> dict[str, float]:
    return {c.id: max(-1.0, min(1.0, c.margin)) for c in study(design).checks if c.margin is not None}


def test_shares_sum_to_the_change_of_every_margin() -> None:
    old, new = timer(), changed(timer(), R7="1k", R1="330k", C1="22u", R8="4k7")
    found = between(old, new)
    assert len(found) > 5
    for cause in found.values():
        assert fsum(cause.shares.values()) == pytest.approx(cause.after - cause.before, abs=1e-14), cause.id
        assert list(cause.shares) == ["R7", "R8", "R1", "C1"]
        assert cause.error is None
        interaction = cause.after - cause.before - sum(v - cause.before for v in cause.alone.values())
        assert cause.interaction == pytest.approx(interaction, abs=1e-12)


def test_a_single_change_has_the_whole_share() -> None:
    cause = between(timer(), changed(timer(), R7="1k"))[OVERDRIVE]
    assert cause.shares == {"R7": cause.after - cause.before}
    assert cause.alone == {"R7": cause.after}
    assert cause.reverted == {"R7": cause.before}
    assert cause.interaction == pytest.approx(0.0, abs=1e-15)


def test_before_and_after_are_the_margins_in_the_union_of_both_worst_corners() -> None:
    old, new = timer(), changed(timer(), R7="1k", R1="330k")
    before, after = clamped(load(old)), clamped(load(new))
    for name, cause in between(old, new).items():
        # The other design's worst corner cannot be worse than its own, but for what a corner search leaves, and
        # where a peak of power between two steps is read.
        near = 1e-3 if name.startswith("junction_temperature") else 1e-4
        assert cause.before == pytest.approx(before[name], abs=near), name
        assert cause.after == pytest.approx(after[name], abs=near), name


def test_a_part_that_does_nothing_gets_nothing() -> None:
    # The rating of R8 is no part of the circuit, and the timer runs beside the driver.
    document = changed(timer(), R7="1k")
    document["stages"][0]["parts"][2] = {**document["stages"][0]["parts"][2], "rating": "0.5 W"}
    found = between(timer(), document)
    assert found[OVERDRIVE].shares["R8"] == 0.0
    assert found["resistor_power:driver:R8"].shares["R8"] > 0.0
    assert found["resistor_power:driver:R7"].shares["R8"] == 0.0


def halves(first: str, second: str) -> Json:
    """The timing resistor in two halves of the same value."""
    document = changed(timer(), R1=first)
    driver, timing = document["stages"]
    parts = [
        {**part, "pins": {"a": "supply", "b": "half"}} if part["ref"] == "R1" else part for part in timing["parts"]
    ]
    parts.insert(1, resistor("R2", "half", "tc", second, tolerance="5 %", rating="0.25 W"))
    roles = {"load": "LS2", "timing_capacitor": "C1"}
    return document | {"stages": [driver, {**timing, "parts": parts, "roles": roles}]}


def test_changes_that_are_alike_get_the_same_share() -> None:
    cause = between(halves("220k", "220k"), halves("180k", "180k"))[DURATION]
    assert abs(cause.shares["R1"]) > 0.01
    # They stand at different nets: alike but for the solver's tolerance.
    assert cause.shares["R1"] == pytest.approx(cause.shares["R2"], abs=2e-4)


def test_two_parts_that_only_work_together_share_equally() -> None:
    # 100 pF reach either base, and what one of them is turned on for charges the capacitor of the other: one capacitor
    # alone still trips (-1), both make immune (+1).
    strays = [{"between": pair, "value": "100 pF"} for pair in (["supply", "base"], ["high", "0V"])]
    npn = capacitor("C1", "base", "0V", "4n7", tolerance="10 %")
    pnp = capacitor("C2", "supply", "high", "10n", tolerance="10 %")
    old = latch(strays=strays)
    cause = between(old, with_parts(old, npn, pnp))[SLEW]
    assert (cause.before, cause.after) == (-1.0, 1.0)
    assert cause.alone == {"C1": -1.0, "C2": -1.0}
    assert cause.reverted == {"C1": -1.0, "C2": -1.0}
    assert cause.shares == {"C1": 1.0, "C2": 1.0}
    assert cause.interaction == 2.0


def test_an_added_part_is_one_change_with_its_role() -> None:
    old = timer()
    added = with_parts(old, capacitor("C9", "base", "0V", "10n", tolerance="10 %"), base_capacitor="C9")
    found = causes(load(old), load(changed(added, R7="1k")))
    assert found.changed == ("R7", "C9")
    for cause in found.checks:
        assert fsum(cause.shares.values()) == pytest.approx(cause.after - cause.before, abs=1e-14)


def test_parts_that_cannot_be_without_each_other_are_one_change() -> None:
    # A second transistor with its resistor at a net of their own: neither makes a circuit alone.
    old = timer()
    new = with_parts(
        changed(old, R7="1k"),
        resistor("R20", "call", "second", "1k", tolerance="5 %", rating="0.25 W"),
        transistor("Q20", "low", "second", "0V", **{"class": "0.5 A driver npn"}),
    )
    found = causes(load(old), load(new))
    assert set(found.changed) == {"R7", "R20, Q20"}
    assert set(found.appeared) == {
        "reverse_base_emitter:driver:Q20", "peak_collector_emitter:driver:Q20", "resistor_power:driver:R20",
        "junction_temperature:driver:Q20",
    }  # fmt: skip
    assert found.vanished == ()
    back = causes(load(new), load(old))
    assert set(back.vanished) == set(found.appeared)
    assert back.appeared == ()


def test_a_changed_requirement_is_a_cause() -> None:
    wider = timer()
    wider["requirements"] = [{"check": "duration", "of": "LS2", "min": "1 s", "max": "20 s"}, wider["requirements"][1]]
    found = between(timer(), changed(wider, R7="1k"))
    cause = found[DURATION]
    assert cause.shares["requirement duration LS2"] == pytest.approx(cause.after - cause.before, abs=1e-3)
    assert cause.after > cause.before
    assert found[OVERDRIVE].shares["requirement duration LS2"] == 0.0


def test_a_changed_condition_is_a_cause() -> None:
    colder = timer()
    colder["conditions"] = colder["conditions"] | {"ambient": {"min": "-20 C", "nominal": "25 C", "max": "50 C"}}
    cause = between(timer(), colder)[OVERDRIVE]
    assert cause.shares == {"conditions.ambient": cause.after - cause.before}
    assert cause.after < cause.before


def test_nothing_changed_gives_an_empty_sheet() -> None:
    assert causes(load(timer()), load(timer())) == CausesSheet("unit", (), (), (), (), ())


def test_nothing_changed_but_the_engine_leaves_the_change_of_formula() -> None:
    design = load(timer())
    found = causes(design, design, stored=replace(study(design), engine="0"))
    assert found.changed == ()
    assert len(found.checks) > 5
    for cause in found.checks:
        assert (cause.shares, cause.interaction, cause.after - cause.before) == ({}, 0.0, 0.0)
        assert cause.formula == pytest.approx(0.0, abs=1e-9)


def test_more_than_six_changes_are_sampled() -> None:
    new = changed(timer(), R7="820R", R8="8k2", R1="430k", C1="12u")
    driver, timing = new["stages"]
    parts = [{**part, "class": "small npn"} if part["ref"] == "Q3" else part for part in driver["parts"]]
    parts[-1] = {**parts[-1], "data": {"current": {"typical": "20 mA", "max": "30 mA"}, "operating_minimum": "3 V"}}
    new = new | {"stages": [{**driver, "parts": parts}, timing]}
    new["conditions"] = new["conditions"] | {"supply": {"min": "4.4 V", "nominal": "6 V", "max": "6.5 V"}}
    first = causes(load(timer()), load(new), seed=1)
    assert len(first.changed) == 7
    for cause in first.checks:
        assert cause.error is not None
        assert fsum(cause.shares.values()) == pytest.approx(cause.after - cause.before, abs=1e-14), cause.id
    overdrive = next(cause for cause in first.checks if cause.id == OVERDRIVE)
    assert overdrive.error is not None
    assert overdrive.error["R7"] > 0.0
    # The timer has no part in it, in whatever order it is changed.
    assert (overdrive.shares["C1"], overdrive.error["C1"]) == (
        pytest.approx(0.0, abs=1e-4),
        pytest.approx(0.0, abs=1e-4),
    )


def test_what_a_newer_engine_makes_of_the_old_document_is_told_apart() -> None:
    old, new = timer(), changed(timer(), R7="1k")
    sheet = study(load(old))
    assert between(old, new, stored=sheet)[OVERDRIVE].formula is None
    moved = tuple(replace(c, margin=None if c.margin is None else c.margin - 0.125) for c in sheet.checks)
    other = replace(sheet, engine="0", checks=moved)
    cause = between(old, new, stored=other)[OVERDRIVE]
    assert cause.formula == pytest.approx(0.125, abs=1e-9)
    assert cause.shares == {"R7": cause.after - cause.before}


def test_an_unknown_margin_is_listed_and_not_shared() -> None:
    unrated = timer()
    driver, timing = unrated["stages"]
    parts = [{k: v for k, v in part.items() if not (part["ref"] == "R8" and k == "rating")} for part in driver["parts"]]
    found = causes(load(unrated | {"stages": [{**driver, "parts": parts}, timing]}), load(timer()))
    assert found.unknown == ("resistor_power:driver:R8",)
    assert "resistor_power:driver:R8" not in {cause.id for cause in found.checks}


def test_stored_corners_give_the_same_shares() -> None:
    old, new = load(timer()), load(changed(timer(), R7="1k", C1="12u"))
    assert causes(old, new) == causes(old, new, stored=study(old), stored_new=study(new))


def test_progress_and_cancelling() -> None:
    told: list[tuple[int, int]] = []
    old, new = load(timer()), load(changed(timer(), R7="1k", C1="12u"))
    causes(old, new, progress=lambda done, total: told.append((done, total)))
    assert [done for done, total in told if total == 4][-1] == 4
    with pytest.raises(Cancelled):
        causes(old, new, cancelled=lambda: True)


def test_as_json_has_the_keys_of_the_command() -> None:
    sheet = causes(load(timer()), load(changed(timer(), R7="1k"))).as_json()
    assert sheet["design"] == "unit"
    assert sheet["changed"] == ["R7"]
    assert {"id", "before", "after", "shares", "interaction", "alone", "reverted"} <= sheet["checks"][0].keys()
    assert "error" not in sheet["checks"][0]
