"""The output off: what still flows."""

from __future__ import annotations

import numpy as np

from optopick.physics.types import Array, Real

BASE_HELD_OFF = 0.4
"""Base-emitter voltage [V] below which a silicon transistor does not amplify its own leakage (common practice)."""


def dark_current(i_1: float, t_1: float, i_2: float, t_2: float, t: Real) -> Array:
    """Collector-emitter leakage with the base open [A] at `t` [degC], exponential through two points of the sheet.

    i_1*(i_2/i_1)^((t - t_1)/(t_2 - t_1)). Currents [A], temperatures [degC], t_1 != t_2. Broadcasts.
    No doubling per 10 K is assumed: published pairs of points double every 5.6 to 10 K.
    """
    return np.asarray(i_1 * (i_2 / i_1) ** ((np.asarray(t) - t_1) / (t_2 - t_1)))


def dark_current_held(i_ceo: Real, i_cbo: Real, r_be: Real) -> Array:
    """Leakage with a base-emitter resistor [A]: i_cbo while that times r_be stays under 0.4 V, else i_ceo.

    i_ceo [A], i_cbo: what leaks into the base, eta times the LED current that would carry i_ceo [A], r_be [ohm],
    infinite where absent. Broadcasts.
    """
    i_cbo = np.asarray(i_cbo)
    return np.asarray(np.where(i_cbo * r_be < BASE_HELD_OFF, i_cbo, i_ceo))
