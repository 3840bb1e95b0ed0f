"""How much work a sequence is for one lane: moves of contacts, levels and sources, and periods of a sine.

After every move the kernel starts again with a step of 1 ps and needs some twenty steps to be back at its pace; a sine
takes at least twenty steps a period. What is allowed here stays below the steps that a run of a circuit of some twenty
nets may take (``run.py``), so that a document is refused in words before it is computed, and not lane by lane after
minutes. How much the size of the circuit itself makes of it is known once it is built: ``cost.py``.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from typing import Final

from ..design.datum import number
from ..design.document import Design
from ..design.sequence import ContactEvent, Dip, Event, Inject, RampLevel, SetLevel, Surge
from ..errors import QuantityError
from ..quantity import read
from .wave import MOST_PIECES

MOST_MOVES: Final = 2_000
"""In one sequence."""
MOST_MOVES_IN_ALL: Final = 10_000
"""In all sequences of a design."""
MOST_PERIODS: Final = 8_000
"""Of one generator in one sequence."""
MOST_COURSE_POINTS: Final = 30_000
"""Moves of a sequence times the sources and switches of the circuit: each lane holds two numbers for each."""

_MOVED = {"contact", "generator", "probe", "lead", "preset", "light_resistor", "thermistor"}


def work_faults(design: Design) -> Iterator[str]:
    """What would take too long or too much memory to compute, a line each."""
    courses = _courses(design)
    made = _moves_of(design)
    for name, moves in made.items():
        most = min(MOST_MOVES, MOST_COURSE_POINTS // courses)
        if moves > most:
            yield (
                f"sequence {name}: its events and generators make {moves} moves of {courses} contacts, levels and "
                f"sources; write at most {most}, with fewer events, bounces or steps"
            )
        yield from (f"sequence {name}: {words}" for words in _swing_faults(design, design.sequences[name].ends))
    in_all = sum(made.values())
    if in_all > MOST_MOVES_IN_ALL:
        yield (
            f"field sequences: they make {in_all} moves of contacts, levels and sources in all; write at most "
            f"{MOST_MOVES_IN_ALL}, in fewer sequences or with fewer events"
        )


def course_points(design: Design) -> int:
    """Moves times courses of the largest sequence: about how many pairs of numbers a lane holds for it."""
    return _courses(design) * max(_moves_of(design).values(), default=0)


def _swing_faults(design: Design, ends: str) -> Iterator[str]:
    for part in design.parts:
        sine = None if part.waveform is None else part.waveform.sine
        if sine is None:
            continue
        try:
            periods = abs(number(sine.frequency, "Hz")) * read(ends, "s")
        except QuantityError:
            continue  # has its own words elsewhere
        if periods > MOST_PERIODS:
            yield (
                f"generator {part.ref} swings {periods:.3g} times until {ends}; write a lower frequency or an earlier "
                f"'ends', for at most {MOST_PERIODS} times"
            )


def _courses(design: Design) -> int:
    """What a lane holds a course of values for: the supply, generators, contacts, parts with a level, injectors."""
    moved = {part.ref for part in design.parts if part.kind in _MOVED}
    nets = {event.net for sequence in design.sequences.values() for event in sequence.events if event.event == "inject"}
    return 2 + len(moved) + len(nets)


def _moves_of(design: Design) -> dict[str, int]:
    """Moves that events and the steps of generators make, by sequence."""
    waveforms = [part.waveform for part in design.parts if part.waveform is not None]
    points = sum(len(waveform.steps or ()) for waveform in waveforms)
    followers = Counter(part.follows for part in design.parts)
    return {
        name: points + sum(_moves(event, followers) for event in sequence.events)
        for name, sequence in design.sequences.items()
    }


def _moves(event: Event, followers: Counter[str | None]) -> int:
    """Moves that an event makes; one that sets a quantity moves every part that follows it."""
    match event:
        case ContactEvent():
            return 1 if event.bounce is None else 2 * event.bounce.times + 1
        case Dip() | Surge():
            return 4
        case RampLevel():
            return MOST_PIECES * max(1, followers[event.part])
        case SetLevel():
            return max(1, followers[event.part])
        case Inject():
            return 2
        case _:
            return 1
