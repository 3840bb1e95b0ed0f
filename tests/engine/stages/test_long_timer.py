"""Long RC timer: T = R C ln(V/(V - V_th)) (RC charging law), delay and interval, and when it cannot get there."""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.circuit.circuit import build
from stagebook.engine.design.document import Design
from stagebook.engine.errors import DesignError
from stagebook.engine.primitives.columns import AMBIENT
from stagebook.engine.primitives.signals import Anchor, level, maximum, minimum, voltage
from stagebook.engine.results import Verdict
from stagebook.engine.stages.making import doubts, new_design
from stagebook.engine.stages.row import Choice
from stagebook.engine.studies.evaluate import asks_of
from stagebook.engine.studies.margins import study

from .made import PIEZO, begins, choice, conditions, load_goes, made, passing, run, seconds, value

CALL = choice("contact_no", "call", held="60 s")


def timed(
    time: str, share: str = "0.3", supply: tuple[str, str, str] = ("11 V", "12 V", "14 V")
) -> tuple[float, float]:
    """Simulated time, and R C ln(V/(V - V_th)) with the values that were put in."""
    design = made(choice("long_timer", "timer", time=time, threshold=share), PIEZO, supply=supply)
    volts = float(supply[1].split()[0])
    seen = run(design, on := load_goes(True, supply=volts))
    tau = value(design, "timer", "timing_resistor") * value(design, "timer", "timing_capacitor", "F")
    threshold = float(share) * volts + (0.68 if "emitter_diode" in design.stage("timer").roles else 0.43)
    return seconds(seen, on), tau * math.log(volts / (volts - threshold))


@pytest.mark.parametrize("time", ["2 s", "60 s"])
@pytest.mark.parametrize("supply", [("11 V", "12 V", "14 V"), ("5 V", "6 V", "7 V")])
def test_the_delay_is_near_what_was_asked_for(time: str, supply: tuple[str, str, str]) -> None:
    simulated, closed = timed(time, supply=supply)
    # The middle of both ends is what was asked for; the nominal unit is a little quicker, as leakage only slows down.
    assert simulated == pytest.approx(float(time.split()[0]), rel=0.1)
    # V_EB and the diode at a microampere: 0.43 V and 0.25 V (class); leakage is left out.
    assert simulated == pytest.approx(closed, rel=0.08)


@pytest.mark.parametrize("supply", [("11 V", "12 V", "14 V"), ("22 V", "27 V", "29 V")])
def test_a_delay_that_an_edge_starts_does_not_trip_the_latch_behind_it(supply: tuple[str, str, str]) -> None:
    # From the project's own vault alarm, which fired as the door opened: hot, low V_BE, the contact closes in no time.
    row = (CALL, choice("long_timer", "timer", time="20 s"), choice("complementary_latch", "latch"), PIEZO)
    design = made(*row, supply=supply)
    low = {(p.ref, "v_be"): 0.58 for p in design.stage("timer").parts if p.kind in ("npn", "pnp")}
    on = load_goes(True, supply=float(supply[1].split()[0]))
    seen = run(design, on, changes={**low, AMBIENT: 45.0})
    assert seconds(seen, on) - begins(design) == pytest.approx(20.0, rel=0.15)


def test_the_threshold_sets_resistor_and_capacitor_but_not_the_time() -> None:
    low, high = timed("20 s", "0.2")[0], timed("20 s", "0.5")[0]
    assert low == pytest.approx(20.0, rel=0.1)
    assert high == pytest.approx(20.0, rel=0.1)


def test_an_interval_begins_with_its_signal_and_ends_by_itself() -> None:
    design = made(CALL, choice("long_timer", "timer", mode="interval", time="10 s"), PIEZO)
    seen = run(design, on := load_goes(True), off := load_goes(False, Anchor(begins(design) + 0.1)))
    assert seconds(seen, on) == pytest.approx(begins(design), abs=1e-2)
    assert seconds(seen, off) - seconds(seen, on) == pytest.approx(10.0, rel=0.1)


def test_the_emitter_diode_keeps_the_reverse_from_the_threshold_transistor() -> None:
    # 0.3 x 14 V is more than 3.5 V: without the diode the base would stand 3.6 V above the empty capacitor.
    design = made(choice("long_timer", "timer", time="2 s"), PIEZO)
    lowest = minimum(voltage("timer/watched", "timer/ref"))
    seen = run(design, lowest)
    assert seen.value(lowest)[0] > -1.0
    assert (
        "emitter_diode"
        not in made(choice("long_timer", "timer"), PIEZO, supply=("5 V", "6 V", "7 V")).stage("timer").roles
    )


def test_leakage_beyond_what_the_resistor_gives_keeps_it_from_ever_arriving() -> None:
    # A 0.01 C V capacitor leaks C/100 s per volt: with R C = 450 s it rests at V/(1 + 4.5), below 0.3 V + 1 V.
    row = choice("long_timer", "timer", time="240 s", capacitor="electrolytic")
    design = made(row, PIEZO)
    words = doubts(conditions(), (row, PIEZO))["timer"]
    assert words[0].startswith("arrival: hot, with the leakage of its capacitor, it charges to")
    assert words[0].endswith("write a shorter time, capacitor selected")
    seen = run(design, on := load_goes(True), changes={("conditions", "leakage"): 1.0})
    assert np.isnan(seconds(seen, on))
    tau = value(design, "timer", "timing_resistor") * value(design, "timer", "timing_capacitor", "F")
    assert 12.0 / (1.0 + 0.01 * tau) < 0.3 * 12.0 + 1.0


def test_a_latch_that_a_slow_signal_sets_is_not_reset_by_the_start_of_its_timer() -> None:
    # It was, 17,700 times a second: the reference jumps, and 4.5 pF of the threshold transistor (11 pF without bias)
    # took the firing base along. C = 2.5 x 4.5 pF x 0.3 x 14 V / (0.3 x 0.65 V) = 242 pF, next of E6: 330 pF.
    timer = choice("long_timer", "timer", mode="reset", time="10 s")
    lamp = (choice("darlington_driver", "driver", load="none"), choice("lamp"))
    call = choice("contact_no", "call")
    design = made(choice("entry"), call, choice("debounce"), choice("complementary_latch", "latch"), timer, *lamp)
    assert value(design, "timer", "base_capacitor_reset_device", "F") == pytest.approx(330e-12)
    on = passing("latch.out", 5.0, rising=True)
    again = passing("latch.out", 5.0, rising=True, nth=2)
    off = passing("latch.out", 5.0, rising=False)
    fired = maximum(voltage("timer/fire"), Anchor(begins(design)), Anchor(begins(design) + 1.0))
    seen = run(design, on, again, off, fired)
    assert np.isnan(seconds(seen, again))
    assert seconds(seen, off) - seconds(seen, on) == pytest.approx(10.0, rel=0.1)
    # 0.3 V_BE and what the firing base had before it: nothing.
    assert seen.value(fired)[0] < 0.3 * 0.65


def test_what_a_timer_held_is_not_what_keeps_its_load_on() -> None:
    # Without a way of its own the charge of 470 uF went through the driver's base, and the coil let go slowly.
    design = made(CALL, choice("complementary_latch", "latch"), choice("long_timer", mode="reset", time="10 s"), PIEZO)
    off = passing("latch.out", 5.0, rising=False)
    seen = run(design, off, left := level(voltage("latch.out"), Anchor(0.1, off)))
    assert seen.value(left)[0] < 0.3


def test_a_suitable_capacitor_is_a_selected_one_where_the_class_leaks_too_much() -> None:
    # Low drift leaks 0.002 C V at 20 C, 2^(25/30) times that at 45 C: with R C = 1200 s it rests at V / (1 + 4.3).
    short, long = (made(choice("long_timer", "timer", time=time), PIEZO) for time in ("60 s", "600 s"))
    assert short.part(short.stage("timer").roles["timing_capacitor"]).leakage is None
    part = long.part(long.stage("timer").roles["timing_capacitor"])
    leakage, farads = part.limits("leakage", "A", "specified"), value(long, "timer", "timing_capacitor", "F")
    volts = part.limits("voltage", "V")
    assert leakage is not None
    assert volts is not None
    assert leakage.max == pytest.approx(0.1 * 0.002 * farads * (volts.typical or 0.0), rel=0.05)
    assert doubts(conditions(), (choice("long_timer", "timer", time="600 s"), PIEZO)) == {}


def test_a_window_that_tolerances_alone_fill_is_told() -> None:
    row = (choice("long_timer", "timer", time="60 s", window="15 %", capacitor="selected"), PIEZO)
    (words,) = doubts(conditions(), row)["timer"]
    assert words.startswith("duration: tolerances and leakage let its time come out at 4")
    # C 10 % and 5 %, R 1 % are 16 % alone; what it says is enough is.
    window = words.split("write window ")[1].split(" ")[0]
    assert 20.0 < float(window) < 45.0
    enough = (choice("long_timer", "timer", time="60 s", window=f"{int(window) + 1} %", capacitor="selected"), PIEZO)
    assert doubts(conditions(), enough) == {}


def test_an_interval_without_a_start_and_a_reset_without_a_latch_are_refused() -> None:
    with pytest.raises(DesignError, match="stage timer, setting mode: an interval needs something that starts it"):
        made(choice("long_timer", "timer", mode="interval"), PIEZO)
    with pytest.raises(DesignError, match="stage timer, setting mode: there is no latch before it to reset"):
        made(CALL, choice("long_timer", "timer", mode="reset"), PIEZO)
    with pytest.raises(
        DesignError, match="stage timer, setting mode: 'later' is none of them; write delay or interval"
    ):
        made(choice("long_timer", "timer", mode="later"), PIEZO)


_WIDE = {"supply": ("10 V", "12 V", "15 V"), "ambient": ("-30 C", "25 C", "70 C")}


@pytest.mark.parametrize(
    ("mode", "latch", "wide"), [("reset", True, False), ("reset", True, True), ("interval", False, True)]
)
def test_the_window_that_a_doubt_tells_is_kept(mode: str, latch: bool, wide: bool) -> None:
    # A user wrote what was told, and the made design failed: divider, reverse currents and more had been left out.
    kept = conditions(*_WIDE["supply"]) if wide else conditions()
    if wide:
        kept["ambient"] = dict(zip(("min", "nominal", "max"), _WIDE["ambient"], strict=True))

    def row(window: str) -> tuple[Choice, ...]:
        timer = choice("long_timer", "timer", mode=mode, time="45 s", window=window)
        held = (choice("complementary_latch", "latch"),) if latch else ()
        return (choice("entry"), choice("contact_no"), *held, timer, choice("low_side_driver"))

    (words,) = doubts(kept, row("5 %"))["timer"]
    window = words.split("write window ")[1]
    assert doubts(kept, row(window)) == {}
    design = new_design("test", "as told", kept, row(window))
    (timed,) = (ask.id for ask in asks_of(build(design)) if ask.id.startswith("duration:timer"))
    (check,) = study(design, only=timed).checks
    assert check.verdict is Verdict.PASS, (check.low, check.high)
    assert check.margin is not None
    # Told is no more than it needs, within 15 % of the window.
    assert 0.1 <= check.margin < 0.25


def test_an_interval_behind_a_latch_is_told_to_leave_it_on() -> None:
    latch, timer = choice("complementary_latch", "latch"), choice("long_timer", "timer", mode="interval")
    (words,) = doubts(conditions(), (CALL, latch, timer, PIEZO))["timer"]
    assert words.startswith("latch reset: an interval leaves the latch before it on; write mode reset")
    for row in (
        (choice("contact_no", "call"), timer, PIEZO),
        (CALL, latch, choice("long_timer", "timer", mode="reset"), PIEZO),
    ):
        assert doubts(conditions(), row) == {}


COLD_AND_HOT = conditions("10.5 V", "12 V", "14.4 V") | {"ambient": {"min": "-30 C", "nominal": "25 C", "max": "70 C"}}


@pytest.mark.parametrize(
    "driver",
    [choice("low_side_driver", "driver"), choice("relay_driver", "driver", pick_up="57 %")],
    ids=lambda c: c.kind,
)
def test_a_delay_behind_entry_and_contact_does_not_blink_when_it_is_started(driver: Choice) -> None:
    # The closing contact lifted the firing base to 0.37 V by C_ob of two transistors: hot, with 330 pF there, the load
    # was on for 5 us; a coil, which takes no current at first, had the whole supply across it at room temperature too.
    entry, timer = choice("entry", diode="schottky"), choice("long_timer", "timer", time="10 s", window="55 %")
    row = (entry, CALL, timer, driver)
    assert doubts(COLD_AND_HOT, row) == {}
    design = new_design("test", "a delay from cold to hot", COLD_AND_HOT, row)
    (found,) = study(design, only=f"duration:timer:{design.stage('timer').roles['timing_capacitor']}").checks
    assert found.verdict is Verdict.PASS


def test_a_spike_instead_of_the_alarm_is_told_as_one() -> None:
    # 100 pF instead of 1.5 nF at the firing base: the closing contact lifts it by more than a volt.
    row = (choice("entry"), CALL, choice("long_timer", "timer", time="10 s", window="55 %"), choice("low_side_driver"))
    document = new_design("test", "a delay that blinks", COLD_AND_HOT, row).dump()
    roles, parts = document["stages"][2]["roles"], document["stages"][2]["parts"]
    next(part for part in parts if part["ref"] == roles["base_capacitor_reset_device"])["value"] = "100p"
    (found,) = study(Design.load(document), only=f"duration:timer:{roles['timing_capacitor']}").checks
    assert found.outcome == "'LS1 on' came too early, for less than 20 us: a spike"


def test_what_comes_back_when_a_timer_is_hot_is_counted_into_its_early_end() -> None:
    # 25 nA x 2^4.5 and 10 nA x 23 of saturation come back through two diodes at 70 C: 8 % of the time. Compared with
    # the simulated corner: 34.1 s.
    row = (
        choice("entry"),
        choice("contact_no", "call"),
        choice("long_timer", "timer", time="60 s", capacitor="low drift"),
        PIEZO,
    )
    (said,) = doubts(COLD_AND_HOT, row)["timer"]
    assert said.startswith("duration: tolerances and leakage let its time come out at 33 s")


def test_a_latch_that_is_still_set_when_its_timer_lets_it_go_is_doubted_and_found() -> None:
    timer, latch = choice("long_timer", "timer", mode="reset", time="3 s"), choice("complementary_latch", "latch")

    def row(held: str, *between: Choice) -> tuple[Choice, ...]:
        return (choice("contact_no", "call", held=held), *between, latch, timer, PIEZO)

    assert doubts(conditions(), row("2 s")) == {}
    assert doubts(conditions(), row("20 s", choice("differentiator"))) == {}
    (said,) = doubts(conditions(), row("20 s"))["timer"]
    assert said.startswith("duration: what sets the latch is held for 20 s, longer than the alarm of 3 s")
    design = made(*row("20 s"))
    (found,) = study(design, only=f"duration:timer:{design.stage('timer').roles['timing_capacitor']}").checks
    assert found.outcome == "the alarm comes again by itself when it is over: what started it is still there"


@pytest.mark.parametrize("mode", ["delay", "interval"])
def test_an_event_is_as_long_as_was_said_and_one_too_short_is_doubted(mode: str) -> None:
    # A user's contact was held for 1 s before a delay of 10 s; the sequence held it for 15 s, and all passed.
    timer = choice("long_timer", "timer", mode=mode, time="10 s")

    def row(held: str) -> tuple[Choice, ...]:
        return (choice("contact_no", "call", held=held), timer, PIEZO)

    design = made(*row("1 s"))
    assert [event.at for event in design.sequences["alarm"].events] == ["0 s", "1 s", "2 s"]
    (said,) = doubts(conditions(), row("1 s"))["call"]
    assert said.startswith(f"duration: held 1 s is too short: the {mode} of 10 s, which may take 14 s,")
    (found,) = study(design, only=f"duration:timer:{design.stage('timer').roles['timing_capacitor']}").checks
    assert found.verdict is Verdict.FAIL
    # What it tells to write is enough, and what is put in where nothing is said.
    told = said.split("write held ")[1].split(" or ")[0]
    assert doubts(conditions(), row(told)) == doubts(conditions(), row("")) == {}
    unsaid = made(*row(""))
    assert unsaid.stage("call").settings["held_as_made"] == told
    assert [event.at for event in unsaid.sequences["alarm"].events] == ["0 s", "1 s", "16 s"]


def test_a_latch_or_an_edge_before_a_delay_needs_no_more_than_a_moment() -> None:
    latch, timer = choice("complementary_latch", "latch"), choice("long_timer", "timer", time="10 s")
    for between in ((latch,), (choice("differentiator"), latch)):
        row = (choice("contact_no", "call", held="0.2 s"), *between, timer, PIEZO)
        assert doubts(conditions(), row) == {}
        assert [event.at for event in made(*row).sequences["alarm"].events] == ["0 s", "1 s", "1.2 s"]
    # What is debounced is handed on, and so is how long it must stay.
    row = (choice("contact_no", "call", held="0.5 s"), choice("debounce"), timer, PIEZO)
    assert "call" in doubts(conditions(), row)


def test_what_a_source_takes_beside_an_alarm_is_in_the_middle_too() -> None:
    # A user's door unit without an entry: the sounder takes 0.3 V across 2 ohm, so that it came out at 60.9 to 123.6 s
    # and kept +6 % of the window that was told, +10 % being asked for.
    kept = conditions("10.5 V", "12 V", "14.8 V") | {"ambient": {"min": "-10 C", "nominal": "25 C", "max": "50 C"}}

    def row(window: str) -> tuple[Choice, ...]:
        timer = choice("long_timer", "timer", mode="reset", time="90 s", window=window)
        return (choice("contact_nc"), choice("complementary_latch", "latch"), timer, choice("low_side_driver"))

    (words,) = doubts(kept, row("20 %"))["timer"]
    window = words.split("write window ")[1].split(" or")[0]
    design = new_design("test", "as told", kept, row(window))
    (check,) = study(design, only=f"duration:timer:{design.stage('timer').roles['timing_capacitor']}").checks
    assert check.verdict is Verdict.PASS
    assert check.low is not None
    assert check.high is not None
    # E96 has a value within 1.2 % of the middle; what the closed form leaves out is no more than that.
    assert 0.5 * (check.low + check.high) == pytest.approx(90.0, rel=0.024)
