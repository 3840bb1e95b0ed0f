"""Numbers of ``WIDTH`` lanes at once: what a row of the kernel's arrays holds, and the arithmetic on it.

Compiled, a row is one vector of the processor and costs about as much as a single number; uncompiled there is one lane
in a row and everything is NumPy's. No operation mixes lanes, so that a lane gives the same bits beside any others.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, TypeAlias

import numpy as np

from . import machine_code
from .compiled import COMPILED, HERE, leaf

if TYPE_CHECKING:
    from .layout import Floats, Ints

Numbers: TypeAlias = Any
"""One number per lane: in the compiled kernel a vector, otherwise a NumPy scalar."""
Flags: TypeAlias = Any
"""One truth per lane."""

PER_LN2 = 1.4426950408889634
LN2_HIGH = 6.93147180369123816490e-01
LN2_LOW = 1.90821492927058770002e-10
SHIFT = 6755399441055744.0  # 1.5 * 2**52: added, it rounds to a whole number and shows it in the last bits
HALF_ROOT = 0.7071067811865475  # of the mantissa at which a power of two is split off

if HERE and not TYPE_CHECKING:
    from .vector_code import (
        WIDTH,
        add,
        any_of,
        at,
        flag,
        fused,
        greater,
        lesser,
        put,
        root,
        same,
        scaled_by_power,
        split_power,
        where,
    )

else:
    WIDTH = machine_code.WIDTH if COMPILED else 1

    def at(x: Floats, k: Any) -> Numbers:
        """Row k of an array (rows, WIDTH)."""
        return x[k, 0]

    def put(x: Floats, k: Any, v: Numbers) -> None:
        """Set row k of an array."""
        x[k, 0] = v

    def add(x: Floats, k: Any, v: Numbers) -> None:
        """Add to row k of an array."""
        x[k, 0] += v

    def fused(a: Numbers, b: Numbers, c: Numbers) -> Numbers:
        """a b + c."""
        return a * b + c

    def where(flags: Flags, yes: Numbers, no: Numbers) -> Numbers:
        """``yes`` in the lanes that are flagged, ``no`` in the others."""
        return yes if flags else no

    def any_of(flags: Flags) -> bool:
        """Whether any lane is flagged."""
        return bool(flags)

    def same(x: Ints, value: int) -> Flags:
        """Flags the lanes in which (WIDTH,) whole numbers have this value."""
        return np.bool_(x[0] == value)

    def flag(flags: Flags, x: Ints) -> None:
        """Write flags to (WIDTH,) whole numbers, 1 or 0."""
        x[0] = 1 if flags else 0

    def lesser(a: Numbers, b: Numbers) -> Numbers:
        """The lesser of two numbers, the second where they do not compare."""
        return a if a < b else np.float64(b)

    def greater(a: Numbers, b: Numbers) -> Numbers:
        """The greater of two numbers, the second where they do not compare."""
        return a if a > b else np.float64(b)

    def scaled_by_power(a: Numbers, shifted: Numbers) -> Numbers:
        """a times two to the power that was rounded into ``shifted``."""
        return np.ldexp(a, int(shifted - SHIFT)) if shifted == shifted else shifted

    def split_power(a: Numbers) -> tuple[Numbers, Numbers]:
        """a as m times two to the power e, m between the roots of a half and of two."""
        m, e = np.frexp(a)
        return (m, np.float64(e)) if m > HALF_ROOT else (2.0 * m, np.float64(e - 1))

    root = np.sqrt


# exp: reduction by Cody and Waite (Software Manual for the Elementary Functions, 1980), then Taylor's series, whose
# last term is 4e-18 at half of ln 2. log: the series in f / (2 + f) with the coefficients of K. C. Ng's freely
# given fdlibm (Sun Microsystems, 1993). Both are within 1.5 units of the last place; the tests compare.


@leaf
def exp(y: Numbers) -> Numbers:
    """e to the power y, for y within -700 and 700."""
    shifted = y * PER_LN2 + SHIFT
    whole = shifted - SHIFT
    r = fused(whole, -LN2_LOW, fused(whole, -LN2_HIGH, y))
    # Pairs of terms, then pairs of pairs: a chain of thirteen would wait for every product.
    r2 = r * r
    r4 = r2 * r2
    low = fused(r2, fused(r, 1.0 / 6.0, 0.5), r)
    middle = fused(r2, fused(r, 1.0 / 5040.0, 1.0 / 720.0), fused(r, 1.0 / 120.0, 1.0 / 24.0))
    high = fused(r2, fused(r, 1.0 / 39916800.0, 1.0 / 3628800.0), fused(r, 1.0 / 362880.0, 1.0 / 40320.0))
    top = fused(r, 1.0 / 6227020800.0, 1.0 / 479001600.0)
    # The 1 comes last: what is rounded before it is a third of it at most.
    s = 1.0 + fused(r4, fused(r4, fused(r4, top, high), middle), low)
    return scaled_by_power(s, shifted)


@leaf
def log(y: Numbers) -> Numbers:
    """Natural logarithm of a positive normal number."""
    m, e = split_power(y)
    f = m - 1.0
    s = f / (f + 2.0)
    z = s * s
    r = z * 1.479819860511658591e-01 + 1.531383769920937332e-01
    r = r * z + 1.818357216161805012e-01
    r = r * z + 2.222219843214978396e-01
    r = r * z + 2.857142874366239149e-01
    r = r * z + 3.999999999940941908e-01
    r = r * z + 6.666666666666735130e-01
    r = r * z
    half = f * f * 0.5
    return e * LN2_HIGH - ((half - (s * (half + r) + e * LN2_LOW)) - f)
