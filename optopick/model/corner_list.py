"""The corners that no value in stock changes: temperature, lot, output supply; one entry each.

Age is no axis here: it only takes light, so what suffers from little light is judged worn, what suffers from much, new.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import numpy as np

from optopick.brief import Brief
from optopick.corners import ctr_axis, light_axis, supply_axis, temperatures, thresholds
from optopick.coupler import Transfer, Transistor
from optopick.physics.transfer import light_factor, temperature_factor
from optopick.physics.types import Array


@dataclass(frozen=True)
class CornerList:
    """Arrays of shape (C, 1), an entry for each corner.

    Temperature [degC] and its index, CTR [1], light relative to typical [1], supply [V], receiver thresholds [V], CTR
    over temperature h [1], eta [1], gain h_fe [1], v_be of a typical unit [V].
    """

    t: Array
    t_index: np.ndarray
    ctr: Array
    light: Array
    v_cc: Array
    v_il: Array
    v_ih: Array
    h: Array
    eta: Array
    h_fe: Array
    v_be: Array

    @property
    def count(self) -> int:
        """Number of corners."""
        return len(self.t)


def corner_list(brief: Brief, transfer: Transfer, transistor: Transistor) -> CornerList:
    """All combinations of temperature, CTR, light and output supply."""
    axes = (
        temperatures(brief.environment, transfer).values,
        ctr_axis(transfer).values,
        light_axis(transistor.light_spread).values,
        supply_axis(brief).values,
    )
    t, ctr, light, v_cc = (np.asarray(column).reshape(-1, 1) for column in zip(*product(*axes), strict=True))
    h = temperature_factor(transfer, t)
    typical = np.sqrt(transfer.ctr_min * transfer.ctr_max) / transistor.h_fe
    eta = typical * light_factor(transfer, t) * light
    output = brief.output
    return CornerList(
        t=t,
        t_index=np.searchsorted(np.asarray(axes[0]), t[:, 0]),
        ctr=ctr,
        light=light,
        v_cc=v_cc,
        v_il=thresholds(output.v_il, output.supply, v_cc),
        v_ih=thresholds(output.v_ih, output.supply, v_cc),
        h=h,
        eta=eta,
        h_fe=ctr * h / eta,
        v_be=transistor.v_be + transistor.v_be_tc * (t - 25.0),
    )
