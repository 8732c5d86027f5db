"""How fast the output follows: charge control (Ebers and Moll 1954; Moll, Proc. IRE 42 (1954) 1773).

All drive and load quantities are LED currents (see the package glossary): `i_eff` the light, `i_be` what the base
resistor takes of it, `i_sat` what just carries the load. The collector current follows the light with time constant
`tau`, and stops at the load's current: on, it heads for (i_eff - i_be)/i_sat times the load current; off, for
-i_be/i_sat times it. Each limit on one logarithm has its inverse here, linear in what the resistors contribute.
"""

from __future__ import annotations

import numpy as np

from optopick.physics.types import Array, Real

LN9 = float(np.log(9.0))
"""10 to 90 % of an exponential, in time constants: ln 9 = 2.197."""

MOST_CONSTANTS = 50.0
"""Time constants after which an exponential counts as over."""


def time_constant(tau_0: Real, c_m: Real, gain: Real, r_load: Real, c_load: Real) -> Array:
    """Time constant of the collector current [s]: gain*(tau_0 + r_load*c_m) + r_load*c_load.

    tau_0 [s], c_m [F]: the typical unit's, both proportional to its current gain; gain: this unit's gain over the
    typical one's [1]; r_load [ohm]; c_load [F]. Broadcasts.
    """
    r = np.asarray(r_load)
    return np.asarray(np.asarray(gain) * (np.asarray(tau_0) + r * c_m) + r * c_load)


def edge_on(tau: Real, i_eff: Real, i_be: Real, i_sat: Real) -> Array:
    """10 to 90 % of the swing as the LED lights [s]: tau*ln[(n - 0.1*i_sat)/(n - 0.9*i_sat)], n = i_eff - i_be.

    Where the drive does not saturate the output, 10 to 90 % of the swing it does make: tau*ln 9. Infinite where
    n <= 0: the output does not move. Broadcasts.
    """
    n, s = np.asarray(i_eff) - i_be, np.asarray(i_sat)
    saturates = n > s
    safe = np.where(saturates, n, 2.0 * s)
    time = np.where(saturates, np.log((safe - 0.1 * s) / (safe - 0.9 * s)), LN9)
    return np.asarray(np.where(n > 0, tau * time, np.inf))


def edge_off(tau: Real, i_be: Real, i_sat: Real) -> Array:
    """10 to 90 % of the swing as the transistor lets go [s]: tau*ln[(0.9*i_sat + i_be)/(0.1*i_sat + i_be)].

    Without a base resistor tau*ln 9. Broadcasts.
    """
    s = np.asarray(i_sat)
    return np.asarray(tau * np.log((0.9 * s + i_be) / (0.1 * s + i_be)))


def storage(tau_s: Real, i_eff: Real, i_be: Real, i_sat: Real) -> Array:
    """Time the output stays on after the LED is dark [s]: tau_s*ln[i_eff/(i_sat + i_be)], at least 0. Broadcasts."""
    return np.asarray(tau_s * np.log(np.maximum(np.asarray(i_eff) / (np.asarray(i_sat) + i_be), 1.0)))


def base_charging(c_be: Real, v_be: Real, eta: Real, i_eff: Real, i_be: Real) -> Array:
    """Time to charge the base to conduction [s]: the photocurrent eta*i_eff into c_be with the base resistor beside it.

    -(c_be*v_be/eta)*ln(1 - i_be/i_eff)/i_be, which is c_be*v_be/(eta*i_eff) without a base resistor. c_be [F],
    v_be [V], eta [1]. Infinite where i_be >= i_eff. Broadcasts.
    """
    i, b = np.asarray(i_eff, dtype=float), np.asarray(i_be, dtype=float)
    share = np.clip(b / i, 0.0, 1.0 - 1e-15)
    series = 1.0 + share / 2.0
    stretch = np.where(share < 1e-6, series, -np.log1p(-share) / np.where(share < 1e-6, 1.0, share))
    return np.asarray(np.where(b < i, np.asarray(c_be) * v_be / (eta * i) * stretch, np.inf))


def crossing_on(tau: Real, fraction: Real, i_eff: Real, i_be: Real, i_sat: Real) -> Array:
    """Time from first conduction to `fraction` of the swing [s]: tau*ln[n/(n - fraction*i_sat)], n = i_eff - i_be.

    Infinite where the output never gets there. Broadcasts.
    """
    n, part = np.asarray(i_eff) - i_be, np.asarray(fraction) * i_sat
    reaches = n > part
    safe = np.where(reaches, n, part + 1.0)
    return np.asarray(np.where(reaches, tau * np.log(safe / (safe - part)), np.inf))


def crossing_off(tau: Real, fraction: Real, i_be: Real, i_sat: Real) -> Array:
    """Time from the end of storage until `fraction` of the swing is given back [s].

    tau*ln[(i_sat + i_be)/((1 - fraction)*i_sat + i_be)], fraction < 1. Broadcasts.
    """
    s = np.asarray(i_sat)
    return np.asarray(tau * np.log((s + i_be) / ((1.0 - np.asarray(fraction)) * s + i_be)))


def drive_for_edge_on(time: float, tau: Real, i_sat: Real) -> Array:
    """Least i_eff - i_be [A] with edge_on <= time: i_sat*(0.9*e - 0.1)/(e - 1), e = exp(time/tau); 0 where e >= 9.

    Broadcasts; time > 0 [s].
    """
    e = _growth(time, tau)
    return np.asarray(np.where(e >= 9.0, 0.0, np.asarray(i_sat) * (0.9 * e - 0.1) / (e - 1.0)))


def extraction_for_edge_off(time: float, tau: Real, i_sat: Real) -> Array:
    """Least i_be [A] with edge_off <= time: i_sat*(0.9 - 0.1*e)/(e - 1), e = exp(time/tau); may be below 0.

    Broadcasts.
    """
    e = _growth(time, tau)
    return np.asarray(np.asarray(i_sat) * (0.9 - 0.1 * e) / (e - 1.0))


def drive_for_crossing_on(time: Real, tau: Real, fraction: Real, i_sat: Real) -> Array:
    """Least i_eff - i_be [A] with crossing_on <= time: fraction*i_sat*e/(e - 1), e = exp(time/tau).

    Infinite for time <= 0. Broadcasts.
    """
    t = np.asarray(time, dtype=float)
    e = _growth(t, tau)
    return np.asarray(np.where(t > 0, np.asarray(fraction) * i_sat * e / (e - 1.0), np.inf))


def extraction_for_crossing_off(time: Real, tau: Real, fraction: Real, i_sat: Real) -> Array:
    """Least i_be [A] with crossing_off <= time: i_sat*(1 - (1 - fraction)*e)/(e - 1); inf for time <= 0. Broadcasts."""
    t = np.asarray(time, dtype=float)
    e = _growth(t, tau)
    return np.asarray(np.where(t > 0, np.asarray(i_sat) * (1.0 - (1.0 - np.asarray(fraction)) * e) / (e - 1.0), np.inf))


def _growth(time: Real, tau: Real) -> Array:
    """exp(time/tau), kept off 1 and off overflow: an endless tau asks for a drive beyond any, an endless time for none."""
    endless = np.isinf(time)
    ratio = np.where(endless, MOST_CONSTANTS, np.where(endless, 0.0, time) / np.asarray(tau))
    return np.asarray(np.exp(np.clip(ratio, 1e-12, MOST_CONSTANTS)))
