"""The nominal run as voltages over time, against the closed form of an RC and the published error of the scheme."""

from __future__ import annotations

import numpy as np
import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.kernel.layout import Floats
from stagebook.engine.studies import waves as studied
from stagebook.engine.studies.waves import waves

from ..checks.sheets import design
from ..circuits import Json, capacitor, resistor, two
from .test_diagnosis import flasher

ROUGH = 9e-3  # V, a thousandth of 9 V: the customary tolerance
TAU = 0.1  # s, 100k and 1 uF
CONNECT: Json = {"at": "0.1 s", "event": "connect supply", "rise": "1 us"}
CLOSE: Json = {"at": "0.5 s", "event": "close", "part": "S1"}


def charging(*events: Json, ends: str = "1 s") -> Design:
    """1 uF charged through 100k from 9 V, and a net that S1 connects to the supply."""
    return design(
        resistor("R1", "supply", "c", "100k"),
        capacitor("C1", "c", "0V", "1 uF"),
        two("contact", "S1", "supply", "fed"),
        resistor("R2", "fed", "0V", "1k"),
        events=[CONNECT, *events],
        ends=ends,
    )


def charged(t: Floats) -> Floats:
    """The closed form; the mean of the rise is half a microsecond late."""
    return np.where(t > 0.1, -9.0 * np.expm1(-(t - 0.1 - 0.5e-6) / TAU), 0.0)


AT = [0.05, 0.11, 0.123456789, 0.2, 0.35, 0.7, 1.0]


def test_times_are_hit_exactly_and_in_the_order_asked_for() -> None:
    found = waves(charging(), nets=["c"], at=AT)
    assert found.time.tolist() == AT
    assert (found.nets, found.values.shape) == (("c",), (7, 1))
    assert found.values[:, 0] == pytest.approx(charged(np.array(AT)), abs=ROUGH)
    mixed = [0.7, 0.05, 0.7, 0.2]
    again = waves(charging(), nets=["c"], at=mixed)
    assert again.time.tolist() == mixed
    # Other stops are other steps: the same voltages within the solver's tolerance, and to the bit at the same time.
    assert again.values[0, 0] == again.values[2, 0]
    assert again.values[:, 0] == pytest.approx(charged(np.array(mixed)), abs=ROUGH)


def test_a_stop_is_a_step_and_no_interpolation() -> None:
    design_, tight = charging(), 1e-6
    found = waves(design_, nets=["c"], at=AT, relative=tight)
    assert found.values[:, 0] == pytest.approx(charged(np.array(AT)), abs=1e-4)


def test_at_an_event_the_value_before_it_is_meant() -> None:
    found = waves(charging(CLOSE), nets=["fed"], at=[0.4, 0.5, 0.5001])
    assert found.values[:, 0] == pytest.approx([0.0, 0.0, 9.0], abs=2e-2)


def test_the_start_and_the_end_may_be_asked_for() -> None:
    found = waves(charging(), nets=["c"], at=[0.0, 1.0])
    assert found.time.tolist() == [0.0, 1.0]
    assert found.values[:, 0] == pytest.approx(charged(np.array([0.0, 1.0])), abs=ROUGH)


def test_error_goes_with_tolerance_to_the_power_of_two_thirds() -> None:
    # Local errors are those of a third-order estimate: error ~ tolerance^(2/3) (measured on the published amplifier).
    stops = list(np.linspace(0.12, 0.6, 25))
    tolerances = np.array([1e-3, 1e-4, 1e-5, 1e-6])
    errors = [
        np.max(np.abs(waves(charging(), nets=["c"], at=stops, relative=r).values[:, 0] - charged(np.array(stops))))
        for r in tolerances
    ]
    slope = np.polyfit(np.log(tolerances), np.log(errors), 1)[0]
    assert 0.5 < slope < 0.85
    assert errors[0] < ROUGH
    assert errors[-1] < 1e-4


def test_without_times_all_steps_come() -> None:
    found = waves(charging(CLOSE))
    assert found.nets == ("c", "fed", "supply")
    assert found.time[-1] == pytest.approx(1.0)
    assert np.all(np.diff(found.time) >= 0.0)
    # The step between two points is nowhere so long that a straight line misses the curve.
    inside = np.interp(np.array([0.15, 0.25, 0.45]), found.time, found.values[:, 0])
    assert inside == pytest.approx(charged(np.array([0.15, 0.25, 0.45])), abs=0.05)


def test_a_long_trace_is_kept_whole(monkeypatch: pytest.MonkeyPatch) -> None:
    whole = waves(charging(CLOSE))
    monkeypatch.setattr(studied, "FIRST_POINTS", 4)
    grown = waves(charging(CLOSE))
    assert np.array_equal(whole.time, grown.time)
    assert np.array_equal(whole.values, grown.values)


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        ({"sequence": "alert"}, "there is no sequence 'alert'; write one of alarm"),
        ({"nets": ["d"]}, "net 'd' is not in the design; write one of"),
        ({"at": [-0.1]}, "between 0 s and 1 s"),
        ({"at": [0.5, 1.5]}, "between 0 s and 1 s"),
    ],
)
def test_what_cannot_be_is_refused(arguments: Json, says: str) -> None:
    with pytest.raises(CircuitError, match=says):
        waves(charging(), **arguments)


def test_waves_of_what_oscillates_too_long_are_drawn_with_gaps() -> None:
    """An astable of 44 kHz for 10 s: 460,000 periods, most of them carried forward."""
    found = waves(flasher(10.0), nets=["c1", "b1"])
    assert found.carried is not None
    assert len(found.gaps) > 3
    assert found.time[-1] == pytest.approx(10.0)
    assert np.all(np.diff(found.time) >= 0.0)
    for begin, end in found.gaps:
        assert not np.any((found.time > begin + 1e-9) & (found.time < end - 1e-9))
    drawn = found.filled()
    assert np.all(np.diff(drawn.time) >= 0.0)
    assert drawn.gaps == ()
    for begin, end in found.gaps:
        within = (drawn.time > begin) & (drawn.time < end)
        # In each gap it swings as it does beside it.
        assert np.ptp(drawn.values[within, 0]) == pytest.approx(np.ptp(found.values[:, 0]), rel=0.1)
