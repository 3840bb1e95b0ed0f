"""The design document: what one alarm or timer unit is, in stages, parts, conditions, sequences and requirements."""

from __future__ import annotations

import hashlib
import json
from collections import Counter
from collections.abc import Mapping
from functools import cached_property
from typing import Annotated, Any, Final, Literal

from pydantic import Field, ValidationError, model_validator

from ..errors import DesignError
from .clause import Clause, DesignName, Name, NetName, Sentence, Share, Slug, Text, Volts
from .complaint import complaint
from .conditions import Conditions, Levels, Range
from .datum import Datum, Entry, Limits
from .intake import take_in
from .part import Bounce, Leakage, Part, Sine, Stage, Waveform
from .requirement import Requirement, Requirements, Stray, Strays
from .sequence import Event, Moment, RelativeMoment, Sequence

MOST_PARTS: Final = 400
"""Parts in all stages together; inspection and elimination grow faster than their number."""


class Design(Clause):
    """A design document. It never changes: an edit makes a new one (``edit.py``). Texts stay as they were typed.

    ``required`` and ``derating`` hold what differs from the customary margins and factors, ``reasons`` why it does.
    """

    stagebook: Literal[1] = Field(examples=[1])
    name: DesignName = Field(examples=["flood"])
    purpose: Sentence = ""
    conditions: Conditions = Conditions()
    stages: Annotated[tuple[Stage, ...], Field(max_length=60)] = ()
    strays: Strays = ()
    sequences: Annotated[dict[Name, Sequence], Field(max_length=40)] = Field(
        examples=[{"alarm": {"events": [{"at": "0 s", "event": "connect supply"}], "ends": "5 s"}}]
    )
    starts: Annotated[dict[NetName, Volts], Field(max_length=400)] | None = None
    requirements: Requirements = ()
    required: dict[Slug, Share] = Field(default={}, max_length=100)
    derating: dict[Slug, Share] = Field(default={}, max_length=100)
    reasons: dict[Slug, Text] = Field(default={}, max_length=200)

    @model_validator(mode="after")
    def _names_are_single(self) -> Design:
        if self.name.endswith(".json"):
            raise ValueError(f"field name: {self.name!r} would be taken for a file; leave '.json' out")
        if "alarm" not in self.sequences:
            raise ValueError("field sequences: there is no sequence 'alarm'; write one of that name")
        for name, count in Counter(stage.name for stage in self.stages).items():
            if count > 1:
                raise ValueError(f"stage {name}, field name: {count} stages have it; give each a name of its own")
        if len(self.parts) > MOST_PARTS:
            raise ValueError(f"field stages: there are {len(self.parts)} parts in all; write at most {MOST_PARTS}")
        refs = Counter(part.ref for part in self.parts)
        for stage in self.stages:
            for part in stage.parts:
                if refs[part.ref] > 1:
                    others = [s.name for s in self.stages for p in s.parts if p.ref == part.ref]
                    where = ", ".join(others[:6]) + (" ..." if len(others) > 6 else "")
                    raise ValueError(
                        f"stage {stage.name}, part {part.ref}, field ref: {refs[part.ref]} parts have it"
                        f" (in {where}); give each a designator of its own"
                    )
        for name in sorted(self.reasons.keys() - self.required.keys() - self.derating.keys()):
            raise ValueError(f"field reasons: {name} stands neither under required nor under derating; leave it out")
        pairs = Counter(frozenset(stray.between) for stray in self.strays)
        for stray in self.strays:
            if pairs[frozenset(stray.between)] > 1:
                one, other = stray.between
                raise ValueError(f"strays, field between: {one} and {other} stand twice; write one stray for them")
        return self

    @classmethod
    def load(cls, source: str | bytes | Mapping[str, Any]) -> Design:
        """The design in a JSON text, UTF-8 bytes or a dict. Raises DesignError in one line that says what to write."""
        document = take_in(source)
        try:
            return cls.model_validate(document)
        except ValidationError as refusal:
            raise DesignError(complaint(refusal, document, cls)) from None

    def dump(self) -> dict[str, Any]:
        """The document as JSON values: the fields that were given, texts as typed."""
        return self.model_dump(mode="json", by_alias=True, exclude_unset=True)

    def canonical(self) -> bytes:
        """The document as bytes that are the same for the same design.

        Sorted keys, compact, UTF-8; fields that are unset or hold what unset means are left out.
        """
        document = _whole_numbers(self.model_dump(mode="json", by_alias=True, exclude_defaults=True))
        return json.dumps(document, sort_keys=True, separators=(",", ":"), ensure_ascii=False).encode()

    @cached_property
    def content(self) -> str:
        """SHA-256 of :meth:`canonical` in hexadecimal digits."""
        return hashlib.sha256(self.canonical()).hexdigest()

    @cached_property
    def parts(self) -> tuple[Part, ...]:
        """All parts, stage by stage."""
        return tuple(part for stage in self.stages for part in stage.parts)

    @cached_property
    def _places(self) -> dict[str, tuple[Stage, Part]]:
        return {part.ref: (stage, part) for stage in self.stages for part in stage.parts}

    def part(self, ref: str) -> Part:
        """The part with this reference designator. Raises DesignError."""
        return self._place(ref)[1]

    def stage_of(self, ref: str) -> Stage:
        """The stage that holds a part. Raises DesignError."""
        return self._place(ref)[0]

    def stage(self, name: str) -> Stage:
        """The stage of this name. Raises DesignError."""
        for stage in self.stages:
            if stage.name == name:
                return stage
        raise DesignError(
            f"there is no stage {name!r}; write one of {', '.join(s.name for s in self.stages) or 'none'}"
        )

    def has_part(self, ref: str) -> bool:
        """Whether a part with this reference designator is in the design."""
        return ref in self._places

    @cached_property
    def nets(self) -> tuple[str, ...]:
        """The nets that pins name, in the order in which they first appear."""
        return tuple(dict.fromkeys(net for part in self.parts for net in part.pins.values()))

    def starts_of(self, sequence: str) -> dict[str, str] | None:
        """Net voltages at 0 s of a sequence, as texts: the design's and over them its own. None if neither is given."""
        own = self.sequences[sequence].starts
        return None if self.starts is None and own is None else {**(self.starts or {}), **(own or {})}

    def _place(self, ref: str) -> tuple[Stage, Part]:
        try:
            return self._places[ref]
        except KeyError:
            raise DesignError(f"there is no part {ref!r} in the design; write a designator from its parts") from None


def _whole_numbers(value: Any) -> Any:
    """Numbers with no fraction as integers, so that 1 and 1.0 are the same bytes."""
    if isinstance(value, dict):
        return {key: _whole_numbers(inner) for key, inner in value.items()}
    if isinstance(value, list):
        return [_whole_numbers(inner) for inner in value]
    return int(value) if isinstance(value, float) and value.is_integer() else value


__all__ = [
    "Bounce",
    "Conditions",
    "Datum",
    "Design",
    "Entry",
    "Event",
    "Leakage",
    "Levels",
    "Limits",
    "Moment",
    "Part",
    "Range",
    "RelativeMoment",
    "Requirement",
    "Sequence",
    "Sine",
    "Stage",
    "Stray",
    "Waveform",
]
