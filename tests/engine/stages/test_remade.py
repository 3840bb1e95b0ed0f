"""Doubts of a design that was made of catalogue stages (the project's own rows; sizing: common practice, no source)."""

from __future__ import annotations

from stagebook.engine import edit
from stagebook.engine.design.document import Design
from stagebook.engine.stages.making import doubts, new_design, with_catalogue_stage
from stagebook.engine.stages.remade import doubts_of

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
