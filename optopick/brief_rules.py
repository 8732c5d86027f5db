"""What the keys of a brief must be to one another. Each rule looks only at values that are valid by themselves."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from optopick.brief import Span
from optopick.key_values import shown
from optopick.keys import named_sets
from optopick.read_keys import Mistakes, Values
from optopick.units import format_quantity, parse_span

# path of the key to blame, what was found, what was expected
Finding = tuple[str, str, str]


def apply_rules(values: Values, mistakes: Mistakes) -> None:
    """Note every mistake that two or more keys make together."""
    for rule in _RULES:
        for path, found, expected in rule(values):
            mistakes.add(tuple(path.split(".")), found, expected)


def _pulse_once(values: Values) -> Iterator[Finding]:
    given = values.given & {"signal.rate", "signal.shortest_pulse"}
    if len(given) == 2:
        yield "signal.shortest_pulse", "rate and shortest_pulse", "one of the two; 1 / rate is the shortest pulse"
    # `lit` always has a value once [signal] itself could be read
    elif not given and (values.has("signal.lit") or "signal.lit" in values.given):
        yield "signal.rate", "neither rate nor shortest_pulse", 'one of them, such as rate = "19.2 kbit/s"'


def _drop_leaves_voltage(values: Values) -> Iterator[Finding]:
    feed = next((path for path in ("drive.supply", "drive.on") if values.has(path)), "")
    if not feed or not values.has("drive.drop"):
        return
    lowest = values.span(feed).low
    # the worst drop at the lowest drive leaves nothing for the LED
    if values.span("drive.drop").high >= lowest:
        yield "drive.drop", _volts(values.span("drive.drop").high), f"less than the lowest drive, {_volts(lowest)}"


def _off_below_on(values: Values) -> Iterator[Finding]:
    if not values.has("drive.on", "drive.off_below"):
        return
    on, off = values.span("drive.on").low, values.number("drive.off_below")
    if off >= on:
        path = _given(values, "drive.off_below", "drive.on", "drive.type")
        yield path, f"off_below {_volts(off)}", f"less than on, {_volts(on)}"


def _current_window(values: Values) -> Iterator[Finding]:
    if not values.has("drive.on_current_min", "drive.max_current"):
        return
    least, most = values.number("drive.on_current_min"), values.number("drive.max_current")
    if least > most:
        found = f"on_current_min {format_quantity(least, 'A')}"
        expected = f"at most max_current, {format_quantity(most, 'A')}"
        yield _given(values, "drive.on_current_min", "drive.max_current", "drive.type"), found, expected


def _levels(values: Values) -> Iterator[Finding]:
    """v_il < v_ih at both ends, and room beyond both for the noise margin."""
    if not values.has("output.supply", "output.v_il", "output.v_ih", "output.noise_margin"):
        return
    supply = values.span("output.supply")
    v_il = values.threshold("output.v_il").over(supply)
    v_ih = values.threshold("output.v_ih").over(supply)
    noise = values.number("output.noise_margin")
    if v_il.low >= v_ih.low or v_il.high >= v_ih.high:
        path = _given(values, "output.v_il", "output.v_ih")
        yield path, f"v_il {_pair(v_il)}", f"less than v_ih, {_pair(v_ih)}"
    if v_il.low - noise <= 0:
        path = _given(values, "output.noise_margin", "output.v_il", "output.logic")
        yield path, f"noise_margin {_volts(noise)}", f"less than v_il, {_volts(v_il.low)}"
    if v_ih.low + noise >= supply.low or v_ih.high + noise >= supply.high:
        path = _given(values, "output.noise_margin", "output.v_ih", "output.logic")
        found = f"v_ih {_pair(v_ih)} and noise_margin {_volts(noise)}"
        yield path, found, f"a sum less than the supply, {_pair(supply)}"


def _logic_supply(values: Values) -> Iterator[Finding]:
    """Keep a set whose levels move with the supply near its own supply."""
    if not values.has("output.logic", "output.supply") or {"output.v_il", "output.v_ih"} <= values.given:
        return
    cell = named_sets("logic_levels.toml")[values.text("output.logic")].get("supply")
    if cell is None:
        return
    supply, window = values.span("output.supply"), Span(*parse_span(cell.value, "V"))
    if supply.low < window.low or supply.high > window.high:
        expected = f"a supply from {_pair(window)}, or v_il and v_ih of the receiver in its place"
        yield "output.logic", f"{shown(values.text('output.logic'))} at {_pair(supply)}", expected


def _goals_differ(values: Values) -> Iterator[Finding]:
    if values.has("goal.then", "goal.minimize") and values.text("goal.then") == values.text("goal.minimize"):
        yield "goal.then", f"{shown(values.text('goal.then'))}, as minimize", "another goal, or no such key"


def _given(values: Values, *paths: str) -> str:
    """Return the first of `paths` that the brief gives, the last if it gives none."""
    # a value may stem from a named set or a default, which have no line of their own
    return next((path for path in paths if path in values.given), paths[-1])


def _volts(value: float) -> str:
    return format_quantity(value, "V", 4)


def _pair(span: Span) -> str:
    return _volts(span.low) if span.low == span.high else f"{_volts(span.low)} to {_volts(span.high)}"


_RULES: tuple[Callable[[Values], Iterator[Finding]], ...] = (
    _pulse_once,
    _drop_leaves_voltage,
    _off_below_on,
    _current_window,
    _levels,
    _logic_supply,
    _goals_differ,
)
