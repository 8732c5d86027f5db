"""The extremes at which every check must hold.

A corner assigns one end of its range to everything uncertain: temperature, age, lot (CTR and light), LED forward
voltage, supplies, driver drop, resistor values. Temperature is tried at the coldest, 25 degC, the hottest, and where
the CTR curve bends in between. Each `Axis` is one uncertain quantity with its trial values, and the words for them.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from optopick.brief import Brief, Environment, Span
from optopick.coupler import Coupler, Transfer
from optopick.physics.types import Array

STRAIGHT = 1e-6
"""Change of slope, as a share of the steepest, below which a curve does not bend."""


@dataclass(frozen=True)
class Axis:
    """One uncertain quantity: its trial values and what each is called in a result; an empty word goes unsaid."""

    name: str
    values: tuple[float, ...]
    words: tuple[str, ...]


def temperatures(environment: Environment, transfer: Transfer | None) -> Axis:
    """Coldest, 25 degC, hottest, and every bend of the CTR curve over temperature between [degC]."""
    low, high = environment.temperature.low, environment.temperature.high
    inner = {25.0} | set(_bends(transfer) if transfer else ())
    values = sorted({low, high} | {t for t in inner if low < t < high})
    words = {low: f"coldest ({low:g} °C)", high: f"hottest ({high:g} °C)"}
    return Axis("temperature", tuple(values), tuple(words.get(t, f"{t:g} °C") for t in values))


def _bends(transfer: Transfer) -> list[float]:
    """Points of the curve where its slope changes, its ends among them: beyond those it is flat."""
    slopes = np.concatenate(([0.0], np.diff(transfer.curve_h) / np.diff(transfer.curve_t), [0.0]))
    changes = np.abs(np.diff(slopes)) > STRAIGHT * np.abs(slopes).max()
    return [t for t, bent in zip(transfer.curve_t, changes, strict=True) if bent]


AGES = Axis("age", (0.0, 1.0), ("new", "end of life"))


def two_ends(name: str, span: Span, low: str, high: str) -> Axis:
    """An axis with both ends of a span, or the one value where they are the same."""
    if span.low == span.high:
        return Axis(name, (span.low,), ("",))
    return Axis(name, (span.low, span.high), (low, high))


def ctr_axis(transfer: Transfer) -> Axis:
    """Both ends of the CTR bin [1]."""
    return two_ends("ctr", Span(transfer.ctr_min, transfer.ctr_max), "lowest CTR", "highest CTR")


def light_axis(spread: float) -> Axis:
    """Light per LED current relative to a typical LED [1]: less light means more gain for the same CTR."""
    return two_ends("light", Span(1.0 / spread, spread), "dim LED", "bright LED")


def v_be_axis(spread: float) -> Axis:
    """How far a unit's base-emitter voltage lies from the typical one [V]."""
    return two_ends("v_be", Span(-spread, spread), "low V_BE", "high V_BE")


def storage_axis(spread: float) -> Axis:
    """Storage constant over that of a typical unit [1]."""
    return two_ends("storage", Span(1.0 / spread, spread), "short storage", "long storage")


def v_f_axis(coupler: Coupler) -> Axis:
    """Both ends of the LED's forward voltage [V]."""
    return two_ends("v_f", Span(coupler.led.v_f_min, coupler.led.v_f_max), "V_F min", "V_F max")


def drive_axis(brief: Brief) -> Axis:
    """Both ends of the voltage that drives the LED [V]."""
    return two_ends("drive", brief.drive.supply, "drive min", "drive max")


def drop_axis(brief: Brief) -> Axis:
    """Both ends of the driver's drop [V]."""
    return two_ends("drop", brief.drive.drop, "drop min", "drop max")


def supply_axis(brief: Brief) -> Axis:
    """Both ends of the output supply [V]."""
    return two_ends("supply", brief.output.supply, "V_CC min", "V_CC max")


def resistor_span(
    value: Array | float, tolerance: Array | float, drift: float, t: Array | float
) -> tuple[Array, Array]:
    """Least and largest resistance [ohm]: value*(1 -/+ (tolerance + drift*|t - 25|)).

    value [ohm], tolerance [1], drift [1/K], t [degC]; broadcasts.
    """
    part = np.asarray(tolerance) + drift * np.abs(np.asarray(t) - 25.0)
    return np.asarray(value * (1.0 - part)), np.asarray(value * (1.0 + part))


def thresholds(span: Span, supply: Span, v_cc: Array | float) -> Array:
    """Receiver threshold [V] at supply `v_cc` [V], between its values at the low and the high supply."""
    if supply.high == supply.low:
        return np.full_like(np.asarray(v_cc, dtype=float), span.low)
    share = (np.asarray(v_cc) - supply.low) / (supply.high - supply.low)
    return np.asarray(span.low + share * (span.high - span.low))
