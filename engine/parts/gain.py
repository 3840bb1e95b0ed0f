"""How the current gain of a bipolar transistor falls off at both ends, from guaranteed points at several currents.

Gummel and Poon (Bell Syst. Tech. J. 49 (1970) 827): at high injection i_F = i_C (1 + i_C/i_K) with the knee current
i_K; at low currents the base also feeds recombination, which goes as exp(v_BE / 2 V_T) (Sah, Noyce, Shockley, Proc. IRE
45 (1957) 1228), so as the root of i_F. Hence 1/h = (1 + i/i_K)/B + D sqrt((1 + i/i_K)/i), linear in 1/B, 1/(B i_K), D.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from ..errors import CircuitError
from ..kernel.layout import Floats

ROUNDS = 50


@dataclass(frozen=True, slots=True)
class GainLaw:
    """The gain over collector current in parts of the gain at the current ``at`` (A); 1/i_K in 1/A, 0 = no knee."""

    at: float
    mid: float
    per_knee: float
    recombination: float

    def share(self, current: Floats | float) -> Floats:
        """Gain at a collector current in A over the gain at ``at``."""
        i = np.asarray(current, dtype=float)
        q = 1.0 + i * self.per_knee
        return np.asarray(1.0 / (self.mid * q + self.recombination * np.sqrt(q / i)))


def gain_law(points: Sequence[tuple[float, float]], at: float) -> GainLaw:
    """The law nearest to (A, gain) points in parts of each; through them where there are no more than three.

    No share may be below zero: where the points do not fall off at an end, that end stays flat. Raises CircuitError
    where the points are fewer than two or not above zero.
    """
    if len(points) < 2 or min(min(point) for point in points) <= 0.0:
        raise CircuitError("the gain at two currents or more is needed, all above zero")
    i, h = (np.array(column, dtype=float) for column in zip(*points, strict=True))
    per_knee = 0.0
    found = np.zeros(3)
    for _ in range(ROUNDS):
        terms = np.stack([np.ones_like(i), i, np.sqrt((1.0 + i * per_knee) / i)], axis=1) * h[:, None]
        found = _nearest(terms)
        last, per_knee = per_knee, float(found[1] / found[0])
        if abs(per_knee - last) <= 1e-12 * per_knee:
            break
    law = GainLaw(at, float(found[0]), per_knee, float(found[2]))
    scale = float(law.share(at))
    return GainLaw(at, law.mid * scale, per_knee, law.recombination * scale)


def _nearest(terms: Floats) -> Floats:
    """Factors of the three terms, none below zero and the first above it, whose sum is nearest to 1 at all points."""
    best, left = np.zeros(3), np.inf
    for others in (others for count in range(3) for others in combinations((1, 2), count)):
        chosen = [0, *others]
        if len(chosen) > len(terms):
            continue
        factors = np.linalg.lstsq(terms[:, chosen], np.ones(len(terms)), rcond=None)[0]
        rest = float(np.sum((terms[:, chosen] @ factors - 1.0) ** 2))
        if factors[0] > 0.0 and factors.min() >= 0.0 and rest < left - 1e-15:
            best, left = np.zeros(3), rest
            best[chosen] = factors
    return best
