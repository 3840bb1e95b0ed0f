"""How long what starts an alarm lasts, and whether that is long enough for what follows it."""

from __future__ import annotations

from dataclasses import dataclass

from ..quantity import write
from .kind import Setting
from .plan import Plan

NAME = "held"
HELD = 2.0  # s that a sensor is held where nothing else is said or needed


@dataclass(frozen=True)
class Held:
    """``time`` s of the event, ``lasts`` s of it before what follows has its own; ``doubts`` where it is short."""

    time: float
    lasts: float
    doubts: tuple[str, ...] = ()


def held_setting(usual: float, about: str) -> Setting:
    """The setting of how long an event lasts: where none is written, as long as what follows needs."""
    return Setting(NAME, "s", "", f"{about}; empty: {write(usual, 's')}, or more where a timer behind needs it")


def held(plan: Plan, usual: float) -> Held:
    """How long the event lasts: as it was said, even where nothing comes of it, else as long as what follows needs."""
    needs = plan.next.holds
    if not plan.text(NAME):
        time = max(usual, needs)
        plan.found[NAME] = write(time, "s", digits=4)
        return Held(time, usual)
    said = plan.above_zero(NAME)
    if said >= plan.next.holds_least:
        return Held(said, said)
    return Held(
        said,
        said,
        (
            f"duration: held {plan.text(NAME)} is too short: {plan.next.cut}; write held {write(needs, 's', digits=4)}"
            f" or {plan.next.instead}",
        ),
    )
