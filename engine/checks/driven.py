"""Which loads one driver carries, and what they draw together: all that hang on its switched net, not only the one that
fills the role beside it."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from ..design.part import Part, Stage
from ..kernel.layout import Floats
from ..primitives.builder import RETURN, SUPPLY_NET
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor, Row, level, maximum, voltage
from .check import Mask
from .peak_collector_emitter import MOSFETS
from .seen import Seen
from .view import View

OFF = 0.1  # of the voltage at which a load counts as on
OVER = "{load} is off again when it is looked at: its alarm is shorter than that"
THROUGH = ("lead", "fuse")  # kinds behind which a net counts as the same
Draw = Callable[[Lanes, Floats], Floats]


def driven(view: View, stage: Stage, role: str, driver: Part) -> tuple[Part, ...]:
    """The loads of a driver: that of its role first, then every other one between its switched net and another than its
    own return. The load of the role is left out where it is that of another driver, and others hang on this one."""
    first = view.role(stage, "load" if role == "driver" else role.replace("driver", "load"))
    if first is None:
        return ()
    hanging = tuple(load for load in _loads(view) if _carries(view, driver, load, first))
    if first in hanging or not hanging:
        return first, *(load for load in hanging if load.ref != first.ref)
    others = (part for _, _, part in view.with_role("driver") if part.ref != driver.ref)
    return hanging if any(_carries(view, other, first, first) for other in others) else (first, *hanging)


def together(view: View, load: Part) -> tuple[Part, ...]:
    """A load and all that come on with it, because the same driver carries them."""
    for stage, role, driver in view.with_role("driver"):
        found = driven(view, stage, role, driver)
        if load in found:
            return load, *(other for other in found if other.ref != load.ref)
    return (load,)


def lifted(view: View, driver: Part, lanes: Lanes, current: Floats) -> Floats | float:
    """What a Darlington drops beside its V_CE(sat), V: the first transistor saturates, the second cannot, so that its
    V_BE comes on top, about half of that of both. Nothing of any other kind."""
    turned_on = view.bench(driver.ref).base_voltage if driver.kind.startswith("darlington") else None
    return 0.0 if turned_on is None else 0.5 * turned_on(lanes, np.maximum(current, 1e-6))


def drawn(view: View, loads: Sequence[Part]) -> Draw | None:
    """What loads draw together at a voltage, A; None where one of them does not say."""
    draws = [draw for load in loads if (draw := view.bench(load.ref).draw) is not None]
    if not draws or len(draws) < len(loads):
        return None
    return lambda lanes, volts: np.asarray(sum(np.asarray(draw(lanes, volts)) for draw in draws))


def first_seen(view: View, loads: Sequence[Part]) -> Part:
    """The load that tells when all of them are on: the first that has a level at which it counts as on."""
    return next((load for load in loads if view.bench(load.ref).on is not None), loads[0])


def surged(view: View, loads: Sequence[Part], draw: Callable[[Part], Draw | None]) -> Draw:
    """What loads draw together as they come on, A: of each the larger of its surge and of what ``draw`` says of it."""
    known = [(draw(load), view.datum(load, "surge", "A")) for load in loads]

    def amperes(lanes: Lanes, volts: Floats) -> Floats:
        total = np.zeros(lanes.count)
        for at, surge in known:
            one = np.zeros(lanes.count) if at is None else np.asarray(at(lanes, volts))
            total = total + (one if surge is None else np.maximum(one, surge.high))
        return total

    return amperes


def over(view: View, load: Part, at: Anchor) -> tuple[tuple[Row, ...], Callable[[Seen, str], Mask]]:
    """In which lanes a load that came on is off at the instant at which it is looked at, and the rows that tell."""
    on = view.bench(load.ref).on
    if on is None:
        return (), lambda seen, _sequence: np.zeros(seen.lanes.count, dtype=bool)
    plus, minus, least = on
    row = level(voltage(plus, minus), at)
    return (row,), lambda seen, sequence: seen.seen(row, sequence) & (seen.value(row, sequence) < OFF * least)


def ends(view: View, load: Part) -> tuple[str, str]:
    """The nets between which a load has its voltage, the positive one first where it says so."""
    on, (first, second, *_) = view.bench(load.ref).on, load.pins.values()
    return (first, second) if on is None else on[:2]


def own_current(view: View, load: Part, at: Anchor | None = None) -> tuple[Row, ...]:
    """The rows of which the largest magnitude is the current of a load that says nothing of its draw: at an instant,
    else the most in either direction."""
    currents = list(view.bench(load.ref).currents.values())[:1]
    if at is not None:
        return tuple(level(current, at) for current in currents)
    return tuple(maximum(current.scaled(sign)) for current in currents for sign in (1.0, -1.0))


def _loads(view: View) -> list[Part]:
    """All parts in a role of a load, and all that are one by their kind."""
    filled = {part.ref for _, _, part in view.with_role("load")}
    parts = (part for stage in view.design.stages for part in stage.parts)
    return [part for part in parts if part.ref in filled or view.bench(part.ref).draw is not None]


def _carries(view: View, driver: Part, load: Part, first: Part) -> bool:
    """Whether a load hangs on the switched net of a driver: its collector or drain, else, of a follower whose emitter
    or source is that of ``first``, this one."""
    upper, lower = ("drain", "source") if driver.kind in MOSFETS else ("collector", "emitter")
    if upper not in driver.pins or lower not in driver.pins or load.ref == driver.ref:
        return False
    high, low = joined(view, driver.pins[upper]), joined(view, driver.pins[lower])
    follows = not low & {RETURN, SUPPLY_NET} and not high & set(first.pins.values()) and low & set(first.pins.values())
    switched, other = (low, high) if follows else (high, low)
    nets = set(load.pins.values())
    return bool(nets & switched) and not nets & other


def joined(view: View, net: str) -> set[str]:
    """A net with all that leads and fuses join to it."""
    found, new = {net}, True
    while new:
        reached = [set(part.pins.values()) for _, part in view.parts_of(*THROUGH) if found & set(part.pins.values())]
        new = any(nets - found for nets in reached)
        found = found.union(*reached)
    return found
