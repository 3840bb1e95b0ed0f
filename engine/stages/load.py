"""Loads as a stage of their own: a sounder or a piezo element on whatever switches it."""

from __future__ import annotations

from functools import partial

from .kind import IN_PORT, RAIL_PORT, RETURN_PORT, Intake, Made, Place, Sense, Setting, StageKind
from .loads import LOAD_SETTINGS, add_load, doubtful, load_requirements
from .plan import RETURN, Plan


def _make(plan: Plan, load: str) -> Made:
    if plan.drive is None:
        plus, minus = plan.port("rail"), RETURN
    elif plan.drive.sense is Sense.LOW_SIDE:
        plus, minus = plan.port("rail"), plan.port("in")
    else:
        plus, minus = plan.port("in"), RETURN
    add_load(plan, load, plus, minus)
    lost = 0.0 if plan.drive is None else plan.drive.drop
    return Made(requirements=load_requirements(plan), doubts=doubtful(plan, lost))


def _kind(name: str, title: str, current: str, level: str, words: str) -> StageKind:
    return StageKind(
        name=name,
        title=title,
        place=Place.LOAD,
        help=words,
        ports=(IN_PORT, RAIL_PORT, RETURN_PORT),
        settings=(
            Setting("current", "A", current, LOAD_SETTINGS[1].about),
            LOAD_SETTINGS[2],
            Setting("sound_level", "dB", level, LOAD_SETTINGS[3].about),
            *LOAD_SETTINGS[4:],
        ),
        make=partial(_make, load=name),
        takes=(Sense.LOW_SIDE, Sense.HIGH_SIDE, Sense.LEVEL),
        intake=lambda plan: Intake(plan.above_zero("current"), passes=True),
        draws=lambda plan: plan.above_zero("current") * plan.supply.max / plan.supply.nominal,
    )


KINDS = (
    _kind(
        "sounder",
        "sounder",
        "150 mA",
        "95 dB",
        "A siren or buzzer that draws its current at the nominal supply; it counts as on above the voltage from which"
        " it works. Sound falls by 20 log10 d with the distance d in m, so L at 1 m must be that much above what is"
        " needed there; the typical current is taken as 0.8 of the largest. Source: free-field law; currents from"
        " memory (0.2-1 A, surge 2 times).",
    ),
    _kind(
        "piezo",
        "piezo element",
        "12 mA",
        "88 dB",
        "A piezo element with its oscillator, as a conductance and 20 nF. It counts as on above the voltage from"
        " which it works. Sound falls by 20 log10 d with the distance d in m. Source: free-field law; figures from"
        " memory (5-20 mA, 85-105 dB at 1 m).",
    ),
)
