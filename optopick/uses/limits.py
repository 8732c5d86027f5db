"""The limits of a brief that an engineer could move: how to read each, and how to set it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

from optopick.brief import Brief, Drive, Environment, Output, Position, Span
from optopick.eseries import SERIES, series_values

Setter = Callable[[Brief, float], Brief]


@dataclass(frozen=True)
class Limit:
    """One limit: its key, its value in this brief, its unit, which way is easier, and the brief with another value.

    goal: the field of Goal whose least value answers how far it must move, where there is one. floor, ceiling: as far
    as it makes sense to move it. moved: the brief with the limit at a value.
    """

    key: str
    check: str
    value: float
    unit: str
    easier_up: bool
    far: float
    moved: Setter


def movable_limits(brief: Brief) -> list[Limit]:
    """Every limit that this brief states and that can be moved by degrees."""
    return [limit for limit in _all(brief) if limit is not None]


def _all(brief: Brief) -> list[Limit | None]:
    limits, output, drive, environment = brief.limits, brief.output, brief.drive, brief.environment
    found: list[Limit | None] = []
    for name, unit in (("edge_time", "s"), ("delay", "s"), ("distortion", "s"), ("power", "W")):
        value = getattr(limits, name)
        found.append(
            None if value is None else Limit(f"limits.{name}", name, value, unit, True, 1e3 * value, _limits(name))
        )
    if limits.ctr_margin is not None:
        found.append(
            Limit("limits.ctr_margin", "ctr_margin", limits.ctr_margin, "1", False, 1.0, _limits("ctr_margin"))
        )
    pulse = brief.signal.shortest_pulse
    found.append(Limit("signal.shortest_pulse", "shortest_pulse", pulse, "s", True, 1e3 * pulse, _pulse))
    if drive.max_current is not None:
        moved = _drive(lambda d, v: replace(d, max_current=v))
        found.append(
            Limit("drive.max_current", "driver_current", drive.max_current, "A", True, 1e2 * drive.max_current, moved)
        )
    if drive.off_leakage > 0:
        moved = _drive(lambda d, v: replace(d, off_leakage=v))
        found.append(Limit("drive.off_leakage", "led_dark", drive.off_leakage, "A", False, 0.0, moved))
    if drive.off_current > 0:
        moved = _drive(lambda d, v: replace(d, off_current=v))
        found.append(Limit("drive.off_current", "led_dark", drive.off_current, "A", False, 0.0, moved))
    if drive.on_current_min > 0:
        moved = _drive(lambda d, v: replace(d, on_current_min=v))
        found.append(Limit("drive.on_current_min", "input_current", drive.on_current_min, "A", False, 0.0, moved))
    if output.noise_margin > 0:
        moved = _output(lambda o, v: replace(o, noise_margin=v))
        found.append(Limit("output.noise_margin", "output_low", output.noise_margin, "V", False, 0.0, moved))
    hot = environment.temperature.high
    if hot > 25:
        moved = _environment(lambda e, v: replace(e, temperature=Span(min(e.temperature.low, v), v)))
        found.append(Limit("environment.temperature[1]", "", hot, "degC", False, 25.0, moved))
    cold = environment.temperature.low
    if cold < 25:
        moved = _environment(lambda e, v: replace(e, temperature=Span(v, max(e.temperature.high, v))))
        found.append(Limit("environment.temperature[0]", "", cold, "degC", True, 25.0, moved))
    if environment.life > 0:
        moved = _environment(lambda e, v: replace(e, life=v))
        found.append(Limit("environment.life", "", environment.life, "h", False, 0.0, moved))
    return found


def _limits(name: str) -> Setter:
    return lambda brief, value: replace(brief, limits=replace(brief.limits, **{name: value}))  # type: ignore[arg-type]


def _pulse(brief: Brief, value: float) -> Brief:
    return replace(brief, signal=replace(brief.signal, shortest_pulse=value))


def _drive(change: Callable[[Drive, float], Drive]) -> Setter:
    return lambda brief, value: replace(brief, drive=change(brief.drive, value))


def _output(change: Callable[[Output, float], Output]) -> Setter:
    return lambda brief, value: replace(brief, output=change(brief.output, value))


def _environment(change: Callable[[Environment, float], Environment]) -> Setter:
    return lambda brief, value: replace(brief, environment=change(brief.environment, value))


def finer_stock(brief: Brief, name: str) -> list[tuple[str, Brief]]:
    """The brief with each finer series at one position, over the same range; (series, brief), coarsest first."""
    position: Position | None = getattr(brief.stock, name)
    if position is None or not position.described.startswith("E"):
        return []
    own = position.described.split(",")[0]
    finer = [series for series in SERIES if own in SERIES and int(series[1:]) > int(own[1:])]
    return [(series, _restocked(brief, name, position, series)) for series in finer]


def _restocked(brief: Brief, name: str, position: Position, series: str) -> Brief:
    values = series_values(series, position.values[0], position.values[-1])
    n = len(values)
    finer = replace(
        position,
        values=values,
        tolerance=position.tolerance[:1] * n,
        power=position.power[:1] * n,
        voltage=position.voltage[:1] * n,
        price=position.price[:1] * n,
        described=series + position.described[len(position.described.split(",")[0]) :],
    )
    return replace(brief, stock=replace(brief.stock, **{name: finer}))  # type: ignore[arg-type]
