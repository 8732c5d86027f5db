"""Preferred values as floats over a range, neighbours and nearest, and the words of a refusal."""

from __future__ import annotations

import math
from decimal import Decimal

import pytest
from hypothesis import given
from hypothesis import strategies as st

from optopick.eseries import SERIES, decade, nearest, neighbours, series_values


def test_values_are_the_nearest_floats():
    assert series_values("E12", 1, 10) == (1.0, 1.2, 1.5, 1.8, 2.2, 2.7, 3.3, 3.9, 4.7, 5.6, 6.8, 8.2, 10.0)
    assert 0.47 in series_values("E6", 0.1, 1)
    assert 4700.0 in series_values("E3", 1e3, 1e4)
    assert 1.02e6 in series_values("E96", 1e6, 1e7)


@pytest.mark.parametrize("name", SERIES)
def test_every_value_is_the_float_of_its_shortest_text(name):
    members = decade(name)
    for value in series_values(name, 1e-3, 1e7):
        digits = Decimal(repr(value)).normalize().as_tuple().digits  # repr is the shortest text of a float
        text = "".join(str(digit) for digit in digits)
        assert int(text.ljust(len(str(members[0])), "0")) in members


def test_the_range_includes_its_ends():
    assert series_values("E24", 330, 390) == (330.0, 360.0, 390.0)
    assert series_values("E24", 330.1, 389.9) == (360.0,)
    assert series_values("E24", 0.33, 0.33) == (0.33,)
    # limits that arithmetic moved by a rounding step, the lower one up, the upper one down
    assert 3 * 0.1 > 0.3
    assert 4.3 - 4 < 0.3
    assert series_values("E24", 3 * 0.1, 0.33) == (0.3, 0.33)
    assert series_values("E24", 0.27, 4.3 - 4) == (0.27, 0.3)


def test_ten_ohm_to_one_megohm():
    values = series_values("E24", 10, 1e6)
    assert len(values) == 5 * 24 + 1
    assert values[0] == 10.0
    assert values[-1] == 1e6


@given(st.sampled_from(SERIES), st.floats(1e-3, 1e9), st.floats(1, 1e6))
def test_ascending_distinct_and_inside(name, low, ratio):
    high = low * ratio
    try:
        values = series_values(name, low, high)
    except ValueError:
        assert ratio < 2.3  # the widest gap, E3's 2.2 to 4.7, is 2.14
        return
    assert list(values) == sorted(set(values))
    assert low * (1 - 1e-8) <= values[0]
    assert values[-1] <= high * (1 + 1e-8)


@given(st.sampled_from(SERIES), st.floats(1e-6, 1e9))
def test_neighbours_enclose_and_nothing_lies_between(name, value):
    below, above = neighbours(name, value)
    assert below * (1 - 1e-8) <= value <= above * (1 + 1e-8)
    assert series_values(name, below, above) in ((below, above), (below,))
    assert nearest(name, value) in (below, above)


@given(st.sampled_from(SERIES), st.floats(1e-6, 1e9))
def test_nearest_is_least_in_ratio(name, value):
    chosen = nearest(name, value)
    best = min(abs(math.log(member / value)) for member in series_values(name, value / 10, value * 10))
    assert abs(math.log(chosen / value)) <= best + 1e-12


def test_known_neighbours():
    assert neighbours("E12", 5000) == (4700.0, 5600.0)
    assert neighbours("E12", 4700) == (4700.0, 4700.0)
    assert neighbours("E12", 9.5) == (8.2, 10.0)
    assert neighbours("E3", 1.0) == (1.0, 1.0)
    assert neighbours("E24", 9.9999998) == (9.1, 10.0)
    assert neighbours("E24", 10.0000002) == (10.0, 11.0)
    assert nearest("E12", 5000) == 4700.0
    assert nearest("E12", 5200) == 5600.0
    assert nearest("E6", 9) == 10.0


NAMES = "E3, E6, E12, E24, E48, E96, E192"


@pytest.mark.parametrize(
    ("name", "low", "high", "message"),
    [
        ("E25", 1, 10, f'unknown series "E25"; expected one of {NAMES}'),
        ("e24", 1, 10, f'unknown series "e24"; expected one of {NAMES}'),
        ("", 1, 10, f'unknown series ""; expected one of {NAMES}'),
        ("E24", 10, 1, "range 10 to 1; expected two positive values, the lowest first"),
        ("E24", 0, 1, "range 0 to 1; expected two positive values, the lowest first"),
        ("E24", -5, 1, "range -5 to 1; expected two positive values, the lowest first"),
        ("E24", 1, math.inf, "range 1 to inf; expected two positive values, the lowest first"),
        ("E24", math.nan, 1, "range nan to 1; expected two positive values, the lowest first"),
        ("E3", 23, 46, "no value of E3 lies from 23 to 46; expected a range with one at least"),
    ],
)
def test_refusals(name, low, high, message):
    with pytest.raises(ValueError) as refusal:
        series_values(name, low, high)
    assert str(refusal.value) == message


@pytest.mark.parametrize("value", [0, -1, math.inf, math.nan])
@pytest.mark.parametrize("function", [nearest, neighbours])
def test_nothing_is_near_an_impossible_value(function, value):
    with pytest.raises(ValueError) as refusal:
        function("E24", value)
    assert str(refusal.value) == f"value {value:g}; expected a positive, finite one"


@pytest.mark.parametrize("function", [nearest, neighbours])
def test_unknown_names_are_refused_everywhere(function):
    with pytest.raises(ValueError, match="unknown series"):
        function("E13", 1.0)
