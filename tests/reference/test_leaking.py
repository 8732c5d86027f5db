"""How near the product comes to the simulator where light is left in the dark LED and dark current flows."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from optopick.physics.types import Array
from tests.reference.compare import Ratios, comes_back, endless, product_ratios, ratios
from tests.reference.integrate import by_parameters, by_rows
from tests.reference.predict import Links, Predicted, links, product, rest_of
from tests.reference.record import LEAKING, Entry, read_record, write_record
from tests.reference.sheet import CURVE_I, Sheet

STRIDE = 30
OFF = ("edge_off", "storage", "delay_off")


@pytest.fixture(scope="module")
def back() -> Ratios:
    """Of the circuits whose output comes back."""
    found = product_ratios((LEAKING,))[LEAKING]
    return found.part(comes_back(found.entries))


@pytest.mark.parametrize("quantity", OFF)
def test_times_off_are_within_reach(back: Ratios, quantity: str) -> None:
    ratio = back.by_quantity[quantity]
    assert np.isfinite(ratio).sum() > 810
    assert abs(np.median(ratio) - 1.0) < 0.05
    # an allowance for high supplies errs on the late side
    assert np.mean(np.abs(ratio - 1.0) <= 0.25) > (0.95 if quantity == "delay_off" else 0.98)
    assert ratio.min() > 0.7


@pytest.mark.parametrize("quantity", ["edge_on", "delay_on"])
def test_times_on_err_on_the_late_side(back: Ratios, quantity: str) -> None:
    """They count nothing that is left: what is, charges the base beforehand."""
    ratio = back.by_quantity[quantity]
    assert np.median(ratio) > 1.0
    assert ratio.min() > 0.7


@pytest.mark.parametrize("quantity", OFF)
def test_without_what_is_left_times_off_would_be_out_of_reach(quantity: str) -> None:
    """The comparison can tell whether i_rest counts."""
    record = read_record(LEAKING)

    def nothing_left(sheet: Sheet, x: Links) -> Predicted:
        none: Array = np.zeros_like(x.i_off)
        return product(sheet, replace(x, i_off=none, i_ceo=none))

    found = ratios(nothing_left, record.entries, record.sheets)
    assert np.min(found.part(comes_back(found.entries)).by_quantity[quantity]) < 0.6


def test_endless_delays_are_predicted() -> None:
    """All of them, and few others."""
    found = endless(read_record(LEAKING))
    assert found.stays == found.found > 50
    assert found.early < 0.02 * 831


def test_what_is_left_adds_up() -> None:
    """Light as it is, dark current as the LED current that the sheet's curve gives it."""
    record = read_record(LEAKING)
    sheet = record.sheets["plain"]
    own = [e for e in record.entries if e.device == "plain"]
    rest, stated = rest_of(sheet, links(own)), np.array([e.i_ceo for e in own])
    left = np.array([e.circuit.i_off for e in own])
    at_base = np.array([e.circuit.i_dark for e in own]) * sheet.h_fe / sheet.ctr
    assert np.all(rest >= left)
    inside = at_base > CURVE_I[0]
    assert np.sum(inside) > 5
    np.testing.assert_allclose((rest - left)[inside], at_base[inside], rtol=0.15)
    assert rest_of(sheet, replace(links(own), i_ceo=np.zeros_like(stated))) == pytest.approx(left)


def test_integration_with_the_devices_own_parameters_agrees() -> None:
    off = _off(by_parameters(STRIDE))
    assert np.mean(off < 0.03) > 0.96
    assert off.max() < 0.12


def test_integration_with_the_data_sheets_rows_is_near() -> None:
    off = _off(by_rows(STRIDE))
    assert np.median(off) < 0.07
    assert np.mean(off < 0.25) > 0.93
    assert off.max() < 0.8


def _off(found: Array) -> Array:
    compared = found[~np.isnan(found)]
    assert compared.size > 0.98 * found.size
    return np.asarray(np.abs(compared - 1.0))


def test_a_record_reads_as_written(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    record = read_record(LEAKING)
    some = [next(e for e in record.entries if wanted(e)) for wanted in (_stays, _with_base, _dark)]
    monkeypatch.setattr("tests.reference.record.HERE", tmp_path)
    write_record("some", replace(record, entries=tuple(some)))
    again = read_record("some")
    assert str(again) == str(replace(record, entries=tuple(some)))  # as words: nan is not itself


def _stays(e: Entry) -> bool:
    return bool(np.isnan(e.times.delay_off))


def _with_base(e: Entry) -> bool:
    return e.circuit.r_be is not None and e.circuit.i_off > 0


def _dark(e: Entry) -> bool:
    return e.circuit.i_off == 0 and e.circuit.i_dark == 0
