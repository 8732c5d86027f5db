"""How much light the LED has left."""

from __future__ import annotations

import numpy as np
from scipy.constants import Boltzmann, elementary_charge, zero_Celsius

from optopick.coupler import Ageing
from optopick.physics.types import Array, Real


def acceleration_factor(i: Real, i_ref: Real, t: Real, t_ref: Real, n: float, e_a: float) -> Array:
    """How much faster the LED wears at (i, t) than at (i_ref, t_ref) [1].

    AF = (i/i_ref)^n * exp(e_a/k*(1/T_ref - 1/T)); currents [A], temperatures [degC] (kelvin inside), e_a [eV].
    Broadcasts. Source: the form used in makers' reliability notes (Avago, LED reliability white paper): a power law
    of current with an Arrhenius term.
    """
    k_ev = Boltzmann / elementary_charge
    inverse = 1.0 / (np.asarray(t_ref) + zero_Celsius) - 1.0 / (np.asarray(t) + zero_Celsius)
    return np.asarray((np.asarray(i) / np.asarray(i_ref)) ** n * np.exp(e_a / k_ev * inverse))


def light_left(ageing: Ageing, i_f: Real, t: Real, life: Real, lit: Real) -> Array:
    """Share of the new LED's light left after `life` [h], lit the fraction `lit` of the time [1].

    (1 - loss)^(life*lit*AF/time): the table's loss, repeated as often as the use is as hard as the test. Exponential
    decay is the rule of this program; makers' curves flatten with time, so it leans to the safe side.
    i_f [A], t [degC]. Broadcasts.
    """
    af = acceleration_factor(i_f, ageing.current, t, ageing.temperature, ageing.n, ageing.e_a)
    return np.asarray((1.0 - ageing.loss) ** (np.asarray(life) * lit * af / ageing.time))
