"""Inspecting a design before it is computed: parts that suit their kind, nets that lead somewhere, names that exist."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from difflib import get_close_matches

from ..design.document import Design
from ..errors import CircuitError
from ..parts import kinds
from ..parts.kind import Kind
from ..parts.suitability import unsuitable
from .name_inspection import name_faults
from .net_inspection import net_faults
from .work_inspection import work_faults


def inspect(design: Design, known: Mapping[str, Kind] | None = None) -> None:
    """Raise CircuitError, in one line that says what to write, if the design cannot be computed as it is written.

    ``known`` are the part kinds by name, those of :mod:`..parts` where None.
    """
    faults = list(found_faults(design, known))
    if faults:
        more = f" (and {len(faults) - 1} more)" if len(faults) > 1 else ""
        raise CircuitError(faults[0] + more)


def found_faults(design: Design, known: Mapping[str, Kind] | None = None) -> Iterator[str]:
    """Everything that keeps a design from being computed, a line each: parts, nets, names, then the work."""
    known = kinds() if known is None else known
    misfits = list(_part_faults(design, known))
    yield from misfits
    if not misfits:
        yield from net_faults(design, known)
    yield from name_faults(design)
    yield from work_faults(design)


def _part_faults(design: Design, known: Mapping[str, Kind]) -> Iterator[str]:
    for stage in design.stages:
        for part in stage.parts:
            where = f"stage {stage.name}, part {part.ref}"
            kind = known.get(part.kind)
            if kind is None:
                near = get_close_matches(part.kind, known, 1, 0.5)
                meant = f"'{near[0]}'" if near else f"one of {', '.join(sorted(known))}"
                yield f"{where}, field kind: there is no kind '{part.kind}'; write {meant}"
                continue
            for field, words in unsuitable(part, kind):
                yield f"{where}, field {field}: {words}"
