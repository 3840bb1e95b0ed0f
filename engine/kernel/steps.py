"""One step of TR-BDF2 in a row of lanes, each with its own length: predictors, what a stage leaves, the error.

TR-BDF2: Bank, Coughran, Fichtner, Grosse, Rose, Smith, IEEE Trans. CAD 4 (1985) 436; embedded third-order error and
the filter through the iteration matrix: Hosea, Shampine, Appl. Numer. Math. 20 (1996) 21. Both stages share C + a h G.
"""

from __future__ import annotations

import math

from .compiled import leaf
from .layout import Floats
from .vectors import Flags, Numbers, at, exp, greater, log, put, where

GAMMA = 2.0 - math.sqrt(2.0)
A = 1.0 - 0.5 * math.sqrt(2.0)
TO_STAGE = 1.0 / (GAMMA * (2.0 - GAMMA))
TO_START = (1.0 - GAMMA) * (1.0 - GAMMA) / (GAMMA * (2.0 - GAMMA))
ERROR_START = (math.sqrt(2.0) - 1.0) / 3.0
ERROR_STAGE = -1.0 / 3.0
ERROR_END = 2.0 * A / 3.0


@leaf
def take(chosen: Flags, source: Floats, target: Floats) -> None:
    """Copy the columns of the chosen lanes."""
    for k in range(target.shape[0]):
        put(target, k, where(chosen, at(source, k), at(target, k)))


@leaf
def begin_stage(
    starting: Flags,
    relative: Floats,
    absolute: Floats,
    reach: Numbers,
    carry: Numbers,
    x0: Floats,
    q0: Floats,
    i0: Floats,
    first: Floats,
    second: Floats,
    x: Floats,
    constant: Floats,
    tolerance: Floats,
) -> None:
    """Set out for the stage, ``reach`` = gamma h after the start, from the parabola of the step before; ``carry`` is
    a h of the trapezoidal rule, 0 for a jump."""
    for k in range(constant.shape[0]):
        start = at(x0, k)
        guess = start + reach * (at(first, k) + reach * at(second, k))
        put(x, k, where(starting, guess, at(x, k)))
        put(constant, k, where(starting, carry * at(i0, k) - at(q0, k), at(constant, k)))
        put(tolerance, k, where(starting, relative[k] * abs(start) + absolute[k], at(tolerance, k)))


@leaf
def begin_end(
    ending: Flags,
    reach: Numbers,
    h: Numbers,
    last: Numbers,
    x0: Floats,
    q0: Floats,
    xg: Floats,
    qg: Floats,
    first: Floats,
    second: Floats,
    x: Floats,
    constant: Floats,
    expected: Floats,
) -> None:
    """Set out for the end by the second backward difference, from the cubic through the parabola and the stage.

    ``last`` is the length of the step before, 0 after a jump; what is expected of the end is kept.
    """
    before = (1.0 - GAMMA) * last
    cubic = h * (h + last) * (h + before) / (reach * (reach + last) * (reach + before))
    share = where(last > 0.0, cubic, 1.0 / GAMMA)
    for k in range(constant.shape[0]):
        start = at(x0, k)
        miss = at(xg, k) - (start + reach * (at(first, k) + reach * at(second, k)))
        guess = start + h * (at(first, k) + h * at(second, k)) + miss * share
        put(x, k, where(ending, guess, at(x, k)))
        put(expected, k, where(ending, guess, at(expected, k)))
        put(constant, k, where(ending, TO_START * at(q0, k) - TO_STAGE * at(qg, k), at(constant, k)))


@leaf
def keep_parabola(
    arrived: Flags, jumped: Flags, h: Numbers, x0: Floats, xg: Floats, x: Floats, first: Floats, second: Floats
) -> None:
    """Keep the parabola of an accepted step, about its end, for the predictor of the next; nothing after a jump."""
    per_h = 1.0 / h
    per_stage = per_h / GAMMA
    per_rest = per_h / (1.0 - GAMMA)
    rest = (1.0 - GAMMA) * h
    for k in range(first.shape[0]):
        end = (at(x, k) - at(xg, k)) * per_rest
        bend = (end - (at(xg, k) - at(x0, k)) * per_stage) * per_h
        slope = end + bend * rest
        put(first, k, where(jumped, 0.0, where(arrived, slope, at(first, k))))
        put(second, k, where(jumped, 0.0, where(arrived, bend, at(second, k))))


@leaf
def left_over(h: Numbers, i0: Floats, ig: Floats, i: Floats, noise: Floats, out: Floats) -> None:
    """Set out to the third-order error of the step as charges, to be filtered by substitution."""
    for k in range(out.shape[0]):
        r = h * (ERROR_START * at(i0, k) + ERROR_STAGE * at(ig, k) + ERROR_END * at(i, k))
        put(out, k, where(abs(r) <= 4.0 * at(noise, k), 0.0, r))


@leaf
def error_of(relative: Floats, absolute: Floats, x0: Floats, x: Floats, filtered: Floats) -> Numbers:
    """Return the largest filtered error of the step in parts of the tolerance (1 = just allowed)."""
    # The largest of all quotients with one division, which takes as long as ten products.
    error = 0.0 * at(filtered, 0)
    allowed = error + 1.0
    for k in range(filtered.shape[0]):
        own = abs(at(filtered, k))
        own_allowed = relative[k] * greater(abs(at(x0, k)), abs(at(x, k))) + absolute[k]
        larger = own * allowed > error * own_allowed
        error = where(larger, own, error)
        allowed = where(larger, own_allowed, allowed)
    return error / allowed


@leaf
def surprise(nets: int, expected: Floats, x: Floats) -> Numbers:
    """Return by how many volts the end differs most from what was expected of it, a tenth of the voltage forgiven.

    Nets without capacitance have no error that the formula sees: where such nets snap over, only this tells.
    """
    most = 0.0 * at(x, 0)
    for k in range(nets):
        most = greater(abs(at(x, k) - at(expected, k)) - 0.1 * abs(at(x, k)), most)
    return most


@leaf
def growth(error: Numbers) -> Numbers:
    """Return by how much the next step may be longer, before limits: 0.85 error^(-1/3)."""
    return 0.85 * exp(log(greater(error, 1e-6)) * (-1.0 / 3.0))
