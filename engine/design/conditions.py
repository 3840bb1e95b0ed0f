"""The conditions a design is judged in: supply, ambient, source resistance, and the leakage state of capacitors."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any, Literal

from pydantic import Discriminator, Field, Tag, field_validator

from ..quantity import read
from .clause import Clause, Text

LeakageState = Literal["conditioned", "specified"]
COLDEST, HOTTEST = -100.0, 250.0  # deg C: silicon conducts by itself above, and freezes out below
UNITS = {"supply": "V", "ambient": "degC", "source_resistance": "ohm"}


@dataclass(frozen=True, slots=True)
class Levels:
    """One condition in SI (temperature in deg C)."""

    min: float
    nominal: float
    max: float


class Range(Clause):
    """A condition's texts; an end that is left out is the nominal value."""

    min: Text | None = None
    nominal: Text = Field(examples=["6 V"])
    max: Text | None = None


def _condition_shape(value: object) -> str | None:
    if isinstance(value, str):
        return "text"
    return "range" if isinstance(value, dict | Range) else None


Condition = Annotated[Annotated[Text, Tag("text")] | Annotated[Range, Tag("range")], Discriminator(_condition_shape)]


class Conditions(Clause):
    """What the surroundings do: each condition has min / nominal / max, or one text where it does not vary."""

    supply: Condition | None = Field(None, examples=[{"min": "4 V", "nominal": "6 V", "max": "6.4 V"}])
    ambient: Condition | None = Field(None, examples=[{"min": "0 C", "nominal": "25 C", "max": "50 C"}])
    source_resistance: Condition | None = Field(None, examples=[{"min": "0R1", "nominal": "0R5", "max": "2R"}])
    leakage: tuple[LeakageState, ...] = Field(default=(), max_length=2, examples=[["conditioned", "specified"]])

    @field_validator("supply", "ambient", "source_resistance")
    @classmethod
    def _in_order(cls, condition: Any, info: Any) -> Any:
        if condition is None:
            return condition
        found = _levels(condition, UNITS[info.field_name])
        if not found.min <= found.nominal <= found.max:
            raise ValueError("the values are not in order; write min, nominal and max from low to high")
        if info.field_name != "ambient" and found.min < 0:
            raise ValueError(f"a {info.field_name} below zero cannot be computed; write min as 0 or above")
        if info.field_name == "ambient" and (found.min < COLDEST or found.max > HOTTEST):
            raise ValueError(f"no law of a part holds beyond {COLDEST:g} C to {HOTTEST:g} C; write it within them")
        return condition

    @field_validator("leakage")
    @classmethod
    def _states_once(cls, states: tuple[str, ...]) -> tuple[str, ...]:
        if len(set(states)) != len(states):
            raise ValueError('a state is named twice; write ["conditioned", "specified"] or one of them')
        return states

    def levels(self, name: str) -> Levels | None:
        """``supply`` (V), ``ambient`` (deg C) or ``source_resistance`` (ohm); None where the document gives none."""
        condition = getattr(self, name)
        return None if condition is None else _levels(condition, UNITS[name])

    @property
    def leakage_states(self) -> tuple[LeakageState, ...]:
        """The leakage states to judge in; both where the document names none."""
        return self.leakage or ("conditioned", "specified")


def _levels(condition: str | Range, unit: str) -> Levels:
    if isinstance(condition, str):
        value = read(condition, unit)
        return Levels(value, value, value)
    nominal = read(condition.nominal, unit)
    ends = (nominal if end is None else read(end, unit) for end in (condition.min, condition.max))
    low, high = ends
    return Levels(low, nominal, high)
