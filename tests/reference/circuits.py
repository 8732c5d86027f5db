"""Random circuits around a device, drawn from what its data sheet says, so that all of them work."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from tests.reference.deck import Circuit
from tests.reference.sheet import CURVE_I, Sheet

SUPPLIES = (3.3, 5.0, 12.0, 15.0, 24.0)
R_LOAD, R_BE = (220.0, 47e3), (22e3, 2.2e6)
R_LOAD_LEAKING = (220.0, 220e3)
LEFT = (1e-3, 0.6)
"""Light left in the dark LED, and dark current, as a share of what just carries the load [1]; else none, ..."""

NONE_LEFT = 1 / 3
"""... with this probability."""

C_LOAD = (10e-12, 300e-12)
OVERDRIVE = (1.2, 10.0)
I_C_MOST = 30e-3
BASE_MOST = 4.0
"""Most that the base resistor may take, as a multiple of what the load needs: beyond that nobody places it."""

V_BE, V_CE = 0.65, 0.1
"""Voltages that size the circuits [V]; what the circuit then really does is simulated."""


@dataclass(frozen=True)
class Drawn:
    """A circuit of a device, and the overdrive it was sized for [1]."""

    device: str
    circuit: Circuit
    overdrive: float


def led_current_for(sheet: Sheet, i_c: float) -> float:
    """LED current [A] that carries `i_c` [A] by the sheet's curve, log-log; nan beyond its end."""
    log_i = np.log(CURVE_I)
    log_c = log_i + np.log(sheet.curve_g) + np.log(sheet.ctr)
    wanted = np.log(i_c)
    if wanted > log_c[-1]:
        return float("nan")
    slope = (log_i[1] - log_i[0]) / (log_c[1] - log_c[0])
    below = log_i[0] + slope * (wanted - log_c[0])
    return float(np.exp(below if wanted < log_c[0] else np.interp(wanted, log_c, log_i)))


def draw(rng: np.random.Generator, sheet: Sheet) -> Drawn:
    """One circuit of a device whose currents lie inside the data sheet."""
    return _drawn(rng, sheet, R_LOAD)


def draw_leaking(rng: np.random.Generator, sheet: Sheet) -> Drawn:
    """As `draw`, with larger loads, light left in the dark LED, and dark current."""
    drawn = _drawn(rng, sheet, R_LOAD_LEAKING)
    circuit = drawn.circuit
    i_sat = led_current_for(sheet, (circuit.v_cc - V_CE) / circuit.r_load)
    left, dark = (0.0 if rng.random() < NONE_LEFT else _log_uniform(rng, LEFT) for _ in range(2))
    i_off, i_dark = _short(left * i_sat), _short(dark * i_sat * sheet.ctr / sheet.h_fe)
    return replace(drawn, circuit=replace(circuit, i_off=i_off, i_dark=i_dark))


def _drawn(rng: np.random.Generator, sheet: Sheet, loads: tuple[float, float]) -> Drawn:
    while True:
        drawn = _attempt(rng, sheet, loads)
        if drawn is not None:
            return drawn


def _attempt(rng: np.random.Generator, sheet: Sheet, loads: tuple[float, float]) -> Drawn | None:
    v_cc = float(rng.choice(SUPPLIES))
    r_load, overdrive, c_load = (_log_uniform(rng, span) for span in (loads, OVERDRIVE, C_LOAD))
    r_be = _log_uniform(rng, R_BE) if rng.random() < 0.5 else None
    pulled_up = bool(rng.random() < 0.5)
    j_s = (v_cc - V_CE) / r_load
    i_sat = led_current_for(sheet, j_s)
    eta = sheet.ctr / sheet.h_fe
    i_be = V_BE / (r_be * eta) if r_be is not None else 0.0
    i_f = _short(overdrive * i_sat + i_be)
    inside = j_s < I_C_MOST and CURVE_I[0] <= i_f <= CURVE_I[-1] and i_be <= BASE_MOST * i_sat
    if not inside:
        return None
    return Drawn(sheet.name, Circuit(pulled_up, v_cc, r_load, r_be, c_load, i_f), overdrive)


def _log_uniform(rng: np.random.Generator, span: tuple[float, float]) -> float:
    """A value between the ends of `span`, even in its logarithm, to four digits as it will be recorded."""
    return _short(np.exp(rng.uniform(np.log(span[0]), np.log(span[1]))))


def _short(value: float) -> float:
    return float(f"{value:.4g}")
