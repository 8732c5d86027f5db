"""The product's own integration on the leaking record: python -m tests.reference.integrate.

As tests/test_simulate_record.py does on the two others, with light in the dark LED and dark current.
"""

from __future__ import annotations

import math
import sys
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from test_simulate_record import coupler_of, true_device

from optopick.physics.types import Array
from optopick.simulate.corner import TIMES, Corner, PulseTimes
from optopick.simulate.device import Device, device_at
from optopick.simulate.measure import pulse_times
from optopick.simulate.transient import Circuit, Phase, run
from tests.reference.devices import Device as Parameters
from tests.reference.generate import devices_of
from tests.reference.record import LEAKING, Entry, read_record
from tests.reference.sheet import Sheet
from tests.reference.simulate import OFF_THRESHOLD, ON_THRESHOLD


def of_parameters(p: Parameters, e: Entry) -> Device:
    """The device itself with the circuit's dark current."""
    return replace(true_device(p), i_cbo=p.i_cbo + e.circuit.i_dark)


def of_rows(sheet: Sheet, e: Entry) -> Device:
    """What optopick makes of the data sheet and its dark current."""
    coupler, c = coupler_of(sheet), e.circuit
    assert coupler.transistor is not None
    transistor = replace(coupler.transistor, i_ceo_1=e.i_ceo, i_ceo_2=e.i_ceo)
    corner = Corner(
        words="", t=25.0, age=0.0, ctr=sheet.ctr, light=1.0, v_be=0.0, storage=1.0, left=1.0, v_f=1.2, drive=5.0,
        drop=0.0, v_cc=c.v_cc,
        r_led=1e3, r_load=c.r_load, r_be=math.inf, r_shunt=math.inf, i_f=c.i_f, i_off=c.i_off, dark=1.0,
    )  # fmt: skip
    return device_at(replace(coupler, transistor=transistor), corner)


def integrated(d: Device, e: Entry, r_c: float = 0.0) -> PulseTimes:
    """Times of a pulse between the light left and the full one; r_c between output and transistor [ohm]."""
    c, r = e.circuit, e.circuit.r_load + r_c
    circuit = Circuit(c.pulled_up, c.v_cc, r, c.r_be or math.inf, c.c_load)
    low, high = ON_THRESHOLD * c.v_cc, OFF_THRESHOLD * c.v_cc
    if c.pulled_up:
        inner = (c.v_cc - (c.v_cc - low) * r / c.r_load, c.v_cc - (c.v_cc - high) * r / c.r_load)
    else:
        inner = (low * r / c.r_load, high * r / c.r_load)
    return pulse_times(run(d, circuit, (Phase(c.i_f), Phase(c.i_off)), c.i_off), inner)


def ratio(found: float, recorded: float) -> float:
    """Integrated over recorded time; 1 where neither ever ends. A threshold that rest is beyond has no time: nan."""
    if math.isnan(recorded):
        return 1.0 if math.isinf(found) else (math.nan if found == 0.0 else 0.0)
    return found / recorded


def by_parameters(stride: int) -> Array:
    """Ratios of every `stride`-th circuit, a column for each of TIMES: the devices' own parameters."""
    devices = devices_of(LEAKING)
    return _ratios(stride, lambda e: integrated(of_parameters(devices[e.device], e), e, devices[e.device].r_c))


def by_rows(stride: int) -> Array:
    """The same from the data sheets."""
    sheets = read_record(LEAKING).sheets
    return _ratios(stride, lambda e: integrated(of_rows(sheets[e.device], e), e))


def _ratios(stride: int, times: Callable[[Entry], PulseTimes]) -> Array:
    found = [(times(e), e.times) for e in read_record(LEAKING).entries[::stride]]
    return np.array([[ratio(getattr(one, name), getattr(other, name)) for name in TIMES] for one, other in found])


def main() -> None:
    """Print both comparisons over the whole record."""
    for ratios_of in (by_parameters, by_rows):
        found = ratios_of(1)
        print(f"{LEAKING}, {ratios_of.__name__}, {len(found)} circuits: integrated / recorded")
        for k, quantity in enumerate(TIMES):
            column = found[np.isfinite(found[:, k]), k]
            low, p5, mid, p95, high = np.percentile(column, (0, 5, 50, 95, 100))
            near = [np.mean(np.abs(column - 1) < reach) for reach in (0.03, 0.25)]
            spread = f"{mid:6.3f} {p5:6.3f} {p95:6.3f} {low:6.3f} {high:6.3f}"
            endless = int(np.sum(np.isinf(found[:, k])))
            print(f"  {quantity:10} {spread}   in 3 % {near[0]:6.1%}, in 25 % {near[1]:6.1%}, endless {endless}")


if __name__ == "__main__":
    main()
