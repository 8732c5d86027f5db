"""An existing design against a brief: every check, and what the table left to assume."""

from __future__ import annotations

from collections.abc import Mapping
from difflib import get_close_matches

from optopick.answers import Checked
from optopick.brief import Brief
from optopick.cautions import cautions
from optopick.coupler import Coupler
from optopick.errors import InputError, Mistake
from optopick.read_couplers import read_couplers
from optopick.recheck import review
from optopick.result import Design
from optopick.units import QuantityError, format_resistor, parse_quantity
from optopick.uses.engine import unusable

LEAST, MOST = 0.1, 1e9
"""Resistances between which a design's are believed [ohm]."""


def design_from_text(coupler: str | None, texts: Mapping[str, str | None]) -> Design:
    """A design from resistor values as typed; raises InputError with every value that cannot be read."""
    ohms: dict[str, float | None] = {}
    pieces, mistakes = 1, []
    if not coupler:
        mistakes.append(Mistake("--coupler", "nothing", "a part of the brief's table"))
    for name in ("r_led", "r_load"):
        if texts.get(name) is None:
            mistakes.append(Mistake(_option(name), "nothing", 'a resistance such as "2k2"'))
    for name, text in texts.items():
        try:
            counted = text.partition("x") if name == "r_led" and text else None
            if counted and counted[1] and counted[0].strip() in ("2", "3"):
                pieces, text = int(counted[0]), counted[2]  # noqa: PLW2901
            ohms[name] = None if text is None else _positive(text)
        except QuantityError as error:
            mistakes.append(Mistake(_option(name), error.found, error.expected))
    if mistakes:
        raise InputError(mistakes)
    r_led, r_load = ohms["r_led"], ohms["r_load"]
    assert coupler is not None
    assert r_led is not None
    assert r_load is not None
    return Design(coupler, r_led, r_load, ohms.get("r_be"), ohms.get("r_shunt"), pieces)


def _option(name: str) -> str:
    return f"--{name.replace('_', '-')}"


def _positive(text: str) -> float:
    value = parse_quantity(text, "ohm")
    if not LEAST <= value <= MOST:
        believed = f"{format_resistor(LEAST)} to {format_resistor(MOST)}"
        raise QuantityError(f'"{text}"', f'a resistance such as "2k2", from {believed}')
    return value


def check_design(brief: Brief, design: Design) -> Checked:
    """Every check of a design; raises InputError where the table has no such coupler or it has no base pin."""
    coupler = coupler_named(brief, design.coupler)
    refuse_missing_pin(coupler, design)
    return Checked(review(brief, coupler, design), coupler.assumed, _notes(brief, coupler, design), cautions(brief))


def refuse_missing_pin(coupler: Coupler, design: Design) -> None:
    """Raise InputError where a design has a base-emitter resistor and its coupler no base pin."""
    if design.r_be is not None and not coupler.base_pin:
        found = f"a base-emitter resistor with {coupler.part}, whose base is not brought out"
        raise InputError([Mistake("--r-be", found, "no --r-be, or a coupler with a base pin")])


def coupler_named(brief: Brief, part: str) -> Coupler:
    """The row of the brief's table with this part; raises InputError where it has none, or set it aside."""
    table = read_couplers(brief.couplers.table)
    for coupler in table.couplers:
        if coupler.part == part:
            return coupler
    for aside in table.set_aside:
        if aside.part == part:
            raise InputError(
                [Mistake("--coupler", f'"{part}", set aside: {aside.reason}', "a complete row of the table")]
            )
    parts = [coupler.part for coupler in table.couplers]
    near = get_close_matches(part.upper(), parts, n=1, cutoff=0.4) or parts[:1]
    expected = f'a part of {table.path.name} such as "{near[0]}"' if near else "a table with usable couplers"
    raise InputError([Mistake("--coupler", f'"{part}"', expected)])


def _notes(brief: Brief, coupler: Coupler, design: Design) -> tuple[str, ...]:
    """What the design has that the brief's stock and choice of couplers do not."""
    unfit = unusable(brief, coupler)
    notes = [f"the brief would not take {coupler.part}: {unfit}"] if unfit else []
    for name in ("r_led", "r_load", "r_be", "r_shunt"):
        ohms, stock = getattr(design, name), getattr(brief.stock, name)
        if ohms is not None and (stock is None or not any(abs(v / ohms - 1) < 1e-6 for v in stock.values)):
            where = (
                f"not in the stock ({stock.described})" if stock else "at a position that the brief has no stock for"
            )
            notes.append(f"{name}, {format_resistor(ohms)}, is {where}")
    return tuple(notes)
