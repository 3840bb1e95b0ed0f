"""Speed against SUNDIALS IDA: same equations, same run, equal accuracy of the timed interval.

``python -m pytest -m benchmark -s tests/peers`` prints every figure as ``figure: NAME = VALUE UNIT``. Times are those
of the processor, so that a busy machine changes little; elapsed times stand beside them as ``NAME_elapsed``. Engine and
peer take turns, and the least of some repetitions counts. Two cores: the blocks of lanes are timed in their threads,
and the time is what is not divided among threads plus half of what is, as on a machine that has nothing else to do.

IDA takes a residual and a Jacobian compiled by numba, called through Python; how much of its time these calls are is a
figure too. Its tolerance is the loosest, of half decades, at which its largest error of the interval over eight random
units is not above the engine's; the engine runs at its own tolerance.
"""

from __future__ import annotations

import json
import os
import resource
import subprocess
import sys
import threading
import time
from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
import pytest

pytest.importorskip("sksundae", reason="the peer SUNDIALS comes with scikit-sundae")

from stagebook.engine import run as engine_run
from stagebook.engine.design.document import Design
from stagebook.engine.primitives.columns import Lanes
from stagebook.engine.run import Observed, run

from ..engine.circuits import Setup, capacitor
from . import network as equations
from .lanes import lanes_of, network_of, spread_out
from .solvers import ida
from .units import CONNECT, Unit, latch_alarm, latch_parts

pytestmark = pytest.mark.benchmark
ACCURACY_UNITS, REPETITIONS, SAMPLE = 8, 5, 40
BARS = {  # of the project: at least, at most
    "nominal_vs_ida": (10.0, None),
    "lanes1000_two_cores_vs_ida_loop": (25.0, None),
    "lanes1000_seconds": (None, 2.0),
    "warm_start_seconds": (None, 1.2),
    "memory_100k_lanes_mb": (None, 500.0),
    "growth_nets_per_iteration": (None, 1.0),
    "compile_seconds": (None, 20.0),
}
FIGURES: dict[str, float] = {}
RISING = (100, 1000, 10_000, 100_000)


def figure(name: str, value: float, unit: str = "1") -> None:
    FIGURES[name] = value
    print(f"\nfigure: {name} = {value:.4g} {unit}", end="", flush=True)


@dataclass
class Clock:
    """Seconds of the processor and elapsed; those of blocks of lanes, whatever thread they ran in."""

    processor: float = 0.0
    elapsed: float = 0.0
    blocks: float = 0.0
    result: Any = None

    def on_cores(self, cores: int) -> float:
        """Seconds on so many cores that have nothing else to do."""
        return self.processor - self.blocks + self.blocks / cores


def timed(work: Callable[[], Any]) -> Clock:
    clock, lock, march = Clock(), threading.Lock(), engine_run.march

    def watched(*arguments: Any, **options: Any) -> None:
        begin = time.thread_time()
        march(*arguments, **options)
        with lock:
            clock.blocks += time.thread_time() - begin

    engine_run.march = watched
    try:
        processor, elapsed = time.process_time(), time.perf_counter()
        clock.result = work()
        clock.processor, clock.elapsed = time.process_time() - processor, time.perf_counter() - elapsed
    finally:
        engine_run.march = march
    return clock


@pytest.fixture(scope="module")
def unit() -> Unit:
    made = latch_alarm()
    topology = made.setup.circuit.topology
    kinds = [part.kind for part in made.setup.design.parts]
    assert int(topology.size[0]) == 17
    assert (kinds.count("npn") + kinds.count("pnp"), kinds.count("diode")) == (5, 3)
    return made


def engine(unit: Unit, lanes: Lanes, threads: int = 1, relative: float = engine_run.RELATIVE) -> Observed:
    program = unit.setup.program(lanes)
    return run(unit.setup.circuit, lanes, program, unit.rows, threads=threads, relative=relative)


def intervals(unit: Unit, seen: Observed) -> np.ndarray:
    begin, end = (seen.value(row) for row in unit.rows)
    return end - begin


@pytest.fixture(scope="module")
def tolerance(unit: Unit) -> float:
    """The relative tolerance of IDA at which it is as accurate as the engine; its absolute one is a tenth of that."""
    lanes = lanes_of(unit, ACCURACY_UNITS)
    networks = [network_of(unit.document, lanes, k) for k in range(ACCURACY_UNITS)]
    exact = np.array([unit.interval(ida(each, unit.watches, 1e-8, 1e-9)) for each in networks])
    own = float(np.max(np.abs(intervals(unit, engine(unit, lanes)) / exact - 1)))
    figure("interval_error", own)
    for relative in 10.0 ** np.arange(-3.0, -7.0, -0.5):
        try:
            found = np.array([unit.interval(ida(each, unit.watches, relative, 0.1 * relative)) for each in networks])
        except (AssertionError, IndexError):
            continue  # it stopped early, or missed the alarm
        error = float(np.max(np.abs(found / exact - 1)))
        if error <= own:
            figure("ida_interval_error", error)
            figure("ida_relative_tolerance", float(relative))
            return float(relative)
    raise AssertionError("IDA is nowhere as accurate")


def test_one_lane_and_a_thousand_against_ida(unit: Unit, tolerance: float) -> None:
    document, nominal, many = unit.document, unit.setup.lanes(), lanes_of(unit, 1000)
    alone = network_of(document, nominal, 0)
    sample = [network_of(document, many, int(k)) for k in spread_out(1000, SAMPLE)]

    def peer(networks: list[Any]) -> Callable[[], Any]:
        return lambda: [ida(each, unit.watches, tolerance, 0.1 * tolerance) for each in networks]

    engine(unit, nominal)
    peer([alone])()
    ours, theirs, one_core, two_cores, loop = [], [], [], [], []
    for _ in range(REPETITIONS):
        ours.append(timed(lambda: [engine(unit, nominal) for _ in range(10)]))
        theirs.append(timed(peer([alone])))
        one_core.append(timed(lambda: engine(unit, many, 1)))
        loop.append(timed(peer(sample)))
        two_cores.append(timed(lambda: engine(unit, many, 2)))
    hundred = [timed(lambda: engine(unit, many.take(range(100)), 2)) for _ in range(REPETITIONS)]

    def least(clocks: list[Clock], cores: int = 1) -> float:
        return min(clock.on_cores(cores) for clock in clocks)

    def elapsed(clocks: list[Clock]) -> float:
        return min(clock.elapsed for clock in clocks)

    share = 1000 / SAMPLE
    figure("nominal_seconds", least(ours) / 10, "s")
    figure("nominal_kernel_seconds", min(clock.blocks for clock in ours) / 10, "s")
    figure("ida_seconds", least(theirs), "s")
    figure("nominal_vs_ida", least(theirs) / (least(ours) / 10))
    figure("nominal_vs_ida_elapsed", elapsed(theirs) / (elapsed(ours) / 10))
    figure("lanes1000_one_core_seconds", least(one_core), "s")
    figure("lanes1000_one_core_vs_ida_loop", share * least(loop) / least(one_core))
    figure("lanes1000_one_core_vs_ida_loop_elapsed", share * elapsed(loop) / elapsed(one_core))
    figure("lanes1000_two_cores_vs_ida_loop", share * least(loop) / least(two_cores, 2))
    figure("lanes1000_two_cores_vs_ida_loop_elapsed", share * elapsed(loop) / elapsed(two_cores))
    figure("lanes1000_seconds", least(two_cores, 2), "s")
    figure("lanes1000_seconds_elapsed", elapsed(two_cores), "s")
    figure("lanes100_seconds", least(hundred, 2), "s")
    figure("lanes100_seconds_elapsed", elapsed(hundred), "s")


def test_how_much_of_ida_is_calling_python(unit: Unit, tolerance: float, monkeypatch: pytest.MonkeyPatch) -> None:
    network = network_of(unit.document, unit.setup.lanes(), 0)
    calls = {"residual": 0, "jacobian": 0}
    for name in calls:
        plain = getattr(equations, name)

        def counted(*arguments: Any, name: str = name, plain: Any = plain) -> None:
            calls[name] += 1
            plain(*arguments)

        monkeypatch.setattr(f"{ida.__module__}.{name}", counted)
    ida(network, unit.watches, tolerance, 0.1 * tolerance)
    monkeypatch.undo()
    whole = min(timed(lambda: ida(network, unit.watches, tolerance, 0.1 * tolerance)).processor for _ in range(3))
    y, out = np.zeros(len(network.names)), np.zeros(len(network.names))
    y.flags.writeable = False
    nothing = np.zeros((0, 5), dtype=np.int64)  # no element: what remains is the call
    begin = time.process_time()
    for _ in range(10_000):
        equations.residual(0.0, y, y, out, nothing, network.p)
    each = (time.process_time() - begin) / 10_000
    figure("ida_calls", sum(calls.values()))
    figure("ida_share_of_calling", sum(calls.values()) * each / whole)


def chain(copies: int) -> Setup:
    """As many latch alarms side by side on one supply: 17 nets each but for the supply that they share."""
    marks = ["", *(f"x{k}" for k in range(1, copies))]
    stages = []
    for mark in marks:
        parts = latch_parts(mark) if mark else [*latch_parts(), capacitor("C9", "supply", "0V", "100n")]
        stages.append({"name": f"alarm{mark}", "parts": parts, "roles": {"timing_capacitor": f"C7{mark}"}})
    sequence = {"ends": "110 s", "events": [CONNECT]}
    conditions = {"ambient": "25 C", "leakage": ["specified"], "supply": "6 V", "source_resistance": "2R"}
    return Setup(
        Design.load(
            {
                "stagebook": 1,
                "name": "row",
                "conditions": conditions,
                "stages": stages,
                "sequences": {"alarm": sequence},
            }
        )
    )


def test_time_per_iteration_of_larger_circuits() -> None:
    chains = [chain(copies) for copies in (1, 2, 4)]
    work: list[list[float]] = [[] for _ in chains]
    # In turn, so that an hour in which the machine is slow is one for all.
    for repetition in range(2 * REPETITIONS + 1):
        for made, seconds in zip(chains, work, strict=True):
            lanes = made.lanes(count=32)
            program = made.program(lanes)
            clock = timed(partial(run, made.circuit, lanes, program, (), threads=1))
            assert not clock.result.failed.any()
            if repetition:
                seconds.append(clock.blocks / int(clock.result.results.work[:, 2].sum()))
    nets = [int(made.circuit.topology.size[0]) for made in chains]
    least = [min(seconds) for seconds in work]
    for count, seconds in zip(nets, least, strict=True):
        figure(f"iteration_of_{count}_nets", 1e6 * seconds, "us")
    figure("growth_nets_per_iteration", float(np.polyfit(np.log(nets), np.log(least), 1)[0]))


CHILD = """
import json, resource, sys, time
from stagebook.tui.solver_cache import ready
assert ready()
from stagebook.engine.circuit.circuit import build
from stagebook.engine.design.document import Design
from stagebook.engine.run import run
from stagebook.engine.studies.lanes import random_lanes
from stagebook.engine.studies.sequences import program_of
from stagebook.engine.studies.spread import PORTION
circuit = build(Design.load(json.load(sys.stdin)))
ends, count = float(sys.argv[1]), int(sys.argv[2])
lanes = circuit.nominal() if count == 1 else random_lanes(circuit.columns, count, 1)
if count > 1:  # the compiled solver is loaded before the clock runs
    run(circuit, circuit.nominal(), program_of(circuit, circuit.nominal(), "alarm")[0].program(1e-6), ())
begin = time.process_time()
for low in range(0, count, PORTION):
    portion = lanes.take(range(low, min(low + PORTION, count)))
    seen = run(circuit, portion, program_of(circuit, portion, "alarm")[0].program(ends), ())
    assert not seen.failed.any()
taken, megabytes = time.process_time() - begin, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
try:  # the figure above begins with what the parent had when it started this process
    said = next(line for line in open("/proc/self/status") if line.startswith("VmHWM"))
    megabytes = int(said.split()[1]) / 1024
except OSError:
    pass
print(taken, megabytes)
"""


def child(code: str, *arguments: str, given: str = "", **environment: str) -> tuple[str, float, float]:
    """Output, seconds of the processor and elapsed of a fresh interpreter that reads ``given``."""
    variables = {**os.environ, **environment}
    variables.pop("PYTHONDONTWRITEBYTECODE", None)  # an installed program does not compile its sources each time
    if "XDG_CACHE_HOME" in environment:
        variables.pop("NUMBA_CACHE_DIR", None)
    before, begin = resource.getrusage(resource.RUSAGE_CHILDREN), time.perf_counter()
    command = [sys.executable, "-c", code, *arguments]
    done = subprocess.run(command, env=variables, input=given, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr[-2000:]
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    processor = after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime
    return done.stdout, processor, time.perf_counter() - begin


def test_from_a_fresh_process_to_the_first_result(unit: Unit, tmp_path: Path) -> None:
    document, fresh = json.dumps(unit.document), {"XDG_CACHE_HOME": str(tmp_path)}
    _, compiling, elapsed = child("from stagebook.tui.solver_cache import prepare_here; prepare_here()", **fresh)
    figure("compile_seconds", compiling, "s")
    figure("compile_seconds_elapsed", elapsed, "s")
    starts = [child(CHILD, "110", "1", given=document, **fresh)[1:] for _ in range(REPETITIONS)]
    figure("warm_start_seconds", min(processor for processor, _ in starts), "s")
    figure("warm_start_seconds_elapsed", min(elapsed for _, elapsed in starts), "s")


def test_time_and_memory_of_a_hundred_thousand_lanes(unit: Unit) -> None:
    # In portions, as the spread of a study takes them.
    document, seconds, megabytes = json.dumps(unit.document), [], 0.0
    for count in RISING:
        out, _, _ = child(CHILD, "110", str(count), given=document)
        taken, megabytes = map(float, out.split())
        seconds.append(taken)
        figure(f"processor_seconds_of_{count}_lanes", taken, "s")
    figure("growth_lanes", float(np.polyfit(np.log(RISING), np.log(seconds), 1)[0]))
    figure("memory_100k_lanes_mb", megabytes, "MB")


@pytest.mark.parametrize("name", BARS)
def test_bars(name: str) -> None:
    if name not in FIGURES:
        pytest.skip("its figure was not measured in this run")
    low, high = BARS[name]
    assert low is None or FIGURES[name] >= low
    assert high is None or FIGURES[name] <= high
