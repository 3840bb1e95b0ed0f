"""Doubts of a design that was made of catalogue stages (the project's own rows; sizing: common practice, no source)."""

from __future__ import annotations

import pytest

from stagebook.engine import edit
from stagebook.engine.design.document import Design
from stagebook.engine.errors import DesignError
from stagebook.engine.stages.making import doubts, new_design, with_catalogue_stage
from stagebook.engine.stages.remade import asked_again, choice_of, doubts_of

from .made import choice, conditions

ENTRY, CALL = choice("entry"), choice("contact_no", "call")
QUIET = choice("low_side_driver", "driver", heard="85 dB", distance="5 m")


def test_the_doubts_of_a_row_are_those_of_its_design() -> None:
    row = (ENTRY, CALL, QUIET)
    told = doubts(conditions(), row)
    assert set(told) == {"driver"}
    assert doubts_of(new_design("test", "", conditions(), row)) == told


def test_a_load_stage_that_is_added_leaves_the_driver_sized_for_less() -> None:
    # Its base gets 3 x 50 mA / h_FE, and now 3 x 110 mA / h_FE are wanted: the resistor is to be less than half of it.
    design = new_design("test", "", conditions(), (CALL, choice("low_side_driver", "driver", current="50 mA")))
    assert doubts_of(design) == {}
    more = with_catalogue_stage(design, choice("sounder", "siren", current="60 mA"))
    (said,) = doubts_of(more)["driver"]
    assert said.startswith("sizing: it was made for another row or other conditions; for these the catalogue puts in R")
    # What the user has changed is the user's own.
    changed = edit.with_value(more, more.stage("driver").roles["base_resistor"], "1k")
    assert doubts_of(changed) == {}


def test_a_load_that_the_driver_cannot_carry_is_told_in_the_words_of_the_row() -> None:
    design = new_design("test", "", conditions(), (CALL, choice("low_side_driver", "driver")))
    (said,) = doubts_of(with_catalogue_stage(design, choice("sounder", "siren")))["driver"]
    assert said.startswith(
        "sizing: as the row is now it could not be made: stage driver, setting current: an inrush of"
    )


def test_other_conditions_are_another_sizing_and_stages_made_by_hand_have_none() -> None:
    document = new_design("test", "", conditions(), (CALL, choice("low_side_driver", "driver"))).dump()
    document["conditions"]["supply"] = {"min": "22 V", "nominal": "24 V", "max": "28 V"}
    assert set(doubts_of(Design.load(document))) == {"call", "driver"}
    for stage in document["stages"]:
        stage["kind"] = "free"
    assert doubts_of(Design.load(document)) == {}


TIMED = (CALL, choice("complementary_latch", "latch"), choice("long_timer", "timer", mode="reset", time="20 s"))


def test_a_timer_asked_for_another_mode_makes_its_row_anew() -> None:
    row = (CALL, choice("long_timer", "timer", time="20 s"), choice("low_side_driver", "driver"))
    design = new_design("test", "", conditions(), row)
    interval = choice("long_timer", "timer", mode="interval", time="30 s")
    after = asked_again(design, "timer", interval)
    assert after == new_design("test", "", conditions(), (row[0], interval, row[2]))
    # And back again: nothing of it is left.
    assert asked_again(after, "timer", row[1]) == design
    assert asked_again(design, "timer", choice_of(design.stage("timer"))) == design


def test_what_was_changed_by_hand_is_not_lost_by_asking_again() -> None:
    design = new_design("test", "", conditions(), (*TIMED, choice("low_side_driver", "driver")))
    longer = choice("long_timer", "timer", mode="reset", time="30 s")
    ref = design.stage("latch").roles["collector_resistor"]
    with pytest.raises(DesignError, match="was changed by hand, which would be lost"):
        asked_again(edit.with_value(design, ref, "12k3"), "timer", longer)
    with pytest.raises(DesignError, match="its requirements are others than its row brings"):
        asked_again(edit.without_requirement(design, 0), "timer", longer)
    free = edit.with_stage(design, {"name": "more", "kind": "free"})
    with pytest.raises(DesignError, match="stage more was put in by hand"):
        asked_again(free, "timer", longer)
