"""Some of the values of a position: the last axis of every array in a dataclass of candidates."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import fields, replace
from typing import Any, TypeVar

import numpy as np

Part = TypeVar("Part", bound=Any)


def taken(part: Part, values: np.ndarray, besides: Collection[str] = ()) -> Part:
    """The candidates `values` of a position; fields named in `besides` are not over its values."""
    changed: dict[str, Any] = {"keep": {name: mask[values] for name, mask in part.keep.items()}}
    for field in fields(part):
        array = getattr(part, field.name)
        if isinstance(array, np.ndarray) and field.name not in besides:
            changed[field.name] = array[..., values]
    found: Part = replace(part, **changed)
    return found
