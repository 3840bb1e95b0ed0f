"""Check 8, peak collector-emitter: the largest voltage of all sequences against 0.8 V_CEO (factor from memory)."""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import CheckResult, Verdict

from ..circuits import Json, mosfet, resistor, transistor, two
from .sheets import CONNECT, design, exact, margin

DATA: Json = {"gain": "200", "v_be": "0.64 V", "v_ceo": "45 V"}


def switch(supply: str, data: Json = DATA, kind: str = "npn", **more: Any) -> Design:
    """A transistor that is off, its collector pulled to the other rail."""
    rail, common = ("supply", "0V") if kind == "npn" else ("0V", "supply")
    return design(
        exact(resistor("R1", "base", common, "10k")),
        exact(resistor("R2", rail, "out", "10k")),
        transistor("Q1", "out", "base", common, kind, data=data),
        supply=supply,
        ambient="25 C",
        **more,
    )


@pytest.mark.parametrize("kind", ["npn", "pnp"])
@pytest.mark.parametrize(
    ("supply", "expected", "verdict"),
    [("24 V", 1.0 - 24.0 / 36.0, Verdict.PASS), ("40 V", 1.0 - 40.0 / 36.0, Verdict.FAIL)],
)
def test_the_supply_against_the_derated_rating(kind: str, supply: str, expected: float, verdict: Verdict) -> None:
    found = margin(switch(supply, kind=kind), "peak_collector_emitter", "Q1")
    assert found.margin == pytest.approx(expected, abs=1e-3)
    assert (found.capability, found.verdict) == (pytest.approx(36.0), verdict)
    assert found.hand == pytest.approx(expected, abs=1e-6)


def test_a_transient_counts_and_not_only_what_stands() -> None:
    # A generator that gives 30 V for 1 ms between moments: 1 - 30/36.
    pulse = two(
        "generator",
        "G1",
        "out",
        "0V",
        waveform={"steps": [["0 s", "5 V"], ["0.5 s", "5 V"], ["0.5001 s", "30 V"], ["0.501 s", "30 V"],
                            ["0.5011 s", "5 V"]]},
    )  # fmt: skip
    parts = [exact(resistor("R1", "base", "0V", "10k")), pulse, transistor("Q1", "out", "base", "0V", data=DATA)]
    feed = exact(resistor("R3", "supply", "0V", "10k"))
    found = margin(design(*parts, feed, events=[CONNECT]), "peak_collector_emitter", "Q1")
    assert found.margin == pytest.approx(1.0 - 30.0 / 36.0, abs=1e-3)


def test_derating_of_the_design() -> None:
    found = margin(switch("40 V", derating={"v_ceo": "100 %"}), "peak_collector_emitter", "Q1")
    assert found.margin == pytest.approx(1.0 - 40.0 / 45.0, abs=1e-3)


def test_without_the_rating_it_is_unknown() -> None:
    data = {key: text for key, text in DATA.items() if key != "v_ceo"}
    found = margin(switch("24 V", data), "peak_collector_emitter", "Q1")
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, "missing: v_ceo of Q1")


@pytest.mark.parametrize("kind", ["mosfet_n", "mosfet_p"])
def test_of_a_field_effect_transistor_the_drain_counts(kind: str) -> None:
    rail, common = ("supply", "0V") if kind == "mosfet_n" else ("0V", "supply")
    data = {"threshold": "2 V", "resistance_on": "1 ohm", "v_dss": "60 V"}
    parts = [exact(resistor("R1", "gate", common, "10k")), exact(resistor("R2", rail, "out", "10k"))]
    switch = design(*parts, mosfet("Q1", "out", "gate", common, kind, data=data), supply="24 V", ambient="25 C")
    found = margin(switch, "peak_collector_emitter", "Q1")
    assert (found.margin, found.capability) == (pytest.approx(1.0 - 24.0 / 48.0, abs=1e-3), pytest.approx(48.0))


@pytest.mark.parametrize("kind", ["mosfet_n", "mosfet_p"])
@pytest.mark.parametrize(("supply", "verdict"), [("15 V", Verdict.PASS), ("18 V", Verdict.FAIL)])
def test_the_gate_has_a_rating_of_its_own(kind: str, supply: str, verdict: Verdict) -> None:
    # The whole supply between gate and source, of 0.8 x 20 V = 16 V.
    rail, common = ("supply", "0V") if kind == "mosfet_n" else ("0V", "supply")
    data = {"threshold": "2 V", "resistance_on": "1 ohm", "v_dss": "60 V", "v_gss": "20 V"}
    parts = [exact(resistor("R1", "gate", rail, "1k")), exact(resistor("R2", rail, "out", "1k"))]
    found = margin(
        design(*parts, mosfet("Q1", "out", "gate", common, kind, data=data), supply=supply), "gate_source", "Q1"
    )
    assert found.margin == pytest.approx(1.0 - float(supply.split()[0]) / 16.0, abs=1e-3)
    assert (found.verdict, found.capability) == (verdict, pytest.approx(16.0))
    assert found.hand == pytest.approx(found.margin, abs=1e-3)


def test_a_divider_at_the_gate_counts_by_hand_and_a_missing_rating_is_named() -> None:
    # 24 V x 100k/191k = 12.6 V.
    data = {"threshold": "2 V", "resistance_on": "1 ohm", "v_gss": "20 V"}
    parts = [exact(resistor(*each)) for each in (("R1", "supply", "gate", "91k"), ("R2", "gate", "0V", "100k"))]
    roles = {"gate_resistor": "R1", "gate_bleed_resistor": "R2"}
    load = exact(resistor("R3", "supply", "out", "1k"))

    def judged(**known: str) -> CheckResult:
        part = mosfet("Q1", "out", "gate", "0V", data={**data, **known})
        return margin(design(*parts, load, part, supply="24 V", roles=roles), "gate_source", "Q1")

    assert judged().hand == pytest.approx(1.0 - 24.0 * 100.0 / 191.0 / 16.0, abs=1e-3)
    assert judged().margin == pytest.approx(judged().hand, abs=1e-3)
    del data["v_gss"]
    assert judged().reason == "missing: v_gss of Q1"


@pytest.mark.parametrize(("zener", "volts"), [(None, 0.72), ("5.1 V", 5.82)])
def test_a_clamped_coil_counts_by_hand(zener: str | None, volts: float) -> None:
    # 24 V and the clamp of a coil that is switched off: 0.7 V of a diode at 10 mA, 5.1 V of a zener; of 0.8 x 45 V.
    coil = {"resistance": "1k", "inductance": "1 H", "pick_up": "12 V", "drop_out": "3 V", "armature_delay": "5 ms"}
    parts = [
        two("coil", "K1", "supply", "out", **coil),
        two("diode", "D1", "out", "supply" if zener is None else "back", **{"class": "signal diode"}),
        two("contact", "S1", "supply", "feed", form="break"),
        exact(resistor("R1", "feed", "base", "10k")),
        exact(resistor("R2", "base", "0V", "10k")),
        transistor("Q1", "out", "base", "0V", data=DATA),
    ]
    roles = {"flyback_diode": "D1"}
    if zener is not None:
        parts.append(two("zener", "D2", "supply", "back", zener, tolerance="0 %", **{"class": "zener 0.5 W"}))
        roles["flyback_zener"] = "D2"
    events = [CONNECT, {"at": "0.5 s", "event": "open", "part": "S1"}]
    found = margin(design(*parts, supply="24 V", roles=roles, events=events), "peak_collector_emitter", "Q1")
    assert found.hand == pytest.approx(1.0 - (24.0 + volts) / 36.0, abs=1e-3)
    assert found.margin == pytest.approx(found.hand, abs=0.02)
