"""Preferred values and marking codes against published values.

Sources: IEC 60063 sums and exceptions as computed with the PyPI library `eseries` 1.2.1 (used here as the reference);
IEC 60062 codes as read in encyclopaedia articles on the code.
"""

from __future__ import annotations

import eseries as reference
import pytest

from optopick.eseries import SERIES, decade, series_values
from optopick.units import QuantityError, parse_quantity

REFERENCE = {
    "E3": reference.E3,
    "E6": reference.E6,
    "E12": reference.E12,
    "E24": reference.E24,
    "E48": reference.E48,
    "E96": reference.E96,
    "E192": reference.E192,
}


def formula(count: int, digits: int) -> list[int]:
    return [round(10 ** (step / count + digits - 1)) for step in range(count)]


def test_e12():
    # IEC 60063
    assert decade("E12") == (10, 12, 15, 18, 22, 27, 33, 39, 47, 56, 68, 82)


@pytest.mark.parametrize(("name", "total"), [("E24", 901), ("E48", 18313), ("E96", 37070), ("E192", 74599)])
def test_sums_of_one_decade(name, total):
    # IEC 60063 by way of eseries 1.2.1
    assert sum(decade(name)) == total


@pytest.mark.parametrize("name", SERIES)
def test_as_many_values_as_the_name_says(name):
    assert len(decade(name)) == len(set(decade(name))) == int(name[1:])
    assert list(decade(name)) == sorted(decade(name))


def test_e24_leaves_the_formula_at_exactly_eight_values():
    # IEC 60063
    differing = [value for value, rule in zip(decade("E24"), formula(24, 2), strict=True) if value != rule]
    assert differing == [27, 30, 33, 36, 39, 43, 47, 82]


@pytest.mark.parametrize("name", ["E48", "E96"])
def test_e48_and_e96_follow_the_formula(name):
    # IEC 60063
    assert list(decade(name)) == formula(int(name[1:]), 3)


def test_e192_leaves_the_formula_once():
    # IEC 60063: 9.20 where the formula gives 9.19
    differing = [pair for pair in zip(decade("E192"), formula(192, 3), strict=True) if pair[0] != pair[1]]
    assert differing == [(920, 919)]


@pytest.mark.parametrize(
    ("small", "large"), [("E3", "E6"), ("E6", "E12"), ("E12", "E24"), ("E48", "E96"), ("E96", "E192")]
)
def test_subsets(small, large):
    # IEC 60063
    assert set(decade(small)) < set(decade(large))


def test_e24_is_no_subset_of_e96():
    # IEC 60063
    assert not {10 * value for value in decade("E24")} <= set(decade("E96"))


@pytest.mark.parametrize("name", SERIES)
def test_one_decade_against_the_reference(name):
    # eseries 1.2.1
    assert list(decade(name)) == [round(value) for value in reference.series(REFERENCE[name])]


@pytest.mark.parametrize("name", SERIES)
def test_a_range_against_the_reference(name):
    # eseries 1.2.1; its floats carry rounding, ours are exact
    theirs = list(reference.erange(REFERENCE[name], 10, 1e6))
    assert list(series_values(name, 10, 1e6)) == pytest.approx(theirs, rel=1e-12)


@pytest.mark.parametrize(
    ("code", "ohms"),
    [
        ("R47", 0.47),
        ("4R7", 4.7),
        ("470R", 470.0),
        ("4K7", 4.7e3),
        ("47K3", 47.3e3),
        ("4M7", 4.7e6),
        ("R300", 0.300),
    ],
)
def test_marking_codes(code, ohms):
    # IEC 60062, read in encyclopaedia articles on the code
    assert parse_quantity(code, "ohm") == ohms


@pytest.mark.parametrize("code", ["R47", "4R7", "470R", "4K7", "47K3", "4M7", "R300"])
@pytest.mark.parametrize("unit", ["V", "A", "s", "W", "F", "Hz"])
def test_marking_codes_of_resistors_are_nothing_else(code, unit):
    with pytest.raises(QuantityError):
        parse_quantity(code, unit)
