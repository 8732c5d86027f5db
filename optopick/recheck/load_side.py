"""Checks of the load resistor, whatever drives it."""

from __future__ import annotations

from optopick.brief import Brief
from optopick.physics.heat import resistor_derated
from optopick.recheck.measured import Measured
from optopick.recheck.vertices import Vertices, rating_of
from optopick.result import Design


def load_checks(brief: Brief, design: Design, box: Vertices) -> list[Measured]:
    """Power and voltage of the load resistor, the whole supply across it."""
    _, power, voltage = rating_of(brief, "r_load", design.r_load)
    return [
        Measured("r_load_power", box.v_cc**2 / box.r_load, resistor_derated(power, box.t), "<=", "W"),
        Measured("r_load_voltage", box.v_cc, voltage, "<=", "V"),
    ]
