"""From the points that a datasheet gives to the law of a junction or of a saturated transistor, all at 25 C."""

from __future__ import annotations

import math
from dataclasses import dataclass

from ..errors import CircuitError
from .physics import REFERENCE, thermal_voltage

Point = tuple[float, float]
"""Volts, amperes."""
ROUNDS = 60
LEAST_REVERSE, MOST_REVERSE = 1e-3, 1e3


@dataclass(frozen=True, slots=True)
class ForwardLaw:
    """v = n V_T ln(1 + i/I_S) + i r: saturation current in A, ideality, series resistance in ohm."""

    saturation: float
    ideality: float
    series: float

    def voltage(self, current: float) -> float:
        """Forward voltage at a current."""
        slope = self.ideality * float(thermal_voltage(REFERENCE))
        return slope * math.log1p(current / self.saturation) + current * self.series


def forward_law(low: Point, high: Point, *, series: float | None = None, ideality: float = 1.0) -> ForwardLaw:
    """The law through two forward points (Shockley, Bell Syst. Tech. J. 28 (1949) 435, with a series resistance).

    Three unknowns and two points: with ``series`` given the slope n V_T is what the points leave, otherwise the series
    resistance is, at the given ``ideality``. Raises CircuitError where no such law passes through both points.
    """
    (v1, i1), (v2, i2) = low, high
    if not (0.0 < i1 < i2 and 0.0 < v1 < v2):
        raise CircuitError("the two forward points must rise in voltage and in current; write the lower one first")
    unit = float(thermal_voltage(REFERENCE))
    saturation = 0.0
    n, r = ideality, 0.0 if series is None else series
    for _ in range(ROUNDS):
        ratio = math.log((i2 + saturation) / (i1 + saturation))
        if series is None:
            r = (v2 - v1 - n * unit * ratio) / (i2 - i1)
        else:
            n = (v2 - v1 - r * (i2 - i1)) / (unit * ratio)
        if n <= 0.0 or r < 0.0 or v1 <= i1 * r:
            raise CircuitError(
                f"no junction passes {v1:g} V at {i1:g} A and {v2:g} V at {i2:g} A"
                + (" with that series resistance; write a smaller one" if series else "; write points further apart")
            )
        last, saturation = saturation, i1 / math.expm1((v1 - i1 * r) / (n * unit))
        if abs(saturation - last) <= 1e-14 * saturation:
            break
    return ForwardLaw(saturation, n, r)


def forward_law_of_three(low: Point, middle: Point, high: Point) -> ForwardLaw:
    """The law through three forward points: saturation current, ideality and series resistance (source as above).

    Two differences of voltage, linear in n V_T and r. Raises CircuitError where n or r would be below zero.
    """
    unit = float(thermal_voltage(REFERENCE))
    saturation = 0.0
    points = (low, middle, high)
    if not all(a[0] < b[0] and 0.0 < a[1] < b[1] for a, b in ((low, middle), (middle, high))):
        raise CircuitError("the three forward points must rise in voltage and in current; write the lowest one first")
    n = r = 0.0
    for _ in range(ROUNDS):
        logs = [math.log1p(i / saturation) if saturation else math.log(i) for _, i in points]
        a1, b1, c1 = (logs[1] - logs[0]) * unit, middle[1] - low[1], middle[0] - low[0]
        a2, b2, c2 = (logs[2] - logs[1]) * unit, high[1] - middle[1], high[0] - middle[0]
        whole = a1 * b2 - a2 * b1
        n, r = (c1 * b2 - c2 * b1) / whole, (a1 * c2 - a2 * c1) / whole
        if n <= 0.0 or r < 0.0 or low[0] <= low[1] * r:
            raise CircuitError("no junction passes the three forward points; write two of them")
        last, saturation = saturation, low[1] / math.expm1((low[0] - low[1] * r) / (n * unit))
        if abs(saturation - last) <= 1e-14 * saturation:
            break
    return ForwardLaw(saturation, n, r)


def saturation_voltage(forced: float, forward: float, reverse: float) -> float:
    """V_CE = V_T ln[(1 + (b + 1)/B_R) / (1 - b/B_F)] at forced gain b, in V (Ebers, Moll, Proc. IRE 42 (1954) 1761)."""
    return float(thermal_voltage(REFERENCE)) * math.log((1.0 + (forced + 1.0) / reverse) / (1.0 - forced / forward))


def saturation_law(
    low: tuple[float, float, float], high: tuple[float, float, float], forward: float
) -> tuple[float, float]:
    """Reverse gain and collector resistance (ohm) from two saturation points (V_CE in V, I_C in A, forced gain).

    V_CE = V_T ln[(1 + (b + 1)/B_R) / (1 - b/B_F)] + I_C r (Ebers, Moll, Proc. IRE 42 (1954) 1761, with the resistance
    of the collector in series). ``forward`` is B_F. Raises CircuitError where no B_R and r of zero or more meet both.
    """
    (v1, i1, b1), (v2, i2, b2) = low, high
    if not 0.0 < i1 < i2 or not 0.0 < max(b1, b2) < forward:
        raise CircuitError(
            "the two saturation points must rise in collector current, with forced gains below the current gain"
        )

    def left(reverse: float) -> tuple[float, float]:
        r = (v1 - saturation_voltage(b1, forward, reverse)) / i1
        return v2 - saturation_voltage(b2, forward, reverse) - i2 * r, r

    low_end, high_end = math.log(LEAST_REVERSE), math.log(MOST_REVERSE)
    first, last = left(math.exp(low_end))[0], left(math.exp(high_end))[0]
    if first * last > 0.0:
        raise CircuitError("no reverse gain and collector resistance meet both saturation points; write one of them")
    for _ in range(ROUNDS):
        middle = 0.5 * (low_end + high_end)
        if left(math.exp(middle))[0] * first > 0.0:
            low_end = middle
        else:
            high_end = middle
    reverse = math.exp(0.5 * (low_end + high_end))
    resistance = left(reverse)[1]
    if resistance < -1e-9:
        raise CircuitError("the saturation points ask for a collector resistance below zero; write one of them")
    return reverse, max(0.0, resistance)


def resistance_of_loads(light: tuple[float, float], heavy: tuple[float, float]) -> float:
    """Internal resistance of a source in ohm from two loads (amperes, volts): the drop over the change of current."""
    if heavy[0] <= light[0] or heavy[1] > light[1]:
        raise CircuitError("the second load must draw more current at a lower voltage; write the lighter load first")
    return (light[1] - heavy[1]) / (heavy[0] - light[0])


def beta_of(cool: tuple[float, float], hot: tuple[float, float]) -> float:
    """B in K of a thermistor from two (deg C, ohm) points: ln(R1/R2) / (1/T1 - 1/T2) (common form, IEC 60539 terms)."""
    if hot[0] <= cool[0] or cool[1] <= 0.0 or hot[1] <= 0.0 or hot[1] >= cool[1]:
        raise CircuitError("the second point must be hotter and of a lower resistance; write the cooler one first")
    return math.log(cool[1] / hot[1]) / (1.0 / (cool[0] + 273.15) - 1.0 / (hot[0] + 273.15))
