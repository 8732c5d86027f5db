"""The design a command works on: the one typed, or else the best one."""

from __future__ import annotations

from collections.abc import Mapping

from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.errors import InputError, Mistake
from optopick.result import Design
from optopick.uses.check import coupler_named, design_from_text, refuse_missing_pin
from optopick.uses.engine import Progress, quiet
from optopick.uses.pick import pick


def chosen_design(
    brief: Brief, part: str | None, texts: Mapping[str, str | None], progress: Progress = quiet
) -> tuple[Coupler, Design] | None:
    """Coupler and design; None where the best is asked for and no design exists.

    Raises InputError where the design typed is not whole or not right.
    """
    if part is None:
        stray = [name for name, text in texts.items() if text is not None]
        if stray:
            raise InputError([Mistake("--coupler", "nothing, beside resistor values", "the part they belong to")])
        found = pick(brief, progress=progress).design
        return None if found is None else (coupler_named(brief, found.coupler), found)
    design, coupler = design_from_text(part, texts), coupler_named(brief, part)
    refuse_missing_pin(coupler, design)
    return coupler, design
