"""The LED and the resistors around it."""

from __future__ import annotations

import numpy as np
from scipy.constants import Boltzmann, elementary_charge, zero_Celsius
from scipy.special import wrightomega

from optopick.coupler import Led
from optopick.physics.types import Array, Real


def thermal_voltage(t: Real) -> Array:
    """Thermal voltage k*T/q [V] at `t` [degC]; k and q from CODATA as in scipy.constants. Broadcasts."""
    return np.asarray((np.asarray(t) + zero_Celsius) * (Boltzmann / elementary_charge))


def forward_voltage(led: Led, v_f_ref: Real, i_f: Real, t: Real) -> Array:
    """Forward voltage [V] of the diode law with series resistance.

    v_f = v_f_ref + n*(kT/q)*ln(i_f/i_ref) + r_s*(i_f - i_ref) + v_f_tc*(t - 25)

    v_f_ref: this unit's forward voltage at led.i_ref and 25 degC [V]; i_f > 0 [A]; t [degC]. Broadcasts.
    Source: Shockley's diode law (Bell System Technical Journal 28, 1949) with a linear drift.
    """
    i = np.asarray(i_f)
    log_term = led.n * thermal_voltage(t) * np.log(i / led.i_ref)
    return np.asarray(v_f_ref + log_term + led.r_s * (i - led.i_ref) + led.v_f_tc * (np.asarray(t) - 25.0))


def led_current(led: Led, v_f_ref: Real, v: Real, r_led: Real, t: Real, r_shunt: Real = np.inf) -> Array:
    """LED current [A] from a voltage behind a series resistor, a shunt across the LED.

    v = r_led*(i_f + v_f/r_shunt) + v_f with v_f of `forward_voltage`. With a = r_led + (1 + r_led/r_shunt)*r_s and
    b = (1 + r_led/r_shunt)*n*kT/q this is a*i + b*ln(i/i_ref) = c, solved exactly by the Wright omega function:
    i = (b/a)*omega(c/b + ln(a*i_ref/b)).

    v [V], v_f_ref [V], r_led > 0 [ohm], t [degC], r_shunt > 0 [ohm], infinite where absent. Broadcasts.
    Returns a positive current, vanishing where the voltage does not reach the LED's knee.
    """
    share = 1.0 + np.asarray(r_led) / np.asarray(r_shunt)
    a = np.asarray(r_led) + share * led.r_s
    b = share * led.n * thermal_voltage(t)
    v_ref = v_f_ref - led.r_s * led.i_ref + led.v_f_tc * (np.asarray(t) - 25.0)
    c = np.asarray(v) - share * v_ref
    return np.asarray(b / a * wrightomega(c / b + np.log(a * led.i_ref / b)))


def led_current_of_leak(led: Led, v_f_ref: Real, i_leak: Real, t: Real, r_shunt: Real = np.inf) -> Array:
    """LED current [A] left of a leakage current once the shunt has taken its part.

    i_leak = i_f + v_f(i_f)/r_shunt. i_leak >= 0 [A], v_f_ref [V], t [degC], r_shunt > 0 [ohm]. Broadcasts.
    """
    placed = np.isfinite(r_shunt)
    r = np.where(placed, r_shunt, 1.0)
    shared = led_current(led, v_f_ref, np.asarray(i_leak) * r, r, t)
    return np.asarray(np.where(placed, np.minimum(shared, i_leak), i_leak))


def branch_current(i_f: Real, v_f: Real, r_shunt: Real) -> Array:
    """Current through the series resistor and the driver [A]: i_f + v_f/r_shunt. Broadcasts."""
    return np.asarray(i_f + np.asarray(v_f) / np.asarray(r_shunt))
