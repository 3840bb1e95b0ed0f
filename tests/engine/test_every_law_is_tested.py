"""Which test compares each part kind and each event with a closed form, a published value or an independent solution.

The rule is the project's own: a new kind or event is not done without its line here.
"""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

from stagebook.engine.design.sequence import EVENTS
from stagebook.engine.parts import kinds

HERE = Path(__file__).parent
KINDS = {
    "resistor": "test_rc_closed_forms.py::test_a_temperature_coefficient_moves_the_time",
    "preset": "test_presets.py::test_the_setting_is_a_share_of_the_range",
    "capacitor": "test_rc_closed_forms.py::test_leakage_follows_state_and_temperature",
    "inductor": "test_inductors.py::test_current_rises_with_l_over_r",
    "coil": "test_own_heat.py::test_a_coil_grows_warm_and_draws_less",
    "contact": "test_relays.py::test_a_make_contact_closes_when_the_current_has_reached_pick_up",
    "diode": "test_diodes.py::test_a_diode_behind_a_resistor_takes_the_current_of_the_lambert_function",
    "zener": "test_diodes.py::test_a_zener_has_its_voltage_at_the_test_current_and_its_slope_resistance_there",
    "led": "test_other_diodes.py::test_temperature_moves_the_saturation_current_by_barrier_or_gap",
    "schottky": "test_other_diodes.py::test_temperature_moves_the_saturation_current_by_barrier_or_gap",
    "clamp": "test_other_diodes.py::test_a_clamp_meets_its_stand_off_and_clamping_points",
    "npn": "test_independent_solution.py::test_a_transistor_switch_with_stored_charge",
    "pnp": "test_gain_fall_off.py::test_currents_are_those_of_the_published_base_charge",
    "darlington_npn": "test_transistors.py::test_the_gains_of_a_darlington_multiply",
    "darlington_pnp": "test_datasheet_figures.py::test_a_pnp_darlington_is_the_mirror_image_of_an_npn",
    "mosfet_n": "test_mosfets.py::test_a_switch_with_its_charges_against_another_method",
    "mosfet_p": "test_mosfets.py::test_a_p_channel_is_the_mirror_image_of_an_n_channel",
    "thermistor": "test_sensors.py::test_a_thermistor_follows_ambient",
    "light_resistor": "test_sensors.py::test_a_light_resistor_begins_at_its_light",
    "probe": "test_events.py::test_a_probe_is_set_at_once",
    "lamp": "test_lamps.py::test_an_independent_solution_through_a_resistor",
    "sounder": "test_surges.py::test_it_falls_from_the_surge_to_the_current",
    "piezo": "test_surges.py::test_a_piezo_element_has_its_capacitance",
    "fuse": "test_own_heat.py::test_a_fuse_melts_when_its_wire_is_hot_enough",
    "battery": "test_batteries.py::test_voltage_follows_the_charge_state",
    "lead": "test_inductors.py::test_a_lead_charges_its_far_half_through_its_resistance",
    "generator": "test_events.py::test_a_sine_begins_at_its_phase",
}
OCCURRENCES = {
    "connect supply": "test_events.py::test_the_supply_rises_evenly",
    "disconnect supply": "test_events.py::test_a_supply_is_taken_away_and_comes_back",
    "reverse supply": "test_supply_events.py::test_a_supply_is_connected_the_wrong_way_round_and_right_again",
    "dip": "test_supply_events.py::test_a_dip_draws_the_charge_out_of_the_rail",
    "surge": "test_supply_events.py::test_a_surge_comes_through_its_own_impedance",
    "close": "test_events.py::test_a_bouncing_contact_opens_as_often_as_it_says",
    "open": "test_events.py::test_a_bouncing_contact_that_opens_closes_again_in_between",
    "set": "test_sensors.py::test_events_set_the_temperature_of_one_sensor",
    "ramp": "test_sensors.py::test_light_falls_over_decades_and_passes_a_level_when_it_should",
    "inject": "test_injected_charge.py::test_a_long_pulse_is_a_current",
}


def test_every_kind_and_every_event_has_its_line() -> None:
    assert set(KINDS) == set(kinds())
    assert set(OCCURRENCES) == set(EVENTS)


@pytest.mark.parametrize("what", [*KINDS, *OCCURRENCES])
def test_the_test_is_there_and_makes_what_it_is_said_to_test(what: str) -> None:
    file, name = ({**KINDS, **OCCURRENCES}[what]).split("::")
    text = (HERE / file).read_text("utf-8")
    assert name in {node.name for node in ast.parse(text).body if isinstance(node, ast.FunctionDef)}
    makers = {"resistor": "resistor(", "capacitor": "capacitor(", "npn": "transistor("}
    makers |= {"mosfet_n": "mosfet(", "generator": "generator"}
    assert makers.get(what, f'"{what}"') in text
