"""The box of everything uncertain about one design, as arrays that broadcast: one axis per uncertain quantity."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

import numpy as np

from optopick.brief import Brief, Position
from optopick.corners import (
    AGES,
    Axis,
    ctr_axis,
    drive_axis,
    drop_axis,
    light_axis,
    resistor_span,
    storage_axis,
    supply_axis,
    temperatures,
    v_be_axis,
    v_f_axis,
)
from optopick.coupler import Coupler
from optopick.physics.types import Array
from optopick.recheck.measured import Measured
from optopick.result import Check, Design

RESISTORS = ("r_led", "r_load", "r_be", "r_shunt")
CONDITIONS = ("temperature", "age", "ctr", "light", "v_be", "storage", "v_f", "drive", "drop", "supply")
ORDER = (*CONDITIONS, *RESISTORS)


@dataclass(frozen=True)
class Vertices:
    """All ends of all ranges. Each array is shaped to lie along its own axes of `ORDER`; `words` names the ends.

    v_be: how far from the typical unit's [V]; storage: storage constant over the typical unit's [1].
    """

    t: Array
    age: Array
    ctr: Array
    light: Array
    v_be: Array
    storage: Array
    v_f: Array
    drive: Array
    drop: Array
    v_cc: Array
    r_led: Array
    r_load: Array
    r_be: Array
    r_shunt: Array
    words: tuple[tuple[str, ...], ...]

    def corner(self, margin: Array, flat: int) -> str:
        """The vertex at flat index `flat` of the margins, in words; what makes no difference there goes unsaid."""
        index = [int(k) for k in np.unravel_index(flat, margin.shape)]
        here, parts = float(margin[tuple(index)]), []
        for axis in (n for n, size in enumerate(margin.shape) if size > 1):
            line: tuple[int | slice, ...] = (*index[:axis], slice(None), *index[axis + 1 :])
            along = margin[line]
            if not all(_same(other, here) for other in along.tolist()):
                parts.append(self.words[axis][index[axis]])
        return ", ".join(_drive_as_one([part for part in parts if part]))


def _same(other: float, here: float) -> bool:
    """Whether two margins differ by rounding at the most; they are no not-a-number, and may be infinite."""
    return other == here or abs(other - here) <= 1e-12 + 1e-9 * abs(here)


WEAKEST = frozenset({"V_F max", "drive min", "drop max", "R_LED max"})
STRONGEST = frozenset({"V_F min", "drive max", "drop min", "R_LED min"})


def _drive_as_one(parts: list[str]) -> list[str]:
    """The ends that all weaken, or all strengthen, the LED's drive said as one."""
    for ends, phrase in ((WEAKEST, "LED driven least"), (STRONGEST, "LED driven most")):
        said = [part for part in parts if part in ends]
        if len(said) > 1 and not any(part in WEAKEST | STRONGEST for part in parts if part not in ends):
            at = parts.index(said[0])
            return [*parts[:at], phrase, *(part for part in parts[at:] if part not in ends)]
    return parts


def vertices(brief: Brief, coupler: Coupler, design: Design, nominal: Collection[str] = ()) -> Vertices:
    """The box of a design; lots without a transistor have a single point on the axes of a transistor.

    nominal: axes of `ORDER` that stand at their nominal value alone (25 degC, new, typical, mid supply, no tolerance).
    """
    one = Axis("", (1.0,), ("",))
    transfer, transistor = coupler.transfer, coupler.transistor
    axes = {
        "temperature": temperatures(brief.environment, transfer),
        "age": AGES,
        "ctr": ctr_axis(transfer) if transfer else one,
        "light": light_axis(transistor.light_spread) if transistor else one,
        # the base-emitter voltage matters by what the base resistor takes
        "v_be": v_be_axis(transistor.v_be_spread if transistor and design.r_be is not None else 0.0),
        "storage": storage_axis(transistor.tau_s_spread) if transistor else one,
        "v_f": v_f_axis(coupler),
        "drive": drive_axis(brief),
        "drop": drop_axis(brief),
        "supply": supply_axis(brief),
    }
    axes |= {name: Axis(name, (_nominal(brief, coupler, name),), ("",)) for name in nominal if name in axes}
    placed = [_placed(k, axes[name].values) for k, name in enumerate(CONDITIONS)]
    resistors = [
        _placed(ORDER.index(name), (_ohms(design, name),))
        if name in nominal
        else _resistor(brief, design, name, placed[0])
        for name in RESISTORS
    ]
    ends = tuple((f"{word} min", f"{word} max") for word in ("R_LED", "R_load", "R_BE", "R_shunt"))
    words = tuple(axes[name].words for name in CONDITIONS) + ends
    fields = ("t", "age", "ctr", "light", "v_be", "storage", "v_f", "drive", "drop", "v_cc", *RESISTORS)
    return Vertices(**dict(zip(fields, [*placed, *resistors], strict=True)), words=words)


def _nominal(brief: Brief, coupler: Coupler, name: str) -> float:
    """The nominal value of an axis."""
    transfer = coupler.transfer
    return {
        "temperature": 25.0,
        "age": 0.0,
        "ctr": float(np.sqrt(transfer.ctr_min * transfer.ctr_max)) if transfer else 1.0,
        "light": 1.0,
        "v_be": 0.0,
        "storage": 1.0,
        "v_f": coupler.led.v_f_typ,
        "drive": brief.drive.supply.middle,
        "drop": brief.drive.drop.middle,
        "supply": brief.output.supply.middle,
    }[name]


def _ohms(design: Design, name: str) -> float:
    """The whole resistance at a position [ohm], infinite where it stays empty."""
    value = getattr(design, name)
    if value is None:
        return float("inf")
    return float(value * design.pieces if name == "r_led" else value)


def stock_of(brief: Brief, name: str) -> Position | None:
    """The stock of a resistor position, None where the brief does not use it."""
    position: Position | None = getattr(brief.stock, name)
    return position


def rating_of(brief: Brief, name: str, value: float) -> tuple[float, float, float]:
    """Tolerance [1], power rating [W] and voltage limit [V] of the stock value nearest to `value` [ohm].

    For a position without stock those of r_load's first value: a `check` may place what the brief does not list.
    """
    position = stock_of(brief, name) or brief.stock.r_load
    k = int(np.argmin(np.abs(np.log(np.asarray(position.values) / value))))
    return position.tolerance[k], position.power[k], position.voltage[k]


def _placed(axis: int, values: tuple[float, ...]) -> Array:
    shape = [1] * len(ORDER)
    shape[axis] = len(values)
    return np.asarray(values, dtype=float).reshape(shape)


def _resistor(brief: Brief, design: Design, name: str, t: Array) -> Array:
    axis, value = ORDER.index(name), getattr(design, name)
    if value is None:
        return _placed(axis, (np.inf,))
    low, high = resistor_span(_ohms(design, name), rating_of(brief, name, value)[0], brief.stock.drift, t)
    return np.concatenate([low, high], axis=axis)


def worst(box: Vertices, measured: Measured) -> Check:
    """The check at the vertex with the least room."""
    margin = measured.margin
    flat = int(np.argmin(margin))
    index = np.unravel_index(flat, margin.shape)
    value, limit = (_at(part, index) for part in (measured.value, measured.limit))
    corner = box.corner(margin, flat) if margin.ndim else ""
    if np.isnan(value):
        # the physics knows nothing only where a current leaves the curve, a table nothing where it has no figure
        corner = "beyond the end of the CTR curve" if margin.ndim else "the table has no figure"
    return Check(measured.name, value, limit, measured.sense, measured.unit, corner)


def _at(values: Array | float, index: tuple[np.intp, ...]) -> float:
    """The value at an index of what these values broadcast to."""
    own = np.asarray(values, dtype=float)
    last = index[len(index) - own.ndim :]
    return float(own[tuple(k if size > 1 else 0 for k, size in zip(last, own.shape, strict=True))])
