"""Sequences: timed events that exercise a design, and the moments at which levels are read."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import AfterValidator, Discriminator, Field, Tag

from ..quantity import read
from .anchor import read_anchor
from .clause import Clause, Delay, Name, NetName, Number, Ref, Seconds, Text, Volts
from .part import Bounce


def _charge(text: str) -> str:
    read(text, "C")
    return text


def _ohms(text: str) -> str:
    read(text, "ohm")
    return text


def _anchor(text: str) -> str:
    read_anchor(text)
    return text


class Timed(Clause):
    """Something that happens at a time of its sequence."""

    at: Seconds = Field(examples=["1 s"])


class ConnectSupply(Timed):
    """The supply is connected; it rises from 0 V in ``rise``."""

    event: Literal["connect supply"]
    rise: Seconds | None = Field(None, examples=["1 us"])


class DisconnectSupply(Timed):
    """The supply is taken away."""

    event: Literal["disconnect supply"]


class ReverseSupply(Timed):
    """The supply is connected the wrong way round."""

    event: Literal["reverse supply"]


class Dip(Timed):
    """The supply sinks to a lower voltage for a while."""

    event: Literal["dip"]
    to: Volts
    for_: Seconds = Field(alias="for", examples=["40 ms"])
    edge: Seconds | None = Field(None, examples=["1 us"])


class Surge(Timed):
    """The supply rises to a higher voltage for a while, through ``impedance``."""

    event: Literal["surge"]
    to: Volts
    for_: Seconds = Field(alias="for", examples=["60 s"])
    edge: Seconds | None = Field(None, examples=["1 us"])
    impedance: Annotated[Text, AfterValidator(_ohms)] | None = Field(None, examples=["0R5"])


class ContactEvent(Timed):
    """A contact closes or opens."""

    event: Literal["close", "open"]
    part: Ref = Field(examples=["S1"])
    bounce: Bounce | None = None


class SetLevel(Timed):
    """A resistance, a light level, a sensor's temperature, a preset or a generator is set to a level at once."""

    event: Literal["set"]
    part: Name = Field(examples=["B1"])
    to: Number | Text = Field(examples=["200k"])


class RampLevel(Timed):
    """As ``set``, reached evenly over a while."""

    event: Literal["ramp"]
    part: Name = Field(examples=["B1"])
    to: Number | Text = Field(examples=["200k"])
    for_: Seconds = Field(alias="for", examples=["10 s"])


class Inject(Timed):
    """A pulse of charge is put into a net; a negative charge is drawn from it."""

    event: Literal["inject"]
    net: NetName = Field(examples=["base"])
    charge: Annotated[Text, AfterValidator(_charge)] = Field(examples=["10 pC"])
    width: Seconds = Field(examples=["100 ns"])


EVENTS: dict[str, type[Timed]] = {
    "connect supply": ConnectSupply,
    "disconnect supply": DisconnectSupply,
    "reverse supply": ReverseSupply,
    "dip": Dip,
    "surge": Surge,
    "close": ContactEvent,
    "open": ContactEvent,
    "set": SetLevel,
    "ramp": RampLevel,
    "inject": Inject,
}
Event = Annotated[
    ConnectSupply | DisconnectSupply | ReverseSupply | Dip | Surge | ContactEvent | SetLevel | RampLevel | Inject,
    Discriminator("event"),
]


class RelativeMoment(Clause):
    """An instant ``by`` after an observed event, so that it means the same state in every corner."""

    after: Annotated[Text, AfterValidator(_anchor)] = Field(examples=["LS1 on"])
    by: Delay = Field("0 s", examples=["0.5 s"])


def _moment_shape(value: object) -> str | None:
    if isinstance(value, str):
        return "time"
    return "relative" if isinstance(value, dict | RelativeMoment) else None


Moment = Annotated[
    Annotated[Seconds, Tag("time")] | Annotated[RelativeMoment, Tag("relative")], Discriminator(_moment_shape)
]


class Sequence(Clause):
    """Events from 0 s to ``ends``; ``starts`` fixes net voltages at 0 s for this sequence, over those of the design."""

    events: tuple[Event, ...] = Field(default=(), max_length=200)
    ends: Seconds = Field(examples=["5 s"])
    moments: dict[Name, Moment] = Field(default={}, max_length=60, examples=[{"standby": "0.9 s"}])
    starts: dict[NetName, Volts] | None = Field(None, max_length=400)
