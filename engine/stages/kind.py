"""What every stage kind declares: its ports, its settings, what it takes and gives, and how its parts are made."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from enum import IntEnum, StrEnum
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from .plan import Plan

Json = dict[str, Any]
WORD = "text"
"""The unit of a setting that is a word out of its choices."""


class Sense(StrEnum):
    """How a signal port says that it is active."""

    LEVEL = "level"
    """Near 0 V at rest, near the rail while active."""
    PULSE = "pulse"
    """A short positive charge, straight into a base."""
    LOW_SIDE = "low side"
    """A switch to 0V for a load."""
    HIGH_SIDE = "high side"
    """A switch to the rail for a load."""


class Wire(StrEnum):
    """What a port is connected to when a stage is put into a row."""

    RAIL = "rail"
    """The rail of loads: the supply, or what the last entry gives."""
    QUIET = "quiet rail"
    """The rail of small stages: behind the last filter where there is one."""
    RETURN = "return"
    IN = "in"
    """The signal of the stage before."""
    BASE = "latch base"
    """The base of the last latch, into which it is set and by which it is reset."""
    OUT = "out"
    """A net of its own, the signal for the next stage."""
    NEW_RAIL = "new rail"
    NEW_QUIET = "new quiet rail"
    NEW_BASE = "new latch base"


class Place(IntEnum):
    """Where in a row a kind usually stands: the order of the list that they are chosen from."""

    FEED = 1
    SENSE = 2
    SHAPE = 3
    HOLD = 4
    TIME = 5
    SWITCH = 6
    LOAD = 7


@dataclass(frozen=True, slots=True)
class Port:
    """One connection of a stage to the others."""

    name: str
    wire: Wire
    about: str


@dataclass(frozen=True, slots=True)
class Setting:
    """One thing that is asked of a stage: its unit, what it is where nothing is said, and what it is for."""

    name: str
    unit: str
    usual: str
    about: str
    choices: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Drive:
    """What a signal port gives while it is active: ``drop`` V below its rail behind ``ohms``; ``slow``: no edge.

    ``held`` is the current in A that keeps a latch: what must be taken from its base to let it go.
    """

    sense: Sense
    drop: float = 0.0
    ohms: float = 0.0
    slow: bool = False
    held: float = 0.0


@dataclass(frozen=True, slots=True)
class Intake:
    """What a stage takes at its signal port while active: ``current`` in A, at ``threshold``, a share of the rail.

    ``passes``: the stage has no signal of its own, and what follows it hangs on the same net. ``surge`` is its inrush
    in parts of the current, where it is known. ``holds`` is how many s its signal must stay; with less
    than ``holds_least`` it is ``cut`` short, in words, as is what to write ``instead``.
    """

    current: float = 0.0
    threshold: float | None = None
    passes: bool = False
    surge: float | None = None
    holds: float = 0.0
    holds_least: float = 0.0
    cut: str = ""
    instead: str = ""


@dataclass(frozen=True, slots=True)
class Beyond:
    """What the stages behind one draw in A: their ``loads`` from the rail of loads, the others from the quiet one.

    None where nothing is known of them.
    """

    loads: float | None = None
    small: float | None = None


NOTHING_KNOWN = Beyond()


@dataclass(frozen=True)
class Made:
    """What a stage brings beside its parts and roles. Times are in s, voltages in V.

    ``output`` is its signal, None where it passes on the one it got. ``rail_drop`` and ``quiet_drop`` are what its
    rails lose. ``acts`` are events counted from the instant at which the alarm begins, none of them before the supply
    comes; ``settles`` is how long it needs before that, ``lasts`` how long it goes on after it, ``active`` how long
    its signal then stays, None for as long as it is asked to. ``standby`` is when it rests in a design that the supply
    itself starts. ``moments`` and ``requirements`` may name the design's ``{load}`` and ``{contact}``, the event
    ``{trips}`` with which what follows the stage acts, and the moment ``begins``. ``doubts`` say which check will not
    hold as asked, why, and what to write instead.
    """

    output: Drive | None = None
    rail_drop: float = 0.0
    quiet_drop: float = 0.0
    acts: tuple[tuple[float, Json], ...] = ()
    settles: float = 0.0
    lasts: float = 0.0
    active: float | None = None
    standby: float | None = None
    moments: Mapping[str, Json | str] = field(default_factory=dict)
    sequences: Mapping[str, Json] = field(default_factory=dict)
    requirements: tuple[Json, ...] = ()
    doubts: tuple[str, ...] = ()


@dataclass(frozen=True)
class StageKind:
    """A stage of the catalogue. ``help`` is one paragraph with formula and source; ``make`` writes into a plan.

    ``takes`` is which senses its port ``in`` understands, ``intake`` what it takes there with these settings, ``draws``
    the largest current in A of a load of its own, ``rests`` what it takes from the quiet rail at rest, where that may
    be much; ``edge``: only a steep edge starts it; ``supply_starts``: the rail
    itself can stand for the signal where no stage before it gives one. ``called`` is the name of a stage that is given
    none.
    """

    name: str
    title: str
    place: Place
    help: str
    ports: tuple[Port, ...]
    settings: tuple[Setting, ...]
    make: Callable[[Plan], Made]
    takes: tuple[Sense, ...] = (Sense.LEVEL,)
    intake: Callable[[Plan], Intake] = lambda plan: Intake()
    draws: Callable[[Plan], float] = lambda plan: 0.0
    rests: Callable[[Plan], float] = lambda plan: 0.0
    edge: bool = False
    supply_starts: bool = True
    called: str = ""

    def setting(self, name: str) -> Setting | None:
        """The setting of this name."""
        return next((each for each in self.settings if each.name == name), None)

    def port(self, wire: Wire) -> Port | None:
        """The first port of this wire."""
        return next((each for each in self.ports if each.wire is wire), None)


RETURN_PORT = Port("0V", Wire.RETURN, "the return")
QUIET_PORT = Port("rail", Wire.QUIET, "what it is fed from")
RAIL_PORT = Port("rail", Wire.RAIL, "what it is fed from")
IN_PORT = Port("in", Wire.IN, "active while high")
OUT_PORT = Port("out", Wire.OUT, "high while active")
