"""How near the product comes to the simulator, and what guard that asks for."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest

from optopick.keys import brief_sections
from optopick.physics import switching
from optopick.physics.charge import Base, Load
from optopick.physics.transfer import led_current_for
from tests.reference.compare import BEYOND, GUARDED, LATE, Ratios, guard, product_ratios, ratios, report, summary
from tests.reference.predict import (
    C_BE,
    PREDICTORS,
    V_BE,
    T,
    constants_of_plain_row,
    constants_of_rows,
    plain_row,
    saturated_row,
    transfer_of,
)
from tests.reference.record import RECORDS, read_record
from tests.reference.sheet import Sheet

SHEETS = [sheet for name in RECORDS for sheet in read_record(name).sheets.values()]


@pytest.mark.parametrize("name", RECORDS)
@pytest.mark.parametrize("predictor", PREDICTORS)
def test_predictions_are_within_reach(name: str, predictor: str) -> None:
    record = read_record(name)
    for quantity, ratio in ratios(PREDICTORS[predictor], record.entries, record.sheets).by_quantity.items():
        assert abs(np.median(ratio) - 1.0) < 0.10, quantity
        assert np.mean(np.abs(ratio - 1.0) <= 0.25) > 0.95, quantity
        assert np.all((ratio > 0.6) & (ratio < 1.8)), quantity


def test_every_circuit_is_compared_once() -> None:
    record = read_record("record")
    found = ratios(PREDICTORS["product"], record.entries, record.sheets)
    assert len(found.entries) == len(record.entries) == len(set(map(id, found.entries)))
    lines = report(record, "product")
    assert f"product, all ({len(record.entries)} circuits)" in lines


@pytest.mark.parametrize("sheet", SHEETS, ids=lambda s: s.name)
def test_constants_give_the_rows_back(sheet: Sheet) -> None:
    """Both rows by the physics from the constants, nothing to fall back on; of the plain row alone that row."""
    transfer, plain, saturated = transfer_of(sheet), plain_row(sheet), saturated_row(sheet)
    both, alone = constants_of_rows(sheet), constants_of_plain_row(sheet)
    assert both.assumed == ()
    assert not any("; so " in item.rule for item in alone.assumed)
    of_plain = Load(plain.i_c, plain.v_cc, plain.i_c * plain.r_l, plain.r_l, 0.0, T)
    swing = saturated.v_cc - saturated.v_ce
    of_saturated = Load(swing / saturated.r_l, saturated.v_cc, swing, saturated.r_l, 0.0, T)
    for found in (both, alone):
        base = Base(found.tau_0 / sheet.h_fe, found.c_m / sheet.h_fe, C_BE, V_BE, sheet.ctr / sheet.h_fe)
        edge = switching.steps(base, of_plain, transfer, sheet.ctr, switching.EDGE)
        n = led_current_for(transfer, sheet.ctr, 1.0, plain.i_c)
        longer = switching.time_off(edge, 0.0) if sheet.t_f > sheet.t_r else switching.time_on(edge, n)
        assert float(longer) == pytest.approx(max(sheet.t_r, sheet.t_f), rel=1e-9)
    base = Base(both.tau_0 / sheet.h_fe, both.c_m / sheet.h_fe, C_BE, V_BE, sheet.ctr / sheet.h_fe)
    fall, tenth = (
        float(switching.time_off(switching.steps(base, of_saturated, transfer, sheet.ctr, cut), 0.0))
        for cut in (switching.EDGE, switching.FIRST_TENTH)
    )
    assert fall == pytest.approx(sheet.t_off - sheet.t_s, rel=1e-9)
    i_sat = float(led_current_for(transfer, sheet.ctr, 1.0, of_saturated.j_s))
    assert both.tau_s * math.log(saturated.i_f / i_sat) + tenth == pytest.approx(sheet.t_s, rel=1e-9)


# ---- the guard ------------------------------------------------------------------------------------------------------


def test_the_guard_leaves_one_in_five_hundred() -> None:
    """Of four quantities with 250 circuits each two may be later, and it is the third that sets the guard."""
    simulated_over_predicted = np.ones(1000)
    simulated_over_predicted[[3, 500, 999]] = 1.5, 1.7, 1.4
    parts = np.split(1.0 / simulated_over_predicted, 4)
    by_quantity = dict(zip(GUARDED, parts, strict=True)) | {"storage": np.full(250, 0.1)}  # no limit asks for that
    assert guard([Ratios(by_quantity, ())]) == pytest.approx(1.4)


def test_the_default_guard_covers_all_but_one_in_five_hundred() -> None:
    found = list(product_ratios().values())
    late = np.concatenate([1.0 / r.by_quantity[name] for r in found for name in GUARDED])
    least, default = guard(found), default_guard()
    assert late.size == 1800 * 4
    assert np.mean(late > least * (1 + 1e-12)) <= BEYOND < np.mean(late >= least * (1 - 1e-12))
    assert default == pytest.approx(math.ceil(least / 0.05) * 0.05)
    assert default == LATE


def default_guard() -> float:
    keys = (key for section in brief_sections() for key in section.keys)
    return float(next(key.default for key in keys if key.path == "limits.timing_guard"))


def test_the_table_of_the_readme_is_that_of_the_records() -> None:
    text = (Path(__file__).parent / "README.md").read_text(encoding="utf-8")
    assert "\n".join(summary()) in text, "put the first lines of python -m tests.reference.compare there"
