"""A stage in the making: where it stands, what was asked of it, and the parts written so far."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

from ..design.conditions import Levels
from ..design.part import Part
from ..errors import DesignError, QuantityError
from ..parts.classes import POINTS
from ..parts.figures import Figure, needed
from ..parts.physics import BAND_GAP, REFERENCE, ZERO_CELSIUS, gain_factor, thermal_voltage
from ..preferred import nearest, next_down, next_up, series_for
from ..quantity import read, write
from ..units import unit_named
from .kind import NOTHING_KNOWN, WORD, Beyond, Drive, Intake, Json, StageKind, Wire

RETURN = "0V"
NOTHING = Intake()
V_BE = 0.65  # V, silicon at some milliampere, for sizing; from memory
V_SATURATED = 0.15  # V across a small transistor that is fully on, for sizing; from memory
V_DIODE = 0.65  # V, for sizing; from memory
V_REVERSE = 3.5  # V, more than that in reverse across a base-emitter junction is kept away by a diode (V_EBO 5 V x 0.8)
OVERDRIVE = 3.0  # times the least base current (common practice: 2 to 5)
SMALL_CURRENT = 50e-3  # A, above it a driver transistor is taken
DRIVER_CURRENT = 0.4  # A, above it a larger one (0.8 of the 0.5 A that it is rated for)
_VOLTAGES = (10.0, 16.0, 25.0, 35.0, 50.0, 63.0, 100.0)
_POWERS = (0.25, 0.5, 1.0, 2.0, 5.0, 10.0)
_LEAST, _MOST = 1.0, 10e6  # ohm, what is put in where a formula asks for less or more
COUPLED = 0.3  # of V_BE: what a fast edge may bring to a base that rests, through strays and junctions
UNBIASED = 2.5  # times its C_ob at 10 V, a transistor's capacitance without bias: (1 + 10 V/0.7 V)^(1/3)
ABOVE = (
    1.01  # times the rail that a capacitor's rated voltage is chosen for: what comes back from a load lifts it a little
)
_NEVER_BELOW = {"s", "m", "ohm", "F", "A", "W", "Hz", "lx", "V/s"}
BOUGHT = {"R": (1.0, 22e6), "C": (1e-12, 10e-3), "film": (1e-12, 100e-6)}
"""Ohm and F that one can buy (common practice, no source)."""
TIMED_LEAST = 100e-12  # F of a capacitor that times, at least: strays are some 10 pF (common practice)
LARGEST_FILM = 2.2e-6  # F; above it capacitors are polarised (common practice)


@dataclass
class Plan:
    """Settings, surroundings and the growing list of parts of one stage.

    ``ports`` are the nets of its ports; ``rail`` are the volts of the small stages' rail, ``load_rail`` those of the
    rail of loads (the supply where none are given), ``beyond`` what the stages behind it draw, ``source`` the largest
    resistance of the supply in ohm; ``drive`` is what comes in
    from the stage before, None where the rail itself starts it; ``next`` is what the following stage takes.
    ``found`` are settings that nothing was written for, as they were worked out;
    ``unbought`` are doubts about parts that nobody sells.
    """

    kind: StageKind
    stage: str
    given: Mapping[str, str]
    ports: dict[str, str]
    supply: Levels
    rail: Levels
    ambient: Levels
    drive: Drive | None = None
    next: Intake = NOTHING
    taken: frozenset[str] = frozenset()
    load_rail: Levels | None = None
    beyond: Beyond = NOTHING_KNOWN
    source: float = 0.0
    parts: list[Json] = field(default_factory=list)
    roles: dict[str, str] = field(default_factory=dict)
    found: dict[str, str] = field(default_factory=dict)
    unbought: list[str] = field(default_factory=list)

    # -- what was asked

    def text(self, name: str) -> str:
        """A setting as written, or what is usual."""
        setting = self.kind.setting(name)
        assert setting is not None, name
        text = str(self.given.get(name, setting.usual)).strip() or setting.usual
        if setting.choices and text not in setting.choices:
            raise DesignError(f"{self._where(name)}: {text!r} is none of them; write {' or '.join(setting.choices)}")
        return text

    def number(self, name: str) -> float:
        """A setting in SI. Raises DesignError naming stage and setting."""
        setting = self.kind.setting(name)
        assert setting is not None, name
        try:
            return read(self.text(name), setting.unit)
        except QuantityError as refusal:
            raise DesignError(f"{self._where(name)}: {refusal}") from refusal

    def above_zero(self, name: str) -> float:
        """As :meth:`number`; it must be above zero."""
        value = self.number(name)
        if value <= 0.0:
            raise DesignError(
                f"{self._where(name)}: {self.text(name)} is not above zero; write it like {self._example(name)}"
            )
        return value

    def share(self, name: str) -> float:
        """A setting between 0 and 1, both left out."""
        value = self.number(name)
        if not 0.0 < value < 1.0:
            setting = self.kind.setting(name)
            low, high = ("0 %", "100 %") if setting is not None and setting.unit == "%" else ("0", "1")
            raise DesignError(
                f"{self._where(name)}: {self.text(name)} is not between {low} and {high}, both left out;"
                f" write it like {self._example(name)}"
            )
        return value

    def refused(self, name: str, words: str) -> DesignError:
        """What is wrong with a setting, in one line."""
        return DesignError(f"{self._where(name)}: {words}")

    def check(self) -> None:
        """Refuse settings that the kind does not have or that cannot be read."""
        for name in self.given:
            if self.kind.setting(name) is None:
                known = ", ".join(each.name for each in self.kind.settings) or "none"
                raise DesignError(f"{self._where(name)}: a {self.kind.title} has no such setting; write one of {known}")
        for setting in self.kind.settings:
            if setting.unit == WORD:
                self.text(setting.name)
            elif self.text(setting.name) and self.number(setting.name) < 0.0 and setting.unit in _NEVER_BELOW:
                raise DesignError(
                    f"{self._where(setting.name)}: {self.text(setting.name)} is below zero;"
                    f" write it like {self._example(setting.name)}"
                )

    def _example(self, name: str) -> str:
        """A setting as it may be written: what is usual, else any of its unit."""
        setting = self.kind.setting(name)
        assert setting is not None, name
        return setting.usual or unit_named(setting.unit).example.split(" or ")[0].split(", ")[0]

    def _where(self, name: str) -> str:
        return f"stage {self.stage}, setting {name}"

    # -- nets

    def net(self, name: str) -> str:
        """An inner net, which no other stage has."""
        return f"{self.stage}/{name}"

    def port(self, name: str) -> str:
        """The net of a port."""
        return self.ports[name]

    # -- figures for sizing

    def gain(self, kind: str = "npn", current: float = 0.0) -> float:
        """The least current gain of the generic class that :meth:`transistor` takes, at the coldest ambient."""
        of_class = self.transistor_class(kind, current)
        given = POINTS.get(of_class, {}).get("gain_points")
        points = () if given is None else given.points
        least = min([class_figure(kind, of_class, "gain", "").low, *(float(gain) for _, gain in points)])
        return least * float(gain_factor(self.ambient.min))

    def transistor_class(self, kind: str, current: float) -> str:
        """The generic class for a collector current."""
        if kind.startswith("darlington"):
            return "power Darlington"
        if kind == "pnp" and current > DRIVER_CURRENT:
            return "2 A pnp"
        return f"0.5 A driver {kind}" if current > SMALL_CURRENT else f"small {kind}"

    @property
    def has_latch(self) -> bool:
        """Whether a latch stands before it, whose base it may reach."""
        return f"{self.stage}.{Wire.BASE}" not in self.ports.values()

    @property
    def fed(self) -> float:
        """The least volts of the rail of loads."""
        return (self.load_rail or self.supply).min

    @property
    def arriving(self) -> float:
        """The least volts at the port ``in`` while it is active, before its own resistance."""
        return self.rail.min - (0.0 if self.drive is None else self.drive.drop)

    @property
    def arriving_ohms(self) -> float:
        """The resistance behind the port ``in``."""
        return 0.0 if self.drive is None else self.drive.ohms

    # -- parts

    def part(self, letter: str, kind: str, pins: Mapping[str, str], role: str | None = None, **fields: object) -> str:
        """A part with the next free designator of its letter; returns it."""
        ref = next(ref for ref in _designators(letter) if ref not in self.taken and ref not in self._own())
        self.parts.append({"ref": ref, "kind": kind, "pins": dict(pins), **fields})
        if role is not None:
            self.roles[role] = ref
        return ref

    def _own(self) -> set[str]:
        return {part["ref"] for part in self.parts}

    def resistor(
        self,
        ohms: float,
        a: str,
        b: str,
        role: str | None = None,
        *,
        snap: str = "nearest",
        tolerance: str = "5 %",
        volts: float | None = None,
    ) -> float:
        """A resistor of the preferred value ``nearest``, ``down`` or ``up``; returns that value in ohm.

        Its power rating is the least usual one that bears ``volts``, the whole rail where none are given, at the
        customary 0.6.
        """
        value = snapped(min(max(ohms, _LEAST), _MOST), series_for(read(tolerance, "%")), snap)
        self._bought("R", ohms, "ohm", role)
        self.part(
            "R",
            "resistor",
            {"a": a, "b": b},
            role,
            value=write(value, "ohm"),
            tolerance=tolerance,
            rating=f"{_at_least((self.rail.max if volts is None else volts) ** 2 / value / 0.6, _POWERS):g} W",
        )
        return value

    def capacitor(
        self,
        farads: float,
        a: str,
        b: str,
        role: str | None = None,
        *,
        snap: str = "nearest",
        low_drift: bool = False,
        film: bool = False,
        times: str = "",
    ) -> float:
        """A capacitor of a preferred value, ``a`` the more positive net; returns that value in farad.

        Film up to 2.2 uF or where ``film`` says so, else polarised, with a rated voltage that bears the rail at the
        customary 0.6 and 0.8. ``times`` is the setting of a time that it is in proportion to.
        """
        self._bought("film" if film or farads <= LARGEST_FILM else "C", farads, "F", role, times)
        if film or farads <= LARGEST_FILM:
            value = snapped(farads, "E6", snap)
            rated = _at_least(ABOVE * self.rail.max / 0.6, _VOLTAGES[4:])
            fields = {"tolerance": "10 %", "class": "film", "voltage": f"{rated:g} V"}
            self.part("C", "capacitor", {"a": a, "b": b}, role, value=write(value, "F"), **fields)
            return value
        value = snapped(farads, "E6", snap)
        rated = _at_least(ABOVE * self.rail.max / 0.8, _VOLTAGES)
        name, tolerance = ("timing capacitor, low drift", "10 %") if low_drift else ("electrolytic", "20 %")
        fields = {"tolerance": tolerance, "class": name, "voltage": f"{rated:g} V"}
        polarised = {"plus": a, "minus": b}
        self.part("C", "capacitor", polarised, role, value=write(value, "F"), **fields)
        return value

    def _bought(self, kind: str, value: float, unit: str, role: str | None, times: str = "") -> None:
        """Note a doubt about a value that nobody sells."""
        least, most = BOUGHT[kind]
        if times:
            least = TIMED_LEAST
        if 0.95 * least <= value <= 1.05 * most:
            return
        low, high, asked = (write(each, unit, digits=2) for each in (least, most, value))
        cure = "is it meant? write what it follows from otherwise"
        if times:
            nearest_time = write(self.number(times) * (least if value < least else most) / value, "s", digits=2)
            bound = "longer" if value < least else "shorter"
            cure = f"is {times} {self.text(times)} meant? write {nearest_time} or {bound}"
        name = (role or "a part").removesuffix("_one").removesuffix("_two").replace("_", " ")
        self.unbought.append(f"sizing: {name} is to have {asked}, and {low} to {high} can be bought and used; {cure}")

    def transistor(
        self,
        collector: str,
        base: str,
        emitter: str,
        role: str | None = None,
        *,
        kind: str = "npn",
        current: float = 0.0,
    ) -> str:
        """A transistor of the generic class for a collector current."""
        pins = {"collector": collector, "base": base, "emitter": emitter}
        return self.part("Q", kind, pins, role, **{"class": self.transistor_class(kind, current)})

    def quieting(self, *moved: tuple[str, float, float]) -> float:
        """The capacitance in F that keeps a resting base below 0.3 V_BE while the other sides of the C_ob of all that
        hangs on it move: each (kind, current, volts) of a transistor and its step, which both divide."""
        charge = 0.0
        for kind, current, volts in moved:
            charge += UNBIASED * class_figure(kind, self.transistor_class(kind, current), "c_ob", "F").high * volts
        return charge / (COUPLED * V_BE)

    def off_volts(self, kind: str, current: float, amps: float) -> float:
        """The base-emitter voltage at which a transistor of the least V_BE lets no more than ``amps`` through when
        hottest: V_G0 - (V_G0 - V_BE) T/T0 - kT/q ln(I/amps) (Tsividis 1980 without its logarithm of T)."""
        of_class = self.transistor_class(kind, current)
        least = class_figure(kind, of_class, "v_be", "V").low
        given = class_figure(kind, of_class, "v_be_current", "A").typical
        ratio = (self.ambient.max + ZERO_CELSIUS) / (REFERENCE + ZERO_CELSIUS)
        thermal = float(thermal_voltage(self.ambient.max))
        return BAND_GAP - (BAND_GAP - least) * ratio - thermal * math.log(given / amps)

    def diode(
        self, anode: str, cathode: str, role: str | None = None, *, kind: str = "diode", name: str = "signal diode"
    ) -> str:
        """A diode of a generic class."""
        return self.part("D", kind, {"anode": anode, "cathode": cathode}, role, **{"class": name})


def class_figure(kind: str, name: str, key: str, unit: str) -> Figure:
    """A figure of a generic class, as a part of that class has it."""
    return needed(part_of_class(kind, name), key, unit, "")


def part_of_class(kind: str, name: str) -> Part:
    """A part that says no more than its class."""
    return Part.model_validate({"ref": "X", "kind": kind, "pins": {"a": RETURN}, "class": name})


def snapped(value: float, series: str, snap: str) -> float:
    """The preferred value ``nearest`` to a value, or the next ``down`` or ``up`` unless it is one itself."""
    near = nearest(value, series)
    if snap == "nearest" or abs(near - value) <= 1e-3 * value:
        return near
    return next_down(value, series) if snap == "down" else next_up(value, series)


def _designators(letter: str) -> Iterator[str]:
    number = 0
    while True:
        number += 1
        yield f"{letter}{number}"


def _at_least(wanted: float, offered: tuple[float, ...]) -> float:
    return next((each for each in offered if each >= wanted), offered[-1])
