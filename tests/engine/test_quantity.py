"""Values as the trade writes them."""

from __future__ import annotations

import math

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from stagebook.engine.errors import QuantityError
from stagebook.engine.quantity import LONGEST, parse, read, write

# IEC 60062:2016, marking codes of resistors and capacitors: the letter stands for the decimal point.
IEC_60062 = [
    ("R47", "ohm", 0.47),
    ("0R1", "ohm", 0.1),
    ("4R7", "ohm", 4.7),
    ("470R", "ohm", 470.0),
    ("4K7", "ohm", 4700.0),
    ("4k7", "ohm", 4700.0),
    ("47K3", "ohm", 47300.0),
    ("4M7", "ohm", 4.7e6),
    ("1M0", "ohm", 1e6),
    ("2G2", "ohm", 2.2e9),
    ("10p", "F", 10e-12),
    ("p47", "F", 0.47e-12),
    ("4n7", "F", 4.7e-9),
    ("2u2", "F", 2.2e-6),
    ("3m3", "F", 3.3e-3),
]

# SI brochure (BIPM 2019): symbols, prefixes, min, h, d, deg C and %. The month, year and ppm are common practice.
SI = [
    ("4.7k", "ohm", 4700.0),
    ("330 k", "ohm", 330e3),
    ("330 kohm", "ohm", 330e3),
    ("1.5 kΩ", "ohm", 1500.0),
    ("330 \u2126", "ohm", 330.0),
    ("22 mohm", "ohm", 0.022),
    ("22 Mohm", "ohm", 22e6),
    ("220 uF", "F", 220e-6),
    ("220\u00b5F", "F", 220e-6),
    ("220 \u03bcF", "F", 220e-6),
    ("1.2 H", "H", 1.2),
    ("75 s", "s", 75.0),
    ("1 us", "s", 1e-6),
    ("90 min", "s", 5400.0),
    ("24 h", "s", 86400.0),
    ("1 year", "s", 365.25 * 86400),
    ("4 V", "V", 4.0),
    ("-350 mV", "V", -0.35),
    (".5 V", "V", 0.5),
    ("1e-14 A", "A", 1e-14),
    ("0.25 W", "W", 0.25),
    ("5 %", "%", 0.05),
    ("50 ppm", "%", 50e-6),
    ("0 C", "degC", 0.0),
    ("-20 C", "degC", -20.0),
    ("\u221220 °C", "degC", -20.0),
    ("0.7 K", "K", 0.7),
    ("88 dB", "dB", 88.0),
    ("1 kHz", "Hz", 1000.0),
    ("6 m", "m", 6.0),
    ("25 mm", "m", 0.025),
    ("2 nC", "C", 2e-9),
    ("500 mAh", "Ah", 1800.0),
    ("10 V/us", "V/s", 10e6),
    ("200 K/W", "K/W", 200.0),
    ("50 ppm/K", "1/K", 50e-6),
    ("100 pF/m", "F/m", 100e-12),
    ("3 %/month", "1/s", 0.03 / (365.25 * 86400 / 12)),
    ("2 A2s", "A2s", 2.0),
    ("200", "", 200.0),
    ("6", "V", 6.0),
    ("0", "F", 0.0),
]

# Voltages, currents and inductances marked the same way: common practice, no source.
MARKED_ALIKE = [("5V1", "V", 5.1), ("3A15", "A", 3.15), ("0W25", "W", 0.25), ("4u7 H", "H", 4.7e-6)]


@pytest.mark.parametrize(("text", "unit", "value"), IEC_60062 + SI + MARKED_ALIKE)
def test_reads_what_the_trade_writes(text: str, unit: str, value: float) -> None:
    assert read(text, unit) == pytest.approx(value, rel=1e-15)
    assert read(f"  {text} ", unit) == read(text, unit)


def test_decimal_texts_are_read_exactly() -> None:
    """4.7 times 1e-9 in binary is not 4.7e-9: reading must not add a rounding of its own."""
    assert read("4n7", "F") == 4.7e-9
    assert read("0.7 %", "%") == 0.007
    assert read("330 us", "s") == 330e-6


@pytest.mark.parametrize(("letter", "value"), [("F", 0.01), ("G", 0.02), ("J", 0.05), ("K", 0.10), ("M", 0.20)])
def test_tolerance_letters(letter: str, value: float) -> None:
    """IEC 60062, letter codes for symmetrical tolerances."""
    assert read(letter, "%") == value
    assert read(f"+/- {value * 100:g} %", "%") == value
    assert read(f"±{value * 100:g}%", "%") == value


@pytest.mark.parametrize(
    ("text", "unit"),
    [
        ("20 C", "degC"),
        ("6 m", "m"),
        ("4k7 ohm", "ohm"),
        ("1R5", "ohm"),
        ("20 ms", "s"),
        ("5 %", "%"),
        ("3 K", "K"),
        ("7", ""),
    ],
)
def test_a_unit_that_is_written_out_is_found(text: str, unit: str) -> None:
    assert parse(text).unit == unit


@pytest.mark.parametrize(
    ("text", "unit", "says"),
    [
        ("", "V", "empty; write it like 6 V"),
        ("   ", "ohm", "empty"),
        ("nan", "ohm", "not a value; write it like 4k7"),
        ("inf", "V", "not a value"),
        ("-inf V", "V", "not a value"),
        ("Infinity", "s", "not a value"),
        ("1e999 V", "V", "far outside"),
        ("1e400 ohm", "ohm", "far outside"),
        ("1e-300 A", "A", "far outside"),
        ("1e99999 V", "V", "not a voltage"),
        ("1" * 90, "ohm", "90 characters"),
        ("6 V", "ohm", "is a voltage where a resistance is asked for"),
        ("4k7", "V", "not a voltage"),
        ("75 s", "V", "is a time where a voltage"),
        ("5", "%", "lacks its unit; write it like 5 %"),
        ("220", "F", "lacks its unit; write it like 220u"),
        ("150m", "A", "lacks its unit; write 150 mA"),
        ("4,7k", "ohm", "has a comma; write 4.7k"),
        ("10 KV", "V", "kilo is a small k; write 10 kV"),
        ("4K7", "F", "not a capacitance"),
        ("5 v", "V", "not a voltage"),
        ("1_0", "ohm", "not a resistance"),
        ("1 2", "ohm", "not a resistance"),
        ("\u0663", "ohm", "not a value"),
        ("--5", "V", "not a value"),
        ("4k7k", "ohm", "not a resistance"),
        ("0x10", "V", "not a voltage"),
        ("-300 C", "degC", "absolute zero"),
        ("300 K", "degC", "temperature difference where a temperature"),
        ("10 V/", "V/s", "not a value in V/s"),
        ("10 V", "V/s", "is a voltage where a value in V/s"),
        ("4k7", None, "no unit that is known"),
        ("5 parsecs", None, "no unit that is known"),
    ],
)
def test_refuses_in_one_line(text: str, unit: str | None, says: str) -> None:
    with pytest.raises(QuantityError) as refusal:
        read(text, unit)
    assert says in str(refusal.value)
    assert "\n" not in str(refusal.value)


@given(st.text(max_size=LONGEST + 10), st.sampled_from(["ohm", "F", "V", "s", "degC", "%", "", "V/s", None]))
def test_any_text_is_read_or_refused_in_one_line(text: str, unit: str | None) -> None:
    try:
        said = str(read(text, unit))
    except QuantityError as refusal:
        said = str(refusal)
    assert len(said.splitlines()) == 1
    assert said not in ("nan", "inf", "-inf")


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        # IEC 60062 marking; a whole number takes its letter behind it.
        (4700.0, "ohm", "4k7"),
        (10e3, "ohm", "10k"),
        (1e6, "ohm", "1M"),
        (680.0, "ohm", "680R"),
        (0.5, "ohm", "0R5"),
        (0.022, "ohm", "22m"),
        (0.0, "ohm", "0R"),
        (220e-6, "F", "220u"),
        (4.7e-9, "F", "4n7"),
        (0.47e-12, "F", "0p47"),
        # SI brochure (BIPM 2019) 5.4.3: a space between number and unit. The steps chosen are our own.
        (75.0, "s", "75 s"),
        (0.0123, "s", "12.3 ms"),
        (5400.0, "s", "5400 s"),
        (86400.0, "s", "24 h"),
        (0.05, "%", "5 %"),
        (-20.0, "degC", "-20 C"),
        (88.0, "dB", "88 dB"),
        (10e6, "V/s", "10 V/us"),
        (50e-6, "1/K", "50 ppm/K"),
        (9000.0, "Ah", "2.5 Ah"),
        (-0.35, "V", "-350 mV"),
        (0.0, "A", "0 A"),
        (200.0, "", "200"),
        (1.2, "H", "1.2 H"),
    ],
)
def test_writes_as_the_trade_does(value: float, unit: str, text: str) -> None:
    assert write(value, unit) == text
    assert read(text, unit) == pytest.approx(value, rel=1e-15)


def test_rounding_up_takes_the_next_prefix() -> None:
    assert write(999.9, "ohm") == "1k"
    assert write(0.9999e-3, "s") == "1 ms"
    assert write(9.996e-6, "F", digits=2) == "10u"


def test_a_value_is_rounded_once() -> None:
    assert write(363335162426.75, "s", digits=12) == "100926434.007 h"  # 100926434.00743 h


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
def test_what_is_not_finite_is_not_written(value: float) -> None:
    with pytest.raises(QuantityError, match="cannot be written"):
        write(value, "V")


UNITS = ["ohm", "F", "H", "V", "A", "W", "s", "Hz", "K", "J", "lx", "C", "Ah", "m", "A2s", "dB", "%", ""]
QUOTIENTS = ["V/s", "K/W", "1/K", "1/s", "ohm/m", "F/m"]


@given(
    st.sampled_from(UNITS + QUOTIENTS),
    st.floats(min_value=1e-15, max_value=1e12),
    st.sampled_from([-1.0, 1.0]),
    st.integers(min_value=1, max_value=12),
)
def test_what_is_written_reads_the_same_to_its_digits(unit: str, size: float, sign: float, digits: int) -> None:
    text = write(sign * size, unit, digits=digits)
    assume(len(text) <= LONGEST)
    assert read(text, unit) == pytest.approx(sign * size, rel=0.5000001 * 10 ** (1 - digits))
    assert write(read(text, unit), unit, digits=digits) == text


@given(st.floats(min_value=-273, max_value=1000).filter(lambda celsius: celsius == 0 or abs(celsius) > 1e-9))
def test_temperatures_read_as_written(celsius: float) -> None:
    assert read(write(celsius, "degC", digits=12), "degC") == pytest.approx(celsius, rel=1e-11)


def test_an_unknown_unit_name_is_a_mistake_in_the_code() -> None:
    with pytest.raises(KeyError, match="furlong"):
        read("1", "furlong")
