"""The demo ``flood``: a pump-room water alarm whose latch trips when its cells are snapped on."""

from __future__ import annotations

from ...engine import edit
from ...engine.design.document import Design
from ...storage import Note
from .history import Demo, Step, set_value


def _add_npn_capacitor(design: Design) -> Design:
    part = {
        "ref": "C3",
        "kind": "capacitor",
        "pins": {"a": "nb", "b": "0V"},
        "value": "1n",
        "tolerance": "10 %",
        "voltage": "50 V",
    }
    return edit.with_role(edit.with_part(design, "latch", part), "latch", "base_capacitor", "C3")


def _add_pnp_capacitor(design: Design) -> Design:
    part = {
        "ref": "C4",
        "kind": "capacitor",
        "pins": {"a": "supply", "b": "pb"},
        "value": "1n",
        "tolerance": "10 %",
        "voltage": "50 V",
    }
    return edit.with_part(design, "latch", part)


def _add_slow_water_resistor(design: Design) -> Design:
    part = {
        "ref": "R22",
        "kind": "resistor",
        "pins": {"a": "trig", "b": "base"},
        "value": "10M",
        "tolerance": "5 %",
        "rating": "0.25 W",
    }
    return edit.with_part(design, "trigger", part)


FLOOD = Demo(
    "flood",
    (
        Step(
            Note(
                "first unit: works on the bench supply, sounds when the cells are snapped on",
                symptom="Four cells clipped in: it sounds at once, probe dry. From the bench supply it stays silent.",
                hypothesis="The bench supply rises in milliseconds, cells in less than a microsecond. About 10 pF from"
                " the supply rail to the base of Q5 carry a current that R11 at 1M cannot drain.",
                prediction="The slew that the latch bears is far below the cells' 10 V/us; nothing else in trouble.",
                result="So it is: it trips from about 0.1 V/us on, a hundredth of what the cells do.",
                next="Make R11 smaller.",
            ),
        ),
        Step(
            Note(
                "R11 1M > 100k: drain the base of Q5 ten times better",
                hypothesis="A tenth of the resistance bears ten times the slew.",
                change="R11 1M > 100k",
                prediction="Supply slew about ten times better, still too little; hold margin a little worse.",
                result="Barely twice as good. With 30 pF on the base, R11 hardly matters within half a microsecond.",
                next="Even smaller, or a capacitor that divides the step.",
            ),
            (set_value("R11", "100k"),),
            parent=1,
        ),
        Step(
            Note(
                "R11 100k > 22k: given up, it starves the latch",
                hypothesis="Brute force: 22k should drain what 100k does not.",
                change="R11 100k > 22k",
                prediction="Slew better again. At 4 V, cold, R10 gives 33 uA and R11 takes 32 uA: hold must suffer.",
                result="Still trips, and the latch hardly holds at low supply in the cold. Given up.",
                next="Back to 100k and a capacitor.",
            ),
            (set_value("R11", "22k"),),
            parent=2,
        ),
        Step(
            Note(
                "C3 1n at the base of Q5, from r2: good at nominal, a hot corner still trips",
                hypothesis="10 pF against 1 nF divide 6.4 V to 64 mV, whatever the slew.",
                change="C3 1n added from the base of Q5 to 0V",
                prediction="Immune at any slew.",
                result="At nominal yes. Hot, with low V_BE, Q4 is turned on through its own capacitances and feeds Q5"
                " through R10.",
                next="The same for Q4.",
            ),
            (("add C3 1n at the base of Q5", _add_npn_capacitor),),
            parent=2,
        ),
        Step(
            Note(
                "C4 1n across R13: both bases held, immune at any slew in every corner",
                hypothesis="Q4 needs the same division as Q5. And water that takes a minute to rise gives C2 no edge:"
                " it stays silent. With what Q3 gives led back to Q1 the amplifier snaps, however slowly water comes.",
                change="C4 1n added from the supply to the base of Q4; R22 10M from the collector of Q3 to the base of"
                " Q1",
                prediction="Immune in every corner; duration and hold do not move. 0.4 uA through R22 into 180k are"
                " 70 mV: less than the water of the probe moves between dry and wet.",
                result="Immune in every corner; every required margin holds. Water that takes an hour to rise sounds it"
                " in every corner of supply and temperature.",
                next="Build three units, measure the duration cold and hot.",
            ),
            (
                ("add C4 1n across R13", _add_pnp_capacitor),
                ("add R22 10M from Q3 back to Q1", _add_slow_water_resistor),
            ),
            parent=4,
        ),
    ),
)
