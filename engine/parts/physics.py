"""Temperature laws of junctions and metals, with their sources. Arguments and results are arrays over lanes, SI."""

from __future__ import annotations

import numpy as np

from ..kernel.layout import Floats

ELEMENTARY_CHARGE = 1.602176634e-19  # C, exact (SI 2019)
BOLTZMANN = 1.380649e-23  # J/K, exact (SI 2019)
ZERO_CELSIUS = 273.15
REFERENCE = 25.0  # deg C at which laws and class data are given
BAND_GAP = 1.206  # V, silicon extrapolated to 0 K (Tsividis, IEEE J. Solid-State Circuits 15 (1980) 1076)
SATURATION_EXPONENT = 3.0  # eta in the same paper
GAIN_PER_KELVIN = 0.005  # common practice, from memory
COPPER = 234.5  # K above the temperature at which annealed copper would have no resistance, extrapolated
_AT_REFERENCE = BOLTZMANN / ELEMENTARY_CHARGE * (REFERENCE + ZERO_CELSIUS)  # V
LEAKAGE_DOUBLING = 10.0  # K, common practice where no second point is given


def thermal_voltage(celsius: Floats | float) -> Floats:
    """KT/q in volts."""
    return np.asarray(BOLTZMANN / ELEMENTARY_CHARGE * (np.asarray(celsius) + ZERO_CELSIUS))


def saturation_factor(
    celsius: Floats | float,
    ideality: Floats | float = 1.0,
    gap: float = BAND_GAP,
    power: float = SATURATION_EXPONENT,
) -> Floats:
    """How far the saturation current has moved from its value at the reference temperature.

    (T/T0)^(eta/n) exp(V_G0/(n kT0/q) (1 - T0/T)); with n = 1 it is what V_BE(T) of Tsividis (1980) implies. ``gap`` is
    V_G0 in V, or the barrier of a metal contact, whose eta, ``power``, is 2 (Richardson's law).
    """
    ratio = (np.asarray(celsius) + ZERO_CELSIUS) / (REFERENCE + ZERO_CELSIUS)
    exponent = gap / (ideality * _AT_REFERENCE) * (1.0 - 1.0 / ratio)
    return np.asarray(ratio ** (power / ideality) * np.exp(exponent))


def gain_factor(celsius: Floats | float) -> Floats:
    """How far the current gain has moved from its value at the reference temperature, never below a tenth."""
    return np.maximum(0.1, 1.0 + GAIN_PER_KELVIN * (np.asarray(celsius) - REFERENCE))


def doubling(celsius: Floats | float, step: float = LEAKAGE_DOUBLING) -> Floats:
    """Growth of a leakage current that doubles every ``step`` kelvin, 1 at the reference temperature."""
    return np.asarray(2.0 ** ((np.asarray(celsius) - REFERENCE) / step))


def doubling_step(cool: tuple[float, float], hot: tuple[float, float]) -> float:
    """Kelvin per doubling from two (temperature, leakage) points."""
    return (hot[0] - cool[0]) / float(np.log2(hot[1] / cool[1]))


def saturation_from(voltage: float, current: float, ideality: float = 1.0) -> float:
    """Saturation current at the reference temperature from one forward point of a junction (Shockley 1949)."""
    return float(current / np.expm1(voltage / (ideality * float(thermal_voltage(REFERENCE)))))


def ideality_from(low: tuple[float, float], high: tuple[float, float]) -> float:
    """Ideality from two forward points (voltage, current) well above the saturation current."""
    return (high[0] - low[0]) / (float(thermal_voltage(REFERENCE)) * float(np.log(high[1] / low[1])))


def copper_factor(celsius: Floats | float) -> Floats:
    """How far the resistance of a copper winding has moved from its value at 20 C: (234.5 + T)/254.5 (common form)."""
    return np.asarray((COPPER + np.asarray(celsius)) / (COPPER + 20.0))
