"""Collects the primitives that parts become, with the laws that turn lanes into their parameters."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

from ..errors import CircuitError
from ..kernel import layout
from ..kernel.layout import Floats
from .columns import Column, Group, Lanes
from .signals import BRANCH_CURRENT, Signal, temperature_of

Law = Callable[[Lanes], "Floats | float"]
Laws = dict[str, Law]

RETURN = "0V"
SUPPLY_NET = "supply"


@dataclass(frozen=True, slots=True)
class Constant:
    """A law that gives the same value in every lane."""

    value: float

    def __call__(self, lanes: Lanes) -> float:
        """The value of all lanes."""
        return self.value


constant = Constant


def inverse(key: tuple[str, str]) -> Law:
    """The conductance of a resistance that is a column."""
    return lambda lanes: 1.0 / lanes[key]


@dataclass(frozen=True, slots=True)
class Handle:
    """A primitive that was added: its family and its place in it."""

    family: str
    index: int
    nets: tuple[str, ...]

    @property
    def current(self) -> Signal:
        """Current from the first net to the second; collector or drain current of a transistor."""
        kinds = {
            "conductance": layout.S_CONDUCTANCE_CURRENT,
            "branch": BRANCH_CURRENT,
            "junction": layout.S_JUNCTION_CURRENT,
            "transport": layout.S_COLLECTOR_CURRENT,
            "channel": layout.S_DRAIN_CURRENT,
            "warm": layout.S_WARM_CURRENT,
        }
        return Signal(((kinds[self.family], self.index, 1.0),))

    @property
    def base_current(self) -> Signal:
        """Current into the base of a transistor."""
        return Signal(((layout.S_BASE_CURRENT, self.index, 1.0),))

    @property
    def power(self) -> Signal:
        """Power turned into heat."""
        kinds = {
            "conductance": layout.S_CONDUCTANCE_POWER,
            "junction": layout.S_JUNCTION_POWER,
            "transport": layout.S_TRANSPORT_POWER,
            "channel": layout.S_CHANNEL_POWER,
            "warm": layout.S_WARM_POWER,
        }
        return Signal(((kinds[self.family], self.index, 1.0),))


@dataclass(frozen=True)
class Settable:
    """A conductance that events set in a quantity of the part's own: ohm, lux, deg C, a share of its travel.

    ``start`` is that quantity before any event, ``reading`` turns what an event writes into a number, ``siemens`` gives
    the conductance at a quantity. ``follows`` names what the part follows, when events may set it by that name too.
    A warm conductance (``family``) is set by its parameter ``place`` instead, to what ``setting`` gives.
    """

    index: int
    start: Law
    reading: Callable[[str | float], float]
    siemens: Callable[[Lanes, Floats | float], Floats | float]
    follows: str | None = None
    family: int = layout.CONDUCTANCE
    place: int = 0
    setting: Callable[[Lanes, Floats | float], Floats | float] | None = None

    def written(self, lanes: Lanes, quantity: Floats | float) -> Floats | float:
        """What the parameter that events set becomes at a quantity."""
        return (self.siemens if self.setting is None else self.setting)(lanes, quantity)


@dataclass(frozen=True, slots=True)
class Guard:
    """What tells contacts to move: the voltage between two nets, or the current of a branch (its ``branch``), with its
    upper and lower level, the delays until it moves, and the name under which its state (0 or 1) can be watched."""

    state: str
    nets: tuple[str, str]
    branch: int | None
    on: Law
    off: Law
    on_delay: Law
    off_delay: Law
    either_sign: bool = True


@dataclass(frozen=True, slots=True)
class Operated:
    """A conductance that a guard moves: its place, which guard, and how it closes and opens.

    Of a warm conductance (``family``) ``closed`` and ``opened`` are the logarithms of its level.
    """

    conductance: int
    state: str
    make: bool
    closed: Law
    opened: Law
    delay: Law
    bounce_for: float = 0.0
    bounce_times: int = 0
    family: int = layout.CONDUCTANCE


@dataclass
class Bench:
    """What can be observed at a part, and the laws that hand formulas need.

    ``currents`` by pin name; ``armature``: the state of what a coil moves; ``rise``: how far above the ambient it is,
    in K; ``on``: the nets and the level in volts at which a load counts as on; ``draw``: current of a load at a
    voltage, ``inrush``: what it draws there cold; of a transistor ``gain`` as its figure states it, ``gain_at`` and
    ``base_voltage`` at a collector current in A, ``gain_given`` between which currents it is given, and ``leakage`` in
    A; of a field-effect transistor ``lets_through``: the drain current in A that a gate voltage carries at most; of a
    capacitor ``leak_conductance`` in S.
    """

    currents: dict[str, Signal] = field(default_factory=dict)
    armature: str | None = None
    power: Signal | None = None
    rise: Signal | None = None
    on: tuple[str, str, float] | None = None
    draw: Callable[[Lanes, Floats], Floats] | None = None
    inrush: Callable[[Lanes, Floats], Floats] | None = None
    gain: Law | None = None
    gain_at: Callable[[Lanes, Floats], Floats] | None = None
    gain_given: tuple[float, float] | None = None
    base_voltage: Callable[[Lanes, Floats | float], Floats] | None = None
    leakage: Law | None = None
    lets_through: Callable[[Lanes, Floats], Floats] | None = None
    leak_conductance: Law | None = None


class Builder:
    """Filled by the ``expand`` functions of part kinds; :mod:`.circuit` makes arrays of it.

    ``hidden`` are temperatures and states that lists of nets leave out.
    """

    def __init__(self, supply_nominal: float = 0.0, alias: dict[str, str] | None = None) -> None:
        self.supply_nominal = supply_nominal
        self.nets: dict[str, None] = {RETURN: None}
        self.columns: list[Column] = []
        self.conductances: list[tuple[str, str, Law]] = []
        self.capacitances: list[tuple[str, str, Law]] = []
        self.branches: list[tuple[str, str, Law, Law, str | None]] = []
        self.junctions: list[tuple[str, str, Laws]] = []
        self.transports: list[tuple[str, str, str, int, Laws]] = []
        self.channels: list[tuple[str, str, str, int, Laws]] = []
        self.temperatures: dict[str, None] = {}
        self.warms: list[tuple[str, str, str, Laws]] = []
        self.switches: dict[str, tuple[int, Callable[[str], Law]]] = {}
        self.settables: dict[str, Settable] = {}
        self.guards: dict[str, Guard] = {}
        self.operated: list[Operated] = []
        self.generators: dict[str, str] = {}
        self.injectors: list[str] = []
        self.hidden: set[str] = set()
        self.batteries: dict[str, Law] = {}
        self.benches: dict[str, Bench] = {}
        self._alias = alias or {}

    def net(self, name: str) -> str:
        """The net that a name stands for (nets joined by 0R parts share one), noted as used."""
        seen = name
        while seen in self._alias:
            seen = self._alias[seen]
        self.nets.setdefault(seen)
        return seen

    def column(
        self,
        ref: str,
        datum: str,
        nominal: float,
        low: float | None = None,
        high: float | None = None,
        group: Group = Group.TOLERANCE,
        logarithmic: bool = False,
    ) -> tuple[str, str]:
        """Add a number that lanes may vary; return its key."""
        low = nominal if low is None else low
        high = nominal if high is None else high
        if not low <= nominal <= high:
            raise CircuitError(
                f"part {ref}, {datum}: typical {nominal:g} lies outside of its limits {low:g} .. {high:g}; "
                "write min, typical and max in rising order"
            )
        self.columns.append(Column(ref, datum, nominal, low, high, group, logarithmic))
        return ref, datum

    def conductance(self, a: str, b: str, law: Law) -> Handle:
        """A linear conductance in siemens between two nets."""
        pair = self.net(a), self.net(b)
        self.conductances.append((*pair, law))
        return Handle("conductance", len(self.conductances) - 1, pair)

    def capacitance(self, a: str, b: str, law: Law) -> None:
        """A linear capacitance in farad between two nets."""
        self.capacitances.append((self.net(a), self.net(b), law))

    def branch(self, a: str, b: str, inductance: Law, resistance: Law, source: str | None = None) -> Handle:
        """A branch with its current as an unknown: v(a) - v(b) = L di/dt + R i + source."""
        pair = self.net(a), self.net(b)
        self.branches.append((*pair, inductance, resistance, source))
        return Handle("branch", len(self.branches) - 1, pair)

    def junction(self, anode: str, cathode: str, laws: Laws) -> Handle:
        """A two-terminal junction; ``laws`` by the names of ``lane_table.JUNCTION``."""
        pair = self.net(anode), self.net(cathode)
        self.junctions.append((*pair, laws))
        return Handle("junction", len(self.junctions) - 1, pair)

    def transport(self, collector: str, base: str, emitter: str, polarity: int, laws: Laws) -> Handle:
        """A bipolar transistor; polarity +1 npn, -1 pnp. Junction laws are prefixed ``emitter_`` / ``collector_``."""
        nets = self.net(collector), self.net(base), self.net(emitter)
        self.transports.append((*nets, polarity, laws))
        return Handle("transport", len(self.transports) - 1, nets)

    def channel(self, drain: str, gate: str, source: str, polarity: int, laws: Laws) -> Handle:
        """A field-effect channel; polarity +1 n, -1 p; ``laws`` by the names of ``lane_table.CHANNEL``."""
        nets = self.net(drain), self.net(gate), self.net(source)
        self.channels.append((*nets, polarity, laws))
        return Handle("channel", len(self.channels) - 1, nets)

    def temperature(self, ref: str, per_kelvin: Law, capacity: Law) -> str:
        """Add the temperature of a part, as a rise above its surroundings, and return its name.

        ``per_kelvin``: watts that leave it for each kelvin; ``capacity``: joules for each kelvin. It is held beside the
        nets, with these as a conductance and a capacitance to 0V, but is no net: no part can be on it.
        """
        name = temperature_of(ref)
        self.temperatures.setdefault(name)
        self.hidden.add(name)
        self.conductances.append((name, RETURN, per_kelvin))
        self.capacitances.append((name, RETURN, capacity))
        return name

    def warm(self, a: str, b: str, temperature: str, laws: Laws) -> Handle:
        """A conductance that its own temperature changes; ``laws`` by the names of ``lane_table.WARM``, in kelvin."""
        nets = self.net(a), temperature, self.net(b)
        self.warms.append((*nets, laws))
        return Handle("warm", len(self.warms) - 1, nets)

    def switch(self, ref: str, a: str, b: str, start: Law, reading: Callable[[str], Law]) -> Handle:
        """A conductance that events set; ``reading`` turns the text of an event (``closed``, ``open`` or a value)
        into a law in siemens."""
        handle = self.conductance(a, b, start)
        self.switches[ref] = (handle.index, reading)
        return handle

    def settable(
        self,
        ref: str,
        a: str,
        b: str,
        start: Law,
        siemens: Callable[[Lanes, Floats | float], Floats | float],
        reading: Callable[[str | float], float],
        follows: str | None = None,
    ) -> Handle:
        """A conductance that events set in a quantity of the part's own, see :class:`Settable`."""
        handle = self.conductance(a, b, lambda lanes: siemens(lanes, start(lanes)))
        self.settables[ref] = Settable(handle.index, start, reading, siemens, follows)
        return handle

    def bench(self, ref: str) -> Bench:
        """Where a kind notes what can be observed at its part."""
        return self.benches.setdefault(ref, Bench())
