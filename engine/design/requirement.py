"""What is asked of a design, and the stray capacitances it has to live with."""

from __future__ import annotations

from difflib import get_close_matches
from typing import Annotated, Final

from pydantic import Field, field_validator, model_validator

from .clause import Clause, Farads, Name, NetName, Scalar, Share, Slew, Slug, StageName, Text

MOST_EXTRAS: Final = 20


class Requirement(Clause, extra="allow"):
    """One requirement: which check, of which part or net, in which sequence, within which limits.

    ``from_`` and ``to`` are anchors or named moments. A check may read further fields of its own (``extras``);
    ``reason`` says why a limit or a derating differs from the customary one.
    """

    __pydantic_extra__: dict[str, Scalar] = Field(init=False)

    check: Slug = Field(examples=["duration"])
    of: Name | None = Field(None, examples=["LS1"])
    stage: StageName | None = None
    sequence: Name | None = Field(None, examples=["alarm"])
    from_: Text | None = Field(None, alias="from", examples=["LS1 on"])
    to: Text | None = Field(None, examples=["LS1 off"])
    at: Text | None = Field(None, examples=["sounding"])
    min: Text | None = Field(None, examples=["1.8 s"])
    max: Text | None = Field(None, examples=["2.2 s"])
    required: Share | None = Field(None, examples=["10 %"])
    derating: Share | None = Field(None, examples=["0.8"])
    reason: Text | None = None

    @model_validator(mode="after")
    def _no_slips(self) -> Requirement:
        if len(self.extras) > MOST_EXTRAS:
            raise ValueError(f"there are {len(self.extras)} fields that no check reads; write at most {MOST_EXTRAS}")
        known = [field.alias or name for name, field in type(self).model_fields.items()]
        for key in self.extras:
            near = get_close_matches(key, known, 1, 0.8)
            if near or not key.isidentifier() or len(key) > 60:
                meant = f"'{near[0]}'" if near else "a name of letters, digits and _"
                raise ValueError(f"unknown field '{key}'; write {meant}")
        return self

    @property
    def extras(self) -> dict[str, Scalar]:
        """The fields that only this check reads."""
        return self.__pydantic_extra__


class Stray(Clause):
    """A stray capacitance between two nets; ``slew`` is how fast the first of them may move against the second."""

    between: tuple[NetName, NetName] = Field(examples=[["supply", "base"]])
    value: Farads
    slew: Slew | None = None

    @field_validator("between")
    @classmethod
    def _two_nets(cls, nets: tuple[str, str]) -> tuple[str, str]:
        if nets[0] == nets[1]:
            raise ValueError(f"both nets are {nets[0]!r}; name two different nets")
        return nets


Strays = Annotated[tuple[Stray, ...], Field(max_length=400)]
Requirements = Annotated[tuple[Requirement, ...], Field(max_length=400)]
