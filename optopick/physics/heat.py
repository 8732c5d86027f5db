"""Ratings that fall with temperature, and what the parts dissipate."""

from __future__ import annotations

import numpy as np

from optopick.coupler import Rating
from optopick.physics.types import Array, Real

RESISTOR_FULL = 70.0
RESISTOR_ZERO = 155.0


def derated(rating: Rating, t: Real) -> Array:
    """A rating at ambient `t` [degC]: value - slope*(t - above) above the knee, never below zero. Broadcasts."""
    return np.asarray(np.maximum(rating.value - rating.slope * np.maximum(np.asarray(t) - rating.above, 0.0), 0.0))


def resistor_derated(power: Real, t: Real) -> Array:
    """Resistor rating [W] at ambient `t` [degC]: full to 70 degC, linear to zero at 155 degC. Broadcasts.

    Source: the curve common to chip resistor sheets, as in a Vishay RCM training page (35 % at 125 degC).
    """
    share = (RESISTOR_ZERO - np.asarray(t)) / (RESISTOR_ZERO - RESISTOR_FULL)
    return np.asarray(power * np.clip(share, 0.0, 1.0))


def output_dissipation(v_cc: Real, r_load: Real, i_input: Real) -> Array:
    """Largest power in the output transistor [W] anywhere on its load line: v_cc^2/(4*r_load) + v_cc*i_input.

    Half the supply on the transistor is the worst point of a resistive load. v_cc [V], r_load [ohm]. Broadcasts.
    """
    v = np.asarray(v_cc)
    return np.asarray(v * v / (4.0 * np.asarray(r_load)) + v * i_input)
