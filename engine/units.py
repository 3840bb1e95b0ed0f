"""The units that values are written in: symbols, scale to SI, and the steps in which a value is shown.

Unit names as code uses them: ``ohm F H V A W s Hz K m J lx dB C`` (coulomb), ``Ah`` (a charge shown in ampere hours),
``A2s``, ``A/V2``, ``degC`` (temperature), ``%`` (a fraction, written in percent), ``""`` (a plain number), and any
quotient of two of them such as ``V/s``, ``K/W``, ``ohm/m`` or ``1/K``.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from decimal import Decimal
from functools import cache

_ONE = Decimal(1)
PREFIXES: Mapping[str, Decimal] = {
    "f": Decimal("1e-15"),
    "p": Decimal("1e-12"),
    "n": Decimal("1e-9"),
    "u": Decimal("1e-6"),
    "m": Decimal("1e-3"),
    "": _ONE,
    "k": Decimal("1e3"),
    "M": Decimal("1e6"),
    "G": Decimal("1e9"),
}


@dataclass(frozen=True)
class Unit:
    """One unit. ``symbols`` take SI prefixes, ``fixed`` symbols do not; both map to their scale in SI.

    ``marked`` units may be written as IEC 60062 marks them, a letter standing for the decimal point; ``bare`` units
    may leave their symbol out after a prefix (``220u``). ``over`` are the two sides of a quotient. ``steps`` are the
    (suffix, scale) pairs in which a value is shown, smallest first.
    """

    name: str
    what: str
    example: str
    symbols: Mapping[str, Decimal] = field(default_factory=dict)
    fixed: Mapping[str, Decimal] = field(default_factory=dict)
    marked: bool = False
    bare: bool = False
    over: tuple[Unit, Unit] | None = None
    steps: tuple[tuple[str, Decimal], ...] = ()

    def scale(self, suffix: str) -> Decimal | None:
        """What one ``suffix`` is in SI (``mV`` -> 0.001); None if the suffix is not of this unit."""
        if self.over is not None:
            above, slash, below = suffix.partition("/")
            top = self.over[0].scale("" if above == "1" else above)
            bottom = self.over[1].scale(below) if slash else None
            return None if top is None or bottom is None else top / bottom
        for symbols in (self.symbols, self.fixed):
            if suffix in symbols:
                return symbols[suffix]
        letter = "k" if self.name == "ohm" and suffix[:1] == "K" else suffix[:1]
        if not letter or letter not in PREFIXES:
            return None
        if suffix[1:] in self.symbols:
            return PREFIXES[letter] * self.symbols[suffix[1:]]
        return PREFIXES[letter] if self.bare and len(suffix) == 1 else None


def _steps(prefixes: str, symbol: str) -> tuple[tuple[str, Decimal], ...]:
    """Steps of one symbol; a dot in ``prefixes`` is the symbol without a prefix."""
    return tuple((p.strip(".") + symbol, PREFIXES[p.strip(".")]) for p in prefixes)


def _plain(name: str, what: str, example: str, prefixes: str = "fpnum.kMG", *, marked: bool = False) -> Unit:
    return Unit(name, what, example, symbols={name: _ONE}, marked=marked, steps=_steps(prefixes, name))


def _fixed(name: str, what: str, example: str, *others: str, shown: str | None = None) -> Unit:
    return Unit(name, what, example, fixed=dict.fromkeys((name, *others), _ONE), steps=((shown or name, _ONE),))


_MINUTE, _HOUR, _DAY, _YEAR = Decimal(60), Decimal(3600), Decimal(86400), Decimal(31557600)
_TIMES = {"min": _MINUTE, "h": _HOUR, "d": _DAY, "day": _DAY, "days": _DAY, "month": _YEAR / 12, "year": _YEAR}
_CHARGES = {"C": _ONE, "As": _ONE, "Ah": _HOUR}
_PARTS = {"%": Decimal("0.01"), "ppm": Decimal("1e-6")}

# Where a suffix alone must decide (no unit was asked for), the first unit that knows it wins: "20 C" is a temperature.
_UNITS: Mapping[str, Unit] = {
    unit.name: unit
    for unit in (
        _fixed("degC", "a temperature", "25 C or -20 C", "C", "°C", shown="C"),
        Unit(
            "K",
            "a temperature difference",
            "0.7 K",
            symbols={"K": _ONE},
            fixed={"C": _ONE, "°C": _ONE},
            steps=_steps("m.", "K"),
        ),
        Unit(
            "ohm",
            "a resistance",
            "4k7 or 330 ohm",
            symbols={"ohm": _ONE, "ohms": _ONE, "Ohm": _ONE, "Ω": _ONE},
            fixed={"R": _ONE},
            marked=True,
            bare=True,
            steps=(*_steps("um", ""), ("R", _ONE), *_steps("kMG", "")),
        ),
        Unit(
            "F",
            "a capacitance",
            "220u or 4n7",
            symbols={"F": _ONE},
            marked=True,
            bare=True,
            steps=(*_steps("pnum", ""), ("F", _ONE)),
        ),
        Unit(
            "H",
            "an inductance",
            "4.7 mH or 1.2 H",
            symbols={"H": _ONE},
            marked=True,
            bare=True,
            steps=_steps("num.", "H"),
        ),
        _plain("V", "a voltage", "6 V or 350 mV", marked=True),
        _plain("A", "a current", "150 mA or 2 uA", marked=True),
        _plain("W", "a power", "0.25 W or 600 mW", marked=True),
        Unit(
            "s",
            "a time",
            "75 s, 20 ms or 90 min",
            symbols={"s": _ONE},
            fixed=_TIMES,
            steps=(*_steps("fpnum.", "s"), ("h", _HOUR)),
        ),
        _plain("Hz", "a frequency", "1 Hz or 50 kHz"),
        _plain("J", "an energy", "50 mJ"),
        _plain("lx", "a light level", "10 lx", "m.k"),
        Unit("C", "a charge", "2 nC or 7 Ah", symbols=_CHARGES, steps=_steps("fpnum.kMG", "C")),
        Unit("Ah", "a charge", "2.5 Ah or 500 mAh", symbols=_CHARGES, steps=(("Ah", _HOUR),)),
        Unit(
            "m",
            "a length",
            "6 m or 25 cm",
            symbols={"m": _ONE},
            fixed={"cm": Decimal("0.01")},
            steps=_steps("m.k", "m"),
        ),
        _fixed("A2s", "a melting I2t", "2 A2s", "A²s", "A^2s"),
        Unit(
            "A/V2",
            "a transconductance factor",
            "0.5 A/V2",
            symbols={"A/V2": _ONE, "A/V²": _ONE},
            steps=_steps("um.", "A/V2"),
        ),
        _fixed("dB", "a level", "88 dB", "dB(A)"),
        Unit("%", "a fraction", "5 %", fixed=_PARTS, steps=(("%", _PARTS["%"]),)),
        Unit("", "a plain number", "200", fixed={"": _ONE, **_PARTS}, steps=(("", _ONE),)),
    )
}
# Slew and temperature coefficients have customary steps of their own; other quotients step as their upper side does.
_QUOTIENT_STEPS: Mapping[str, tuple[tuple[str, Decimal], ...]] = {
    "V/s": (*_steps("um.", "V/s"), ("V/ms", Decimal("1e3")), ("V/us", Decimal("1e6"))),
    "1/K": (("ppm/K", _PARTS["ppm"]),),
    "1/s": (("/s", _ONE),),
}


@cache
def unit_named(name: str) -> Unit:
    """The unit that code calls ``name``. A name that is not in the table raises KeyError: a mistake in the code."""
    if name in _UNITS:
        return _UNITS[name]
    above, slash, below = name.partition("/")
    if not slash:
        raise KeyError(f"no unit is called {name!r}")
    over = (unit_named("" if above == "1" else above), unit_named(below))
    prefixes = "fpnum.kMG" if above in over[0].symbols else "."
    steps = _QUOTIENT_STEPS.get(name, _steps(prefixes, name))
    return Unit(name, f"a value in {name}", f"3 {name}".replace(" 1/", " /"), over=over, steps=steps)


def units_with(suffix: str) -> tuple[Unit, ...]:
    """Every simple unit that a suffix can belong to, the likelier first."""
    return tuple(unit for unit in _UNITS.values() if unit.name and unit.scale(suffix) is not None)
