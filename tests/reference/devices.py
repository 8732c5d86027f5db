"""Six invented output transistors that span what phototransistor couplers look like, as Gummel-Poon parameters.

No maker's model is copied. The spans are those that data sheets show: CTR 50 to 400 %, gain 150 to 900, time constant
at 100 ohm 1 to 5 us, storage constant 5 to 30 us, collector-base capacitance 4 to 15 pF at zero bias.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from pathlib import Path

import numpy as np


@dataclass(frozen=True)
class Device:
    """One output transistor and its light.

    eta: base photocurrent per LED current [1]. The rest are parameters of the Gummel-Poon model in SPICE's names and
    units: i_s, i_se [A], n_e [1]: base current that takes the gain at low current; b_f, b_r [1]; i_kf [A]: knee of the
    gain at high current; v_af [V]; c_je, c_jc [F] at zero bias, m_jc [1], v_jc [V]: grading of the latter; t_f, t_r
    [s]: transit times; r_b, r_c [ohm]. i_cbo [A]: dark current from collector to base.
    """

    name: str
    eta: float
    i_s: float
    b_f: float
    i_se: float
    n_e: float
    i_kf: float
    b_r: float
    v_af: float
    c_je: float
    c_jc: float
    m_jc: float
    v_jc: float
    t_f: float
    t_r: float
    r_b: float
    r_c: float
    i_cbo: float


def _read(path: Path) -> tuple[Device, ...]:
    """Devices of a CSV file whose columns are the fields of Device."""
    with path.open(newline="") as file:
        rows = list(csv.reader(file))[1:]
    return tuple(Device(name, *(float(cell) for cell in cells)) for name, *cells in rows)


DEVICES = _read(Path(__file__).with_name("devices.csv"))


def stranger(rng: np.random.Generator, name: str) -> Device:
    """A random device; its data sheet may lie outside what couplers look like."""

    def even(low: float, high: float) -> float:
        return _short(rng.uniform(low, high))

    def log_even(low: float, high: float) -> float:
        return _short(np.exp(rng.uniform(np.log(low), np.log(high))))

    return Device(
        name=name,
        eta=log_even(2.4e-3, 5.5e-3),
        i_s=log_even(0.4e-14, 8e-14),
        b_f=log_even(200, 1300),
        i_se=log_even(0.4e-13, 3e-12),
        n_e=even(1.5, 1.9),
        i_kf=log_even(0.04, 0.2),
        b_r=log_even(2.5, 10),
        v_af=log_even(40, 120),
        c_je=log_even(6e-12, 22e-12),
        c_jc=log_even(4e-12, 15e-12),
        m_jc=even(0.33, 0.5),
        v_jc=even(0.55, 0.85),
        t_f=log_even(3e-9, 10e-9),
        t_r=log_even(0.5e-6, 4e-6),
        r_b=log_even(80, 300),
        r_c=log_even(4, 15),
        i_cbo=log_even(2e-12, 2e-11),
    )


def _short(value: float) -> float:
    return float(f"{value:.4g}")
