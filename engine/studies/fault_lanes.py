"""The lanes of one faulted circuit, run through every sequence and judged against the sound unit in the first lane."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from ..checks.fuse import blown_in
from ..checks.view import MAIN, View
from ..kernel.layout import Floats
from ..primitives.signals import START, Anchor, Row, crossing, level, maximum, voltage
from ..quantity import write
from ..run import Observed
from .diagnosis import diagnosed
from .evaluate import observe
from .fault_heat import Heat
from .fault_outcomes import SAID, FaultResult, Outcome
from .faulted import Faulted
from .healthy import CLICK, Behaviour

CLICK_SHARE = 0.02  # a smaller share of the sound unit's alarm is none either
TAIL = 0.2  # share of the time after the sound unit's alarm, at its end, in which none may be on
OTHERWISE = 0.1  # share by which a time differs that is worth a word
DRAINS, LEAST_DRAIN = 2.0, 1e-5  # times the stand-by current of the sound unit; A


@dataclass(frozen=True)
class _Spell:
    """A load from coming on to going off. Off counts after the chatter of contacts, unless it is off by then."""

    on: Row
    off: Row
    first_off: Row
    settled: Row

    @classmethod
    def of(cls, on: Row, chatter: float) -> _Spell:
        """The spell that begins with a crossing."""
        after, at_once = Anchor(chatter, on), Anchor(0.0, on)
        off, first = (crossing(on.signal, on.level, False, start) for start in (after, at_once))
        return cls(on, off, first, level(on.signal, after))

    @property
    def rows(self) -> tuple[Row, ...]:
        """What is to be observed."""
        return self.on, self.off, self.first_off, self.settled

    def times(self, seen: Observed, lane: int) -> tuple[float | None, float | None]:
        """When it came on and off in a lane, in s; None where it did not."""
        over = self.off if float(seen.value(self.settled)[lane]) > self.on.level else self.first_off
        return _number(seen.time(self.on), lane), _number(seen.time(over), lane)

    def lasts(self, seen: Observed, lane: int, ends: float) -> float:
        """How long it is on; to the end of the sequence where it does not go off, 0 where it does not come on."""
        on, off = self.times(seen, lane)
        return 0.0 if on is None else (ends if off is None else off) - on


@dataclass(frozen=True)
class _LoadRows:
    """What is watched at one load in one sequence: before its cause, after it, and at the end."""

    healthy: Behaviour
    early: _Spell
    alarm: _Spell
    largest: Row
    tail: Row | None

    @property
    def rows(self) -> tuple[Row, ...]:
        """All of them."""
        return (*self.early.rows, *self.alarm.rows, self.largest, *(() if self.tail is None else (self.tail,)))

    @classmethod
    def of(cls, healthy: Behaviour, view: View) -> _LoadRows:
        """The rows at the load's own pins, which a gap may part from its nets."""
        on = view.bench(healthy.load).on
        assert on is not None
        across = voltage(on[0], on[1])
        after = Anchor(0.0 if healthy.cause is None else healthy.cause)
        early = crossing(across, healthy.level, True, START, Anchor(healthy.ends) if healthy.cause is None else after)
        alarm = crossing(across, healthy.level, True, after)
        tail = None
        if healthy.over is not None:
            tail = maximum(across, Anchor(healthy.ends - TAIL * (healthy.ends - healthy.over)))
        before, due = _Spell.of(early, view.chatter), _Spell.of(alarm, view.chatter)
        return cls(healthy, before, due, maximum(across, after), tail)


class FaultLanes:
    """A faulted circuit that was run. ``progress`` counts faults while it is."""

    def __init__(
        self,
        made: Faulted,
        healthy: Sequence[Behaviour],
        progress: Callable[[int], None],
        cancelled: Callable[[], bool],
    ) -> None:
        """Runs all lanes through every sequence. Raises Cancelled."""
        self._made = made
        view = View(made.circuit.design, made.circuit)
        self._loads = [_LoadRows.of(each, view) for each in healthy]
        self._observed: dict[str, Observed] = {}
        self._failures: dict[tuple[str, int], str | None] = {}
        current, moment = view.supply_current, view.moment(MAIN, "standby")
        self._draw = None if current is None or moment is None else level(current, moment)
        heat = Heat(view)
        sequences = list(dict.fromkeys(each.sequence for each in healthy))
        for k, sequence in enumerate(sequences):
            loads = [load for load in self._loads if load.healthy.sequence == sequence]
            instants = [t for load in loads for t in (load.healthy.on, load.healthy.over) if t is not None]
            rows = [row for load in loads for row in load.rows] + heat.rows(sequence, instants)
            if sequence == MAIN and self._draw is not None:
                rows.append(self._draw)

            def portion(done: int, total: int, k: int = k) -> None:
                progress(int((k * total + done) * len(made.faults) / (total * len(sequences))))

            self._observed[sequence] = observe(made.circuit, made.lanes, sequence, rows, portion, cancelled)
        self._blown = [
            list(dict.fromkeys(ref for run in gone for ref, lanes in run.items() if lanes[lane] and not lanes[0]))
            for gone in [[blown_in(each) for each in self._observed.values()]]
            for lane in range(made.lanes.count)
        ]
        self._heat = heat.shares(self._observed, float(made.lanes.ambient[0]))

    def standby(self, lane: int = 0) -> float | None:
        """Supply current at the moment ``standby`` in A; None where it cannot be seen."""
        return None if self._draw is None else _number(self._observed[MAIN].value(self._draw), lane)

    def results(self) -> list[FaultResult]:
        """What comes of each fault."""
        return [self._result(lane) for lane in range(1, self._made.lanes.count)]

    def _result(self, lane: int) -> FaultResult:
        fault = self._made.faults[lane - 1]
        seen = [(*self._of_load(load, lane), load) for load in self._loads]
        outcome, words, load = min(seen, key=lambda each: each[0])
        ranked = sorted(self._heat, key=lambda ref: -self._heat[ref][lane])
        hot = tuple(ref for ref in ranked if self._heat[ref][lane] > 1.0 >= self._heat[ref][0])
        said = [words]
        if len({each.healthy.load for each in self._loads}) > 1 and outcome is not Outcome.STILL_ALARMS:
            said = [f"{words} ({load.healthy.load})"]
        if outcome is Outcome.STILL_ALARMS and hot:
            outcome, said = Outcome.OVERHEATS, []
        if hot:
            said.append(f"overheats {', '.join(hot)}")
        if self._blown[lane]:
            said.append(f"blows {', '.join(self._blown[lane])}")
        beside = {each: its for each, its, _ in seen if each in (Outcome.RUNS_ON, Outcome.FALSE_ALARM)}
        said += [its for each, its in sorted(beside.items()) if SAID[each] not in words]
        detail = [self._otherwise(load, lane)] if outcome in (Outcome.STILL_ALARMS, Outcome.OVERHEATS) else []
        detail.append(self._oscillates(load.healthy.sequence, lane))
        detail += [f"{ref} at {self._heat[ref][lane]:.1f} times its power" for ref in hot[:2]]
        standby, usual = self.standby(lane), self.standby()
        drains = standby is not None and usual is not None and standby > max(DRAINS * usual, LEAST_DRAIN)
        if drains and standby is not None and usual is not None:
            detail.append(f"draws {_amperes(standby)} in stand-by instead of {_amperes(usual)}")
        on, off = load.alarm.times(self._observed[load.healthy.sequence], lane)
        return FaultResult(
            stage=fault.stage,
            part=fault.part,
            fault=fault.words,
            outcome=outcome,
            words="; ".join(said),
            detail=", ".join(filter(None, detail)),
            load=load.healthy.load,
            sequence=load.healthy.sequence,
            overheats=hot,
            on=on,
            off=off,
            standby=standby,
            drains=drains,
        )

    def _of_load(self, load: _LoadRows, lane: int) -> tuple[Outcome, str]:
        healthy, watched = load.healthy, self._observed[load.healthy.sequence]
        failure = self._failure(healthy.sequence, lane)
        if failure is not None:
            return Outcome.UNKNOWN, f"{SAID[Outcome.UNKNOWN]}: {failure}"
        click = min(CLICK, CLICK_SHARE * healthy.lasts) if healthy.alarms else CLICK
        early = load.early.lasts(watched, lane, healthy.ends) > click
        # What has been on since before its cause counts as an alarm, though it does not come on again.
        held = early and float(watched.value(load.largest)[lane]) > healthy.level
        alarms = held or load.alarm.lasts(watched, lane, healthy.ends) > click
        where = "" if healthy.sequence == MAIN else f" in sequence {healthy.sequence}"
        if healthy.alarms and not alarms:
            return Outcome.SILENT, SAID[Outcome.SILENT] + where + (", but once before" if early else "")
        if healthy.alarms and load.tail is not None and float(watched.value(load.tail)[lane]) > healthy.level:
            also = f"; {SAID[Outcome.FALSE_ALARM]}" if early else ""
            return Outcome.RUNS_ON, SAID[Outcome.RUNS_ON] + where + also
        if early:
            return Outcome.FALSE_ALARM, SAID[Outcome.FALSE_ALARM] + where
        return Outcome.STILL_ALARMS, SAID[Outcome.STILL_ALARMS]

    def _failure(self, sequence: str, lane: int) -> str | None:
        """Why a lane ended early, without advice: that is for the sequence of a design, not for a fault."""
        if (sequence, lane) not in self._failures:
            words = diagnosed(self._observed[sequence], self._made.lanes, sequence, lane)
            self._failures[sequence, lane] = None if words is None else words.split(";")[0]
        return self._failures[sequence, lane]

    def _oscillates(self, sequence: str, lane: int) -> str:
        """Where and how fast a lane oscillates that was carried forward, as the unit without a fault does not."""
        watched = self._observed[sequence]
        words = None if watched.carried_forward(0) else watched.carried_forward(lane)
        return "" if words is None else words.split(";")[0]

    def _otherwise(self, load: _LoadRows, lane: int) -> str:
        """What differs of an alarm that still comes: how late, how long."""
        healthy, watched = load.healthy, self._observed[load.healthy.sequence]
        if healthy.cause is None:
            return ""
        said = []
        now, usual = (float(watched.time(load.alarm.on)[n]) - healthy.cause for n in (lane, 0))
        if np.isfinite(now) and abs(now - usual) > max(OTHERWISE * abs(usual), CLICK):
            said.append(f"{_seconds(now)} after its cause instead of {_seconds(usual)}")
        lasts, usually = (load.alarm.lasts(watched, n, healthy.ends) for n in (lane, 0))
        if np.isfinite(now) and abs(lasts - usually) > OTHERWISE * usually:
            said.append(f"for {_seconds(lasts)} instead of {_seconds(usually)}")
        return ", ".join(said)


def _number(values: Floats, lane: int) -> float | None:
    return float(values[lane]) if np.isfinite(values[lane]) else None


def _seconds(value: float) -> str:
    return write(float(f"{value:.3g}"), "s") if value > 0.0 else "0 s"


def _amperes(value: float) -> str:
    return write(float(f"{max(value, 0.0):.2g}"), "A")
