"""What one link must do: the brief, validated and frozen. SI throughout, temperatures in degC.

`read_brief` makes these from a TOML file; everything behind it takes them as given.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from pathlib import Path


class DriveCircuit(StrEnum):
    """What lights the LED."""

    SOURCE = "source"  # a pin that drives high lights it
    SINK = "sink"  # a pin that pulls low lights it
    FIELD = "field"  # a voltage range from outside the equipment


class OutputCircuit(StrEnum):
    """Where the load resistor sits."""

    PULL_UP = "pull-up"
    EMITTER_LOAD = "emitter-load"


class GoalName(StrEnum):
    """What can be made least."""

    EDGE_TIME = "edge time"
    DELAY = "delay"
    DISTORTION = "distortion"
    POWER = "power"


@dataclass(frozen=True)
class Span:
    """The lowest and the highest value of a quantity; `low <= high`."""

    low: float
    high: float

    @property
    def middle(self) -> float:
        """The value half way between."""
        return (self.low + self.high) / 2


@dataclass(frozen=True)
class Signal:
    """The signal: its shortest pulse [s] and the fraction of time the LED is lit [1]."""

    shortest_pulse: float
    lit: float


@dataclass(frozen=True)
class Drive:
    """What lights the LED.

    supply: voltage that drives the LED branch when on [V]. drop: lost in the driver when on [V].
    max_current: what the driver can give [A], None where no limit is stated.
    off_leakage: current the driver still gives when off [A].
    off_voltage: field only, the highest voltage that must read as off [V], else None.
    off_current: field only, the leakage a source may give when off [A], else 0.
    on_current_min: field only, least current the input must draw when on [A], else 0.
    reverse: reverse voltage the input may see [V]; reverse_diode: a diode may be placed against it.
    """

    circuit: DriveCircuit
    supply: Span
    drop: Span
    max_current: float | None
    off_leakage: float
    off_voltage: float | None = None
    off_current: float = 0.0
    on_current_min: float = 0.0
    reverse: float = 0.0
    reverse_diode: bool = False


@dataclass(frozen=True)
class Output:
    """The receiving side.

    v_il, v_ih: receiver thresholds at each end of the supply span, (at low supply, at high supply) [V].
    input_leakage: either sign, flows while the output is off [A]. input_current_low: what the input sources while
    held low [A]. capacitance: on the output node [F]. noise_margin [V].
    """

    circuit: OutputCircuit
    supply: Span
    v_il: Span
    v_ih: Span
    noise_margin: float
    input_leakage: float
    input_current_low: float
    capacitance: float


@dataclass(frozen=True)
class Environment:
    """Ambient temperature [degC] and service life [h]."""

    temperature: Span
    life: float


@dataclass(frozen=True)
class Isolation:
    """Barrier requirements; None where none is stated. withstand [V rms], working [V], creepage [m]."""

    withstand: float | None = None
    working: float | None = None
    creepage: float | None = None


@dataclass(frozen=True)
class Limits:
    """Upper limits (ctr_margin: lower); None where none is stated. Times [s], power [W], guards [1]."""

    ctr_margin: float | None
    edge_time: float | None
    delay: float | None
    distortion: float | None
    power: float | None
    isolation: Isolation
    timing_guard: float


@dataclass(frozen=True)
class Position:
    """The stock for one resistor position.

    values: ascending, distinct [ohm]; tolerance [1] and prices [per piece] alongside each value (price None if
    unknown). power: rating [W] and voltage: limit [V] alongside each value. absent: the position may stay empty.
    described: the stock in words, e.g. "E24, 10 ohm to 1 Mohm". pieces: into how many equal resistors the position
    may be split where one cannot take the watts or the volts.
    """

    values: tuple[float, ...]
    tolerance: tuple[float, ...]
    power: tuple[float, ...]
    voltage: tuple[float, ...]
    price: tuple[float | None, ...]
    absent: bool
    described: str
    pieces: int = 1


@dataclass(frozen=True)
class Stock:
    """Stock of each position and the temperature drift of all resistors [1/K]. None: the position is not used."""

    drift: float
    r_led: Position
    r_load: Position
    r_be: Position | None
    r_shunt: Position | None


@dataclass(frozen=True)
class CouplerChoice:
    """Where the coupler table is and which rows may be used; kinds: names of `coupler.Kind`, all where None."""

    table: Path
    only: tuple[str, ...] | None
    at_least_channels: int
    kinds: tuple[str, ...] | None = None


@dataclass(frozen=True)
class Goal:
    """What to make least, then what, within `give` [1] of the first."""

    minimize: GoalName
    then: GoalName
    give: float


@dataclass(frozen=True)
class Brief:
    """One link's requirements, complete."""

    title: str
    signal: Signal
    drive: Drive
    output: Output
    environment: Environment
    limits: Limits
    stock: Stock
    couplers: CouplerChoice
    goal: Goal
    path: Path | None = None
