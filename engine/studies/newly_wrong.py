"""What an edit makes wrong that was right before: all that would be refused once the edited design is computed."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from functools import lru_cache, partial

from ..checks import catalogue
from ..checks.check import Check
from ..checks.view import View
from ..circuit.circuit import Circuit, build
from ..circuit.inspection import found_faults
from ..circuit.name_inspection import name_faults
from ..circuit.work_inspection import work_faults
from ..design.document import Design
from ..errors import CircuitError, DesignError, EngineError, QuantityError
from ..parts import kinds
from ..parts.suitability import unsuitable
from ..primitives.builder import Builder
from ..primitives.columns import Lanes
from ..quantity import parse
from .evaluate import inspect_requirements, inspect_tables
from .sequences import program_of, starts_of

_NUMBERED = re.compile(r"^(requirement|stray) \d+ ")


def refuse_newly_wrong(before: Design, after: Design) -> None:
    """Raise DesignError, in one line that says what to write, for what the edit ``before`` -> ``after`` makes wrong.

    What an edit that is one of several leaves open for the next one is none of it: nets that lead nowhere yet, names
    that wires on their way leave behind, data that a part has not yet been given.
    """
    if before == after:
        return
    for look in (_parts, _names, _work, _requirements, _whole):
        known = set(map(_unnumbered, look(before, before)))
        for words in look(after, before):
            if _unnumbered(words) not in known:
                raise DesignError(words)


def _unnumbered(words: str) -> str:
    """The same without its place in a list, which moves where an entry before it goes."""
    return _NUMBERED.sub(r"\1 ", words)


def _parts(design: Design, other: Design) -> Iterator[str]:
    """Parts that are complete, and whose law cannot be made of what they say."""
    others = {part.ref: part for part in other.parts} if design is not other else {}
    for part in design.parts:
        kind = kinds().get(part.kind)
        if kind is not None and part != others.get(part.ref) and not any(unsuitable(part, kind)):
            yield from _refused(partial(kind.expand, part, Builder(12.0)))


def _names(design: Design, other: Design) -> Iterator[str]:
    if _wires(design) == _wires(other):
        yield from name_faults(design)


def _wires(design: Design) -> set[str]:
    return {*design.nets, *(part.ref for part in design.parts)}


def _work(design: Design, other: Design) -> Iterator[str]:
    yield from work_faults(design)


def _requirements(design: Design, other: Design) -> Iterator[str]:
    """What can be told of requirements, required margins and factors without a circuit."""
    yield from _refused(lambda: inspect_tables(design))
    yield from _refused(lambda: inspect_requirements(design))
    for number, each in enumerate(design.requirements, 1):
        if each.min is None or each.max is None:
            continue
        try:
            low, high = parse(each.min), parse(each.max)
        except QuantityError:
            continue  # its check knows the unit
        if low.unit == high.unit and low.value > high.value:
            name = " ".join(filter(None, (each.check, each.of)))
            yield f"requirement {number} ({name}): min {each.min} is above max {each.max}; write the lower one as min"


def _whole(design: Design, other: Design) -> Iterator[str]:
    """What only the circuit tells: asks of the checks, sequences. Nothing where one of both is not whole yet."""
    if design is other or _computed(_Known(other.content, other)).whole:
        yield from _computed(_Known(design.content, design)).refusals


@dataclass(frozen=True)
class _Known:
    """A design that is the same as another of the same content."""

    content: str
    design: Design = field(compare=False)


@dataclass(frozen=True)
class _Computed:
    """Whether a circuit can be made of a design, and what is refused of it."""

    whole: bool
    refusals: tuple[str, ...] = ()


@lru_cache(maxsize=4)  # what one edit came to is what the next one begins with
def _computed(known: _Known) -> _Computed:
    design = known.design
    if any(found_faults(design)):
        return _Computed(False)
    try:
        circuit = build(design)
    except CircuitError as refusal:
        return _Computed(False, (str(refusal),))
    found: list[str] = []
    view, nominal = View(design, circuit), circuit.nominal()
    for check in catalogue().values():
        for words in _refused(partial(_asked, check, view)):
            found.append(words if check.slug in words else f"requirement {check.slug}: {words}")
    for name in design.sequences:
        found += _refused(partial(_begun, circuit, nominal, name))
    return _Computed(True, tuple(found))


def _asked(check: Check, view: View) -> None:
    for _ in check.asks(check, view):
        pass


def _begun(circuit: Circuit, lanes: Lanes, sequence: str) -> None:
    _, program = program_of(circuit, lanes, sequence)
    starts_of(circuit, sequence, program)


def _refused(deed: Callable[[], object]) -> Iterator[str]:
    try:
        deed()
    except EngineError as refusal:
        yield str(refusal)
