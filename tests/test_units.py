"""Quantities: what is read, what is refused with which words, and how values are shown."""

from __future__ import annotations

import math
import subprocess
import sys
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from optopick.units import QuantityError, format_quantity, format_resistor, parse_quantity, parse_span

READ = [
    ("4.7k", "ohm", 4700.0),
    ("4k7", "ohm", 4700.0),
    ("4K7", "ohm", 4700.0),
    ("4.7 kOhm", "ohm", 4700.0),
    ("4.7 kohm", "ohm", 4700.0),
    ("4.7 kΩ", "ohm", 4700.0),
    ("4.7 k\u2126", "ohm", 4700.0),  # the ohm sign, not the Greek letter
    ("4.7 KΩ", "ohm", 4700.0),
    ("10K", "ohm", 10e3),
    ("4k7 Ω", "ohm", 4700.0),
    ("100R", "ohm", 100.0),
    ("100 R", "ohm", 100.0),
    ("R47", "ohm", 0.47),
    ("4L7", "ohm", 4.7e-3),
    ("4M7", "ohm", 4.7e6),
    ("2.2 MΩ", "ohm", 2.2e6),
    ("2.2 mΩ", "ohm", 2.2e-3),
    ("0R", "ohm", 0.0),
    (330, "ohm", 330.0),
    ("330", "ohm", 330.0),
    ("10 mA", "A", 10e-3),
    ("10mA", "A", 10e-3),
    ("10 uA", "A", 10e-6),
    ("10 \u00b5A", "A", 10e-6),  # micro sign
    ("10 \u03bcA", "A", 10e-6),  # Greek mu
    ("10\u00a0mA", "A", 10e-3),  # space that does not break
    ("1.5e-3 A", "A", 1.5e-3),
    ("1.5e-3 kA", "A", 1.5),
    ("10 MA", "A", 10e6),
    ("2m", "A", 2e-3),
    ("3.3 V", "V", 3.3),
    ("3.3V", "V", 3.3),
    ("  3.3 V ", "V", 3.3),
    ("+5 V", "V", 5.0),
    (".5 V", "V", 0.5),
    ("5. V", "V", 5.0),
    ("3.75 kV", "V", 3750.0),
    ("-20 degC", "degC", -20.0),
    ("-20 °C", "degC", -20.0),
    ("\u221220 \u2103", "degC", -20.0),  # minus sign, one-letter degree Celsius
    ("25 C", "degC", 25.0),
    (70, "degC", 70.0),
    ("52 us", "s", 52e-6),
    ("20 ns", "s", 20e-9),
    ("1 s", "s", 1.0),
    ("40 mW", "W", 40e-3),
    ("15 pF", "F", 15e-12),
    ("4n7", "F", 4.7e-9),
    ("100n", "F", 100e-9),
    ("6 mm", "m", 6e-3),
    ("0.8 cm", "m", 8e-3),
    ("6 m", "m", 6.0),
    ("1 %", "1", 0.01),
    ("50%", "1", 0.5),
    ("1.3", "1", 1.3),
    (1.3, "1", 1.3),
    ("50 %", "%", 0.5),
    ("100 ppm/K", "1/K", 100e-6),
    ("100 ppm/°C", "1/K", 100e-6),
    ("0.4 %/K", "1/K", 0.004),
    ("0.004 1/K", "1/K", 0.004),
    ("10 kHz", "Hz", 10e3),
    ("19.2 kbit/s", "bit/s", 19200.0),
    ("1 Mbit/s", "bit/s", 1e6),
    ("31.25 kBd", "bit/s", 31250.0),
    ("9600 Bd", "bit/s", 9600.0),
    ("9600 baud", "bit/s", 9600.0),
    ("10 years", "h", 87660.0),
    ("1 year", "h", 8766.0),
    ("2 a", "h", 17532.0),
    ("5 days", "h", 120.0),
    ("1000 h", "h", 1000.0),
    (1000, "h", 1000.0),
    ("87.66 kh", "h", 87660.0),
    ("-1.8 mV/K", "V/K", -1.8e-3),
    ("-1.8 mV/°C", "V/K", -1.8e-3),
    ("-0.67 mA/K", "A/K", -0.67e-3),
    ("-1.33 mW/degC", "W/K", -1.33e-3),
    ("0.43 eV", "eV", 0.43),
    ("10 K", "K", 10.0),
]


@pytest.mark.parametrize(("text", "unit", "value"), READ)
def test_reads_exactly(text, unit, value):
    assert parse_quantity(text, unit) == value


NOUN = {
    "V": 'a voltage such as "3.3 V"',
    "A": 'a current such as "10 mA"',
    "ohm": 'a resistance such as "4.7 kohm"',
    "s": 'a time such as "52 us"',
    "W": 'a power such as "40 mW"',
    "F": 'a capacitance such as "15 pF"',
    "m": 'a length such as "6 mm"',
    "degC": 'a temperature such as "25 degC"',
    "1": 'a ratio such as "50 %"',
    "%": 'a ratio such as "50 %"',
    "1/K": 'a temperature coefficient such as "100 ppm/K"',
    "Hz": 'a frequency such as "10 kHz"',
    "bit/s": 'a bit rate such as "19.2 kbit/s"',
    "h": 'a life such as "10 years"',
    "V/K": 'a voltage slope such as "-1.8 mV/K"',
    "A/K": 'a current slope such as "-0.7 mA/K"',
    "W/K": 'a power slope such as "-1.3 mW/K"',
    "eV": 'an energy such as "0.43 eV"',
    "K": 'a temperature difference such as "10 K"',
}

REFUSED = [
    ("10 mA", "V", '"10 mA"'),
    ("100R", "V", '"100R"'),  # plain quantiphy: 1e29
    ("4k7", "V", '"4k7"'),  # plain quantiphy: 4 of a unit k7
    ("4V7", "V", '"4V7"'),
    ("10 KV", "V", '"10 KV"'),
    ("5 v", "V", '"5 v"'),
    ("5 V 3", "V", '"5 V 3"'),
    ("V 5", "V", '"V 5"'),
    ("a = 5 V", "V", '"a = 5 V"'),
    ("5 V # nominal", "V", '"5 V # nominal"'),
    ("5 V#x", "V", '"5 V#x"'),
    ("1 000 V", "V", '"1 000 V"'),
    ("1_000 V", "V", '"1_000 V"'),
    ("- 5 V", "V", '"- 5 V"'),
    ("0x10 V", "V", '"0x10 V"'),
    ("5² V", "V", '"5² V"'),
    ("٣ V", "V", '"٣ V"'),
    ("five volts", "V", '"five volts"'),
    ("", "V", '""'),
    ("   ", "V", '"   "'),
    ("V", "V", '"V"'),
    ("1e400 V", "V", '"1e400 V"'),
    ("1e999999999 kV", "V", '"1e999999999 kV"'),
    ("inf", "V", '"inf"'),
    ("nan V", "V", '"nan V"'),
    ("5 V\n", "A", '"5 V\\n"'),
    ('5 "', "V", '"5 \\""'),
    ("x" * 100, "V", '"' + "x" * 57 + '..."'),
    (math.inf, "V", "inf"),
    (math.nan, "V", "nan"),
    (10**400, "V", "a number of more than 60 digits"),
    (True, "V", "true"),
    (False, "1", "false"),
    (None, "V", "nothing"),
    ({}, "V", "a table"),
    ([1.0, "2 V"], "V", '[1.0, "2 V"]'),
    ("4m7", "ohm", '"4m7"'),
    ("4k7x", "ohm", '"4k7x"'),
    ("4k7 V", "ohm", '"4k7 V"'),
    ("4n7", "ohm", '"4n7"'),
    ("100RJ", "ohm", '"100RJ"'),
    ("-4k7", "ohm", '"-4k7"'),
    ("R", "ohm", '"R"'),
    ("1 Meg", "ohm", '"1 Meg"'),
    ("1 Kbit/s", "bit/s", '"1 Kbit/s"'),
    ("9600 B/s", "bit/s", '"9600 B/s"'),
    ("10R", "F", '"10R"'),
    ("4k7", "F", '"4k7"'),
    ("5 m", "s", '"5 m"'),
    ("5 min", "s", '"5 min"'),
    ("300 K", "degC", '"300 K"'),
    ("77 °F", "degC", '"77 °F"'),
    ("1 mdegC", "degC", '"1 mdegC"'),
    ("10 degC", "K", '"10 degC"'),
    ("10 k", "K", '"10 k"'),
    ("6 k", "m", '"6 k"'),
    ("1k", "1", '"1k"'),
    ("50 percent", "%", '"50 percent"'),
    ("100 ppm", "1/K", '"100 ppm"'),
    ("1e-41/K", "1/K", '"1e-41/K"'),
    ("10 s", "Hz", '"10 s"'),
    ("10 y", "h", '"10 y"'),
    ("10 s", "h", '"10 s"'),
    ("40 mA", "W", '"40 mA"'),
    ("2 mV", "V/K", '"2 mV"'),
    ("2 mV/K", "A/K", '"2 mV/K"'),
    ("2 mW", "W/K", '"2 mW"'),
    ("0.43 V", "eV", '"0.43 V"'),
]


@pytest.mark.parametrize(("text", "unit", "found"), REFUSED)
def test_refuses_with_the_exact_words(text, unit, found):
    with pytest.raises(QuantityError) as refusal:
        parse_quantity(text, unit)
    assert refusal.value.found == found
    assert refusal.value.expected == NOUN[unit]
    assert str(refusal.value) == f"found {found}; expected {NOUN[unit]}"


def test_a_comma_is_answered_with_the_decimal_point():
    with pytest.raises(QuantityError) as refusal:
        parse_quantity("1,5 V", "V")
    assert str(refusal.value) == 'found "1,5 V"; expected a voltage such as "3.3 V", with a decimal point'


def test_the_example_of_every_message_can_be_read():
    for unit, text in NOUN.items():
        assert math.isfinite(parse_quantity(text.split('"')[1], unit))


def test_an_unknown_unit_is_the_callers_fault():
    with pytest.raises(KeyError):
        parse_quantity("1 V", "furlong")


def test_spans():
    assert parse_span(["3.0 V", "3.6 V"], "V") == (3.0, 3.6)
    assert parse_span(["3.3 V", 3.3], "V") == (3.3, 3.3)
    assert parse_span("3.3 V", "V") == (3.3, 3.3)
    assert parse_span(5, "V") == (5.0, 5.0)


@pytest.mark.parametrize(
    ("value", "message"),
    [
        (["3.6 V", "3.0 V"], 'found ["3.6 V", "3.0 V"]; expected the lowest value first'),
        (["3 V"], 'found ["3 V"]; expected a voltage such as "3.3 V", or a list of two, lowest first'),
        ([], 'found []; expected a voltage such as "3.3 V", or a list of two, lowest first'),
        ([1, 2, 3], 'found [1, 2, 3]; expected a voltage such as "3.3 V", or a list of two, lowest first'),
        (["3 V", "5 A"], 'found "5 A"; expected a voltage such as "3.3 V"'),
        ("3 A", 'found "3 A"; expected a voltage such as "3.3 V"'),
        (True, 'found true; expected a voltage such as "3.3 V"'),
    ],
)
def test_bad_spans(value, message):
    with pytest.raises(QuantityError) as refusal:
        parse_span(value, "V")
    assert str(refusal.value) == message


SHOWN = [
    (4700, "ohm", "4.7 kΩ"),
    (52e-6, "s", "52 µs"),
    (0.01, "A", "10 mA"),
    (-20, "degC", "-20 °C"),
    (-20.5, "degC", "-20.5 °C"),
    (0.5, "%", "50 %"),
    (0.07, "%", "7 %"),
    (1.3, "1", "1.3"),
    (1.30149, "1", "1.3"),
    (1234.4, "1", "1234"),
    (1.0, "1", "1"),
    (100.0, "1", "100"),
    (87660, "h", "10 years"),
    (8766, "h", "1 year"),
    (13149, "h", "1.5 years"),
    (1000, "h", "1000 h"),
    (19200, "bit/s", "19.2 kbit/s"),
    (15e-12, "F", "15 pF"),
    (6e-3, "m", "6 mm"),
    (3750, "V", "3.75 kV"),
    (330e3, "V", "330 kV"),
    (3.0, "V", "3 V"),
    (999.96, "V", "1 kV"),
    (999.4, "V", "999 V"),
    (0, "V", "0 V"),
    (-0.0, "V", "0 V"),
    (-0.0, "degC", "0 °C"),
    (0, "h", "0 h"),
    (-5e-3, "A", "-5 mA"),
    (1e-15, "F", "1 fF"),
    (100e-6, "1/K", "100 ppm/K"),
    (0.004, "1/K", "0.4 %/K"),
    (-1.8e-3, "V/K", "-1.8 mV/K"),
    (-1.33e-3, "W/K", "-1.33 mW/K"),
    (0.43, "eV", "0.43 eV"),
    (10, "K", "10 K"),
    (10e3, "Hz", "10 kHz"),
    (math.inf, "s", "∞"),
    (-math.inf, "s", "-∞"),
    (math.nan, "s", "n/a"),
]


@pytest.mark.parametrize(("value", "unit", "text"), SHOWN)
def test_shows(value, unit, text):
    assert format_quantity(value, unit) == text


def test_digits_are_asked_for():
    assert format_quantity(1.23456e-6, "s", 2) == "1.2 µs"
    assert format_quantity(1.23456e-6, "s", 5) == "1.2346 µs"
    assert format_quantity(1.23456, "1", 2) == "1.2"


@pytest.mark.parametrize(
    ("ohms", "text"),
    [
        (330, "330 Ω"),
        (2200, "2.2 kΩ"),
        (1.02e6, "1.02 MΩ"),
        (0.47, "0.47 Ω"),
        (10, "10 Ω"),
        (9880, "9.88 kΩ"),
        (1001, "1.001 kΩ"),
        (0, "0 Ω"),
    ],
)
def test_shows_resistors(ohms, text):
    assert format_resistor(ohms) == text


SCALED = st.sampled_from(["V", "A", "ohm", "s", "W", "F", "Hz", "bit/s", "V/K", "A/K", "W/K"])
UNSCALED = st.sampled_from(["degC", "1", "%", "1/K", "h", "eV", "K"])
MAGNITUDE = st.floats(1e-12, 1e12) | st.floats(-1e12, -1e-12) | st.just(0.0)


@given(MAGNITUDE, SCALED | UNSCALED, st.integers(2, 12))
def test_what_is_shown_reads_back_within_its_digits(value, unit, digits):
    back = parse_quantity(format_quantity(value, unit, digits), unit)
    assert back == pytest.approx(value, rel=0.51 * 10 ** (1 - digits), abs=0)


@given(MAGNITUDE, SCALED | UNSCALED)
def test_shown_values_have_no_exponent_and_no_idle_zeros(value, unit):
    number = format_quantity(value, unit).split(" ")[0]
    assert "e" not in number.lower()
    assert "." not in number or not number.endswith(("0", "."))


@given(st.floats(allow_nan=False, allow_infinity=False), st.sampled_from(["V", "h", "degC", "1"]))
def test_plain_numbers_are_si_as_number_and_as_text(value, unit):
    assert parse_quantity(value, unit) == value
    assert parse_quantity(repr(value), unit) == pytest.approx(value, rel=1e-15)


@given(st.text(max_size=12) | st.text('0147.,eE+-kKmMuµnpRLΩohmVAs%/° "#', max_size=9), SCALED | UNSCALED)
def test_any_text_is_read_or_refused_and_nothing_else(text, unit):
    try:
        assert math.isfinite(parse_quantity(text, unit))
    except QuantityError as refusal:
        assert refusal.expected.startswith(NOUN[unit])


@given(st.integers(1, 999), st.sampled_from([("R", 0), ("K", 3), ("k", 3), ("M", 6), ("G", 9), ("L", -3)]))
def test_resistor_codes_decode_with_the_letter_at_each_place(number, letter):
    code, exponent = letter
    digits = str(number)
    for place in range(len(digits) + 1):
        text = digits[:place] + code + digits[place:]
        assert parse_quantity(text, "ohm") == float(f"{number}e{exponent - (len(digits) - place)}")


@given(st.integers(1, 999), st.sampled_from([("p", -12), ("n", -9), ("u", -6), ("µ", -6), ("m", -3)]))
def test_capacitor_codes_decode_and_are_no_resistances(number, letter):
    code, exponent = letter
    digits = str(number)
    text = f"{digits[0]}{code}{digits[1:] or '0'}"
    decimals = len(digits[1:] or "0")
    assert parse_quantity(text, "F") == float(f"{digits[0]}{digits[1:] or '0'}e{exponent - decimals}")
    with pytest.raises(QuantityError):
        parse_quantity(text, "ohm")


def test_quantiphy_settings_of_others_stay_as_they_were():
    # rkm_codes itself narrows the input scale factors of the base class; everything shown is left alone
    code = (
        "from quantiphy import Quantity; import rkm_codes; before = [Quantity.get_pref(k) for k in KEYS];"
        "import optopick.units; assert before == [Quantity.get_pref(k) for k in KEYS]"
    )
    keys = "KEYS = ('input_sf', 'output_sf', 'map_sf', 'spacer', 'strip_zeros', 'prec');"
    subprocess.run([sys.executable, "-c", keys + code], check=True, cwd=Path(__file__).parents[1])
