"""An alarm that is over before its load is looked at: said in these words by every check that looks then. Our own
rule: what is off has no base current, no voltage and no level that could be judged.
"""

from __future__ import annotations

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import resistor, transistor, two
from .sheets import CONNECT, design, margin, sounder

ROLES = {"driver": "Q1", "base_resistor": "R1", "load": "LS1", "base_emitter_resistor": "R2"}


def alarm(ends: str) -> Design:
    """A contact turns a sounder on at 0.1 s and off again at ``ends``; it is looked at 0.5 s after it came on."""
    return design(
        two("contact", "S1", "supply", "drive"),
        resistor("R1", "drive", "base", "1k"),
        resistor("R2", "base", "0V", "10k"),
        transistor("Q1", "low", "base", "0V", **{"class": "0.5 A driver npn"}),
        {
            **sounder("LS1", "supply", "low", "50 mA", "3 V"),
            "data": {
                "current": "50 mA",
                "surge": "60 mA",
                "operating_minimum": "3 V",
                "sound_level": "100 dB",
                "rated_voltage": "9 V",
            },
        },
        roles=ROLES,
        events=[
            CONNECT,
            {"at": "0.1 s", "event": "close", "part": "S1"},
            {"at": ends, "event": "open", "part": "S1"},
        ],
        moments={"sounding": {"after": "LS1 on", "by": "0.5 s"}},
        requirements=[
            {"check": "sound_level", "of": "LS1", "min": "80 dB", "distance": "1 m"},
            {"check": "load_voltage", "of": "LS1", "min": "5 V"},
        ],
    )


@pytest.mark.parametrize(
    ("slug", "part"),
    [("base_overdrive", "Q1"), ("peak_current", "Q1"), ("sound_level", "LS1"), ("load_voltage", "LS1")],
)
def test_what_is_over_is_said_to_be_over(slug: str, part: str) -> None:
    lasting, short = (margin(alarm(ends), slug, part) for ends in ("0.9 s", "0.3 s"))
    assert lasting.outcome is None
    assert lasting.margin is not None
    assert lasting.margin > 0.0
    words = "LS1 is off again when it is looked at: its alarm is shorter than that"
    assert (short.margin, short.verdict, short.outcome) == (-1.0, Verdict.FAIL, words)
