"""The demo ``vault``: a seed-vault door alarm whose latch forgets when its own siren starts."""

from __future__ import annotations

from ...engine import edit
from ...engine.design.document import Design
from ...storage import Note
from .history import Demo, Step, set_value

_RESERVE = {
    "ref": "C11",
    "kind": "capacitor",
    "pins": {"plus": "quiet", "minus": "0V"},
    "value": "220u",
    "tolerance": "20 %",
    "voltage": "50 V",
    "class": "electrolytic",
    "series_resistance": {"typical": "1R1", "source": "memory"},
    "ripple_rating": {"typical": "150 mA", "source": "memory"},
}


def _own_capacitor(design: Design) -> Design:
    return edit.with_part(design, "feed", dict(_RESERVE))


def _from_the_rail(design: Design) -> Design:
    return edit.with_field(design, "R33", "pins", {"a": "rail", "b": "quiet"})


VAULT = Demo(
    "vault",
    (
        Step(
            Note(
                "first unit: sounds when it should, but forgets the alarm when the siren starts twice",
                symptom="Door closed again after 40 s, siren unplugged and plugged in: it stays silent, nobody has"
                " acknowledged.",
                hypothesis="R32 and C4 keep the siren from chirping at power-up, and the latch is fed from behind them:"
                " the starting siren takes the latch's own supply away.",
                prediction="Self-dip of Q8 fails in the cold at low supply with a siren that starts hard; all else"
                " holds, because in the alarm sequence the door is still open and holds the latch.",
                result="13 V of dip where 10 V are left before Q8 lets go. Nothing else fails.",
                next="Less dip, or none for the latch.",
            ),
        ),
        Step(
            Note(
                "C4 2200u > 10000u: given up, a bucket that does not last",
                hypothesis="C4 gives what the siren takes for its first 150 ms.",
                change="C4 2200u > 10000u",
                prediction="Dip down to the siren's steady 7 V.",
                result="9.7 V, no margin to speak of, and R32 takes all of its 3 W until C4 is full. Given up.",
                next="Back to 2200u; keep the latch off that rail.",
            ),
            (set_value("C4", "10000u"),),
            parent=1,
        ),
        Step(
            Note(
                "R33 a 220R with C11 220u, from r1: its own filter, but behind the siren's",
                hypothesis="A second filter lets the dip through only slowly.",
                change="R33 0R > 220R, C11 220u added",
                prediction="Some volts less of a dip at the latch.",
                result="1.7 V less: the siren starts for 150 ms, the filter's time is 50 ms. Still fails.",
                next="Feed it from before R32.",
            ),
            (set_value("R33", "220R"), ("C11 220u added", _own_capacitor)),
            parent=1,
        ),
        Step(
            Note(
                "R33 from the rail: the latch has its own filter",
                hypothesis="Before R32 the siren's start is worth half a volt, and less behind a filter.",
                change="R33 from sr to rail",
                prediction="Self-dip above 90 %; delay and siren time do not move.",
                result="A quarter of a volt of dip. Every required margin holds.",
                next="Try it on the battery alone, cold.",
            ),
            (("R33 from the rail", _from_the_rail),),
            parent=3,
        ),
    ),
    lanes=200,
)
