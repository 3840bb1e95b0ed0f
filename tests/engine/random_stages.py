"""Random units made of the blocks that stages are made of, with values over decades; the same seed, the same unit.

Blocks and ranges: common practice, no source; the ranges go decades beyond it on purpose.
"""

from __future__ import annotations

import math
import random
from collections.abc import Callable

from .circuits import Json, capacitor, resistor, transistor, two

CABLE = {"resistance": "0.05 ohm/m", "inductance": "0.7 uH/m", "capacitance": "50 pF/m"}  # two cores, from memory


class Unit:
    """Parts of one unit as they are drawn. Blocks take nets and give the net on which they put their signal."""

    def __init__(self, seed: int) -> None:
        self.random = random.Random(seed)
        self.parts: list[Json] = []
        self.events: list[Json] = []
        self.ends = self.decades(-3, 3)
        self._count: dict[str, int] = {}

    def decades(self, low: float, high: float) -> float:
        return float(f"{10.0 ** self.random.uniform(low, high):.2g}")

    def chance(self, share: float) -> bool:
        return self.random.random() < share

    def one(self, *choices: Callable[..., str]) -> Callable[..., str]:
        return self.random.choice(choices)

    def ref(self, letter: str) -> str:
        self._count[letter] = self._count.get(letter, 0) + 1
        return f"{letter}{self._count[letter]}"

    def net(self) -> str:
        self._count["net"] = self._count.get("net", 0) + 1
        return f"n{self._count['net']}"

    def r(self, a: str, b: str, low: float = 2, high: float = 6) -> None:
        self.parts.append(resistor(self.ref("R"), a, b, self.decades(low, high)))

    def c(self, a: str, b: str, low: float = -11, high: float = -5) -> None:
        self.parts.append(capacitor(self.ref("C"), a, b, self.decades(low, high)))

    def electrolytic(self, plus: str, minus: str, low: float = -6.5, high: float = -2.7) -> None:
        part = {"ref": self.ref("C"), "kind": "capacitor", "pins": {"plus": plus, "minus": minus}}
        known = {"class": "electrolytic", "voltage": "35 V"}
        self.parts.append({**part, "value": f"{self.decades(low, high)!r} F", **known})

    def q(self, collector: str, base: str, emitter: str, kind: str = "npn") -> None:
        name = {"npn": ["small npn", "0.5 A driver npn"], "pnp": ["small pnp", "0.5 A driver pnp"]}.get(
            kind, ["power Darlington"]
        )
        known = {"class": self.random.choice(name)}
        self.parts.append(transistor(self.ref("Q"), collector, base, emitter, kind, **known))

    def d(self, anode: str, cathode: str, kind: str = "diode", **fields: object) -> None:
        name = {"schottky": ["1 A Schottky"], "led": ["red"], "zener": ["zener 0.5 W"]}.get(
            kind, ["signal diode", "1 A rectifier"]
        )
        known = {"class": self.random.choice(name), **fields}
        self.parts.append(two(kind, self.ref("D"), anode, cathode, **known))

    def when(self) -> str:
        return f"{float(f'{self.ends * self.random.uniform(0.02, 0.98):.4g}')!r} s"

    def happens(self, event: str, **fields: object) -> None:
        self.events.append({"at": self.when(), "event": event, **fields})


# From the supply to a rail.
def entry(u: Unit, supply: str) -> str:
    rail = u.net()
    kind = u.random.choice(("diode", "schottky", "resistor", "lead", "choke"))
    if kind in ("diode", "schottky"):
        u.d(supply, rail, kind)
    elif kind == "resistor":
        u.r(supply, rail, -0.5, 2.5)
    elif kind == "lead":
        u.parts.append(two("lead", u.ref("W"), supply, rail, length=f"{u.decades(0, 2)!r} m", **CABLE))
    else:
        henry, ohms = u.decades(-5, -1), u.decades(-1, 1.5)
        u.parts.append(two("inductor", u.ref("L"), supply, rail, inductance=f"{henry!r} H", resistance=f"{ohms!r} ohm"))
    if u.chance(0.7):
        u.electrolytic(rail, "0V")
    if u.chance(0.3):
        u.c(rail, "0V", -9, -6)
    if u.chance(0.2):
        u.parts.append(two("clamp", u.ref("D"), "0V", rail, **{"class": "24 V surge clamp"}))
    u.r(rail, "0V", 3, 6)
    return rail


# Where something is sensed.
def contact(u: Unit, rail: str) -> str:
    out = u.net()
    side, pull = ("0V", rail) if u.chance(0.5) else (rail, "0V")
    ref = u.ref("S")
    near = out
    if u.chance(0.3):
        near = u.net()
        u.parts.append(two("lead", u.ref("W"), out, near, length=f"{u.decades(0, 2.5)!r} m", **CABLE))
    u.parts.append(two("contact", ref, near, side))
    u.r(out, pull, 3, 6)
    for event in ("close", "open"):
        bounce = {"bounce": {"for": f"{u.decades(-4, -2)!r} s", "times": u.random.randint(1, 6)}}
        u.happens(event, part=ref, **(bounce if u.chance(0.3) else {}))
    return out


def sensor(u: Unit, rail: str) -> str:
    out = u.net()
    above, below = (rail, "0V") if u.chance(0.5) else ("0V", rail)
    kind = u.random.choice(("thermistor", "light_resistor", "probe"))
    ref = u.ref("B")
    if kind == "thermistor":
        u.parts.append(two(kind, ref, above, out, "10k", **{"class": "ntc"}))
        u.happens("set", part=ref, to=f"{u.random.uniform(-15, 50):.1f} C")
    elif kind == "light_resistor":
        u.parts.append(two(kind, ref, above, out, "10k", **{"class": "ldr"}))
        u.happens("ramp", part=ref, to=f"{u.decades(-1, 3)!r} lx", **{"for": f"{u.ends * 0.01!r} s"})
    else:
        u.parts.append(two(kind, ref, above, out, "10M"))
        u.happens("set", part=ref, to=repr(u.decades(2, 7)))
    u.r(out, below, 3, 6)
    return out


def preset(u: Unit, rail: str) -> str:
    out = u.net()
    share = f"{u.random.uniform(1, 99):.0f} %"
    u.parts.append(two("preset", u.ref("RV"), rail, out, range=f"{u.decades(3, 6)!r}", setting=share))
    u.r(out, "0V", 3, 6)
    return out


# From a signal to a signal.
def straight(u: Unit, rail: str, signal: str) -> str:
    out = u.net()
    u.r(signal, out, 2, 5.5)
    u.r(out, u.random.choice((rail, "0V")), 3, 6)
    return out


def debounce(u: Unit, rail: str, signal: str) -> str:
    out = u.net()
    u.r(signal, out, 3, 6)
    u.c(out, u.random.choice((rail, "0V")), -9, -5)
    return out


def differentiator(u: Unit, rail: str, signal: str) -> str:
    out = u.net()
    u.c(signal, out, -10, -6)
    u.r(out, u.random.choice((rail, "0V")), 3, 6)
    if u.chance(0.3):
        u.d("0V", out)
    return out


def inverter(u: Unit, rail: str, signal: str) -> str:
    base, out = u.net(), u.net()
    up = u.chance(0.5)
    u.r(signal, base, 2, 6)
    u.r(base, "0V" if up else rail, 3, 6)
    u.q(out, base, "0V" if up else rail, "npn" if up else "pnp")
    u.r(out, rail if up else "0V", 2, 5.5)
    if u.chance(0.3):
        u.c(base, "0V" if up else rail, -11, -7)
    return out


def darlington_pair(u: Unit, rail: str, signal: str) -> str:
    base, middle, out = u.net(), u.net(), u.net()
    u.r(signal, base, 3, 6.5)
    u.r(base, "0V", 4, 7)
    u.q(out, base, middle)
    u.q(out, middle, "0V")
    if u.chance(0.6):
        u.r(middle, "0V", 3, 6)
    u.r(rail, out, 2, 5.5)
    return out


def schmitt(u: Unit, rail: str, signal: str) -> str:
    base, first, second, out, emitter = u.net(), u.net(), u.net(), u.net(), u.net()
    u.r(signal, base, 2, 5)
    u.q(first, base, emitter)
    u.r(rail, first, 3, 5)
    u.r(first, second, 3, 5.5)
    u.r(second, "0V", 3, 5.5)
    if u.chance(0.3):
        u.c(first, second, -11, -8)
    u.q(out, second, emitter)
    u.r(rail, out, 2.5, 4.5)
    u.r(emitter, "0V", 1, 3.5)
    return out


def latch(u: Unit, rail: str, signal: str) -> str:
    gate, middle, top = u.net(), u.net(), u.net()
    u.r(rail, top, 1, 5)
    if u.chance(0.3):
        u.c(top, "0V", -10, -5)
    u.q(gate, middle, top, "pnp")
    low = middle
    if u.chance(0.5):
        low = u.net()
        u.r(middle, low, 2, 5)
    u.q(low, gate, "0V")
    if u.chance(0.9):
        u.r(gate, "0V", 3, 6)
    if u.chance(0.7):
        u.r(top, middle, 3, 6)
    if u.chance(0.4):
        u.c(gate, "0V", -11, -6)
    u.r(signal, gate, 3, 6)
    return u.random.choice((gate, middle, top))


def bistable(u: Unit, rail: str, signal: str) -> str:
    bases, collectors = (u.net(), u.net()), (u.net(), u.net())
    alike = u.chance(0.5)
    values = [(u.decades(2.5, 4.5), u.decades(3.5, 5.5), u.decades(3.5, 6)) for _ in range(2)]
    for k in range(2):
        load, cross, pull = values[0 if alike else k]
        u.parts.append(resistor(u.ref("R"), rail, collectors[k], load))
        u.parts.append(resistor(u.ref("R"), collectors[k], bases[1 - k], cross))
        u.parts.append(resistor(u.ref("R"), bases[k], "0V", pull))
        part = transistor(u.ref("Q"), collectors[k], bases[k], "0V", **{"class": "small npn"})
        u.parts.append(part)
    if u.chance(0.5):
        u.c(collectors[0], bases[1], -11, -8)
    u.r(signal, bases[0], 3, 6)
    return collectors[1]


def monostable(u: Unit, rail: str, signal: str) -> str:
    b1, c1, b2, c2 = u.net(), u.net(), u.net(), u.net()
    u.r(rail, c1, 2.5, 4.5)
    u.r(rail, c2, 2.5, 4.5)
    u.q(c1, b1, "0V")
    u.q(c2, b2, "0V")
    u.c(c1, b2, -9, -4)
    u.r(rail, b2, 3.5, 6)
    u.r(c2, b1, 3.5, 5.5)
    u.r(b1, "0V", 3.5, 6)
    u.r(signal, b1, 3, 6)
    return c2


def astable(u: Unit, rail: str, signal: str) -> str:
    b1, c1, b2, c2 = u.net(), u.net(), u.net(), u.net()
    load, base = u.decades(2.5, 4), u.decades(3.5, 5.5)
    # A flasher is looked at for some tens of periods: a sequence of hundreds is beyond the work bound of a lane.
    farads = max(u.decades(-9, -4), u.ends / (50.0 * 1.4 * base))
    for k, (b, c, other) in enumerate(((b1, c1, c2), (b2, c2, c1))):
        u.parts.append(resistor(u.ref("R"), rail, c, load))
        u.parts.append(resistor(u.ref("R"), rail, b, base))
        size = farads * (1.0 if u.chance(0.5) else u.random.uniform(1.0, 3.0))
        u.parts.append(capacitor(u.ref("C"), other, b, float(f"{size:.3g}")))
        u.q(c, b, "0V")
        if k == 0:
            u.parts.append(resistor(u.ref("R"), signal, b, float(f"{base * u.random.uniform(2.0, 30.0):.2g}")))
    return c2


def timer(u: Unit, rail: str, signal: str) -> str:
    cap, base, out = u.net(), u.net(), u.net()
    u.r(signal, cap, 3, 6.5)
    if u.chance(0.5):
        u.electrolytic(cap, "0V", -7, -3)
    else:
        u.c(cap, "0V", -8, -5)
    if u.chance(0.5):
        u.d(base, cap, "zener", value=f"{u.random.choice((3.3, 4.7, 5.6))} V")
    else:
        u.r(cap, base, 3, 6)
    u.q(out, base, "0V", u.random.choice(("npn", "darlington_npn")))
    u.r(base, "0V", 4, 7)
    u.r(rail, out, 2.5, 5.5)
    if u.chance(0.3):
        u.d(cap, rail)
    return out


# From a signal to a load.
def low_side(u: Unit, rail: str, signal: str) -> str:
    base, out = u.net(), u.net()
    u.r(signal, base, 2, 5)
    u.r(base, "0V", 3, 6)
    u.q(out, base, "0V", u.random.choice(("npn", "npn", "darlington_npn")))
    load(u, rail, out)
    return out


def high_side(u: Unit, rail: str, signal: str) -> str:
    base, out = u.net(), u.net()
    u.r(signal, base, 2, 5)
    u.r(base, rail, 3, 6)
    u.q(out, base, rail, u.random.choice(("pnp", "pnp", "darlington_pnp")))
    load(u, out, "0V")
    return out


def load(u: Unit, plus: str, minus: str) -> None:
    kind = u.random.choice(("resistor", "sounder", "piezo", "led", "coil"))
    if kind == "resistor":
        u.r(plus, minus, 1, 4)
    elif kind == "led":
        middle = u.net()
        u.r(plus, middle, 2, 4)
        u.d(middle, minus, "led")
    elif kind == "coil":
        fields = {"inductance": f"{u.decades(-3, 0.3)!r} H", "resistance": f"{u.decades(1.5, 3)!r} ohm"}
        u.parts.append(two("inductor", u.ref("L"), plus, minus, **fields))
        if u.chance(0.8):
            u.d(minus, plus)
    else:
        current = f"{u.decades(-3, -0.5)!r} A"
        data = {"current": current, "rated_voltage": "12 V"}
        u.parts.append(two(kind, u.ref("LS"), plus, minus, data=data))
        if u.chance(0.3):
            u.electrolytic(plus, minus, -6, -4)


SENSED = (contact, contact, sensor, preset)
BETWEEN = (
    straight, debounce, differentiator, inverter, darlington_pair, schmitt, latch, latch, bistable, monostable,
    astable, timer, timer,
)  # fmt: skip
DRIVEN = (low_side, high_side)


def unit(seed: int) -> Json:
    """The document of the unit with this number."""
    u = Unit(seed)
    supply = u.random.choice((3, 6, 9, 12, 24))
    rail = entry(u, "supply") if u.chance(0.8) else "supply"
    for _ in range(u.random.randint(1, 2)):
        signal = u.one(*SENSED)(u, rail)
        for _ in range(u.random.randint(1, 4)):
            signal = u.one(*BETWEEN)(u, rail, signal)
        if u.chance(0.8):
            u.one(*DRIVEN)(u, rail, signal)
    soft = u.chance(0.7)
    source = f"{u.decades(-2, 1.5)!r} ohm" if soft else "0R"
    if u.chance(0.3):
        u.happens("dip", to=f"{supply * u.random.uniform(0, 0.8):.2f} V", **{"for": f"{u.ends * 0.01!r} s"})
    if u.chance(0.2) and supply < 24:
        u.happens("surge", to=f"{supply * 1.5:.2f} V", **{"for": f"{u.ends * 0.01!r} s"})
    rise = u.decades(-8, min(0.0, math.log10(u.ends) - 2.5))
    first = u.ends * 0.01
    connect = {"at": "0 s", "event": "connect supply", "rise": f"{rise!r} s"}
    for event in u.events:
        # No excursion before the supply stands.
        if float(event["at"].split()[0]) < first:
            event["at"] = f"{first!r} s"
    return {
        "stagebook": 1,
        "name": f"unit {seed}",
        "conditions": {
            "supply": {"min": f"{supply * 0.8:.2f} V", "nominal": f"{supply} V", "max": f"{supply * 1.2:.2f} V"},
            "ambient": {"min": "-20 C", "nominal": "25 C", "max": "60 C"},
            "source_resistance": source,
            "leakage": ["specified"],
        },
        "stages": [{"name": "all", "parts": u.parts}],
        "sequences": {"alarm": {"ends": f"{u.ends!r} s", "events": [connect, *u.events]}},
    }
