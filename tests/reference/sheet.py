"""The data sheet of a device, simulated row by row: all that optopick may know of it."""

from __future__ import annotations

import re
import tempfile
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from tests.reference.deck import TEMPERATURE, Circuit, transistor_lines
from tests.reference.devices import Device
from tests.reference.simulate import Array, SimulationError, pulse, run_deck

CURVE_I = (0.1e-3, 0.2e-3, 0.5e-3, 1e-3, 2e-3, 5e-3, 10e-3, 20e-3, 50e-3)
I_REF, V_CE_REF = 5e-3, 5.0
"""Where CTR is stated: LED current [A], collector-emitter voltage [V]."""

PLAIN_V_CC, PLAIN_I_C, PLAIN_R_L = 10.0, 2e-3, 100.0
SAT_V_CC, SAT_I_F, SAT_R_L = 5.0, 16e-3, 1900.0
V_CE_SAT_I_F, V_CE_SAT_I_C = 10e-3, 1e-3
I_CEO_V = 10.0
"""Collector-emitter voltage at which the dark current is stated [V]."""

C_CB_V = 5.0
"""Reverse voltage at which C_CB is stated [V]."""


@dataclass(frozen=True)
class Sheet:
    """Rows of one device, typical unit, 25 degC.

    ctr [1] at I_REF; curve_g over CURVE_I [1]; v_ce_sat [V]; h_fe [1] at the CTR's current; c_cb [F] at C_CB_V;
    t_r, t_f [s] of the plain row; t_on, t_s, t_off [s] of the saturated row: from the LED's edge to 90 % of the fall,
    to 10 % and to 90 % of the recovery.
    """

    name: str
    ctr: float
    curve_g: tuple[float, ...]
    v_ce_sat: float
    h_fe: float
    c_cb: float
    t_r: float
    t_f: float
    t_on: float
    t_s: float
    t_off: float


def sheet(d: Device) -> Sheet:
    """Simulate every row of a device."""
    collector = currents(d, np.array(CURVE_I), V_CE_REF)
    ctr_all = collector / np.array(CURVE_I)
    ctr = float(ctr_all[CURVE_I.index(I_REF)])
    plain = pulse(d, Circuit(True, PLAIN_V_CC, PLAIN_R_L, None, 1e-15, _current_for(d, PLAIN_I_C)), 100e-6)
    saturated = pulse(d, Circuit(True, SAT_V_CC, SAT_R_L, None, 1e-15, SAT_I_F), 300e-6)
    return Sheet(
        name=d.name,
        ctr=ctr,
        curve_g=tuple(float(f"{g:.4g}") for g in ctr_all / ctr),
        v_ce_sat=_saturation_voltage(d),
        h_fe=ctr / d.eta - 1.0,
        c_cb=d.c_jc * (1.0 + C_CB_V / d.v_jc) ** -d.m_jc,
        t_r=plain.edge_on,
        t_f=plain.edge_off,
        t_on=saturated.rise_90,
        t_s=saturated.storage,
        t_off=saturated.fall_90,
    )


def currents(d: Device, i_f: Array, v_ce: float) -> Array:
    """Collector currents [A] at LED currents `i_f` [A] and a fixed collector-emitter voltage [V]."""
    model, *_ = transistor_lines(d)
    lines = ["collector currents", model]
    for k, i in enumerate(i_f):
        lines += [f"vc{k} c{k} 0 {v_ce:g}", f"q{k} c{k} b{k} 0 q", f"il{k} c{k} b{k} {d.eta * i + d.i_cbo:.10g}"]
    found = _operating_point(lines, [f"i(vc{k})" for k in range(len(i_f))])
    return np.asarray([-value for value in found])


def dark_currents(d: Device, i_dark: Array) -> Array:
    """Dark currents [A] of the collector with the base open, `i_dark` [A] beyond the device's own at the base."""
    return currents(d, i_dark / d.eta, I_CEO_V)


def _current_for(d: Device, i_c: float) -> float:
    """LED current [A] that carries `i_c` [A] unsaturated in the plain row."""
    i_f = np.geomspace(CURVE_I[0], CURVE_I[-1], 60)
    carried = currents(d, i_f, PLAIN_V_CC - PLAIN_I_C * PLAIN_R_L)
    return float(np.exp(np.interp(np.log(i_c), np.log(carried), np.log(i_f))))


def _saturation_voltage(d: Device) -> float:
    light = d.eta * V_CE_SAT_I_F
    lines = ["saturation", *transistor_lines(d), "ve e 0 0", f"il c b {light:g}", f"ic 0 c {V_CE_SAT_I_C:g}"]
    return _operating_point(lines, ["v(c)"])[0]


def _operating_point(lines: list[str], wanted: list[str]) -> list[float]:
    """Values of an operating point, in the order asked for."""
    options = f".options temp={TEMPERATURE:g} reltol=1e-6 abstol=1e-15 gmin=1e-15"
    printing = [f"print {name}" for name in wanted]
    deck = "\n".join([*lines, options, ".control", "set numdgt=9", "op", *printing, "quit", ".endc", ".end"]) + "\n"
    with tempfile.TemporaryDirectory() as name:
        printed = run_deck(deck, Path(name))
    values = dict(re.findall(r"^(\S+) = (\S+)$", printed, flags=re.MULTILINE))
    if any(name not in values for name in wanted):
        raise SimulationError(f"operating point: {printed[-300:]}")
    return [float(values[name]) for name in wanted]
