"""A store with one design, a solver that answers at once or when it is let, and ways to wait for screens."""

from __future__ import annotations

import asyncio
import threading
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import pytest
import textual.app
import textual.pilot
from textual._context import active_app
from textual.pilot import Pilot

from stagebook.engine.design.differences import differences
from stagebook.engine.design.document import Design
from stagebook.engine.errors import Cancelled, CircuitError
from stagebook.engine.quantity import read
from stagebook.engine.results import CheckResult, Depth, MarginSheet, Spread
from stagebook.engine.studies.causes import Cause, CausesSheet
from stagebook.engine.studies.explanation import Explanation
from stagebook.storage import Note, Store
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp

from .sheets import check, explanation, verdict_of

STAGES = ("probe", "amplifier", "latch", "timer", "driver", "piezo", "lamp")


def document(name: str = "flood", stages: tuple[str, ...] = STAGES, **values: str) -> dict[str, Any]:
    """A chain of stages, each with two resistors and a capacitor; ``values`` replaces values by reference."""
    made = []
    for at, stage in enumerate(stages, start=1):
        parts = [
            {"ref": f"R{2 * at - 1}", "kind": "resistor", "value": "470k", "tolerance": "5 %"},
            {"ref": f"R{2 * at}", "kind": "resistor", "value": "1k", "tolerance": "5 %"},
            {"ref": f"C{at}", "kind": "capacitor", "value": "220u", "tolerance": "20 %"},
        ]
        pins = {"a": "supply", "b": "0V"}
        made.append(
            {
                "name": stage,
                "kind": "free",
                "roles": {"timing_resistor": f"R{2 * at - 1}"},
                "parts": [{**part, "pins": pins, "value": values.get(part["ref"], part["value"])} for part in parts],
            }
        )
    return {
        "stagebook": 1,
        "name": name,
        "conditions": {
            "supply": {"min": "4 V", "nominal": "6 V", "max": "6.4 V"},
            "ambient": {"min": "0 C", "nominal": "25 C", "max": "50 C"},
        },
        "stages": made,
        "sequences": {"alarm": {"events": [{"at": "0 s", "event": "connect supply"}], "ends": "5 s"}},
    }


def flood(**values: str) -> Design:
    return Design.load(document(**values))


def _margins(design: Design) -> dict[str, tuple[str, float]]:
    """Made up for these tests: a resistor's margin is 1 - 330k/R for the first of a stage, 1 - R/3k for the second."""
    found = {}
    for stage in design.stages:
        for part in stage.parts:
            if part.kind == "resistor" and part.value is not None:
                value = read(part.value, "ohm")
                margin = 1 - 330e3 / value if value > 50e3 else 1 - value / 3e3
                found[f"{'arrival' if value > 50e3 else 'overdrive'}:{stage.name}:{part.ref}"] = (stage.name, margin)
    return found


@dataclass
class Gates:
    """Lets the depths of the study below through; all stand open at first."""

    nominal: threading.Event = field(default_factory=threading.Event)
    corners: threading.Event = field(default_factory=threading.Event)
    spread: threading.Event = field(default_factory=threading.Event)
    causes: threading.Event = field(default_factory=threading.Event)
    explained: threading.Event = field(default_factory=threading.Event)
    refusal: str = ""
    most_lanes: int = 1_000_000
    studied: list[str] = field(default_factory=list)
    cancelled: list[str] = field(default_factory=list)

    def open(self) -> None:
        for gate in (self.nominal, self.corners, self.spread, self.causes, self.explained):
            gate.set()

    def shut(self, *names: str) -> None:
        for name in names:
            getattr(self, name).clear()

    def study(
        self,
        design: Design,
        *,
        lanes: int,
        report: Callable[[MarginSheet], None],
        progress: Callable[[int, int], None],
        cancelled: Callable[[], bool],
    ) -> MarginSheet:
        self.studied.append(design.content)
        if self.refusal:
            raise CircuitError(self.refusal)
        worst = [
            check(name, margin, stage=stage, outcome="never times out" if margin < -1 else None)
            for name, (stage, margin) in _margins(design).items()
        ]
        sheet = MarginSheet(design.name, design.content, "1", 1, 0, 0.1, Depth.CORNERS, tuple(worst))
        self._wait(self.nominal, cancelled, design)
        report(replace(sheet, depth=Depth.NOMINAL, checks=tuple(map(_nominal, worst))))
        self._wait(self.corners, cancelled, design)
        report(sheet)
        self._wait(self.spread, cancelled, design)
        progress(lanes, lanes)
        done = replace(sheet, depth=Depth.SPREAD, lanes=min(lanes, self.most_lanes), checks=tuple(map(_spread, worst)))
        report(done)
        return done

    def causes_of(
        self,
        old: Design,
        new: Design,
        *,
        stored: MarginSheet,
        stored_new: MarginSheet,
        progress: Callable[[int, int], None],
        cancelled: Callable[[], bool],
    ) -> CausesSheet:
        self._wait(self.causes, cancelled, new)
        before, after = _margins(old), _margins(new)
        changed = [change.what for change in differences(old, new)]
        found = []
        for name in (name for name in after if name in before):
            was, now = before[name][1], after[name][1]
            shares = {what: (now - was) * name.endswith(f":{what}") for what in changed}
            found.append(Cause(name, was, now, shares, 0.0, {}, {}, None, None))
        gone = tuple(name for name in before if name not in after)
        come = tuple(name for name in after if name not in before)
        return CausesSheet(new.name, tuple(changed), tuple(found), come, gone, ())

    def explain(self, design: Design, result: CheckResult, *, cancelled: Callable[[], bool]) -> Explanation:
        self._wait(self.explained, cancelled, design)
        if self.refusal:
            raise CircuitError(self.refusal)
        return explanation(result.id, result.margin)

    def _wait(self, gate: threading.Event, cancelled: Callable[[], bool], design: Design) -> None:
        while not gate.wait(0.005):
            if cancelled():
                self.cancelled.append(design.content)
                raise Cancelled("stopped")


def _nominal(worst: CheckResult) -> CheckResult:
    return replace(worst, margin=worst.nominal, verdict=verdict_of(worst.nominal), corner="nominal", outcome=None)


def _spread(worst: CheckResult) -> CheckResult:
    return replace(worst, spread=Spread(0.1, 0.2, 0.3, 0.98, (0.97, 0.99)))


_QUIET_ROUNDS = 12
"""Turns of the event loop without a message anywhere after which a key counts as handled."""


async def _handled(min_sleep: float = 0.0, max_sleep: float = 5.0) -> None:
    """Returns when no message waits in any widget of the app that is driven, and what was to be drawn is drawn.

    Stands in for Textual's own wait, which looks at the processor: it takes 20 ms at least, twice for every key, and
    a whole second while a study runs in another thread.
    """
    app = active_app.get()
    assert isinstance(app, StagebookApp)
    end = time.monotonic() + max_sleep
    quiet = 0
    while quiet < _QUIET_ROUNDS and time.monotonic() < end:
        await asyncio.sleep(0)
        if not app.is_running or not app.screen_stack:
            return
        widgets = [widget for screen in app.screen_stack for widget in screen.walk_children(with_self=True)]
        waits = app.keys_wait or app.message_queue_size or app.screen._compositor.size != app.size
        waits = waits or any(widget.message_queue_size or not widget.is_mounted for widget in widgets)
        quiet = 0 if waits else quiet + 1
        if quiet == _QUIET_ROUNDS // 2 or app.screen._compositor.size != app.size:
            app.screen._on_timer_update()


@pytest.fixture(autouse=True)
def _quick_keys(monkeypatch: pytest.MonkeyPatch) -> None:
    for module in (textual.app, textual.pilot):
        monkeypatch.setattr(module, "wait_for_idle", _handled)


@pytest.fixture
def gates() -> Gates:
    made = Gates()
    made.open()
    return made


@pytest.fixture
def solver(gates: Gates) -> Solver:
    return Solver(
        study=gates.study, causes=gates.causes_of, ready=lambda: True, prepare=nothing, lanes=40, explain=gates.explain
    )


def nothing() -> Any:
    raise AssertionError("a solver that is ready needs no preparing")


@pytest.fixture
def store(tmp_path: Path) -> Iterator[Store]:
    with Store.open(tmp_path / "shelf.sqlite3") as opened:
        yield opened


def corners(gates: Gates, design: Design) -> MarginSheet:
    """The sheet of corners that the solver above gives for a design."""
    found: list[MarginSheet] = []
    gates.study(design, lanes=0, report=found.append, progress=lambda done, total: None, cancelled=lambda: False)
    return next(sheet for sheet in found if sheet.depth is Depth.CORNERS)


@pytest.fixture
def shelf(store: Store, gates: Gates) -> Store:
    """One design with two revisions; the second made the timer's resistor smaller."""
    store.create("flood", flood())
    store.save("flood", Note("first try"), corners(gates, flood()))
    store.edit("flood", "R7 390k", flood(R7="390k"))
    store.save("flood", Note("a quicker timer", prediction="shorter"), corners(gates, flood(R7="390k")))
    return store


@pytest.fixture
def app(shelf: Store, solver: Solver) -> StagebookApp:
    return StagebookApp(shelf, solver)


async def until(pilot: Pilot[None], holds: Callable[[], bool]) -> None:
    """Waits until something holds on the screen; fails after ten seconds."""
    async with asyncio.timeout(10):
        while not holds():
            await pilot.pause(0.005)
    await pilot.pause()


async def settled(pilot: Pilot[None]) -> None:
    """Waits until nothing is computed any more and every message about it has been handled."""
    app = pilot.app
    assert isinstance(app, StagebookApp)
    await pilot.pause()
    await until(pilot, lambda: app.computing.idle)


def shown(pilot: Pilot[None]) -> list[str]:
    """The lines of the screen in front as they are drawn."""
    return [strip.text for strip in pilot.app.screen._compositor.render_strips()]


def seen(pilot: Pilot[None]) -> str:
    """The screen in front as one text."""
    return "\n".join(shown(pilot))
