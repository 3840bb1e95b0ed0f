"""A part as the document holds it, and the stage that holds parts."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import Discriminator, Field, Tag, model_validator

from ..errors import DesignError, QuantityError
from .clause import Clause, Key, Name, NetName, Ref, Scalar, Seconds, StageName, Text
from .datum import Datum, Entry, Limits, Single, as_datum


class Bounce(Clause):
    """A contact's bounce: how long it lasts and how often the contact opens in that time."""

    for_: Seconds = Field(alias="for", examples=["2 ms"])
    times: Annotated[int, Field(strict=True, ge=1, le=100)] = Field(examples=[4])


class Leakage(Clause):
    """A capacitor's leakage current at its rated voltage, as specified and after it stood under voltage."""

    specified: Single | None = None
    conditioned: Single | None = None


class Sine(Clause):
    """A sine: offset + amplitude sin(2 pi frequency t + phase)."""

    amplitude: Scalar = Field(examples=["0.1 V"])
    frequency: Scalar = Field(examples=["100 Hz"])
    offset: Scalar | None = None
    phase: Scalar | None = None


class Waveform(Clause):
    """What a generator gives: a sine, or ``steps`` of [time, volts] joined linearly."""

    sine: Sine | None = None
    steps: Annotated[tuple[tuple[Scalar, Scalar], ...], Field(min_length=1, max_length=2000)] | None = None

    @model_validator(mode="after")
    def _is_one(self) -> Waveform:
        if (self.sine is None) == (self.steps is None):
            raise ValueError('give either "sine": {...} or "steps": [["0 s", "0 V"], ["1 ms", "6 V"]]')
        return self


def _leakage_shape(value: object) -> str:
    if isinstance(value, Leakage):
        return "leakage"
    if isinstance(value, dict) and not value.keys() & set(Datum.model_fields):
        return "leakage"
    return "datum"


def _text_or_clause(value: object) -> str:
    return "text" if isinstance(value, str) else "clause"


LeakageEntry = Annotated[
    Annotated[Single, Tag("datum")] | Annotated[Leakage, Tag("leakage")], Discriminator(_leakage_shape)
]
BounceEntry = Annotated[
    Annotated[Seconds, Tag("text")] | Annotated[Bounce, Tag("clause")], Discriminator(_text_or_clause)
]


class Part(Clause):
    """One component. Which fields a part may have depends on its kind; the fields of every kind are known here.

    A datum may stand as a field of the part or under ``data``; :meth:`datum` finds it in either place. ``drawer`` says
    which made part its data were copied from, and is read by nothing.
    """

    ref: Ref = Field(examples=["R7"])
    kind: Key = Field(examples=["resistor"])
    pins: dict[Key, NetName] = Field(min_length=1, max_length=12, examples=[{"a": "supply", "b": "0V"}])
    class_: Text | None = Field(None, alias="class")
    drawer: Text | None = Field(None, examples=["low-leak npn, version 2"])
    value: Text | None = Field(None, examples=["4k7"])
    tolerance: Text | None = Field(None, examples=["5 %"])
    rating: Entry | None = Field(None, examples=["0.25 W"])
    tempco: Entry | None = Field(None, examples=["100 ppm/K"])
    range: Entry | None = None
    setting: Scalar | None = Field(None, examples=["50 %"])
    voltage: Entry | None = Field(None, examples=["16 V"])
    leakage: LeakageEntry | None = Field(None, examples=[{"specified": "3 uA", "conditioned": "0.2 uA"}])
    series_resistance: Entry | None = None
    ripple_rating: Entry | None = None
    inductance: Entry | None = None
    resistance: Entry | None = None
    capacitance: Entry | None = None
    pick_up: Entry | None = None
    drop_out: Entry | None = None
    armature_delay: Entry | None = None
    thermal_resistance: Entry | None = None
    operated_by: Ref | None = Field(None, examples=["K1"])
    form: Literal["make", "break"] | None = None
    delay: Entry | None = None
    bounce: BounceEntry | None = Field(None, examples=[{"for": "2 ms", "times": 4}])
    threshold: Entry | None = None
    resistance_on: Entry | None = None
    charges: Entry | None = None
    ratings: Entry | None = None
    follows: Name | None = Field(None, examples=["ambient"])
    current: Entry | None = None
    operating_minimum: Entry | None = None
    surge: Entry | None = None
    sound_level: Entry | None = None
    rated_current: Entry | None = None
    melting: Entry | None = None
    capacity: Entry | None = None
    charge_limits: Entry | None = None
    length: Entry | None = None
    insulation: Entry | None = None
    waveform: Waveform | None = Field(None, examples=[{"sine": {"amplitude": "0.1 V", "frequency": "100 Hz"}}])
    data: dict[Key, Entry] = Field(default={}, max_length=80)
    law: dict[Key, Entry] = Field(default={}, max_length=40)

    @model_validator(mode="after")
    def _says_it_once(self) -> Part:
        twice = sorted(key for key in self.data if key in _ENTRIES and getattr(self, key) is not None)
        if twice:
            raise ValueError(f"'{twice[0]}' is given twice; write it either as a field of the part or under 'data'")
        return self

    def entry(self, key: str) -> Any:
        """What stands at ``key``: a field of the part or else a key of ``data``; None where neither is given."""
        found = getattr(self, "class_" if key == "class" else key, None) if key in _ENTRIES else None
        return self.data.get(key) if found is None else found

    def datum(self, key: str, inner: str | None = None) -> Datum | None:
        """The datum at ``key``; ``inner`` is one of a group (``leakage`` ``conditioned``). None if not given."""
        found = self.entry(key)
        if isinstance(found, Leakage):
            return as_datum(getattr(found, inner, None)) if inner is not None else None
        return as_datum(found, inner)

    def limits(self, key: str, unit: str, inner: str | None = None) -> Limits | None:
        """The numbers at ``key``, read in ``unit``; None if not given. Raises DesignError naming part and field."""
        return self._read(self.datum(key, inner), key if inner is None else f"{key} {inner}", unit)

    def law_limits(self, key: str, unit: str) -> Limits | None:
        """The numbers at ``key`` of ``law``, read in ``unit``; None if not given. Raises DesignError."""
        return self._read(as_datum(self.law.get(key)), f"law {key}", unit)

    def _read(self, datum: Datum | None, name: str, unit: str) -> Limits | None:
        try:
            return None if datum is None else datum.limits(unit)
        except QuantityError as refusal:
            raise DesignError(f"part {self.ref}, field {name}: {refusal}") from refusal


_STRUCTURE = {"ref", "kind", "pins", "drawer", "data", "law", "waveform", "bounce"}
_ENTRIES = {field.alias or name for name, field in Part.model_fields.items()} - _STRUCTURE


class Stage(Clause):
    """A functional block: its parts, which part is what (``roles``), and where it came from.

    ``kind``, ``settings`` and ``ports`` tell which template made the stage; its parts stand here in full.
    """

    name: StageName = Field(examples=["driver"])
    kind: Name = Field("free", examples=["free"])
    roles: dict[Key, Ref] = Field(default={}, max_length=60, examples=[{"driver": "Q3"}])
    settings: dict[Key, Scalar] = Field(default={}, max_length=60)
    ports: dict[Name, NetName] = Field(default={}, max_length=40)
    parts: tuple[Part, ...] = Field(default=(), max_length=200)
