"""Check 9: how hot does a junction become?

Steady: rise = P R_th. Short losses: the transient thermal resistance of a half space, R_th sqrt(t/t_0) up to t_0
(Carslaw, Jaeger, Conduction of Heat in Solids, 1959, section 2.9: a given flux into a half space), t_0 being the time
from which on the whole of R_th counts. Of all courses of power with the same peak and energy the rectangle that ends at
the instant looked at heats most, because the response only falls with the age of a loss: so all energy beyond what is
lost while the load is on, put into one rectangle of the peak power, is an upper bound, and so is the peak power for
ever. The smaller of both counts. What is lost while the load is on is taken as constant.

Where a thermal capacity is given, the loss itself is followed with the one time constant R_th C, from the temperature
of stand-by on, instead of these bounds; what is lost in stand-by and at the end of a sequence is taken to last. Losses
much shorter than R_th C, in which only part of the capacity takes heat, come out too cool: then leave it unwritten.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from ..design.part import Part, Stage
from ..kernel.layout import Floats
from ..primitives.columns import SUPPLY
from ..primitives.signals import Anchor, Row, integral, lagged, level, maximum
from ..quantity import read
from .check import Ask, Check, Judged, ratio, unknown
from .driven import drawn, driven, first_seen, lifted
from .reverse_base_emitter import BIPOLAR
from .seen import Seen
from .view import View

HEATED = (*BIPOLAR, "mosfet_n", "mosfet_p", "zener")
LIMIT = 150.0  # deg C, silicon in plastic, from memory
SETTLED = 1e-2  # s after which a load that came on draws what it goes on to draw
BRIEF = 0.05  # of the rise allowed: what short losses may add before the hand formula says nothing of them
WHOLE = 1.0  # s from which on all of R_th counts, from memory: small packages take ten times as long
RATED_AT = 25.0  # deg C at which a power is rated


def transient(seconds: Floats, whole: float) -> Floats:
    """Share of the thermal resistance that counts for a loss of this length: sqrt(t/t_0), at most 1."""
    return np.sqrt(np.clip(seconds / whole, 0.0, 1.0))


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every transistor and zener."""
    for stage, part in view.parts_of(*HEATED):
        if view.bench(part.ref).power is not None:
            yield _ask(check, view, stage, part)


def _ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    sequence = view.sequence(requirement)
    resistance, rated = view.datum(part, "thermal_resistance", "K/W"), None
    limit, whole = (_typical(view, part, *key) for key in (("t_j_max", "degC", LIMIT), ("thermal_time", "s", WHOLE)))
    if resistance is None:
        rated = view.datum(part, "power", "W")
        if rated is None:
            return unknown(check, stage.name, part.ref, sequence, required, f"thermal_resistance of {part.ref}")
    if resistance is None:
        view.customary("ambient at which a power is rated", RATED_AT, "degC")
    kelvin = resistance.high if resistance is not None else (limit - RATED_AT) / rated.low if rated is not None else 0.0
    conducts = _conducts(view, stage, part)

    def judged(seen: Seen, rise: Floats, lasting: Floats) -> Judged:
        allowed = limit - seen.lanes.ambient
        by_hand = lasting if conducts is None else kelvin * conducts(seen)
        hand = 1.0 - by_hand / np.where(allowed > 0.0, allowed, np.nan)
        # Where short losses count, the demand is a bound that no formula of a lasting loss comes to.
        brief = rise - lasting > BRIEF * np.maximum(allowed, rise)
        return ratio(rise, allowed, hand=hand, apart=((brief, check.words["brief"]),))

    capacity = view.datum(part, "thermal_capacity", "J/K")
    if capacity is not None and min(capacity.low, kelvin) > 0.0:
        lag = _Lag.of(view, part, kelvin * capacity.low)

        def judge_lag(seen: Seen) -> Judged:
            watts, lasting = (
                np.max([each(seen, name) for name in lag.sequences], axis=0) for each in (lag.most, lag.steady)
            )
            return judged(seen, kelvin * np.maximum(watts, lasting), kelvin * lasting)

        return Ask(check, stage.name, part.ref, lag.sequences, required, judge_lag, lag.rows)
    heat = _Heat.of(view, stage, part, whole)

    def judge(seen: Seen) -> Judged:
        found = [heat.watts(seen, name) for name in heat.sequences]
        steady, bound = (np.max([each[k] for each in found], axis=0) for k in (0, 1))
        return judged(seen, kelvin * np.maximum(steady, bound), kelvin * steady)

    return Ask(check, stage.name, part.ref, heat.sequences, required, judge, heat.rows)


def _conducts(view: View, stage: Stage, part: Part) -> Callable[[Seen], Floats] | None:
    """The loss of a driver whose load is on: I V_CE(sat), or I^2 R_on; None of any other part."""
    roles = [role for role, ref in view.roles_of(stage).items() if ref == part.ref and role.startswith("driver")]
    draw = drawn(view, driven(view, stage, roles[0], part)) if roles else None
    drop, ohms = view.datum(part, "v_ce_sat", "V"), view.datum(part, "resistance_on", "ohm")
    if draw is None or (drop is None and ohms is None) or view.design.conditions.supply is None:
        return None

    def watts(seen: Seen) -> Floats:
        current = np.asarray(draw(seen.lanes, seen.lanes[SUPPLY]))
        if drop is not None:
            return current * (drop.typical + lifted(view, part, seen.lanes, current))
        assert ohms is not None
        return current**2 * ohms.typical

    return watts


def _typical(view: View, part: Part, key: str, unit: str, customary: float) -> float:
    found = view.datum(part, key, unit)
    if found is None:
        return view.customary(f"{key.replace('_', ' ')} of {part.ref}", customary, unit)
    return found.typical


@dataclass(frozen=True)
class _Lag:
    """A part's loss, followed with the time constant of its package, and what of it lasts."""

    sequences: tuple[str, ...]
    standby: dict[str, Row]
    last: dict[str, Row]
    warmest: Row

    @classmethod
    def of(cls, view: View, part: Part, seconds: float) -> _Lag:
        """The rows of a part that turns power to heat; ``seconds`` is R_th C."""
        power = view.bench(part.ref).power
        assert power is not None
        standby = {
            name: level(power, view.anchor("standby", name))
            for name, sequence in view.design.sequences.items()
            if "standby" in sequence.moments
        }
        last = {name: level(power, Anchor(view.ends(name))) for name in view.design.sequences}
        return cls(tuple(last), standby, last, lagged(power, seconds))

    @property
    def rows(self) -> tuple[Row, ...]:
        """Everything that is observed, in every sequence."""
        return tuple(dict.fromkeys((*self.standby.values(), *self.last.values(), self.warmest)))

    def steady(self, seen: Seen, name: str) -> Floats:
        """The largest lasting loss in a sequence."""
        found = [row[name] for row in (self.standby, self.last) if name in row]
        return np.asarray(np.max([np.nan_to_num(seen.value(row, name)) for row in found], axis=0))

    def most(self, seen: Seen, name: str) -> Floats:
        """What the part is at most as warm as by, in watts of lasting loss; it begins as warm as stand-by leaves it."""
        before = self.standby.get(name)
        begun = 0.0 if before is None else np.nan_to_num(seen.value(before, name))
        left = np.exp(-seen.time(self.warmest, name) / self.warmest.level)
        return np.asarray(begun * left + seen.value(self.warmest, name))


@dataclass(frozen=True)
class _Heat:
    """What of a part's loss is observed; ``on``: between which events a driver's load is on, and its loss then."""

    whole: float
    sequences: tuple[str, ...]
    steady: dict[str, tuple[Row, ...]]
    peak: Row
    energy: Row
    on: tuple[Row, Row, Row] | None

    @classmethod
    def of(cls, view: View, stage: Stage, part: Part, whole: float) -> _Heat:
        """The rows of a part that turns power to heat."""
        power = view.bench(part.ref).power
        assert power is not None
        steady = {}
        for name, sequence in view.design.sequences.items():
            moments = [view.anchor(moment, name) for moment in sequence.moments]
            steady[name] = tuple(level(power, at) for at in moments or [Anchor(0.5 * view.ends(name))])
        roles = [role for role, ref in view.roles_of(stage).items() if ref == part.ref and role.startswith("driver")]
        loads = driven(view, stage, roles[0], part) if roles else ()
        load = first_seen(view, loads) if loads else None
        on = None
        if load is not None and view.bench(load.ref).on is not None:
            begin, end = view.event(f"{load.ref} on"), view.event(f"{load.ref} off")
            on = begin, end, level(power, Anchor(SETTLED, begin))
        return cls(whole, tuple(steady), steady, maximum(power), integral(power), on)

    @property
    def rows(self) -> tuple[Row, ...]:
        """Everything that is observed, in every sequence."""
        moments = (row for rows in self.steady.values() for row in rows)
        return tuple(dict.fromkeys((*moments, self.peak, self.energy, *(self.on or ()))))

    def watts(self, seen: Seen, name: str) -> tuple[Floats, Floats]:
        """The largest steady loss in a sequence, and the loss that would heat as much as its peaks at most do."""
        steady = np.nan_to_num(np.array([seen.value(row, name) for row in self.steady[name]])).max(axis=0)
        energy, most = seen.value(self.energy, name), seen.value(self.peak, name)
        lasting = np.zeros(seen.lanes.count)
        if self.on is not None:
            begin, end, lost = self.on
            ends = read(seen.circuit.design.sequences[name].ends, "s")
            off = np.where(seen.seen(end, name), seen.time(end, name), ends)
            lasting = np.minimum(np.nan_to_num(seen.value(lost, name)), most)
            energy = np.maximum(0.0, energy - lasting * np.nan_to_num(off - seen.time(begin, name)))
        beyond = np.maximum(most - lasting, 1e-15)
        return steady, np.minimum(most, lasting + beyond * transient(energy / beyond, self.whole))


CHECKS = (
    Check(
        number=9,
        slug="junction_temperature",
        title="junction temperature",
        unit="K",
        required=0.2,
        formula="D = rise above ambient: R_th x steady power, more where peaks heat beyond it, C = T_limit - ambient",
        asks=asks,
        worst="hot, high supply",
        by_hand="R_th P, P = I_load V_CE(sat) (of a Darlington V_BE/2 more) or I_load^2 R_on of a driver, else V I at"
        " the moments of the sequences",
        accuracy=0.1,
        leaves_out="heat between the moments",
        words={"brief": "losses between the moments count beyond the lasting one, as a bound"},
    ),
)
