"""The screen of waves: what the cursor reads, the window of time, the nets, and that leaving stops the run.

What is expected is this project's own description of the screen; the run is a made-up one.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from textual.pilot import Pilot

from stagebook.engine import edit
from stagebook.engine.design.document import Design
from stagebook.engine.errors import Cancelled, CircuitError
from stagebook.engine.quantity import read
from stagebook.engine.studies.waves import Waves
from stagebook.storage import Store
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.waves import WavesScreen
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp
from stagebook.tui.widgets.status import Notice

from .conftest import flood, seen, settled, shown, until

SIZE = (80, 24)


class Runs:
    """A run in which every net rises evenly from 0 V to 6 V."""

    def __init__(self) -> None:
        self.held = False
        self.cancelled = False
        self.refusal = ""

    def __call__(self, design: Design, sequence: str, *, cancelled: Callable[[], bool]) -> Waves:
        while self.held:
            if cancelled():
                self.cancelled = True
                raise Cancelled("stopped")
        if self.refusal:
            raise CircuitError(self.refusal)
        ends = read(design.sequences[sequence].ends, "s")
        nets = tuple(net for net in design.nets if net != "0V")
        return Waves(np.array([0.0, ends]), nets, np.array([[0.0] * len(nets), [6.0] * len(nets)]))


@pytest.fixture
def runs() -> Runs:
    return Runs()


@pytest.fixture
def with_waves(shelf: Store, solver: Solver, runs: Runs) -> StagebookApp:
    design = flood(R7="390k")
    for ref, a, b in (("R90", "supply", "half"), ("R91", "half", "0V")):
        part = {"ref": ref, "kind": "resistor", "pins": {"a": a, "b": b}, "value": "1k"}
        design = edit.with_part(design, design.stages[0].name, part)
    shelf.edit("flood", "a divider", design)
    return StagebookApp(shelf, replace(solver, waves=runs))


async def open_waves(pilot: Pilot[None]) -> None:
    await settled(pilot)
    await pilot.press("enter")
    await settled(pilot)
    await pilot.press("v")
    await until(pilot, lambda: isinstance(pilot.app.screen, WavesScreen))


async def test_the_cursor_reads_moment_and_voltage(with_waves: StagebookApp) -> None:
    async with with_waves.run_test(size=SIZE) as pilot:
        await open_waves(pilot)
        await settled(pilot)
        await pilot.press("l", "home")
        first = shown(pilot)[1:3]
        await pilot.press("end")
        last = shown(pilot)[1:3]
        # 66 columns: the middle of the last one lies half a column before the end.
        volts = 6.0 * 65.5 / 66
        assert f"{volts:.3f} V" in last[1]
        assert first != last
        assert first[0].startswith(" at ")
        await pilot.press("left", "right")
        assert shown(pilot)[1:3] == last


async def test_closer_and_whole_keep_the_moment(with_waves: StagebookApp) -> None:
    async with with_waves.run_test(size=SIZE) as pilot:
        await open_waves(pilot)
        await settled(pilot)
        await pilot.press("l", "pagedown", "pagedown", "pagedown")
        screen = pilot.app.screen
        assert isinstance(screen, WavesScreen)
        before = screen.moment
        await pilot.press("plus")
        width = screen.window[1] - screen.window[0]
        assert screen.moment == pytest.approx(before, abs=width / 60)
        await pilot.press("0")
        assert screen.window[1] - screen.window[0] == pytest.approx(4.0 * width)


async def test_nets_are_marked_and_drawn(with_waves: StagebookApp) -> None:
    async with with_waves.run_test(size=SIZE) as pilot:
        await open_waves(pilot)
        await settled(pilot)
        screen = pilot.app.screen
        assert isinstance(screen, WavesScreen)
        assert screen.nets == ("supply", "half")
        await pilot.press("n")
        await pilot.pause()
        await pilot.press("home", "space", "enter")
        await pilot.pause()
        assert screen.nets == ("half",)
        await pilot.press("n")
        await pilot.pause()
        await pilot.press("home", "space", "enter")
        await pilot.pause()
        assert screen.nets == ("half", "supply")
        assert shown(pilot)[2].split()[0::3] == ["half", "supply"]


async def test_ascii_shows_no_dots(with_waves: StagebookApp) -> None:
    async with with_waves.run_test(size=SIZE) as pilot:
        await open_waves(pilot)
        await settled(pilot)
        if any(ord(c) > 0x2800 for c in seen(pilot)):
            await pilot.press("a")
        assert not any(ord(c) > 0x7F for c in "".join(shown(pilot)[4:-2]))
        await pilot.press("a")
        assert any(0x2800 < ord(c) < 0x2900 for c in seen(pilot))


async def test_leaving_stops_the_run_and_a_refusal_is_said(with_waves: StagebookApp, runs: Runs) -> None:
    async with with_waves.run_test(size=SIZE) as pilot:
        runs.held = True
        await open_waves(pilot)
        assert "being computed" in shown(pilot)[0]
        assert "being computed; this fills by itself" in shown(pilot)[1]
        await pilot.press("b")
        await until(pilot, lambda: runs.cancelled)
        assert isinstance(pilot.app.screen, BenchScreen)
        runs.held, runs.refusal = False, "net 'x' has no path"
        await pilot.press("v")
        await settled(pilot)
        assert "net 'x' has no path" in pilot.app.screen.query_one(Notice).text


@pytest.mark.parametrize("size", [(120, 40), (20, 5)])
async def test_it_stands_any_size(with_waves: StagebookApp, size: tuple[int, int]) -> None:
    async with with_waves.run_test(size=size) as pilot:
        await open_waves(pilot)
        await settled(pilot)
        await pilot.press("right", "plus", "minus", "e")
        assert len(shown(pilot)) == size[1]
