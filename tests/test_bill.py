"""The bill of materials."""

from __future__ import annotations

import csv
import io
from dataclasses import replace

import report_samples as samples

from optopick.brief import Position
from optopick.report.bill import COLUMNS, bill_csv
from optopick.report.placed import package_hint, placed_resistors, resistors_words
from optopick.result import Design


def rows(brief, coupler, design) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(bill_csv(brief, coupler, design))))


def test_rows():
    """The coupler first, then each resistor with what the stock says; a price only where one is known."""
    brief, coupler, design = samples.link()
    found = rows(brief, replace(coupler, price=0.19), design)
    assert bill_csv(brief, coupler, design).splitlines()[0] == ",".join(COLUMNS)
    assert [tuple(row.values()) for row in found] == [
        ("1", "INV-7", "", "", "coupler", "0.19"),
        ("1", "470 Ω", "1 %", "250 mW, 200 V", "r_led", ""),
        ("1", "10 kΩ", "1 %", "250 mW, 200 V", "r_load", ""),
        ("1", "220 kΩ", "1 %", "250 mW, 200 V", "r_be", ""),
        ("1", "4.7 kΩ", "1 %", "250 mW, 200 V", "r_shunt", ""),
    ]


def test_one_reel_one_row():
    """Positions with the same resistor share a row; another tolerance, rating or price is another reel."""
    brief, coupler, _ = samples.link()
    design = Design(coupler.part, 1000.0, 1000.0, None, 1000.0)
    assert rows(brief, coupler, design)[1] == {
        "quantity": "3",
        "value": "1 kΩ",
        "tolerance": "1 %",
        "rating": "250 mW, 200 V",
        "positions": "r_led r_load r_shunt",
        "price": "",
    }
    dearer = Position((1000.0,), (0.01,), (0.25,), (200.0,), (0.05,), False, "a reel")
    split = rows(replace(brief, stock=replace(brief.stock, r_load=dearer)), coupler, design)
    assert [(row["quantity"], row["positions"], row["price"]) for row in split[1:]] == [
        ("2", "r_led r_shunt", ""),
        ("1", "r_load", "0.05"),
    ]


def test_pieces_and_diode():
    """Resistors in series are counted one by one; the diode is on the bill."""
    brief, coupler, design = samples.link()
    found = rows(brief, coupler, replace(design, pieces=3, reverse_diode=True))
    assert (found[1]["quantity"], found[1]["value"], found[1]["positions"]) == ("3", "470 Ω", "r_led")
    assert (found[-1]["quantity"], found[-1]["value"], found[-1]["positions"]) == ("1", "diode", "reverse_diode")


def test_a_value_that_is_not_in_stock():
    """It is on the bill, with nothing claimed about it."""
    brief, coupler, design = samples.link()
    found = rows(brief, coupler, replace(design, r_led=123.0))
    assert tuple(found[1].values()) == ("1", "123 Ω", "", "", "r_led", "")
    odd = placed_resistors(brief, replace(design, r_led=123.0))[0]
    assert (odd.stocked, odd.described) == (False, "not in the stock (E12)")
    bare = replace(brief, stock=replace(brief.stock, r_shunt=None))
    assert placed_resistors(bare, design)[-1].described == "the brief has no stock here"


def test_package_hints():
    """0.1 W in 0603 and 0.125 W in 0805: two makers' data sheets; the others from memory."""
    assert package_hint(0.1) == "0603"
    assert package_hint(0.125) == "0805"
    assert package_hint(0.2) == "1206"
    assert package_hint(0.05) == "0402"
    assert package_hint(3.0) == ""
    assert package_hint(None) == ""


def test_resistors_in_words():
    _, _, design = samples.link()
    words = resistors_words(replace(design, pieces=2, r_be=None, reverse_diode=True)).replace("\u00a0", " ")
    assert words == "R_LED 2 × 470 Ω, R_load 10 kΩ, R_shunt 4.7 kΩ, reverse diode"


def test_quoting():
    """A part number with the separator in it stays one cell."""
    brief, coupler, design = samples.link()
    assert rows(brief, replace(coupler, part='INV,"7"'), design)[0]["value"] == 'INV,"7"'
