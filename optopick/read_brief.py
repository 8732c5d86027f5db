"""Read a brief: from a TOML file, from its text, or from a mapping in Python."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import cast

from optopick.brief import (
    Brief,
    CouplerChoice,
    Drive,
    DriveCircuit,
    Environment,
    Goal,
    GoalName,
    Isolation,
    Limits,
    Output,
    OutputCircuit,
    Position,
    Signal,
    Span,
    Stock,
)
from optopick.brief_rules import apply_rules
from optopick.brief_stock import read_positions
from optopick.errors import InputError, Mistake
from optopick.key_values import shown
from optopick.read_keys import Mistakes, Values, read_values
from optopick.toml_lines import key_lines
from optopick.toml_text import parse_toml, read_text

_UNTITLED = "Untitled link"


def read_brief(path: Path | str) -> Brief:
    """Read the brief at `path`. Raises InputError with every mistake in it."""
    path = Path(path)
    return brief_from_text(read_text(path, "a brief in TOML"), path)


def brief_from_text(text: str, path: Path) -> Brief:
    """Read the brief `text`, which stands or would stand at `path`. Raises InputError with every mistake in it."""
    if not text.strip():
        raise InputError([Mistake(str(path), "an empty file", "a brief in TOML")])
    document = parse_toml(text, str(path))
    return _brief(document, path.parent, path, Mistakes(str(path), key_lines(text)))


def brief_from_document(document: Mapping[str, object], path: Path, mistakes: Mistakes) -> Brief:
    """Read a brief that is parsed already and stands at `path`. Raises InputError where `mistakes` has any then."""
    return _brief(document, path.parent, path, mistakes)


def brief_from_mapping(mapping: Mapping[str, object], base: Path) -> Brief:
    """Read a brief given as nested mappings with the keys of the file; relative paths start at the folder `base`.

    Raises InputError with every mistake in it.
    """
    if not isinstance(mapping, Mapping):
        raise InputError([Mistake("brief", shown(mapping), "a mapping with the sections of a brief")])
    return _brief(mapping, base, None, Mistakes("brief", {}))


def _brief(document: Mapping[str, object], base: Path, path: Path | None, mistakes: Mistakes) -> Brief:
    values = read_values(document, base, mistakes)
    apply_rules(values, mistakes)
    positions = read_positions(values, mistakes)
    mistakes.raise_any()
    # from here on every required value is there
    return Brief(
        title=values.text("title", path.stem if path else _UNTITLED),
        signal=_signal(values),
        drive=_drive(values),
        output=_output(values),
        environment=Environment(values.span("environment.temperature"), values.number("environment.life")),
        limits=_limits(values),
        stock=_stock(values, positions),
        couplers=_couplers(values),
        goal=_goal(values),
        path=path,
    )


def _signal(values: Values) -> Signal:
    # one of the two is given; the rules have seen to that
    rate = values.optional("signal.rate")
    return Signal(
        shortest_pulse=values.number("signal.shortest_pulse") if rate is None else 1.0 / rate,
        lit=values.number("signal.lit"),
    )


def _drive(values: Values) -> Drive:
    circuit = DriveCircuit(values.text("drive.circuit"))
    field = circuit is DriveCircuit.FIELD
    return Drive(
        circuit=circuit,
        supply=values.span("drive.on" if field else "drive.supply"),
        drop=values.span("drive.drop"),
        max_current=values.optional("drive.max_current"),
        off_leakage=values.number("drive.off_leakage"),
        off_voltage=values.number("drive.off_below") if field else None,
        off_current=values.number("drive.off_current"),
        on_current_min=values.number("drive.on_current_min"),
        reverse=values.number("drive.reverse"),
        reverse_diode=bool(values.get("drive.reverse_diode")),
    )


def _output(values: Values) -> Output:
    supply: Span = values.span("output.supply")
    return Output(
        circuit=OutputCircuit(values.text("output.circuit")),
        supply=supply,
        v_il=values.threshold("output.v_il").over(supply),
        v_ih=values.threshold("output.v_ih").over(supply),
        noise_margin=values.number("output.noise_margin"),
        input_leakage=values.number("output.input_leakage"),
        input_current_low=values.number("output.input_current_low"),
        capacitance=values.number("output.capacitance"),
    )


def _limits(values: Values) -> Limits:
    return Limits(
        ctr_margin=values.optional("limits.ctr_margin"),
        edge_time=values.optional("limits.edge_time"),
        delay=values.optional("limits.delay"),
        distortion=values.optional("limits.distortion"),
        power=values.optional("limits.power"),
        isolation=Isolation(
            withstand=values.optional("limits.isolation.withstand"),
            working=values.optional("limits.isolation.working"),
            creepage=values.optional("limits.isolation.creepage"),
        ),
        timing_guard=values.number("limits.timing_guard"),
    )


def _stock(values: Values, positions: Mapping[str, Position]) -> Stock:
    return Stock(
        drift=values.number("stock.drift"),
        r_led=positions["r_led"],
        r_load=positions["r_load"],
        r_be=positions.get("r_be"),
        r_shunt=positions.get("r_shunt"),
    )


def _couplers(values: Values) -> CouplerChoice:
    return CouplerChoice(
        table=cast(Path, values.get("couplers.table")),
        only=cast("tuple[str, ...] | None", values.get("couplers.only")),
        at_least_channels=cast(int, values.get("couplers.at_least.channels")),
        kinds=cast("tuple[str, ...] | None", values.get("couplers.kinds")),
    )


def _goal(values: Values) -> Goal:
    minimize = GoalName(values.text("goal.minimize"))
    # default of the second goal
    then = GoalName.EDGE_TIME if minimize is GoalName.POWER else GoalName.POWER
    return Goal(minimize, GoalName(values.text("goal.then", then)), values.number("goal.give"))
