"""Checks of the LED branch: currents on and off, the driver, reverse voltage, heat."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.physics.ageing import light_left
from optopick.physics.heat import derated, resistor_derated
from optopick.physics.led import branch_current, forward_voltage, led_current, led_current_of_leak
from optopick.physics.types import Array
from optopick.recheck.measured import Measured
from optopick.recheck.vertices import Vertices, rating_of
from optopick.result import Design

DARK_FRACTION = 0.01
"""An LED counts as dark below this share of the current at which its coupler is specified (a rule of this program)."""

DIODE_DROP = 1.0
"""What a diode antiparallel to the LED leaves of a reverse voltage [V] (common practice, no source)."""


@dataclass(frozen=True)
class LedBranch:
    """The branch at every vertex: LED current on and off [A], its voltage [V], driver current [A], light left [1]."""

    i_f: Array
    i_off: Array
    v_f: Array
    i_branch: Array
    light: Array


def led_branch(brief: Brief, coupler: Coupler, box: Vertices) -> LedBranch:
    """Solve the branch at every vertex."""
    led = coupler.led
    i_f = led_current(led, box.v_f, box.drive - box.drop, box.r_led, box.t, box.r_shunt)
    v_f = forward_voltage(led, box.v_f, i_f, box.t)
    return LedBranch(
        i_f=i_f,
        i_off=_off_current(brief, coupler, box),
        v_f=v_f,
        i_branch=branch_current(i_f, v_f, box.r_shunt),
        light=_light(brief, coupler, box, i_f),
    )


def _light(brief: Brief, coupler: Coupler, box: Vertices, i_f: Array) -> Array:
    """Share of light left at each age; wear is that of the unit driven hardest in the hottest place."""
    hottest = float(box.t.max())
    left = light_left(coupler.ageing, float(i_f.max()), hottest, brief.environment.life, brief.signal.lit)
    return np.asarray(1.0 + box.age * (left - 1.0))


def _off_current(brief: Brief, coupler: Coupler, box: Vertices) -> Array:
    """Current left in the LED when off [A]: of the driver's leakage, and of what a field contact gives."""
    drive, led = brief.drive, coupler.led
    leak = led_current_of_leak(led, box.v_f, drive.off_leakage, box.t, box.r_shunt)
    if drive.off_voltage is None:
        return leak
    by_voltage = led_current(led, box.v_f, drive.off_voltage, box.r_led, box.t, box.r_shunt)
    by_current = led_current_of_leak(led, box.v_f, drive.off_current, box.t, box.r_shunt)
    return np.asarray(np.maximum(leak, np.maximum(by_voltage, by_current)))


def led_checks(brief: Brief, coupler: Coupler, design: Design, box: Vertices, branch: LedBranch) -> list[Measured]:
    """Every check of the LED side."""
    led, drive = coupler.led, brief.drive
    checks = [
        Measured("led_current", branch.i_f, derated(led.i_max, box.t), "<=", "A"),
        Measured("led_power", branch.i_f * branch.v_f, derated(led.p_max, box.t), "<=", "W"),
    ]
    if drive.max_current is not None:
        checks.append(Measured("driver_current", branch.i_branch, drive.max_current, "<=", "A"))
    if drive.on_current_min > 0:
        checks.append(Measured("input_current", branch.i_branch, drive.on_current_min, ">=", "A"))
    if drive.reverse > 0:
        seen = DIODE_DROP if design.reverse_diode else drive.reverse
        checks.append(Measured("reverse_voltage", seen, led.v_r_max, "<=", "V"))
    return checks + _resistor_checks(brief, design, box, branch)


def _resistor_checks(brief: Brief, design: Design, box: Vertices, branch: LedBranch) -> list[Measured]:
    _, power, voltage = rating_of(brief, "r_led", design.r_led)
    drop = branch.i_branch * box.r_led / design.pieces
    checks = [
        Measured("r_led_power", drop * branch.i_branch, resistor_derated(power, box.t), "<=", "W"),
        Measured("r_led_voltage", drop, voltage, "<=", "V"),
    ]
    if design.r_shunt is not None:
        _, power, _ = rating_of(brief, "r_shunt", design.r_shunt)
        heat = branch.v_f**2 / box.r_shunt
        checks.append(Measured("r_shunt_power", heat, resistor_derated(power, box.t), "<=", "W"))
    return checks
