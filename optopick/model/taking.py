"""Some of the values of a position: the last axis of every array in a dataclass of candidates."""

from __future__ import annotations

from dataclasses import fields, replace
from typing import Any, TypeVar

import numpy as np

Part = TypeVar("Part", bound=Any)


def taken(part: Part, values: np.ndarray) -> Part:
    """The candidates `values` of a position."""
    changed: dict[str, Any] = {"keep": {name: mask[values] for name, mask in part.keep.items()}}
    for field in fields(part):
        own = getattr(part, field.name)
        if isinstance(own, np.ndarray):
            changed[field.name] = own[..., values]
        elif hasattr(own, "taken"):
            changed[field.name] = own.taken(values)
    found: Part = replace(part, **changed)
    return found
