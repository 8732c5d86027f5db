"""The output off: what still flows."""

from __future__ import annotations

import numpy as np

from optopick.physics.types import Array, Real

BASE_HELD_OFF = 0.1
"""Base-emitter voltage [V] below which a silicon transistor counts as not amplifying its own leakage.

A quarter of 0.4 V (common practice, no source): at leakage currents the gain falls below what the start of the CTR
curve tells, so that more leaks into the base than computed, about four times in simulated devices (tests/reference).
"""

V_SHEET, V_EARLY = 5.0, 50.0
"""Collector-emitter voltage at which sheets usually state CTR [V], and an Early voltage of small transistors [V] (both
from memory; the simulated devices of tests/reference have 40 to 120 V)."""


def raised(v_cc: Real) -> Array:
    """By what the current in the dark exceeds what the sheet lets expect, for the full supply across the output [1].

    1 + max(0, v_cc - V_SHEET)/V_EARLY, v_cc [V]. Broadcasts. Source: Early, Proc. IRE 40 (1952) 1401.
    """
    return np.asarray(1.0 + np.maximum(np.asarray(v_cc) - V_SHEET, 0.0) / V_EARLY)


def dark_current(i_1: float, t_1: float, i_2: float, t_2: float, t: Real) -> Array:
    """Collector-emitter leakage with the base open [A] at `t` [degC], exponential through two points of the sheet.

    i_1*(i_2/i_1)^((t - t_1)/(t_2 - t_1)). Currents [A], temperatures [degC], t_1 != t_2. Broadcasts.
    No doubling per 10 K is assumed: published pairs of points double every 5.6 to 10 K.
    """
    return np.asarray(i_1 * (i_2 / i_1) ** ((np.asarray(t) - t_1) / (t_2 - t_1)))


def dark_current_held(i_ceo: Real, i_cbo: Real, r_be: Real) -> Array:
    """Leakage with a base-emitter resistor [A]: i_cbo while that times r_be stays under 0.1 V, else i_ceo.

    i_ceo [A], i_cbo: what leaks into the base, eta times the LED current that would carry i_ceo [A], r_be [ohm],
    infinite where absent. Broadcasts.
    """
    i_cbo = np.asarray(i_cbo)
    return np.asarray(np.where(i_cbo * r_be < BASE_HELD_OFF, i_cbo, i_ceo))
