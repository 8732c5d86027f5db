"""The kinds of value that a key of the brief can have, each read with its unit and range checked."""

from __future__ import annotations

import difflib
import json
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import cast

from optopick.brief import Span
from optopick.keys import Key
from optopick.units import QuantityError, parse_quantity, parse_span

# units names what it found by its Python type; these two have a plainer name
_PLAIN_NAMES = {"a dict": "a table", "a NoneType": "nothing"}


@dataclass(frozen=True)
class Threshold:
    """A receiver's level: volts at the lowest and at the highest supply, or a ratio of the supply."""

    volts: Span | None
    ratio: float | None

    def over(self, supply: Span) -> Span:
        """Return the level [V] at each end of `supply` [V]."""
        if self.ratio is not None:
            return Span(self.ratio * supply.low, self.ratio * supply.high)
        return cast(Span, self.volts)


def shown(value: object) -> str:
    """Return `value` as a brief would write it, shortened where long."""
    if isinstance(value, str):
        return json.dumps(value if len(value) <= 60 else value[:57] + "...", ensure_ascii=False)
    if isinstance(value, bool):  # before int, of which Python's bool is a kind
        return str(value).lower()
    if isinstance(value, list | tuple):
        return "[" + ", ".join(shown(item) for item in value[:6]) + (", ...]" if len(value) > 6 else "]")
    if isinstance(value, Mapping):
        return "a table"
    if isinstance(value, int | float):
        return str(value) if not isinstance(value, int) or abs(value) < 10**60 else "a number of more than 60 digits"
    return "nothing" if value is None else f"a {type(value).__name__}"


def nearest(name: str, known: Iterable[str]) -> str:
    """Return a hint that names the one of `known` that `name` may stand for; empty if none is near."""
    near = difflib.get_close_matches(name, list(known), n=1)
    return f' (did you mean "{near[0]}"?)' if near else ""


def one_of(choices: Iterable[str]) -> str:
    """Return the words that ask for one of `choices`."""
    return f"one of {', '.join(shown(choice) for choice in choices)}"


def read_value(key: Key, value: object, base: Path) -> object:
    """Read the value of one key as its kind demands. Raises QuantityError with what was found and expected."""
    try:
        return _READERS[key.kind](key, value, base)
    except QuantityError as error:
        # of a list units shows every item its own way; here the whole list is shown as the brief has it
        found = shown(value) if error.found.startswith("[") else _PLAIN_NAMES.get(error.found, error.found)
        raise QuantityError(found, error.expected) from None
    except RecursionError:
        raise QuantityError("lists nested too deep", f"a value such as {shown(key.example)}") from None


def _in_range(key: Key, number: float, value: object) -> float:
    if not key.allows(number):
        raise QuantityError(shown(value), key.range_in_words())
    return number


def _quantity(key: Key, value: object, _base: Path) -> float:
    return _in_range(key, parse_quantity(value, key.unit), value)


def _span(key: Key, value: object, _base: Path) -> Span:
    low, high = parse_span(value, key.unit)
    # both ends: a range may be left at either
    for end in (low, high):
        _in_range(key, end, value)
    single = not isinstance(value, list | tuple)
    return Span(0.0 if single and key.single == "from zero" else low, high)


def _threshold(key: Key, value: object, base: Path) -> Threshold:
    if not (isinstance(value, str) and value.strip().endswith("%")):
        return Threshold(_span(key, value, base), None)
    ratio = parse_quantity(value, "%")
    if not 0 < ratio < 1:
        raise QuantityError(shown(value), "more than 0 % and less than 100 % of the supply")
    return Threshold(None, ratio)


def _number(key: Key, value: object, _base: Path) -> int:
    if not isinstance(value, int) or isinstance(value, bool):
        raise QuantityError(shown(value), f"a whole number such as {shown(key.example)}")
    _in_range(key, value, value)
    return value


def _text(key: Key, value: object, _base: Path) -> str:
    if not isinstance(value, str) or not value.strip():
        raise QuantityError(shown(value), f"text such as {shown(key.example)}")
    return value.strip()


def _choice(key: Key, value: object, _base: Path) -> str:
    if isinstance(value, str) and value in key.choices:
        return value
    hint = nearest(value, key.choices) if isinstance(value, str) else ""
    raise QuantityError(shown(value), one_of(key.choices) + hint)


def _flag(_key: Key, value: object, _base: Path) -> bool:
    if not isinstance(value, bool):
        raise QuantityError(shown(value), "true or false")
    return value


def _texts(key: Key, value: object, _base: Path) -> tuple[str, ...]:
    if not isinstance(value, list | tuple) or not value:
        raise QuantityError(shown(value), f"a list of texts such as {shown(key.example)}")
    for item in value:
        if not isinstance(item, str) or not item.strip():
            raise QuantityError(f"{shown(item)} in the list", f"texts such as {shown(key.example)}")
        if key.choices and item.strip() not in key.choices:
            raise QuantityError(f"{shown(item)} in the list", one_of(key.choices) + nearest(item, key.choices))
    texts = tuple(item.strip() for item in value)
    _refuse_twice(texts, value)
    return texts


def _refuse_twice(read: tuple[object, ...], written: list[object] | tuple[object, ...]) -> None:
    for index, item in enumerate(read):
        if item in read[:index]:
            raise QuantityError(f"{shown(written[index])} twice", "each once")


def _file(key: Key, value: object, base: Path) -> Path:
    path = base / (value if isinstance(value, Path) else _text(key, value, base))
    try:
        exists = path.is_file()
    except (OSError, ValueError):  # a name that no file can have
        exists = False
    if not exists:
        found = f"{shown(str(value))}, where there is no file"
        raise QuantityError(found, "a file, its path relative to the brief's folder")
    return path


def _stock(key: Key, value: object, base: Path) -> Path | tuple[float, ...]:
    if not isinstance(value, list | tuple):
        return _file(key, value, base)
    if not value:
        raise QuantityError("an empty list", 'values such as ["1k", "2.2k", "4.7k"]')
    numbers = tuple(_quantity(key, item, base) for item in value)
    _refuse_twice(numbers, value)
    return numbers


_READERS: dict[str, Callable[[Key, object, Path], object]] = {
    "quantity": _quantity,
    "span": _span,
    "threshold": _threshold,
    "number": _number,
    "text": _text,
    "choice": _choice,
    "flag": _flag,
    "texts": _texts,
    "file": _file,
    "stock": _stock,
}
