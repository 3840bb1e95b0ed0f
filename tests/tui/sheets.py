"""Small sheets of margins for screen tests."""

from __future__ import annotations

from dataclasses import replace

from stagebook.engine.results import CheckResult, Depth, MarginSheet, Verdict
from stagebook.engine.studies.explanation import Explanation, Observation, Used


def verdict_of(margin: float | None, required: float = 0.1) -> Verdict:
    if margin is None:
        return Verdict.UNKNOWN
    if margin < 0:
        return Verdict.FAIL
    return Verdict.PASS if margin >= required else Verdict.THIN


def check(
    id: str, margin: float | None, *, stage: str = "timer", title: str = "", outcome: str | None = None
) -> CheckResult:
    return CheckResult(
        id=id,
        number=11,
        title=title or id.split(":")[0],
        stage=stage,
        part=id.split(":")[-1],
        sequence="alarm",
        demand=1.0,
        capability=2.0,
        unit="V",
        limits=None,
        low=None,
        high=None,
        margin=margin,
        required=0.1,
        verdict=verdict_of(margin),
        outcome=outcome,
        reason=None,
        corner="hot, low supply",
        conditions={"supply": 4.0, "ambient": 50.0},
        nominal=None if margin is None else margin + 0.1,
        hand=None,
        spread=None,
        formula="1 - demand / capability",
    )


def explanation(id: str, margin: float | None) -> Explanation:
    return Explanation(
        id=id,
        formula="1 - demand / capability",
        put_in="m = 1 - D/C = 1 - 1 V / 2 V = +50.0%",
        margin=margin,
        by_hand="",
        hand_source="common practice, from memory",
        required=Used("required margin", 0.1, "%", None, None, "the design's table: a siren is near"),
        usual_worst="hot",
        observed=(
            Observation("voltage of tc at 9 s", 1.5, "V", "alarm", 9.0),
            Observation("time of LS1 on", None, "s", "alarm", None),
        ),
        used=(
            Used("R7 value", 470e3, "ohm", 446.5e3, 493.5e3, "the part's value, 5 %"),
            Used("Q1 gain", 200.0, "", None, None, "class small npn, from memory"),
        ),
    )


def sheet(*checks: CheckResult, depth: Depth = Depth.CORNERS, content: str = "c", lanes: int = 0) -> MarginSheet:
    return MarginSheet("flood", content, "1", 1, lanes, 0.1, depth, tuple(checks))


def nominal(of: MarginSheet) -> MarginSheet:
    """The sheet as a study reports it first: margins are those of the nominal lane."""
    checks = tuple(
        replace(each, margin=each.nominal, verdict=verdict_of(each.nominal), corner="nominal") for each in of.checks
    )
    return replace(of, depth=Depth.NOMINAL, checks=checks)
