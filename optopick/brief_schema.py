"""The JSON Schema of a brief, made from the list of its keys, for editors that complete and check TOML.

It accepts every brief that the program accepts. It cannot see everything: the range of a quantity written as text, what
keys are to one another in value, and whether files exist are left to the program.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Mapping
from typing import Any

from optopick.keys import Key, Section, brief_sections
from optopick.units import quantity_pattern

DRAFT = "https://json-schema.org/draft/2020-12/schema"

Json = dict[str, Any]

_INSTEAD = re.compile(r"(\w+(?: and \w+)*) (?:is|are) given instead")


def alternatives(section: Section) -> tuple[tuple[Key, tuple[str, ...]], ...]:
    """Return the keys of a section that others may stand in for, each with the names of those others."""
    found = ((key, _INSTEAD.fullmatch(key.default_rule)) for key in section.keys)
    return tuple((key, tuple(match[1].split(" and "))) for key, match in found if match)


def brief_schema() -> Json:
    """Return the JSON Schema (draft 2020-12) of a brief as one object."""
    return {"$schema": DRAFT, "title": "A brief of optopick", "description": "What one link must do."} | _object("")


def _object(name: str) -> Json:
    """Return the schema of the section `name` with the sections in it; an unknown key is refused."""
    section = next(entry for entry in brief_sections() if entry.name == name)
    inner = [entry for entry in brief_sections() if entry.name and entry.name.rpartition(".")[0] == name]
    keys = [key for key in section.keys if not key.only_in or name in key.only_in]
    properties = {key.name: _property(key) for key in keys}
    properties |= {_last(entry): {"description": entry.meaning} | _object(entry.name) for entry in inner}
    required = [key.name for key in keys if key.required and not key.circuits]
    required += [_last(entry) for entry in inner if entry.required]
    found: Json = {"type": "object", "properties": properties, "additionalProperties": False}
    rules = [*_instead_rules(section), *_circuit_rules(keys)]
    return found | ({"required": required} if required else {}) | ({"allOf": rules} if rules else {})


def _last(section: Section) -> str:
    return section.name.rpartition(".")[2]


# ---- what keys are to one another -----------------------------------------------------------------------------------


def _instead_rules(section: Section) -> Iterator[Json]:
    """Yield that a key or those that may stand in for it must be there; both only where it chooses a named set."""
    for key, others in alternatives(section):
        if key.circuits:
            continue  # said with its circuit
        yield _either(key, others)


def _either(key: Key, others: tuple[str, ...]) -> Json:
    how = "anyOf" if key.names_in else "oneOf"
    return {how: [{"required": [key.name]}, {"required": list(others)}]}


def _circuit_rules(keys: list[Key]) -> Iterator[Json]:
    """Yield for each circuit what it requires and what does not belong to it."""
    chooser = next((key for key in keys if key.name == "circuit"), None)
    if chooser is None or not any(key.circuits for key in keys):
        return
    for circuit in chooser.choices:
        chosen = {"properties": {"circuit": {"const": circuit}}, "required": ["circuit"]}
        yield {"if": chosen, "then": _of_circuit(keys, circuit)}


def _of_circuit(keys: list[Key], circuit: str) -> Json:
    strangers = [key.name for key in keys if key.circuits and circuit not in key.circuits]
    own = [key for key in keys if circuit in key.circuits]
    found: Json = {"properties": dict.fromkeys(strangers, False)}
    required = [key.name for key in own if key.required]
    either = [_either(key, tuple(match[1].split(" and "))) for key in own if (match := _instead(key))]
    return found | ({"required": required} if required else {}) | ({"allOf": either} if either else {})


def _instead(key: Key) -> re.Match[str] | None:
    return _INSTEAD.fullmatch(key.default_rule)


# ---- one key --------------------------------------------------------------------------------------------------------


def _property(key: Key) -> Json:
    found: Json = {"description": key.meaning, "examples": [key.example]}
    return found | ({} if key.default is None else {"default": key.default}) | _KINDS[key.kind](key)


def _one(key: Key) -> Json:
    """Return the schema of one quantity: text of its unit, or a plain number in SI within the range."""
    return {"anyOf": [{"type": "string", "pattern": quantity_pattern(key.unit)}, {"type": "number"} | _bounds(key)]}


def _bounds(key: Key) -> Json:
    ends = {"minimum": key.least, "maximum": key.most, "exclusiveMinimum": key.above}
    return {word: bound.value for word, bound in ends.items() if bound is not None}


def _span(key: Key) -> Json:
    pair = {"type": "array", "items": _one(key), "minItems": 2, "maxItems": 2}
    return {"anyOf": [*_one(key)["anyOf"], pair]}


def _threshold(key: Key) -> Json:
    return {"anyOf": [*_span(key)["anyOf"], {"type": "string", "pattern": quantity_pattern("%")}]}


def _text(_key: Key) -> Json:
    return {"type": "string", "pattern": r"\S"}


def _texts(key: Key) -> Json:
    item = {"enum": list(key.choices)} if key.choices else _text(key)
    return {"type": "array", "items": item, "minItems": 1, "uniqueItems": True}


def _stock(key: Key) -> Json:
    return {"anyOf": [_text(key), {"type": "array", "items": _one(key), "minItems": 1, "uniqueItems": True}]}


_KINDS: Mapping[str, Callable[[Key], Json]] = {
    "quantity": _one,
    "span": _span,
    "threshold": _threshold,
    "number": lambda key: {"type": "integer"} | _bounds(key),
    "text": _text,
    "choice": lambda key: {"enum": list(key.choices)},
    "flag": lambda _key: {"type": "boolean"},
    "texts": _texts,
    "file": _text,
    "stock": _stock,
}
