"""Settings that cannot be made are told while they are asked (own description; common practice, no source)."""

from __future__ import annotations

import pytest

from stagebook.engine.errors import DesignError
from stagebook.engine.stages.asked import doubts_beside, in_the_way, refuse_settings
from stagebook.engine.stages.making import doubts
from stagebook.engine.stages.row import Choice

from .made import conditions

CALL = Choice("contact_nc", "call")
DRIVER, LOUD = Choice("low_side_driver", "driver"), Choice("piezo", "piezo", {"heard": "200 dB"})


@pytest.mark.parametrize(
    ("kind", "setting", "text", "says"),
    [
        ("long_timer", "window", "0", "0 is not between 0 % and 100 %, both left out; write it like 40 %"),
        ("long_timer", "threshold", "2", "2 is not between 0 and 1, both left out; write it like 0.3"),
        ("lamp", "power", "-2 W", "-2 W is"),
        ("contact_no", "bounce", "-2 ms", "-2 ms is below zero; write it like "),
        ("low_side_driver", "works_from", "0 V", "0 V is not above zero; write it like "),
    ],
)
def test_a_setting_is_refused_whatever_stands_beside_it(kind: str, setting: str, text: str, says: str) -> None:
    asked = Choice(kind, "asked", {setting: text})
    # A debounce without a signal before it cannot be made either; that is told of it, and not of this stage.
    for row, at in (([asked], 0), ([CALL, asked], 1), ([Choice("debounce", "first"), asked], 1)):
        with pytest.raises(DesignError) as refusal:
            refuse_settings(conditions(), row, at)
        assert says in str(refusal.value)
        assert f"setting {setting}" in str(refusal.value)
        assert not str(refusal.value).endswith("like ")
        refuse_settings(conditions(), [*row[:at], Choice(kind, "asked"), *row[at + 1 :]], at)


def test_a_name_that_cannot_stand_is_refused_with_the_settings() -> None:
    with pytest.raises(DesignError, match="field name"):
        refuse_settings(conditions(), [CALL, Choice("low_side_driver", "0.5 s")], 1)


def test_a_stage_that_still_lacks_its_signal_is_taken_and_told_on_the_page() -> None:
    row = [Choice("debounce", "first"), DRIVER]
    refuse_settings(conditions(), row, 0)
    refuse_settings(conditions(), row, 1)
    assert in_the_way(conditions(), row) == "first"
    assert in_the_way(conditions(), [CALL, DRIVER]) is None


def test_doubts_of_the_others_stay_while_one_stage_is_in_the_way() -> None:
    row = [CALL, DRIVER, LOUD]
    known = doubts(conditions(), row)
    assert known
    wrong = [*row, Choice("lamp", "lamp", {"power": "-2 W"})]
    assert in_the_way(conditions(), wrong) == "lamp"
    assert doubts_beside(conditions(), wrong) == known
    unheld = [Choice("contact_nc", "call", {"held": "0 s"}), *row[1:]]
    assert in_the_way(conditions(), unheld) == "call"
    assert doubts_beside(conditions(), unheld) == {name: words for name, words in known.items() if name != "call"}
    first = [Choice("debounce", "first"), *row]
    assert doubts_beside(conditions(), first) == known
    assert doubts_beside(conditions(), row) == known
