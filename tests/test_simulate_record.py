"""The simulated output against the recorded circuit simulations of tests/reference.

Given the recorded devices' own parameters, it checks the integration; given only their data sheet rows, it shows what a
coupler table's row is worth: `python tests/test_simulate_record.py` prints both over the whole of both records.
"""

from __future__ import annotations

import math
import sys
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest
import random_links

sys.path.insert(0, str(Path(__file__).parents[1]))

from optopick.coupler import Coupler
from optopick.physics.types import Array
from optopick.simulate.corner import TIMES, Corner
from optopick.simulate.device import Device, device_at
from optopick.simulate.gain import gain_law
from optopick.simulate.junction import Junction
from optopick.simulate.measure import pulse_times
from optopick.simulate.transient import Circuit, Phase, run
from tests.reference.devices import Device as Parameters
from tests.reference.generate import devices_of
from tests.reference.predict import C_BE, V_BE, constants_of_rows, transfer_of
from tests.reference.record import RECORDS, Entry, read_record
from tests.reference.sheet import V_CE_SAT_I_C, V_CE_SAT_I_F, Sheet
from tests.reference.simulate import OFF_THRESHOLD, ON_THRESHOLD

V_T = 0.025692579
STRIDE = 23


def true_device(p: Parameters) -> Device:
    """The device of the record itself; its resistances apart, of which r_c counts as part of the load."""
    forward = np.geomspace(1e-9, 0.3, 20)
    high_level = (1 + np.sqrt(1 + 4 * forward / p.i_kf)) / 2
    base = forward / p.b_f + p.i_se * (forward / p.i_s) ** (1 / p.n_e)
    return Device(
        eta=p.eta,
        v_t=V_T,
        i_s=p.i_s,
        gain=gain_law(forward / high_level, base),
        beta_r=p.b_r,
        tau_f=p.t_f,
        tau_r=p.t_r,
        emitter=Junction(p.c_je, 0.75, 0.33),
        collector=Junction(p.c_jc, p.v_jc, p.m_jc),
        v_off=0.0,
        i_cbo=p.i_cbo,
        v_af=p.v_af,
    )


@cache
def coupler_of(sheet: Sheet) -> Coupler:
    """The coupler of a data sheet, its switching constants by optopick's rules for both switching rows."""
    coupler, constants = random_links.coupler(np.random.default_rng(1)), constants_of_rows(sheet)
    assert coupler.transistor is not None
    transistor = replace(
        coupler.transistor,
        h_fe=sheet.h_fe,
        v_be=V_BE,
        v_ce_sat=sheet.v_ce_sat,
        sat_i_f=V_CE_SAT_I_F,
        sat_i_c=V_CE_SAT_I_C,
        c_be=C_BE,
        tau_0=constants.tau_0,
        c_m=constants.c_m,
        tau_s=constants.tau_s,
    )
    return replace(coupler, transfer=transfer_of(sheet), transistor=transistor)


def device_of_rows(e: Entry, sheet: Sheet) -> Device:
    """What optopick makes of the device's data sheet."""
    circuit, coupler = e.circuit, coupler_of(sheet)
    corner = Corner(
        words="", t=25.0, age=0.0, ctr=sheet.ctr, light=1.0, left=1.0, v_f=1.2, drive=5.0, drop=0.0, v_cc=circuit.v_cc,
        r_led=1e3, r_load=circuit.r_load, r_be=math.inf, r_shunt=math.inf, i_f=circuit.i_f, i_off=0.0, dark=0.0,
            v_be=0.0, storage=1.0,
    )  # fmt: skip
    return device_at(coupler, corner)


def ratios(d: Device, e: Entry, r_c: float = 0.0) -> list[float]:
    """Simulated over recorded times; r_c in the collector lies between output and transistor [ohm]."""
    c, r = e.circuit, e.circuit.r_load + r_c
    circuit = Circuit(c.pulled_up, c.v_cc, r, c.r_be or math.inf, c.c_load)
    low, high = ON_THRESHOLD * c.v_cc, OFF_THRESHOLD * c.v_cc
    if c.pulled_up:
        inner = (c.v_cc - (c.v_cc - low) * r / c.r_load, c.v_cc - (c.v_cc - high) * r / c.r_load)
    else:
        inner = (low * r / c.r_load, high * r / c.r_load)
    found = pulse_times(run(d, circuit, (Phase(c.i_f), Phase(0.0)), 0.0), inner)
    return [getattr(found, name) / getattr(e.times, name) for name in TIMES]


def by_parameters(name: str, stride: int) -> Array:
    """Ratios of every `stride`-th circuit of a record, a column for each of TIMES: the devices' own parameters."""
    devices = devices_of(name)
    entries = read_record(name).entries[::stride]
    return np.array([ratios(true_device(devices[e.device]), e, devices[e.device].r_c) for e in entries])


def by_rows(name: str, stride: int) -> Array:
    """The same from the data sheets."""
    record = read_record(name)
    return np.array([ratios(device_of_rows(e, record.sheets[e.device]), e) for e in record.entries[::stride]])


def test_with_the_devices_own_parameters_times_agree() -> None:
    """Within 3 %; base and collector resistance, not in this model, show most close to an overdrive of one."""
    off = np.abs(by_parameters("record", STRIDE) - 1)
    assert np.mean(off < 0.03) > 0.97
    assert off.max() < 0.12


@pytest.mark.parametrize("name", RECORDS)
def test_with_the_data_sheets_rows_times_are_near(name: str) -> None:
    found = by_rows(name, STRIDE)
    assert np.abs(np.median(found, axis=0) - 1).max() < 0.07
    assert np.mean(np.abs(found - 1) < 0.25, axis=0).min() > 0.93
    assert np.all((found > 0.6) & (found < 1.8))


def main() -> None:
    """Print both comparisons over the whole of both records."""
    for name in RECORDS:
        for ratios_of in (by_parameters, by_rows):
            found = ratios_of(name, 1)
            print(f"{name}, {ratios_of.__name__}, {len(found)} circuits: simulated / recorded")
            for k, quantity in enumerate(TIMES):
                low, p5, mid, p95, high = np.percentile(found[:, k], (0, 5, 50, 95, 100))
                near = [np.mean(np.abs(found[:, k] - 1) < reach) for reach in (0.03, 0.25)]
                spread = f"{mid:6.3f} {p5:6.3f} {p95:6.3f} {low:6.3f} {high:6.3f}"
                print(f"  {quantity:10} {spread}   in 3 % {near[0]:6.1%}, in 25 % {near[1]:6.1%}")


if __name__ == "__main__":
    main()
