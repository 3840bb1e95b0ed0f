"""Rows of stages: connecting, naming, provenance, adding to a design, and what is refused."""

from __future__ import annotations

import json

import pytest

from stagebook.engine import edit
from stagebook.engine.circuit.inspection import inspect
from stagebook.engine.design.document import Design
from stagebook.engine.errors import DesignError
from stagebook.engine.parts import kinds
from stagebook.engine.primitives.signals import Anchor, crossing, voltage
from stagebook.engine.results import Verdict
from stagebook.engine.stages import stage_kinds
from stagebook.engine.stages.kind import Wire
from stagebook.engine.stages.making import doubts, new_design, with_catalogue_stage
from stagebook.engine.stages.modified import is_modified
from stagebook.engine.stages.row import Choice
from stagebook.engine.studies.margins import study

from .made import PIEZO, begins, choice, conditions, made, run, seconds, value

CALL = choice("contact_no", "call")
FEEDS = {"battery_backup": ("15 V", "15.5 V", "16 V")}


def row_with(kind: str) -> tuple[Choice, ...]:
    """A row in which a stage of this kind stands where it usually does."""
    made = stage_kinds()[kind]
    before: tuple[Choice, ...] = (CALL,) if made.port(Wire.IN) else ()
    gives = made.port(Wire.OUT)
    if kind == "differentiator":
        return (*before, Choice(kind), choice("complementary_latch", "latch"), PIEZO)
    if kind.endswith("front_end"):
        return (Choice(kind), choice("schmitt_trigger"), PIEZO)
    if made.place.name in ("SWITCH", "LOAD"):
        return (*before, Choice(kind))
    if gives is None and made.port(Wire.IN) is None:
        return (Choice(kind), CALL, PIEZO)
    return (*before, Choice(kind), PIEZO)


@pytest.mark.parametrize("kind", sorted(stage_kinds()))
def test_every_kind_makes_a_design_that_can_be_computed(kind: str) -> None:
    design = made(*row_with(kind), supply=FEEDS.get(kind, ("11 V", "12 V", "14 V")))
    inspect(design)
    stage = next(stage for stage in design.stages if stage.kind == kind)
    assert not is_modified(stage)
    assert {part.kind for part in stage.parts} <= set(kinds())
    assert set(stage.ports.values()) <= set(design.nets)
    for part in stage.parts:
        for net in part.pins.values():
            assert net in {*stage.ports.values()} or net.startswith(f"{stage.name}/")


@pytest.mark.parametrize("kind", sorted(stage_kinds()))
def test_every_kind_says_how_it_is_sized_and_from_where(kind: str) -> None:
    found = stage_kinds()[kind]
    assert "Source:" in found.help
    assert len(found.help) < 900
    assert len({setting.name for setting in found.settings}) == len(found.settings)
    assert all(setting.about for setting in found.settings)


def test_stages_are_connected_by_nets_of_their_ports() -> None:
    design = made(choice("entry"), CALL, choice("complementary_latch", "latch"), PIEZO)
    assert design.stage("latch").ports == {
        "rail": "entry.quiet",
        "in": "call.out",
        "out": "latch.out",
        "base": "latch.base",
        "0V": "0V",
    }
    assert design.stage("driver").ports["in"] == "latch.out"


def test_designators_are_counted_through_the_design() -> None:
    refs = [part.ref for part in made(choice("entry"), CALL, PIEZO).parts]
    assert len(set(refs)) == len(refs)
    assert [ref for ref in refs if ref.startswith("R")] == ["R1", "R2", "R3", "R4"]


def test_settings_are_kept_and_a_changed_part_is_told() -> None:
    design = made(CALL, PIEZO)
    assert design.stage("driver").settings["current"] == "12 mA"
    ref = design.stage("driver").roles["base_resistor"]
    assert not is_modified(design.stage("driver"))
    changed = edit.with_value(design, ref, "47k")
    assert is_modified(changed.stage("driver"))
    assert not is_modified(changed.stage("call"))
    assert not is_modified(edit.with_value(changed, ref, design.part(ref).value or "").stage("driver"))


def test_an_added_or_removed_part_is_told_and_another_net_at_a_port_is_not() -> None:
    design = made(CALL, PIEZO)
    part = {"ref": "R9", "kind": "resistor", "pins": {"a": "call.out", "b": "0V"}, "value": "1M"}
    assert is_modified(edit.with_part(design, "call", part).stage("call"))
    assert is_modified(edit.without_part(design, design.stage("call").roles["pull_down"]).stage("call"))
    document = json.loads(json.dumps(design.dump()).replace('"call.out"', '"renamed"'))
    assert not any(is_modified(stage) for stage in Design.load(document).stages)


def test_a_free_stage_is_never_modified() -> None:
    design = edit.with_stage(made(CALL, PIEZO), {"name": "mine", "kind": "free"})
    assert not is_modified(design.stage("mine"))


def test_a_stage_is_added_to_a_design_where_its_row_ends() -> None:
    whole = made(choice("entry"), CALL, choice("complementary_latch", "latch"), PIEZO)
    grown = made(choice("entry"), CALL)
    for each in (choice("complementary_latch", "latch"), PIEZO):
        grown = with_catalogue_stage(grown, each)
    assert [stage.name for stage in grown.stages] == [stage.name for stage in whole.stages]
    assert grown.stage("driver").ports == whole.stage("driver").ports
    inspect(grown)
    # Sized for what it knows: a latch with nothing behind it yet gets its least output.
    assert value(grown, "latch", "base_emitter_resistor_npn") == value(whole, "latch", "base_emitter_resistor_npn")


def test_a_timer_added_later_brings_its_requirements() -> None:
    design = made(CALL, choice("low_side_driver", "driver", load="none"))
    design = with_catalogue_stage(design, choice("piezo"))
    assert design.requirements == ()
    timer = choice("long_timer", mode="reset", time="10 s")
    design = made(CALL, choice("complementary_latch", "latch"), PIEZO)
    with pytest.raises(DesignError, match="stage timer: a long RC timer does not take a low side signal"):
        with_catalogue_stage(design, timer)
    design = with_catalogue_stage(design, timer, {"in": "latch.out"})
    assert [requirement.check for requirement in design.requirements] == ["duration", "arrival"]
    inspect(design)


def test_an_added_stage_may_be_connected_by_hand() -> None:
    design = with_catalogue_stage(made(CALL, PIEZO), choice("piezo", "other"), {"in": "driver.low", "rail": "supply"})
    assert design.part("LS2").pins == {"plus": "supply", "minus": "driver.low"}


@pytest.mark.parametrize(
    ("row", "words"),
    [
        ((), "the row has no stage; put one in first"),
        ((CALL, CALL), "two stages are called call; give each a name of its own"),
        ((Choice("valve"),), "there is no stage kind 'valve'; write one of"),
        (
            (choice("contact_no", "call", colour="red"),),
            "stage call, setting colour: a contact, normally open has no such",
        ),
        ((choice("contact_no", "call", wetting="1 ohm"),), "stage call, setting wetting: '1 ohm' is a resistance"),
        ((choice("contact_no", "call", wetting="0 mA"),), "stage call, setting wetting: 0 mA is not above zero"),
        ((choice("contact_no", "a b"),), "field name"),
    ],
)
def test_what_cannot_be_made_is_refused_in_words(row: tuple[Choice, ...], words: str) -> None:
    with pytest.raises(DesignError) as refusal:
        made(*row)
    assert words in str(refusal.value)


def test_without_a_supply_nothing_can_be_sized() -> None:
    with pytest.raises(DesignError, match="the catalogue sizes stages by the supply"):
        new_design("x", "", {"ambient": "25 C"}, [CALL, PIEZO])


def test_a_made_design_survives_its_document() -> None:
    design = made(choice("entry"), CALL, PIEZO)
    assert Design.load(design.canonical()).content == design.content


def test_what_starts_an_interval_stays_until_it_is_over() -> None:
    # A light that returns after 2 s would end an interval of 10 s, which may last 14 s.
    row = (
        choice("light_front_end"),
        choice("schmitt_trigger"),
        choice("long_timer", mode="interval", time="10 s"),
    )
    events = made(*row, PIEZO).sequences["alarm"].events
    assert [event.at for event in events] == ["0 s", "1 s", "16 s"]


def test_what_the_supply_starts_ends_with_it() -> None:
    events = made(choice("long_timer", time="10 s"), PIEZO).sequences["alarm"].events
    assert [event.event for event in events] == ["connect supply", "disconnect supply"]


def test_requirements_name_what_follows_the_stage() -> None:
    design = made(choice("water_front_end", "water"), choice("schmitt_trigger", "over"), PIEZO)
    assert {requirement.check: requirement.at for requirement in design.requirements} == {
        "trip_window": "over.out above 6 V",
        "wet_lead": "over.out above 6 V",
    }
    debounced = made(CALL, choice("debounce"), choice("complementary_latch"), PIEZO)
    assert {requirement.of for requirement in debounced.requirements} == {"S1"}
    wet = (choice("water_front_end"), choice("schmitt_trigger"), choice("debounce"), choice("complementary_latch"))
    assert {requirement.check for requirement in made(*wet, PIEZO).requirements} == {"trip_window", "wet_lead"}


def test_a_slow_signal_does_not_start_what_only_an_edge_starts() -> None:
    for kind in ("monostable", "differentiator"):
        with pytest.raises(DesignError, match=f"{kind}.* takes only a steep edge.*put a Schmitt trigger between"):
            made(CALL, choice("debounce"), choice(kind, kind), choice("complementary_latch"), PIEZO)
    inspect(made(CALL, choice("debounce"), choice("schmitt_trigger"), choice("monostable"), PIEZO))


def test_a_fail_safe_relay_tells_of_the_alarm_by_letting_go() -> None:
    relay = choice("relay_driver", "relay", mode="fail-safe")
    design = made(CALL, choice("long_timer", "timer", time="10 s"), choice("complementary_latch", "latch"), relay)
    moments = design.sequences["alarm"].moments
    assert "silent" not in moments
    assert moments["sounding"].after == "K1 off"  # type: ignore[union-attr]
    duration = next(each for each in design.requirements if each.check == "duration")
    assert (duration.from_, duration.to) == ("begins", "K1 off")
    seen = run(design, off := crossing(voltage("supply", "relay/low"), 6.0, False, Anchor(0.5)))
    assert seconds(seen, off) == pytest.approx(begins(design) + 10.0, rel=0.1)
    # Where a load follows its contact, that tells.
    loud = made(CALL, choice("complementary_latch", "latch"), relay, choice("sounder"))
    assert loud.sequences["alarm"].moments["sounding"].after == "LS1 on"  # type: ignore[union-attr]


def test_a_short_event_is_not_asked_of_a_row_that_waits() -> None:
    waits = made(CALL, choice("debounce"), choice("long_timer", time="10 s"), PIEZO)
    assert {each.check for each in waits.requirements} == {"contact_bounce", "duration", "arrival"}
    at_once = made(CALL, choice("debounce"), choice("complementary_latch"), PIEZO)
    assert {each.check for each in at_once.requirements} == {"contact_bounce", "acceptance"}


def test_a_relay_that_would_not_pull_in_is_told_before_the_design_is_made() -> None:
    # 9 V x (234.5 + 45)/254.5 / 0.9 = 11 V, of 11 V less 0.3 V in the driver: 10.7 V x 0.9 x 254.5/279.5 / 12 V = 73 %.
    (words,) = doubts(conditions(), (CALL, choice("relay_driver", "relay")))["relay"]
    assert words.startswith("load_voltage: hot, its coil needs 11 V with 10 % to spare, and of 11 V 10.7 V are left")
    assert "write pick_up 73 %" in words
    assert doubts(conditions(), (CALL, choice("relay_driver", "relay", pick_up="73 %"))) == {}


HOT_AND_COLD = conditions("10.5 V", "12 V", "14.4 V") | {"ambient": {"min": "-30 C", "nominal": "25 C", "max": "70 C"}}


@pytest.mark.parametrize(
    "row",
    [
        # An input at the rail lifted the emitter to it, and a quarter of a volt across the output's junction is not off
        # at 70 C: the load never came on, or never went off.
        (CALL, choice("schmitt_trigger"), choice("high_side_driver", "driver", current="100 mA")),
        # The contact closed on 10 nF straight into a base: the supply fell to 5 V, and the charge came too quickly.
        (CALL, choice("differentiator"), choice("complementary_latch"), PIEZO),
    ],
    ids=["trigger", "edge"],
)
def test_a_row_that_failed_undoubted_from_cold_to_hot_holds(row: tuple[Choice, ...]) -> None:
    assert doubts(HOT_AND_COLD, row) == {}
    sheet = study(new_design("test", "cold to hot", HOT_AND_COLD, row))
    assert [check.id for check in sheet.checks if check.verdict is not Verdict.PASS] == []
