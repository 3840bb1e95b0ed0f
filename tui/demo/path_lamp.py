"""The demo ``path-lamp``: a path-lamp timer whose capacitor leaks more than its resistor brings."""

from __future__ import annotations

from ...engine.design.document import Design
from ...storage import Note
from .history import Demo, Step, set_value, with_fields


def _low_drift(design: Design) -> Design:
    """C5 of a low-drift kind: its maker's limit of 2 uA is that of every value up to 470u (from memory)."""
    fields = {
        "class": "timing capacitor, low drift",
        "tolerance": "10 %",
        "leakage": {"specified": "2 uA", "conditioned": "0.1 uA"},
        "data": {"drift": {"min": "-3 %", "typical": "0 %", "max": "3 %", "source": "memory"}},
    }
    return with_fields(design, "C5", fields)


PATH_LAMP = Demo(
    "path-lamp",
    (
        Step(
            Note(
                "first unit: three minutes on the bench, in the field it burns all night in August",
                symptom="After some weeks without supply and at 50 C in its box the lamp came on with the push and"
                " never went out. The same unit back on the bench: three minutes.",
                hypothesis="C5 is a general-purpose electrolytic. Hot, and not yet conditioned, it leaks like a"
                " resistor of 200k; R9 of 1M1 before it makes a divider that never comes near the threshold.",
                prediction="Arrival of C5 fails hot with the specified leakage, and with it all that waits for the end"
                " of the time; the nominal unit, conditioned, holds everything.",
                result="C5 gets to 3 V where 9.5 V are needed. Time and reset of the latch fail with it, nothing else.",
                next="A smaller resistor against the leakage.",
            ),
        ),
        Step(
            Note(
                "R9 523k and C5 470u, same kind: given up, the leakage grows with the capacitor",
                hypothesis="Half of the resistor brings twice the current against the leakage.",
                change="R9 1M1 > 523k, C5 220u > 470u",
                prediction="The same time, and the hot capacitor gets to its threshold.",
                result="C5 gets to 2.9 V, as before: what an electrolytic may leak goes with C, so that R9 times"
                " leakage is what it was. No choice of R9 helps. Given up.",
                next="Back to r1 and another kind of capacitor.",
            ),
            (set_value("R9", "523k"), set_value("C5", "470u")),
            parent=1,
        ),
        Step(
            Note(
                "C5 a low-drift timing capacitor, from r1: it runs out everywhere, but late when hot",
                hypothesis="Its maker holds every value up to 470u below 2 uA; the electrolytic may leak 55 uA.",
                change="C5 220u electrolytic, 20 % > 220u low drift, 10 %",
                prediction="Arrival holds. What still leaks makes the time longer when hot, never shorter.",
                result="Arrival holds, the latch is reset. 226 s at most where 225 s are allowed: 1 s too late.",
                next="Now a smaller R9 pays: 470u leaks no more than 220u.",
            ),
            (("C5 low drift", _low_drift),),
            parent=1,
        ),
        Step(
            Note(
                "R9 523k and C5 470u of the same row: leakage halved against the charging current",
                hypothesis="Same limit of leakage, twice the current through R9.",
                change="R9 1M1 > 523k, C5 220u > 470u",
                prediction="The longest time comes down, though R9 times C5 is 2 % more.",
                result="141 to 219 s at the corners, the cold now as late as the heat. Every required margin holds.",
                next="Hot box at 55 C with a capacitor that lay a year on the shelf.",
            ),
            (set_value("R9", "523k"), set_value("C5", "470u")),
            parent=3,
        ),
    ),
    lanes=100,  # three minutes of a warm filament per unit: a thousand units take too long
)
