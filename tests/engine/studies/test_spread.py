"""Random lanes and the spread of margins: repeatable, paired between revisions, with the interval of a share."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest
from scipy import stats

from stagebook.engine.circuit.circuit import build
from stagebook.engine.primitives.columns import AMBIENT, SUPPLY
from stagebook.engine.results import CheckResult, Verdict
from stagebook.engine.studies.evaluate import asks_of, judge, look
from stagebook.engine.studies.lanes import random_lanes
from stagebook.engine.studies.margins import study
from stagebook.engine.studies.spread import wilson

from ..circuits import Json, resistor, transistor, two
from .units import changed, latch, load, timer

LANES = 50


def spreads(document: Json, lanes: int = LANES, seed: int = 1) -> dict[str, CheckResult]:
    return {check.id: check for check in study(load(document), lanes=lanes, seed=seed).checks}


def test_the_same_seed_gives_the_same_bits() -> None:
    first, second = (study(load(timer()), lanes=LANES, seed=7) for _ in range(2))
    assert replace(first, seconds=0.0) == replace(second, seconds=0.0)


def test_another_seed_gives_another_spread() -> None:
    first, second = (spreads(timer(), seed=seed)["duration:timer:LS2"].spread for seed in (1, 2))
    assert first is not None
    assert second is not None
    assert first.p50 != second.p50


def test_more_lanes_keep_the_first_ones() -> None:
    columns = build(load(timer())).columns
    few, many = (random_lanes(columns, count, 3) for count in (20, 60))
    assert np.array_equal(few.values, many.values[:, :20])


@pytest.mark.parametrize(
    "document",
    [
        changed(timer(), R7="1k"),
        timer(name="another"),
        timer(conditions={"supply": {"min": "3 V", "nominal": "6 V", "max": "12 V"}, "ambient": "25 C"}),
    ],
)
def test_lanes_are_paired_between_revisions(document: Json) -> None:
    # A column draws by seed, reference and datum: whatever else has changed, its lane is as far between its ends.
    old, new = (random_lanes(build(load(d)).columns, LANES, 5) for d in (timer(), document))
    shared = [column.key for column in old.columns if column.key in new]
    assert len(shared) > 8
    for key in shared:
        before, after = old.columns[old.place(key)], new.columns[new.place(key)]
        if (before.low, before.high) == (after.low, after.high):
            assert np.array_equal(old[key], new[key]), key
        elif before.varies and after.varies and not before.logarithmic:
            shares = [(lanes[key] - c.low) / (c.high - c.low) for lanes, c in ((old, before), (new, after))]
            assert shares[0] == pytest.approx(shares[1], abs=1e-12), key


def test_an_added_part_moves_no_other_column() -> None:
    document = timer()
    first, *rest = document["stages"]
    added = {**first, "parts": [resistor("R0", "supply", "0V", "1M"), *first["parts"]]}
    old, new = (
        random_lanes(build(load(d)).columns, LANES, 5) for d in (timer(), document | {"stages": [added, *rest]})
    )
    for column in old.columns:
        assert np.array_equal(old[column.key], new[column.key]), column.key


def test_lanes_fill_the_ranges_evenly() -> None:
    lanes = random_lanes(build(load(timer())).columns, 4000, 1)
    assert lanes[SUPPLY].min() >= 4.5
    assert lanes[SUPPLY].max() <= 6.4
    # Kolmogorov and Smirnov; logarithmic columns are even on a logarithmic scale.
    for key in (SUPPLY, AMBIENT, ("R7", "value"), ("C1", "value")):
        column = lanes.columns[lanes.place(key)]
        assert stats.kstest(lanes[key], "uniform", (column.low, column.high - column.low)).pvalue > 1e-3
    gain = lanes.columns[lanes.place(("Q3", "gain"))]
    share = np.log(lanes["Q3", "gain"] / gain.low) / np.log(gain.high / gain.low)
    assert stats.kstest(share, "uniform").pvalue > 1e-3


def test_quantiles_and_share_are_those_of_the_lanes() -> None:
    design = load(timer())
    circuit = build(design)
    ask = next(ask for ask in asks_of(circuit) if ask.check.slug == "duration")
    judged, _ = judge(ask, look(circuit, [ask], random_lanes(circuit.columns, LANES, 1)))
    spread = spreads(timer())["duration:timer:LS2"].spread
    assert spread is not None
    expected = np.quantile(judged.margin, [0.05, 0.5, 0.95])
    assert np.array([spread.p05, spread.p50, spread.p95]) == pytest.approx(expected, abs=1e-12)
    assert spread.passing == np.mean(judged.margin >= ask.required)
    assert spread.interval == wilson(int(np.sum(judged.margin >= ask.required)), LANES)


def test_a_trial_passes_in_as_many_lanes_as_bear_the_required_margin() -> None:
    # Connected within 50 us; half of that is 25 us: lanes whose edge lies beyond it pass.
    document = latch()
    document["sequences"]["snap"]["events"][0]["rise"] = "50 us"
    circuit = build(load(document))
    ask = next(ask for ask in asks_of(circuit) if ask.check.slug == "supply_slew")
    assert ask.trial is not None
    assert ask.screen == pytest.approx(1.0 / 25e-6)
    lanes = random_lanes(circuit.columns, 30, 1)
    edge = look(circuit, [ask], lanes, trials={ask.trial.key: range(30)}).edges[ask.trial.key]
    spread = spreads(document, lanes=30)["supply_slew:latch:Q2"].spread
    assert spread is not None
    assert (spread.p05, spread.p50, spread.p95) == (None, None, None)
    assert 0.2 < spread.passing < 0.8
    # An edge lies between the last knob value at which the lane held and the next one.
    beyond, above = edge.knob * 1.03 >= ask.screen, edge.knob >= ask.screen
    assert np.mean(edge.never | above) <= spread.passing <= np.mean(edge.never | beyond)


def test_a_spread_says_nothing_of_the_verdict() -> None:
    # Extremes decide: the corner is worse than the worst twentieth of the lanes.
    found = spreads(timer())["duration:timer:LS2"]
    assert found.spread is not None
    assert found.spread.p05 is not None
    assert found.margin is not None
    assert found.margin < found.spread.p05
    assert found.verdict is Verdict.FAIL


@pytest.mark.parametrize(
    ("passed", "total", "low", "high"),
    [
        # Newcombe, Statistics in Medicine 17 (1998) 857, table I, method 3 (from memory).
        (81, 263, 0.2553, 0.3662),
        (15, 148, 0.0624, 0.1605),
        (0, 20, 0.0, 0.1611),
        (1, 29, 0.0061, 0.1718),
    ],
)
def test_published_intervals_of_a_share(passed: int, total: int, low: float, high: float) -> None:
    assert wilson(passed, total) == (pytest.approx(low, abs=5e-5), pytest.approx(high, abs=5e-5))


@pytest.mark.parametrize(("passed", "total"), [(0, 1), (1, 1), (3, 10), (640, 1000), (1000, 1000)])
def test_intervals_agree_with_the_reference_library(passed: int, total: int) -> None:
    reference = stats.binomtest(passed, total).proportion_ci(method="wilson")
    assert wilson(passed, total) == pytest.approx((reference.low, reference.high), abs=1e-9)


EXACT = {"tolerance": "0 %"}


def test_a_random_unit_that_is_worse_than_all_corners_is_told() -> None:
    # At 8 V no current flows through 8.2 V, at 15 V the driver is saturated; between 12 V and 8 V it stands half-way
    # and is hottest (the power of a resistor's load is largest at half the supply, any textbook).
    driver = {
        "stagebook": 1,
        "name": "starved",
        "conditions": {"supply": {"min": "8 V", "nominal": "12 V", "max": "15 V"}, "ambient": "20 C"},
        "stages": [
            {
                "name": "unit",
                "parts": [
                    two("zener", "D1", "x", "supply", "8.2 V", **{"class": "zener 0.5 W", **EXACT}),
                    resistor("R1", "x", "b", "1k", **EXACT),
                    resistor("R2", "b", "0V", "10k", **EXACT),
                    transistor("Q1", "low", "b", "0V", **{"class": "0.5 A driver npn"}),
                    resistor("R3", "supply", "low", "47R", **EXACT),
                ],
            }
        ],
        "sequences": {"alarm": {"ends": "10 ms", "events": []}},
    }
    name = "junction_temperature:unit:Q1"
    plain, drawn = (spreads(driver, lanes)[name] for lanes in (0, 100))
    assert plain.reason is None
    assert (drawn.margin, drawn.verdict) == (plain.margin, plain.verdict)
    told = re.fullmatch(
        r"a random unit comes to ([+-][\d.]+) %, worse than all corners that are tried, at supply ([\d.]+) V, "
        r"ambient 20 C",
        str(drawn.reason),
    )
    assert told is not None, drawn.reason
    assert drawn.margin is not None
    assert float(told[1]) / 100.0 < drawn.margin - 0.05
    assert 8.5 < float(told[2]) < 11.5


def test_of_nothing_nothing_is_known() -> None:
    assert wilson(0, 0) == (0.0, 1.0)
