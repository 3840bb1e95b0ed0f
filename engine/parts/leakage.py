"""How leakage grows with temperature: by two points of a datasheet, else by so many kelvin per doubling.

Leakage of junctions that are blocked grows exponentially over the range of use; doubling every 10 K is common practice
where nothing is given. From two points, I2/I1 = 2^((T2 - T1)/step).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..errors import CircuitError
from .figures import Figure, figure, needed, typical
from .kind import Entry
from .physics import LEAKAGE_DOUBLING, REFERENCE, doubling_step

if TYPE_CHECKING:
    from ..design.document import Part


def leakage_entries(stem: str) -> dict[str, Entry]:
    """What a part may say about the growth of a leakage."""
    return {
        f"{stem}_hot": Entry("A", about=f"the leakage at {stem}_hot_temperature: gives its growth"),
        f"{stem}_hot_temperature": Entry("degC", about=f"of the {stem}_hot figure"),
        f"{stem}_doubling": Entry("K", about="kelvin per doubling of the leakage, instead of a hot figure"),
    }


def kelvin_per_doubling(part: Part, stem: str, cool: Figure) -> float:
    """Kelvin in which the leakage doubles; ``cool`` is that at 25 C. A hot figure counts before a written step.

    Raises CircuitError where the hot figure has no temperature, or is not hotter or not larger.
    """
    hot = figure(part, f"{stem}_hot", "A")
    if hot is None:
        return typical(part, f"{stem}_doubling", "K", LEAKAGE_DOUBLING)
    celsius = needed(part, f"{stem}_hot_temperature", "degC", "150 C").typical
    if celsius <= REFERENCE or hot.typical <= cool.typical:
        raise CircuitError(
            f"part {part.ref}, {stem}_hot: {hot.typical:g} A at {celsius:g} C is no growth of {cool.typical:g} A at "
            f"{REFERENCE:g} C; write a hotter and larger figure, or {stem}_doubling"
        )
    return doubling_step((REFERENCE, cool.typical), (celsius, hot.typical))
