"""Where a margin comes from, for every check: the demands of this project, no outside source."""

from __future__ import annotations

from collections.abc import Callable

import pytest

from stagebook.engine.checks import catalogue
from stagebook.engine.checks.factors import COMMON_PRACTICE
from stagebook.engine.design.document import Design
from stagebook.engine.parts.physics import gain_factor, saturation_factor
from stagebook.engine.studies.explanation import Explanation, explain

from .latches import CELSIUS
from .test_hand_formulas import CASES, judged

ONE_EACH = {slug: (part, make) for slug, part, make, _ in reversed(CASES)}


@pytest.mark.parametrize("slug", catalogue())
def test_every_number_tells_where_it_comes_from(slug: str) -> None:
    part, make = ONE_EACH[slug]
    found = judged(make(), slug, part)
    told = explain(make(), found)
    assert told.margin == pytest.approx(found.margin, abs=5e-4)
    assert (told.formula, told.put_in.startswith(("m = ", "D = "))) == (catalogue()[slug].formula, True)
    assert (told.by_hand, told.hand_source) == (catalogue()[slug].by_hand, catalogue()[slug].hand_source)
    assert (bool(found.sequence), bool(found.corner), bool(told.usual_worst)) == (True, True, True)
    assert told.required.source
    assert told.used
    assert all(each.source for each in told.used)
    for seen in told.observed:
        # What was seen in a sequence was seen at an instant; a trial has its own time.
        assert seen.value is None or seen.at is not None or "trial" in seen.what
    assert any(seen.value is not None for seen in told.observed)


def sources(make: Callable[[], Design], slug: str, part: str) -> dict[str, tuple[float, str]]:
    told: Explanation = explain(make(), judged(make(), slug, part))
    return {used.what: (used.value, used.source) for used in told.used}


@pytest.mark.parametrize(
    ("slug", "what", "value", "source"),
    [
        ("hot_off_state", "permitted off-current", 1e-6, f"customary: {COMMON_PRACTICE}"),
        ("junction_temperature", "t j max of Q1", 150.0, f"customary: {COMMON_PRACTICE}"),
        ("fuse_fault", "times the rated current at which a fuse blows", 2.0, f"customary: {COMMON_PRACTICE}"),
        ("supply_slew", "stray supply - base", 10e-12, "the strays of the design"),
        (
            "latch_hold",
            "Q2 saturation current",
            1e-14 / float(saturation_factor(CELSIUS)),
            "the law that the part gives",
        ),
        ("latch_hold", "Q2 gain", 100.0 / float(gain_factor(CELSIUS)), "the law that the part gives"),
        ("release", "max of the requirement", 20e-3, "the requirement"),
        ("brown_out", "length of the dip", 0.3e-3, "sequence alarm"),
        ("surge_energy", "voltage of the surge", 60.0, "the event of the sequence"),
    ],
)
def test_what_is_no_datum_is_told_too(slug: str, what: str, value: float, source: str) -> None:
    part, make = ONE_EACH[slug]
    assert sources(make, slug, part)[what] == (pytest.approx(value), source)
