"""What the events ``set`` and ``ramp`` write for a part, read in its own quantity, and the commonest law behind it."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np

from ..design.datum import number
from ..errors import CircuitError, QuantityError

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.columns import Lanes

Reading = Callable[[str | float], float]


def reading_in(part: Part, unit: str) -> Reading:
    """A reading in ``unit`` (SI, temperature in deg C). It raises CircuitError naming the part."""

    def reading(text: str | float) -> float:
        try:
            return number(text, unit)
        except QuantityError as refusal:
            raise CircuitError(f"part {part.ref}: {refusal}") from refusal

    return reading


def reading_above_zero(part: Part, unit: str, example: str) -> Reading:
    """As :func:`reading_in`; the quantity must be above zero."""
    plain = reading_in(part, unit)

    def reading(text: str | float) -> float:
        value = plain(text)
        if value <= 0.0:
            raise CircuitError(f"part {part.ref}: a {part.kind} of {text} cannot be; write one such as {example}")
        return value

    return reading


def ohmic(lanes: Lanes, ohms: Floats | float) -> Floats:
    """The conductance of a part whose quantity is its resistance."""
    return np.asarray(1.0 / np.asarray(ohms))
