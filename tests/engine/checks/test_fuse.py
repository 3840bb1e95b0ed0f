"""Check 26, fuse: load, inrush and fault (0.75, 0.5 and twice the rated current: common practice, no source)."""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, two
from .sheets import CONNECT, design, exact, margin, sounder


def fused(load: str = "0.5 A", farads: str = "1u", source: str = "0R9", **fields: Any) -> Design:
    """12 V, 1 A slow of 0.1 ohm before a capacitor and a load that S1 puts on at 0.2 s."""
    given = {"rated_current": "1 A", "melting": "2 A2s", "resistance": "0R1", **fields}
    events: list[Json] = [CONNECT, {"at": "0.2 s", "event": "close", "part": "S1"}]
    return design(
        two("fuse", "F1", "supply", "rail", **{k: v for k, v in given.items() if v is not None}),
        exact(two("capacitor", "C1", "rail", "0V", farads, voltage="25 V")),
        exact(resistor("R1", "rail", "0V", "100k")),
        two("contact", "S1", "rail", "top", data={"resistance": "1 mohm"}),
        sounder("LS1", "top", "0V", load, "3 V", rated="12 V"),
        supply="12 V",
        source=source,
        events=events,
        roles={"load": "LS1"},
        moments={"standby": "0.1 s", "sounding": "0.5 s"},
        ambient={"min": "0 C", "nominal": "25 C", "max": "75 C"},
        strays=(),
    )


@pytest.mark.parametrize(("load", "verdict"), [("0.5 A", Verdict.PASS), ("0.8 A", Verdict.FAIL)])
def test_the_load_of_a_hot_fuse_by_hand(load: str, verdict: Verdict) -> None:
    # 12 V / (1 ohm + 24 ohm) = 0.48 A of 0.75 x 1 A x (1 - 0.003 x 50) = 0.6375 A; 12/16 = 0.75 A.
    ohms = 12.0 / float(load.split()[0])
    found = margin(fused(load), "fuse_load", "F1")
    assert found.demand == pytest.approx(12.0 / (1.0 + ohms), rel=1e-3)
    assert (found.capability, found.corner, found.verdict) == (pytest.approx(0.6375), "hot", verdict)


@pytest.mark.parametrize(("farads", "verdict"), [("2200u", Verdict.PASS), ("22000u", Verdict.FAIL)])
def test_the_inrush_of_a_capacitor_by_hand(farads: str, verdict: Verdict) -> None:
    # Charging through R: I2t = C V^2/(2 R): 2200 uF, 12 V, 1 ohm: 0.158 A2s of 1 A2s; 22 mF: 1.58 A2s, all but
    # what comes after 0.1 s, four and a half time constants. The load of 100k does not count.
    found = margin(fused("1 mA", farads), "fuse_pulse", "F1")
    whole = (2.2e-3 if farads == "2200u" else 22e-3) * 144.0 / 2.0
    assert found.demand == pytest.approx(whole, rel=0.02)
    assert (found.capability, found.verdict) == (1.0, verdict)


def test_a_fuse_that_blows_is_told_wherever_something_fails() -> None:
    # 60 mF would take 60e-3 x 144/2 = 4.3 A2s: it melts at 2 A2s, and the load that S1 puts on gets nothing then.
    design = fused("0.5 A", "60000u")
    found = margin(design, "fuse_pulse", "F1")
    assert (found.verdict, found.margin, found.outcome) == (Verdict.FAIL, -1.0, "it blows in sequence alarm")
    load = margin(design, "load_voltage", "LS1")
    assert load.verdict is Verdict.FAIL
    assert (load.outcome or "").endswith("fuse F1 has blown")


@pytest.mark.parametrize(("source", "verdict"), [("0R9", Verdict.PASS), ("8R", Verdict.FAIL)])
def test_a_short_behind_it_by_hand(source: str, verdict: Verdict) -> None:
    # 12 V / 1 ohm = 12 A, / 8.1 ohm = 1.48 A, for 2 A.
    found = margin(fused(source=source), "fuse_fault", "F1")
    ohms = 1.0 if source == "0R9" else 8.1
    assert found.margin == pytest.approx(1.0 - 2.0 * ohms / 12.0, abs=1e-6)
    assert found.verdict is verdict


@pytest.mark.parametrize(
    ("slug", "missing"), [("fuse_load", "rated_current"), ("fuse_fault", "rated_current"), ("fuse_pulse", "melting")]
)
def test_what_is_missing_is_named(slug: str, missing: str) -> None:
    found = margin(fused(**{missing: None}), slug, "F1")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, f"missing: {missing} of F1")


def test_a_class_from_memory() -> None:
    of = design(
        two("fuse", "F1", "supply", "rail", **{"class": "1 A slow"}),
        exact(resistor("R1", "rail", "0V", "24R")),
        supply="12 V",
        ambient="25 C",
    )
    assert margin(of, "fuse_load", "F1").margin == pytest.approx(1.0 - 12 / 24.1 / 0.75, abs=1e-3)
