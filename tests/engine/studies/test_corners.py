"""Worst corners: no vertex drawn at random is worse, and what a corner is called agrees with its conditions."""

from __future__ import annotations

import numpy as np
import pytest

from stagebook.engine.circuit.circuit import build
from stagebook.engine.design.document import Design
from stagebook.engine.results import CheckResult, Depth, MarginSheet, Verdict
from stagebook.engine.studies.corner_words import named
from stagebook.engine.studies.evaluate import asks_of, judge, look
from stagebook.engine.studies.lanes import Setting, axes, lanes_of, tolerances
from stagebook.engine.studies.margins import study, worst_corners
from stagebook.engine.studies.vertices import worst_conditions

from ..circuits import Json
from .units import CONDITIONS, changed, latch, load, timer

ROUNDING = 1e-3  # of a margin: what the solver's tolerance moves an extreme by
VERTICES, TRIALS = 300, 60
UNITS = {"timer": timer(), "starved driver": changed(timer(), R7="5k6"), "latch": latch()}


@pytest.fixture(scope="module", params=UNITS)
def unit(request: pytest.FixtureRequest) -> Design:
    return load(UNITS[request.param])


@pytest.fixture(scope="module")
def sheet() -> dict[str, CheckResult]:
    return {check.id: check for check in study(load(timer())).checks}


def random_vertices(design: Design, count: int) -> list[Setting]:
    """Corners of the conditions, middles included, with every part at one of its ends."""
    columns = build(design).columns
    generator = np.random.default_rng(20261201)
    return [
        Setting(
            tuple((key, int(generator.choice(sides))) for key, sides in axes(columns).items()),
            tuple((column.key, int(generator.choice((-1, 1)))) for column in tolerances(columns)),
        )
        for _ in range(count)
    ]


def test_no_random_vertex_is_worse(unit: Design) -> None:
    circuit = build(unit)
    asks = [ask for ask in asks_of(circuit) if ask.missing is None]
    worst = worst_corners(circuit, tuple(asks))
    count = VERTICES if all(ask.trial is None for ask in asks) else TRIALS
    lanes = lanes_of(circuit.columns, random_vertices(unit, count))
    trials = {ask.trial.key: range(count) for ask in asks if ask.trial is not None}
    seen = look(circuit, asks, lanes, trials=trials)
    for ask in asks:
        judged, broken = judge(ask, seen)
        assert not broken
        found = worst[ask.id]
        # Where a margin is to be ranked, -1 is as bad as any.
        least = max(-1.0, float(found.judged.margin[found.lane]))
        # What a trial finds is known within the ratio of two of its knob values.
        step = 0.0 if ask.trial is None else ask.trial.resolution - 1.0
        assert max(-1.0, float(np.min(judged.margin))) >= least - (ROUNDING + step) * max(1.0, 1.0 - least), ask.id


ENDS = {
    "cold": ("ambient", "min"),
    "hot": ("ambient", "max"),
    "low supply": ("supply", "min"),
    "high supply": ("supply", "max"),
    "stiff source": ("source_resistance", "min"),
    "soft source": ("source_resistance", "max"),
}
STATES = {"conditioned capacitors": "conditioned", "leaky capacitors": "specified"}


def test_words_and_conditions_agree(unit: Design) -> None:
    for check in study(unit).checks:
        words = check.corner.split(", ")
        for word in words:
            if word in ENDS:
                condition, end = ENDS[word]
                levels = unit.conditions.levels(condition)
                assert levels is not None
                assert check.conditions[condition] == getattr(levels, end), check.id
            elif word in STATES:
                assert check.conditions["leakage"] == STATES[word], check.id
        nominal = {"supply": 6.0, "ambient": 25.0, "source_resistance": 0.5, "leakage": "conditioned"}
        if words == ["nominal"]:
            assert check.conditions == nominal, check.id
            assert check.margin == check.nominal
            assert check.setting == ()
        elif check.margin is not None and check.nominal is not None:
            assert check.margin < check.nominal, check.id


def test_what_is_called_nominal_is_the_nominal_lane_though_others_differ_a_little() -> None:
    # A resistor at a ten-thousandth of its power: the corners differ by less than a thousandth of a percent.
    found = {check.id: check for check in study(load(changed(timer(), R1="47M"))).checks}["resistor_power:timer:R1"]
    assert (found.corner, found.margin) == ("nominal", found.nominal)


def test_the_kept_setting_gives_the_margin_again(unit: Design) -> None:
    circuit = build(unit)
    for check in study(unit).checks:
        if check.margin is None:
            continue
        ask = next(ask for ask in asks_of(circuit) if ask.id == check.id)
        lanes = lanes_of(circuit.columns, [Setting.from_kept(check.setting)])
        trials = {} if ask.trial is None else {ask.trial.key: [0]}
        judged, _ = judge(ask, look(circuit, [ask], lanes, trials=trials))
        assert judged.margin[0] == check.margin, check.id


def words(sheet: dict[str, CheckResult], name: str) -> set[str]:
    return set(sheet[name].corner.split(", "))


def test_a_corner_names_what_matters(sheet: dict[str, CheckResult]) -> None:
    # Base current: gain, load and base resistor. Load and base current both follow the supply; the timer has no part.
    overdrive = words(sheet, "base_overdrive:driver:Q3")
    assert {"cold", "weak h_FE", "R7 high", "LS1 current high"} <= overdrive
    assert not any(word.startswith(("R1 ", "C1 ", "LS2 ")) for word in overdrive)
    # The time constant and nothing of the driver; LS2 has come off 3 V below whatever the supply is: low is late.
    duration = words(sheet, "duration:timer:LS2")
    assert {"R1 high", "C1 high"} <= duration or {"R1 low", "C1 low"} <= duration
    assert not any(word.startswith(("R7", "R8", "Q3", "LS1")) for word in duration)


def test_what_only_matters_together_is_named(sheet: dict[str, CheckResult]) -> None:
    # 100 nA of leakage and twice 25 K are little by themselves: three doublings of it are what turns a base on.
    assert {"hot", "Q3 i_cbo high"} <= words(sheet, "hot_off_state:driver:Q3")


def test_low_and_high_of_a_window_are_those_of_all_corners(sheet: dict[str, CheckResult]) -> None:
    # tau ln(V/3 V): 4.7 s x 0.95 x 0.8 at 4.5 V, less where LS1 lets the supply sag, up to 4.7 s x 1.05 x 1.2 at 6.4 V,
    # more with leakage.
    found = sheet["duration:timer:LS2"]
    assert found.low is not None
    assert found.high is not None
    assert 4.7 * 0.95 * 0.8 * np.log(4.0 / 3.0) < found.low < 4.7 * 0.95 * 0.8 * np.log(4.5 / 3.0)
    assert 4.7 * 1.05 * 1.2 * np.log(6.2 / 3.0) < found.high < 2.0 * 4.7 * 1.05 * 1.2 * np.log(6.4 / 3.0)
    assert found.margin == pytest.approx(min(12.0 - found.high, found.low - 2.0) / 5.0, abs=1e-9)


def test_sheets_come_in_order_of_their_depth() -> None:
    reported: list[MarginSheet] = []
    last = study(load(timer()), lanes=20, report=reported.append)
    assert [sheet.depth for sheet in reported] == [Depth.NOMINAL, Depth.CORNERS, Depth.SPREAD]
    assert last == reported[-1]
    for check in reported[0].checks:
        assert (check.corner, check.margin) == ("nominal", check.nominal)
        assert check.spread is None
    for first, second in zip(reported[0].checks, reported[1].checks, strict=True):
        assert first.id == second.id
        assert second.margin is None or (second.nominal is not None and second.margin <= second.nominal)


def test_a_missing_datum_stays_unknown_in_every_depth() -> None:
    reported: list[MarginSheet] = []
    study(load(latch()), lanes=5, report=reported.append)
    for sheet in reported:
        found = next(check for check in sheet.checks if check.id == "resistor_power:latch:R1")
        assert (found.verdict, found.margin, found.spread) == (Verdict.UNKNOWN, None, None)
        assert found.reason == "missing: rating of R1"


def test_a_design_with_nothing_to_vary_has_only_the_nominal_corner() -> None:
    document: Json = timer()
    still = {key: value["nominal"] for key, value in CONDITIONS.items() if key != "leakage"}
    parts = [{**stage, "parts": [{**p, "tolerance": "0 %"} if p["kind"] in ("resistor", "capacitor") else p
                                 for p in stage["parts"]]} for stage in document["stages"]]  # fmt: skip
    parts[0]["parts"][3] = {
        "ref": "Q3",
        "kind": "npn",
        "pins": {"collector": "low", "base": "base", "emitter": "0V"},
        "law": {"saturation_current": "1e-13 A", "forward_gain": 160, "reverse_gain": 2},
    }
    parts[0]["parts"][4]["data"] = {"current": "150 mA", "operating_minimum": "3 V"}
    fixed = document | {"conditions": {**still, "leakage": ["conditioned"]}, "stages": parts}
    for check in study(load(fixed)).checks:
        assert check.corner == "nominal"
        assert check.margin == check.nominal


def test_where_nothing_that_matters_is_out_of_its_middle_all_that_is_gets_named() -> None:
    setting = Setting(((("conditions", "ambient"), 1),), ((("R1", "value"), -1),))
    assert named(setting, {("R2", "value"): 1.0, ("R1", "value"): 0.01}) == "hot, R1 low"
    assert named(setting, {("R2", "value"): 1.0, ("R1", "value"): 0.5}) == "R1 low"
    assert named(setting, {}) == "hot, R1 low"


def test_each_side_of_every_condition_is_tried_with_the_tolerances_of_parts() -> None:
    # Worked by hand: metric = 2 supply + ambient, so that cold beats hot in every one of the worst; a part that counts
    # in the heat only would never be met if the two worst were all.
    turned = [(("conditions", "supply"), (-1, 1)), (("conditions", "ambient"), (-1, 0, 1))]
    conditions = [Setting(((turned[0][0], s), (turned[1][0], a))) for s in turned[0][1] for a in turned[1][1]]
    metric = np.array([2.0 * s + a for s in turned[0][1] for a in turned[1][1]])
    chosen = [tuple(side for _, side in conditions[k].axes) for k in worst_conditions(metric, conditions)]
    assert chosen == [(-1, -1), (-1, 0), (1, -1), (-1, 1)]
