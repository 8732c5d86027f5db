"""What charges the base of the output transistor, and what the output node needs: the ground of all switching times."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from optopick.physics.led import thermal_voltage
from optopick.physics.types import Array, Real

V_J, M_J = 0.7, 0.37
"""Built-in voltage [V] and grading exponent [1] of the collector junction: between the abrupt (1/2) and the linearly
graded junction (1/3), silicon. The exponent is fitted once over all devices of tests/reference."""

J_V_BE = 2e-3
"""Collector current [A] at which the stated base-emitter voltage is right for a small transistor (from memory)."""

FIRST = 0.05
"""Share of the load current at which charging the base counts as over and the output as moving."""


@dataclass(frozen=True)
class Base:
    """What charges the base of a unit.

    transit: forward transit time [s]; c_cb: collector-base capacitance at 0 V [F]; c_be: of the emitter junction [F],
    taken as constant; v_be: base-emitter voltage at J_V_BE [V]; eta: base photocurrent over LED current [1].
    """

    transit: Real
    c_cb: Real
    c_be: Real
    v_be: Real
    eta: Real


@dataclass(frozen=True)
class Load:
    """What the output drives.

    j_s: load current at the end of the swing [A]; v_cc, swing [V]; r_load [ohm] and c_load [F] of the output node;
    t: ambient [degC].
    """

    j_s: Real
    v_cc: Real
    swing: Real
    r_load: Real
    c_load: Real
    t: Real


def base_voltage(base: Base, j: Real, t: Real) -> Array:
    """Base-emitter voltage at collector current `j` [A]: v_be + (kT/q)*ln(j/J_V_BE) [V]. Broadcasts."""
    return base_voltage_of_log(base, np.log(np.asarray(j)), t)


def base_voltage_of_log(base: Base, log_j: Real, t: Real) -> Array:
    """The same from ln(j), j in A."""
    return np.asarray(base.v_be + thermal_voltage(t) * (np.asarray(log_j) - np.log(J_V_BE)))


def junction_charge(c_0: Real, v: Real) -> Array:
    """Charge of a graded junction between 0 V and the reverse voltage `v` [C].

    c_0*V_J/(1 - M_J)*[(1 + v/V_J)^(1 - M_J) - 1]; forward of V_J/2 on with the capacitance there. c_0 [F], v [V].
    Broadcasts. Source: the depletion charge of Gummel and Poon, Bell System Technical Journal 49 (1970) 827.
    """
    reverse = np.asarray(v, dtype=float)
    graded = V_J / (1.0 - M_J) * ((1.0 + np.maximum(reverse, -V_J / 2) / V_J) ** (1.0 - M_J) - 1.0)
    forward = np.minimum(reverse + V_J / 2, 0.0)
    return np.asarray(c_0 * (graded + forward * 0.5**-M_J if np.any(forward) else graded))


def base_charge(base: Base, load: Load, x: Real, v_b: Real | None = None) -> Array:
    """Charge that the base has taken up from rest to level `x` > 0, a share of the load current [C].

    transit*x*j_s + c_be*v_b + the charge of the collector junction between v_cc and v_cc - x*swing - v_b, with v_b of
    `base_voltage` where it is not given [V]. The same for a pull-up and for an emitter load. Broadcasts.
    """
    j = np.asarray(x) * load.j_s
    v_b = base_voltage(base, j, load.t) if v_b is None else np.asarray(v_b)
    v_cb = load.v_cc - np.asarray(x) * load.swing - v_b
    collector = junction_charge(base.c_cb, load.v_cc) - junction_charge(base.c_cb, v_cb)
    return np.asarray(base.transit * j + base.c_be * v_b + collector)


def zero_bias(c_cb: Real, v: Real) -> Array:
    """Collector-base capacitance at 0 V [F] from that at reverse voltage `v` [V]: c_cb*(1 + v/V_J)^M_J. Broadcasts."""
    return np.asarray(c_cb * (1.0 + np.asarray(v) / V_J) ** M_J)
