"""Reading and writing values as the trade does.

Three ways of writing are read: IEC 60062 marking, where a letter stands for the decimal point (``4k7``, ``R47``,
``2u2``), a number with an SI prefix and a unit (``4.7 kohm``, ``20 ms``), and a number with a customary unit
(``90 min``, ``5 %``, ``-20 C``). ``m`` is milli and ``M`` is mega, always; ``u`` and ``µ`` are both micro.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from decimal import Decimal
from functools import lru_cache

from .errors import QuantityError
from .units import PREFIXES, Unit, unit_named, units_with

LONGEST = 40
"""Longest text that is looked at, in characters."""
_SMALLEST, _LARGEST = 1e-40, 1e20
_ABSOLUTE_ZERO = -273.15
TOLERANCE_LETTERS = {"F": 0.01, "G": 0.02, "J": 0.05, "K": 0.10, "M": 0.20}
"""Letters for a symmetrical tolerance, IEC 60062."""

_MUST_BE_NAMED = ("%", "F", "H", "Ah")
"""Units in which nobody means the bare SI number: 5 for 5 %, 220 for 220 uF."""

_PLAIN = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d{1,3})?) ?(.*)", re.ASCII)
_MARK = re.compile(r"([+-]?)(\d*)([A-Za-z])(\d+) ?(.*)", re.ASCII)
_ALIKE = str.maketrans({"\u00b5": "u", "\u03bc": "u", "\u2126": "\u03a9", "\u2212": "-"})


@dataclass(frozen=True, slots=True)
class Quantity:
    """A value as typed, with what it is worth in SI (temperature in deg C) and the name of its unit."""

    text: str
    value: float
    unit: str


def read(text: str, unit: str | None = None) -> float:
    """The value of ``text`` in SI (temperature in deg C, percent as a fraction).

    ``unit`` is a name of :mod:`.units` (``ohm``, ``s``, ``degC``, ``V/s``); None takes any single unit that is written
    out. Raises QuantityError in one line that says what is wrong and what to write instead.
    """
    return parse(text, unit).value


@lru_cache(maxsize=4096)  # a study reads the same values of its document hundreds of times
def parse(text: str, unit: str | None = None) -> Quantity:
    """As :func:`read`, with the unit that was found."""
    wanted = None if unit is None else unit_named(unit)
    example = "6 V, 4.7 kohm or 75 s" if wanted is None else wanted.example
    typed = " ".join(text.translate(_ALIKE).split())
    if not typed:
        raise QuantityError(f"the value is empty; write it like {example}")
    if len(text) > LONGEST:
        raise QuantityError(f"the value is {len(text)} characters long; write it like {example}")
    if wanted is not None and wanted.name == "%":
        if typed in TOLERANCE_LETTERS:
            return Quantity(text, TOLERANCE_LETTERS[typed], "%")
        typed = re.sub(r"^(±|\+/-|\+-) ?", "", typed)
    amount, found = _split(typed, wanted)
    if found is None:
        raise QuantityError(_refusal(text, typed, wanted, example))
    value = float(amount)
    if value and not _SMALLEST <= abs(value) <= _LARGEST:
        raise QuantityError(f"{text!r} is far outside of what a part can be; write it like {example}")
    if found.name == "degC" and value < _ABSOLUTE_ZERO:
        raise QuantityError(f"{text!r} is below absolute zero; write a temperature above -273 C")
    return Quantity(text, value, found.name)


def _split(typed: str, wanted: Unit | None) -> tuple[Decimal, Unit | None]:
    """The amount in SI and its unit; no unit if the text is not a value of the wanted one."""
    plain = _PLAIN.fullmatch(typed)
    if plain:
        number, suffix = Decimal(plain[1]), plain[2].replace(" ", "")
        if wanted is not None and not suffix and (wanted.name not in _MUST_BE_NAMED or not number):
            return number, wanted
        for unit in _candidates(suffix, wanted):
            scale = unit.scale(suffix)
            if scale is not None:
                return number * scale, unit
    mark = _MARK.fullmatch(typed)
    if mark:
        sign, whole, letter, part, after = mark.groups()
        for unit in _candidates(after or letter, wanted):
            scale = _mark_scale(letter, after, unit)
            if scale is not None:
                return Decimal(f"{sign}{whole or 0}.{part}") * scale, unit
    return Decimal(0), None


def _candidates(suffix: str, wanted: Unit | None) -> tuple[Unit, ...]:
    """The units to try. Where none is asked for, a prefix alone does not stand for one."""
    if wanted is not None:
        return (wanted,)
    if not suffix:
        return (unit_named(""),)
    return tuple(unit for unit in units_with(suffix) if not (unit.bare and suffix in (*PREFIXES, "K")))


def _mark_scale(letter: str, after: str, unit: Unit) -> Decimal | None:
    """What the letter of a marking such as ``4k7``, ``5V1`` or ``2u2 F`` stands for in this unit."""
    if not unit.marked or (after and after not in unit.symbols):
        return None
    return unit.scale(letter + after)


def _refusal(text: str, typed: str, wanted: Unit | None, example: str) -> str:
    """One line on what is wrong with a text that is not a value of the wanted unit."""
    plain = _PLAIN.fullmatch(typed)
    if re.fullmatch(r"[+-]?\d*,\d+[^,]*", typed, re.ASCII):
        return f"{text!r} has a comma; write {typed.replace(',', '.')}"
    if plain is None:
        return f"{text!r} is not a value; write it like {example}"
    number, suffix = plain[1], plain[2].replace(" ", "")
    if not suffix:
        return f"{text!r} lacks its unit; write it like {example}"
    if wanted is None:
        return f"{text!r} has no unit that is known; write it like {example}"
    if suffix in PREFIXES and wanted.scale(suffix + wanted.name) is not None:
        return f"{text!r} lacks its unit; write {number} {suffix}{wanted.name}"
    if suffix[0] == "K" and wanted.scale("k" + suffix[1:]) is not None:
        return f"{text!r}: kilo is a small k; write {number} k{suffix[1:]}"
    known = units_with(suffix)
    if known:
        return f"{text!r} is {known[0].what} where {wanted.what} is asked for; write it like {example}"
    return f"{text!r} is not {wanted.what}; write it like {example}"


def write(value: float, unit: str, digits: int = 3) -> str:
    """``value`` (SI, temperature in deg C, a fraction for ``%``) as trade text, to ``digits`` significant digits.

    Resistances and capacitances are marked after IEC 60062 (``4k7``, ``0R5``, ``220u``), all others are written with
    a space and a unit (``75 s``, ``12.3 ms``, ``5 %``). Raises QuantityError for a value that is not finite.
    """
    if not math.isfinite(value):
        raise QuantityError(f"{value} cannot be written as a value")
    of = unit_named(unit)
    rounded = Decimal(f"{value:.{digits - 1}e}")
    suffix, size = _step(of, abs(rounded))
    number = _digits(Decimal(value) / size, digits)
    if of.name in ("ohm", "F") and suffix != "F":
        whole, _, part = number.partition(".")
        return whole + suffix + part
    return f"{number} {suffix}".rstrip()


def write_plain(value: float, unit: str, digits: int = 4) -> str:
    """As :func:`write`; plain digits with the unit where the trade has no way of writing it."""
    try:
        return write(value, unit, digits)
    except QuantityError:
        return f"{value:.{digits}g} {unit}".rstrip()


def _step(unit: Unit, size: Decimal) -> tuple[str, Decimal]:
    """The largest step not above ``size``; tenths of an ohm stay in ohms, and seconds are used up to two hours."""
    if not size:
        return next((step for step in unit.steps if step[1] == 1), unit.steps[0])
    chosen = unit.steps[0]
    for suffix, scale in unit.steps:
        least = {"R": Decimal("0.1"), "h": 2 * scale}.get(suffix, scale)
        if size >= least:
            chosen = (suffix, scale)
    return chosen


def _digits(number: Decimal, digits: int) -> str:
    """``number`` without an exponent and without trailing zeros behind the point."""
    text = f"{Decimal(f'{number:.{digits - 1}e}'):f}"
    return text.rstrip("0").rstrip(".") if "." in text else text
