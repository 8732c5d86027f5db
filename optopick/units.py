"""Quantities as engineers write them: read with the unit checked, shown with SI prefixes.

Inside the program every quantity is a float in SI, except temperature [degC] and life [h].
"""

from __future__ import annotations

import json
import math
import re
from dataclasses import dataclass, field
from decimal import Decimal
from functools import cache
from numbers import Real

import rkm_codes
from quantiphy import InvalidNumber, Quantity

HOURS_PER_YEAR = 8766.0  # 365.25 days

# rkm_codes keeps its letter table for the whole process; the standard's own table is the one that tells ohm from farad.
rkm_codes.set_prefs(rkm_maps=rkm_codes.IEC60062_MAPS)


class QuantityError(ValueError):
    """A text that is not the quantity asked for: what was found, what was expected."""

    def __init__(self, found: str, expected: str) -> None:
        self.found = found
        self.expected = expected
        super().__init__(f"found {found}; expected {expected}")


# quantiphy preferences belong to a class: these two leave those of other users in the process alone.
class _SiPrefixes(Quantity):
    """Prefixes with their exact case: k is kilo, K is nothing."""


class _TradePrefixes(Quantity):
    """The same, and K is kilo too, as resistor lists write it."""


_SiPrefixes.set_prefs(input_sf="TGMkcmuµμnpf", output_sf="TGMkmunpf", map_sf={"u": "µ"}, spacer=" ", strip_zeros=True)
_TradePrefixes.set_prefs(input_sf="TGMKkcmuµμnpf")


@dataclass(frozen=True)
class _Unit:
    """How one unit is read and shown.

    scaled: spellings that take an SI prefix. fixed: spellings that take none, with their factor; they win over scaled.
    bare_prefix: "4.7k" without the unit is allowed. trade_kilo: K is kilo. shown: how the unit is printed.
    """

    noun: str
    example: str
    shown: str
    scaled: tuple[str, ...] = ()
    fixed: dict[str, str] = field(default_factory=dict)
    bare_prefix: bool = False
    trade_kilo: bool = False

    @property
    def expected(self) -> str:
        """What an error message asks for."""
        return f'{self.noun} such as "{self.example}"'


def _per_kelvin(noun: str, example: str, unit: str) -> _Unit:
    return _Unit(noun, example, f"{unit}/K", tuple(f"{unit}/{degree}" for degree in ("K", "°C", "degC")))


_OHM_NAMES = ("Ω", "ohm", "Ohm", "ohms", "Ohms")
_PER_KELVIN = {
    f"{name}/{degree}": factor
    for name, factor in (("ppm", "1e-6"), ("%", "0.01"), ("1", "1"))
    for degree in ("K", "°C", "degC")
}
_HOURS = {"h": "1", "hour": "1", "hours": "1", "kh": "1000", "d": "24", "day": "24", "days": "24"}
_YEARS = dict.fromkeys(("a", "year", "years"), "8766")

_UNITS: dict[str, _Unit] = {
    "V": _Unit("a voltage", "3.3 V", "V", ("V",), bare_prefix=True),
    "A": _Unit("a current", "10 mA", "A", ("A",), bare_prefix=True),
    "ohm": _Unit("a resistance", "4.7 kohm", "Ω", _OHM_NAMES, {"R": "1"}, bare_prefix=True, trade_kilo=True),
    # no bare prefix in a time or a length: "5 m" may be meant as minutes, and is five metres
    "s": _Unit("a time", "52 us", "s", ("s",)),
    "W": _Unit("a power", "40 mW", "W", ("W",), bare_prefix=True),
    "F": _Unit("a capacitance", "15 pF", "F", ("F",), bare_prefix=True),
    "m": _Unit("a length", "6 mm", "m", ("m",), {"m": "1"}),
    "degC": _Unit("a temperature", "25 degC", "°C", fixed=dict.fromkeys(("°C", "degC", "C"), "1")),
    "1": _Unit("a ratio", "50 %", "", fixed={"%": "0.01"}),
    "%": _Unit("a ratio", "50 %", "%", fixed={"%": "0.01"}),
    "1/K": _Unit("a temperature coefficient", "100 ppm/K", "1/K", fixed=_PER_KELVIN),
    "Hz": _Unit("a frequency", "10 kHz", "Hz", ("Hz",), bare_prefix=True),
    "bit/s": _Unit("a bit rate", "19.2 kbit/s", "bit/s", ("bit/s", "bps", "Bd", "baud"), bare_prefix=True),
    "h": _Unit("a life", "10 years", "h", fixed=_HOURS | _YEARS),
    "V/K": _per_kelvin("a voltage slope", "-1.8 mV/K", "V"),
    "A/K": _per_kelvin("a current slope", "-0.7 mA/K", "A"),
    "W/K": _per_kelvin("a power slope", "-1.3 mW/K", "W"),
    "eV": _Unit("an energy", "0.43 eV", "eV", ("eV",)),
    "K": _Unit("a temperature difference", "10 K", "K", ("K",)),
}

# Look-alikes that word processors put in: ohm sign, one-letter degree Celsius, minus sign, spaces that do not break.
_SPACES = dict.fromkeys("\u00a0\u2009\u202f", " ")
_KINDS: dict[type, str] = {dict: "a table", type(None): "nothing"}
_LOOK_ALIKES = str.maketrans({"\u2126": "Ω", "\u2103": "°C", "\u2212": "-"} | _SPACES)
_NUMBER = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_QUANTITY = re.compile(rf"({_NUMBER})(?: *([^\s0-9]\S*)| +(1/\S+))?")
_CODE = re.compile(r"((?:[0-9]+[^\W\d_][0-9]*)|(?:[^\W\d_][0-9]+))(?: *([^\s0-9]\S*))?")


def parse_quantity(text: object, unit: str) -> float:
    """Read `text` as a quantity of `unit` and return it in SI (degC for temperature, hours for life).

    A plain number is taken as SI. Text is read as an IEC 60062 code first (ohm and F only), then as number, SI prefix
    and unit. Prefixes keep their case ("10 MA" is ten megaampere), save K, which is kilo in a resistance.
    Raises QuantityError for the wrong unit, unreadable text, nan, inf, a truth value or empty text; KeyError if `unit`
    itself is none that this module knows.
    """
    rule = _UNITS[unit]
    value = _read_text(text, rule) if isinstance(text, str) else _read_number(text)
    if value is None or not math.isfinite(value):
        raise QuantityError(_found(text), rule.expected + _hint(text))
    return value


def parse_span(value: object, unit: str) -> tuple[float, float]:
    """Read the lowest and the highest of a quantity: a list of two, lowest first, or one quantity for both.

    Raises QuantityError as `parse_quantity`, and for a list of another length or in falling order.
    """
    if not isinstance(value, list | tuple):
        single = parse_quantity(value, unit)
        return single, single
    rule = _UNITS[unit]
    if len(value) != 2:
        raise QuantityError(_found(value), f"{rule.expected}, or a list of two, lowest first")
    low, high = (parse_quantity(item, unit) for item in value)
    if low > high:
        raise QuantityError(_found(value), "the lowest value first")
    return low, high


def _read_number(value: object) -> float | None:
    if isinstance(value, bool) or not isinstance(value, Real):
        return None
    try:
        return float(value)
    except OverflowError:  # an integer beyond the largest float
        return None


def _read_text(text: str, rule: _Unit) -> float | None:
    cleaned = text.translate(_LOOK_ALIKES).strip()
    coded = _read_code(cleaned, rule)
    if coded is not None:
        return coded
    match = _QUANTITY.fullmatch(cleaned)
    if match is None or not math.isfinite(float(match[1])):
        return None
    factor = _factor(match[2] or match[3] or "", rule)
    # decimal, so that "52 us" is the float nearest to 52e-6 and not a rounding step beside it
    return None if factor is None else float(Decimal(match[1]) * factor)


def _read_code(text: str, rule: _Unit) -> float | None:
    """Decode an IEC 60062 code such as 4k7, R47 or 4n7; None if it is none, or one of the other kind of part."""
    match = _CODE.fullmatch(text)
    if rule.shown not in ("Ω", "F") or match is None or (match[2] and match[2] not in rule.scaled):
        return None
    # the exact text is matched above because from_rkm ignores whatever follows the code
    decoded = rkm_codes.from_rkm(match[1])
    return float(decoded) if decoded is not None and decoded.units == rule.shown else None


def _factor(suffix: str, rule: _Unit) -> Decimal | None:
    """Return what one `suffix` is in SI; None if it is not the unit asked for."""
    if not suffix:
        return Decimal(1)
    if suffix in rule.fixed:
        return Decimal(rule.fixed[suffix])
    scale, name = _prefix(suffix, rule.trade_kilo)
    known = name in rule.scaled or (rule.bare_prefix and not name)
    return scale if known and suffix.endswith(name) else None


@cache
def _prefix(suffix: str, trade_kilo: bool) -> tuple[Decimal, str]:
    reader = _TradePrefixes if trade_kilo else _SiPrefixes
    try:
        one = reader(f"1 {suffix}")
    except InvalidNumber:
        return Decimal("nan"), "?"
    return Decimal(repr(float(one))), str(one.units)


def _found(value: object) -> str:
    """Repeat a value as the user wrote it: text in quotes, lists in brackets, truth values as files spell them."""
    if isinstance(value, str):
        return json.dumps(value if len(value) <= 60 else value[:57] + "...", ensure_ascii=False)
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, list | tuple):
        return "[" + ", ".join(_found(item) for item in value) + "]"
    if isinstance(value, Real):
        return str(value) if not isinstance(value, int) or abs(value) < 10**60 else "a number of more than 60 digits"
    return _KINDS.get(type(value), f"a {type(value).__name__}")


def _hint(text: object) -> str:
    return ", with a decimal point" if isinstance(text, str) and "," in text else ""


def quantity_pattern(unit: str) -> str:
    """Return a regular expression, for editors, that every text `parse_quantity` can read in `unit` matches.

    Written in what JavaScript and Python have in common. It is no stricter than the reader, and may be less so.
    """
    rule = _UNITS[unit]
    prefix = f"[TGMkcmuµμnpf{'K' if rule.trade_kilo else ''}]"
    names = [re.escape(name) for name in rule.fixed]
    names += [f"{prefix}?{re.escape(name)}" for name in rule.scaled]
    names += [prefix] if rule.bare_prefix else []
    suffix = "|".join(names).replace("Ω", "[Ω\u2126]").replace("°C", "(?:°C|\u2103)").replace("\\-", "-")
    number = _NUMBER.replace("+-", "+\u2212-")
    return rf"^\s*(?:{number}(?:\s*(?:{suffix}))?{_code_pattern(rule)})\s*$"


def _code_pattern(rule: _Unit) -> str:
    letters = "".join(letter for letter, (_, unit) in rkm_codes.IEC60062_MAPS.items() if unit == rule.shown)
    if not letters:
        return ""
    names = "|".join(rule.scaled)
    return f"|(?:[0-9]+[{letters}\u2126][0-9]*|[{letters}\u2126][0-9]+)(?:\\s*(?:{names}|\u2126))?"


def format_quantity(value: float, unit: str, digits: int = 3) -> str:
    """Show `value` (SI, degC or h) of `unit` with `digits` significant digits: "4.7 kΩ", "52 µs", "-20 °C".

    Unit "%" shows a ratio as a percentage, "1" as it is; life from one year up is shown in years. Trailing zeros are
    left out; infinity is "∞" and nan "n/a". Without a prefix to shorten them, whole digits are never rounded away.
    """
    if math.isnan(value):
        return "n/a"
    if math.isinf(value):
        return "∞" if value > 0 else "-∞"
    rule = _UNITS[unit]
    if rule.scaled and unit not in ("eV", "K"):
        return str(_SiPrefixes(value, rule.shown).render(prec=digits - 1))
    scaled, shown = _shown_as(value, unit)
    return f"{_plain(scaled, digits)} {shown}".rstrip()


def _shown_as(value: float, unit: str) -> tuple[float, str]:
    if unit == "%":
        return value * 100, "%"
    if unit == "1/K":
        return (value * 1e6, "ppm/K") if abs(value) < 1e-3 else (value * 100, "%/K")
    if unit == "h" and abs(value) >= HOURS_PER_YEAR:
        years = value / HOURS_PER_YEAR
        return years, "year" if years == 1 else "years"
    return value, _UNITS[unit].shown


def _plain(value: float, digits: int) -> str:
    """`value` in positional notation with at least `digits` significant digits, without trailing zeros."""
    if value == 0:
        return "0"
    places = max(0, digits - 1 - math.floor(math.log10(abs(value))))
    text = f"{value:.{places}f}"
    return text.rstrip("0").rstrip(".") if "." in text else text


def format_resistor(ohms: float) -> str:
    """Show a resistance [ohm] with up to four digits, as it is ordered: "0.47 Ω", "330 Ω", "2.2 kΩ", "1.02 MΩ"."""
    if 0 < abs(ohms) < 1:
        return f"{_plain(ohms, 4)} Ω"
    return format_quantity(ohms, "ohm", 4)
