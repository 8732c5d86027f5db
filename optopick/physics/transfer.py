"""From LED current to collector current and back: CTR with its curves, and the light the base resistor takes."""

from __future__ import annotations

import numpy as np

from optopick.coupler import Transfer
from optopick.physics.types import Array, Real

ROUNDING = 1e-12
"""Share by which a current may exceed the curve's last point."""

FAR = 200.0
"""How far down the curve is carried on its first slope, as a logarithm: farther than any current."""


def relative_ctr(transfer: Transfer, i: Real) -> Array:
    """CTR at LED current `i` over CTR at the test current [1], log-log through the table's points.

    i > 0 [A]. Below the first point the first slope goes on; above the last point the result is nan: the curve is
    not extrapolated upward. Broadcasts.
    """
    return np.asarray(_log_curve(np.asarray(i, dtype=float), transfer) / np.asarray(i, dtype=float))


def collector_current(transfer: Transfer, ctr: Real, h: Real, i_eff: Real) -> Array:
    """Collector current that the light could drive [A]: j = ctr*h*g(i_eff)*i_eff; 0 for i_eff <= 0.

    ctr: at the test current and 25 degC [1]; h: CTR over temperature [1]; i_eff [A]. nan above the curve. Broadcasts.
    """
    i = np.asarray(i_eff, dtype=float)
    lit = i > 0
    g_i = _log_curve(np.where(lit, i, transfer.i_ref), transfer)
    return np.asarray(np.where(lit, np.asarray(ctr) * h * g_i, 0.0))


def led_current_for(transfer: Transfer, ctr: Real, h: Real, j: Real) -> Array:
    """LED current [A] whose light drives a collector current `j` > 0 [A]: the inverse of `collector_current`.

    Infinite where the curve's last point does not reach `j`. Broadcasts.
    """
    return led_current_of_log(transfer, np.log(np.asarray(j, dtype=float) / (np.asarray(ctr) * h)))


def led_current_of_log(transfer: Transfer, wanted: Array) -> Array:
    """The same from ln[j/(ctr*h)], j/(ctr*h) in A."""
    log_i, log_g = _extended(transfer)
    log_ig = log_i + log_g
    found = np.exp(np.interp(wanted, log_ig, log_i))
    beyond = wanted > log_ig[-1] + ROUNDING
    return np.asarray(np.where(beyond, np.inf, found) if np.any(beyond) else found)


def temperature_factor(transfer: Transfer, t: Real) -> Array:
    """CTR at `t` [degC] over CTR at 25 degC [1], linear between the table's points, flat outside. Broadcasts."""
    return np.asarray(np.interp(t, transfer.curve_t, transfer.curve_h))


def light_factor(transfer: Transfer, t: Real) -> Array:
    """Light of the LED at `t` [degC] over its light at 25 degC [1]: 1 + light_tc*(t - 25), at least 0.1. Broadcasts."""
    return np.asarray(np.maximum(1.0 + transfer.light_tc * (np.asarray(t) - 25.0), 0.1))


def base_led_current(v_be: Real, r_be: Real, eta: Real) -> Array:
    """LED current whose light the base-emitter resistor takes [A]: i_be = v_be/(r_be*eta).

    v_be [V], r_be > 0 [ohm], infinite where absent, eta [1]. Broadcasts.
    """
    return np.asarray(np.asarray(v_be) / (np.asarray(r_be) * np.asarray(eta)))


def _log_curve(i: Array, transfer: Transfer) -> Array:
    """i*g(i) [A]; nan above the last point."""
    log_i, log_g = _extended(transfer)
    at = np.log(i)
    found = np.exp(at + np.interp(at, log_i, log_g))
    beyond = i > transfer.curve_i[-1] * (1 + ROUNDING)
    return np.asarray(np.where(beyond, np.nan, found) if np.any(beyond) else found)


def _extended(transfer: Transfer) -> tuple[Array, Array]:
    """Logarithms of the curve's points, i and g, and of one far below them on the line of the first two."""
    log_i, log_g = np.log(transfer.curve_i), np.log(transfer.curve_g)
    slope = (log_g[1] - log_g[0]) / (log_i[1] - log_i[0])
    return np.append(log_i[0] - FAR, log_i), np.append(log_g[0] - slope * FAR, log_g)
