"""Lanes: each is the same to the bit alone and in company, on any number of threads; runs report and can be stopped."""

from __future__ import annotations

import threading
from dataclasses import fields

import numpy as np
import pytest

from stagebook.engine import run as running
from stagebook.engine.circuit.timeline import Timeline
from stagebook.engine.errors import Cancelled
from stagebook.engine.kernel.layout import Results
from stagebook.engine.kernel.march import march
from stagebook.engine.kernel.work import GOES_ON, PAUSE, Work
from stagebook.engine.primitives.columns import Lanes
from stagebook.engine.primitives.signals import Anchor, Row, crossing, integral, level, maximum, voltage
from stagebook.engine.run import BLOCK, Observed, run

from .circuits import Setup, capacitor, resistor, setup, transistor, two

COUNT = 4 * BLOCK + 5


@pytest.fixture(scope="module")
def circuit() -> Setup:
    """A latch that a contact fires, with a timer behind it: junctions, charges, events, a bistable."""
    return setup(
        two("contact", "S1", "supply", "go"),
        resistor("R1", "go", "bn", "100k"),
        resistor("R2", "go", "0V", "1M"),
        transistor("Q1", "on", "bp", "supply", "pnp", **{"class": "small pnp"}),
        transistor("Q2", "bp", "bn", "0V", **{"class": "small npn"}),
        resistor("R3", "supply", "bp", "100k"),
        resistor("R4", "on", "bn", "100k"),
        resistor("R5", "bn", "0V", "22k"),
        resistor("R6", "on", "0V", "10k"),
        resistor("R7", "on", "t", "1M"),
        capacitor("C1", "t", "0V", "1 uF"),
        capacitor("C2", "bn", "0V", "1 nF"),
        supply={"min": "4 V", "nominal": "6 V", "max": "9 V"},
        source="0R5",
        events=[
            {"at": "0 s", "event": "connect supply", "rise": "1 ms"},
            {"at": "1 s", "event": "close", "part": "S1", "bounce": {"for": "2 ms", "times": 2}},
            {"at": "1.5 s", "event": "open", "part": "S1"},
        ],
        ends=3.0,
        roles={"timing_capacitor": "C1"},
    )


@pytest.fixture(scope="module")
def rows() -> list[Row]:
    fires = crossing(voltage("on"), 2.0, True)
    return [
        crossing(voltage("t"), 2.0, True, Anchor(0.0, fires)),
        level(voltage("on"), Anchor(2.9)),
        maximum(voltage("bn")),
        integral(voltage("t"), Anchor(0.0, fires)),
    ]


@pytest.fixture(scope="module")
def lanes(circuit: Setup) -> Lanes:
    """Random values within the limits of every column, among them lanes that do not fire."""
    rng = np.random.default_rng(20261201)
    nominal = circuit.circuit.nominal(COUNT)
    low, high = (np.array([[getattr(c, end)] for c in nominal.columns]) for end in ("low", "high"))
    values = low + (high - low) * rng.uniform(size=nominal.values.shape)
    return Lanes(nominal.columns, values).replaced({("R5", "value"): 10.0 ** rng.uniform(3, 5, COUNT)})


def observe(circuit: Setup, rows: list[Row], lanes: Lanes, **options: object) -> Observed:
    return run(circuit.circuit, lanes, circuit.program(lanes), rows, **options)


def bits(seen: Observed, lanes: slice = slice(None)) -> list[bytes]:
    named = ("value", "time", "status", "ended", "ended_at", "work", "final")
    return [np.ascontiguousarray(getattr(seen.results, name)[lanes]).tobytes() for name in named]


@pytest.mark.parametrize("threads", [1, 2, 3, 8, None])
def test_results_do_not_depend_on_the_number_of_threads(
    circuit: Setup, rows: list[Row], lanes: Lanes, threads: int | None
) -> None:
    one = observe(circuit, rows, lanes, threads=1)
    assert bits(observe(circuit, rows, lanes, threads=threads)) == bits(one)
    fired = one.seen(rows[0])
    assert np.any(fired)
    assert not np.all(fired)


def test_a_lane_alone_is_the_lane_in_a_block(circuit: Setup, rows: list[Row], lanes: Lanes) -> None:
    block = observe(circuit, rows, lanes)
    for lane in (0, 3, BLOCK - 1, BLOCK, COUNT - 1):
        alone = observe(circuit, rows, lanes.take([lane]))
        assert bits(alone) == bits(block, slice(lane, lane + 1))


def test_lanes_with_times_of_their_own_are_the_same_alone(circuit: Setup, rows: list[Row], lanes: Lanes) -> None:
    def started(some: Lanes, index: np.ndarray) -> Observed:
        line = Timeline(circuit.circuit, some)
        line.connect_supply(0.1 * (1 + index % 5), 1e-3 * (1 + index % 3))
        line.set_part("S1", 1.0 + 0.01 * index, "closed")
        return run(circuit.circuit, some, line.program(2.0 + 0.1 * index), rows)

    together = started(lanes, np.arange(COUNT, dtype=float))
    for lane in (0, 7, COUNT - 1):
        alone = started(lanes.take([lane]), np.array([float(lane)]))
        assert bits(alone) == bits(together, slice(lane, lane + 1))


def test_the_order_of_lanes_means_nothing(circuit: Setup, rows: list[Row], lanes: Lanes) -> None:
    forward = observe(circuit, rows, lanes)
    backward = observe(circuit, rows, lanes.take(range(COUNT - 1, -1, -1)))
    assert backward.results.final[::-1].tobytes() == forward.results.final.tobytes()


def test_the_same_run_twice_is_the_same(circuit: Setup, rows: list[Row], lanes: Lanes) -> None:
    assert bits(observe(circuit, rows, lanes)) == bits(observe(circuit, rows, lanes))


def test_what_another_run_left_behind_does_not_matter(circuit: Setup, rows: list[Row], lanes: Lanes) -> None:
    # A thread works in the same arrays again.
    first = bits(observe(circuit, rows, lanes, threads=1))
    observe(circuit, rows, lanes.take(range(lanes.count - 1, 0, -1)), threads=1, relative=1e-2)
    observe(circuit, rows, lanes, threads=1, stop=rows[0])
    assert bits(observe(circuit, rows, lanes, threads=1)) == first


def test_rows_do_not_disturb_the_run(circuit: Setup, rows: list[Row], lanes: Lanes) -> None:
    few = lanes.take([0, 1, 2])
    assert observe(circuit, rows, few).final.tobytes() == observe(circuit, [], few).final.tobytes()


def test_tracing_does_not_disturb_the_run(circuit: Setup, rows: list[Row], lanes: Lanes) -> None:
    one = lanes.take([0])
    traced = observe(circuit, rows, one, trace=20_000)
    assert bits(traced) == bits(observe(circuit, rows, one))
    used = int(traced.results.trace_used[0])
    times = traced.results.trace_time[0, :used]
    assert times[0] == 0.0
    assert times[-1] == pytest.approx(3.0, rel=1e-12)
    assert np.all(np.diff(times) >= 0.0)
    assert traced.results.trace_value[0, used - 1].tobytes() == traced.final[0].tobytes()


@pytest.mark.parametrize("piece", [3, 20])
def test_a_lane_in_pieces_is_the_lane_in_one_go(
    circuit: Setup, rows: list[Row], lanes: Lanes, piece: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Lanes that pause wait for each other, whatever steps they have taken, and go on as if nothing had been."""
    some = lanes.take(range(30))
    whole = observe(circuit, rows, some)
    pauses = []

    def go_on(work: Work, columns: list[int], results: Results) -> Results:
        for w in columns:
            pauses.append(int(work.columns.lane[w]))
            work.columns.phase[w] = GOES_ON
            work.columns.clock[PAUSE, w] += piece
        return results

    monkeypatch.setattr(running, "LINGERS", piece)
    monkeypatch.setattr(running, "march", lambda *arguments, **_: march(*arguments, go_on))
    assert bits(observe(circuit, rows, some)) == bits(whole)
    assert len(set(pauses)) == 30
    assert len(pauses) > 30 * 20 / piece


def test_a_trace_that_is_too_short_says_so(circuit: Setup, lanes: Lanes) -> None:
    seen = observe(circuit, [], lanes.take([0]), trace=10)
    assert seen.failed.tolist() == [True]
    assert "kept too many points" in str(seen.failure(0))


@pytest.mark.parametrize("threads", [1, 2])
def test_progress_rises_to_the_number_of_lanes(circuit: Setup, lanes: Lanes, threads: int) -> None:
    told: list[tuple[int, int]] = []
    observe(circuit, [], lanes, threads=threads, progress=lambda done, total: told.append((done, total)))
    assert [total for _, total in told] == [COUNT] * len(told)
    done = [d for d, _ in told]
    assert done == sorted(done)
    assert done[-1] == COUNT


@pytest.mark.parametrize("threads", [1, 2])
def test_a_run_can_be_stopped(circuit: Setup, lanes: Lanes, threads: int) -> None:
    told: list[int] = []
    with pytest.raises(Cancelled):
        observe(
            circuit,
            [],
            lanes.take(np.tile(np.arange(COUNT), 40)),
            threads=threads,
            progress=lambda done, total: told.append(done),
            cancelled=lambda: bool(told),
        )
    assert told[-1] < 40 * COUNT


def test_a_run_that_is_cancelled_at_once_computes_nothing(circuit: Setup, lanes: Lanes) -> None:
    told: list[int] = []
    with pytest.raises(Cancelled):
        observe(circuit, [], lanes, threads=1, progress=lambda d, t: told.append(d), cancelled=lambda: True)
    assert told == []


def test_runs_of_several_threads_of_the_caller_do_not_mix(circuit: Setup, rows: list[Row], lanes: Lanes) -> None:
    alone = bits(observe(circuit, rows, lanes))
    found: list[list[bytes]] = []
    callers = [threading.Thread(target=lambda: found.append(bits(observe(circuit, rows, lanes)))) for _ in range(3)]
    for caller in callers:
        caller.start()
    for caller in callers:
        caller.join()
    assert found == [alone] * 3


def test_every_array_of_a_run_is_contiguous(circuit: Setup, rows: list[Row], lanes: Lanes) -> None:
    # The kernel reads them at their addresses.
    seen = observe(circuit, rows, lanes)
    for tables in (seen.results, circuit.program(lanes), circuit.circuit.topology):
        for name, array in zip(tables._fields, tables, strict=True):
            assert array.flags.c_contiguous, name
    table = circuit.circuit.table(lanes)
    assert table.flags.c_contiguous
    assert [f.name for f in fields(seen)] == ["circuit", "rows", "results", "keep", "carried"]


def test_runs_of_the_same_lanes_share_their_table(circuit: Setup, lanes: Lanes) -> None:
    table = circuit.circuit.table(lanes)
    assert circuit.circuit.table(lanes) is table
    assert not table.flags.writeable
    other = lanes.take(range(lanes.count))
    assert circuit.circuit.table(other) is not table
    assert np.array_equal(circuit.circuit.table(other), table)
