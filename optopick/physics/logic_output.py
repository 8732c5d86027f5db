"""A logic output with open collector: delays of its own, and an RC where the pull-up lets it rise."""

from __future__ import annotations

import numpy as np

from optopick.coupler import Logic
from optopick.physics.switching import LN9
from optopick.physics.types import Array, Real


def extra_rc(logic: Logic, r_load: Real, c_load: Real) -> Array:
    """RC beyond that of the sheet's test circuit [s]: r_load*(c_load + c_out) - r_l*(c_l + c_out), at least 0.

    r_load [ohm], c_load [F]. Broadcasts. The sheet's times already hold its own RC.
    """
    own = logic.r_l * (logic.c_l + logic.c_out)
    return np.asarray(np.maximum(np.asarray(r_load) * (np.asarray(c_load) + logic.c_out) - own, 0.0))


def rise_delay(logic: Logic, r_load: Real, c_load: Real, fraction: Real) -> Array:
    """LED dark to the output above `fraction` of its swing [s]: t_plh + extra_rc*ln[1/(1 - fraction)]. Broadcasts."""
    return np.asarray(logic.t_plh - extra_rc(logic, r_load, c_load) * np.log1p(-np.asarray(fraction)))


def rise_edge(logic: Logic, r_load: Real, c_load: Real) -> Array:
    """10 to 90 % as the output lets go [s]: t_r + extra_rc*ln 9. Broadcasts."""
    return np.asarray(logic.t_r + LN9 * extra_rc(logic, r_load, c_load))


def discharge(logic: Logic, v_cc: Real, c_load: Real) -> Array:
    """Time that capacitance beyond the sheet's takes to discharge at i_ol [s]: (c_load - c_l)*v_cc/i_ol, at least 0."""
    return np.asarray(np.maximum(np.asarray(c_load) - logic.c_l, 0.0) * v_cc / logic.i_ol)
