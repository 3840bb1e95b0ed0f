"""What an edit makes wrong is told before it is kept (own description of the edits; common practice, no source)."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from stagebook.engine import edit
from stagebook.engine.design.document import Design
from stagebook.engine.errors import DesignError
from stagebook.engine.studies.newly_wrong import refuse_newly_wrong

EXAMPLE = Design.load(json.loads((Path(__file__).parents[1] / "example.json").read_text()))
DURATION = next(at for at, each in enumerate(EXAMPLE.requirements) if each.check == "duration")
SUBJECT = EXAMPLE.requirements[DURATION].of


def duration(low: str, high: str, **more: str) -> Design:
    wanted = {"check": "duration", "of": SUBJECT, "min": low, "max": high, **more}
    return edit.with_requirement_at(EXAMPLE, DURATION, wanted)


@pytest.mark.parametrize(
    ("after", "says"),
    [
        (duration("72 s", "60 s"), "min 72 s is above max 60 s; write the lower one as min"),
        (duration("60 s", "60 s"), "not below"),
        (duration("60 s", "2min 6s"), "2min 6s"),
        (duration("60 s", "72 s", of="LS9"), "LS9"),
        (duration("60 s", "72 s", hue="red"), "does not read it"),
        (edit.with_field(EXAMPLE, "R7", "tolerance", "-5%"), 'tolerance: -5% cannot be; write it like "5 %"'),
        (edit.with_required(EXAMPLE, "durations", "5 %"), "write 'duration'"),
    ],
)
def test_what_the_studies_would_refuse_is_refused_of_the_edit(after: Design, says: str) -> None:
    with pytest.raises(DesignError) as refusal:
        refuse_newly_wrong(EXAMPLE, after)
    assert says in str(refusal.value)
    assert "\n" not in str(refusal.value)
    # It was wrong already: another edit of it is not held up.
    refuse_newly_wrong(after, edit.with_purpose(after, "another"))
    # And the way back is open.
    refuse_newly_wrong(after, EXAMPLE)


def test_edits_that_are_one_of_several_are_taken() -> None:
    stage = EXAMPLE.stages[0].name
    hanging = {"ref": "R99", "kind": "resistor", "value": "1k", "pins": {"a": "supply", "b": "nowhere-yet"}}
    with_hanging = edit.with_part(EXAMPLE, stage, hanging)
    refuse_newly_wrong(EXAMPLE, with_hanging)
    refuse_newly_wrong(with_hanging, edit.with_field(with_hanging, "R99", "pins.b", "0V"))
    refuse_newly_wrong(EXAMPLE, edit.without_requirement(EXAMPLE, DURATION))
    refuse_newly_wrong(EXAMPLE, duration("60 s", "72 s"))
    # While a net hangs, parts and requirements are judged all the same.
    with pytest.raises(DesignError, match="tolerance"):
        refuse_newly_wrong(with_hanging, edit.with_field(with_hanging, "R99", "tolerance", "-5%"))
