"""Quantities in and out: the text of a sheet to a double in SI base units, and back.

Here belongs the way between a written value and a number. Inside the program numbers are bare floats in SI base
units; only this module adds or removes units. Scaling happens on the decimal text, never by multiplying doubles, so
that "10 uA" is the double nearest to 1e-05 and what is written into a sheet reads back as the same double.
"""

from __future__ import annotations

import math
import re
from decimal import Context, Decimal
from functools import lru_cache
from typing import NamedTuple

from worksheet.model.dimension import DIMENSIONS, NUMBER, TEMPERATURE, Dimension
from worksheet.model.text import clean
from worksheet.model.units import (
    PREFIXES,
    Unit,
    UnitError,
    is_bare_prefix,
    leading_power,
    parse_unit,
    plain_spaces,
)

__all__ = ["LONGEST_TEXT", "QuantityError", "format_input", "format_quantity", "parse", "parse_free"]

LONGEST_TEXT = 200

_EXACT = Context(prec=700)
_LEVEL = Context(prec=40)
_ZERO_CELSIUS = Decimal("273.15")
_CELSIUS_SPAN = (1.0, 1e6)  # [K]; below, a rounded text would fall under absolute zero; beyond, the shift is lost
_NUMBER = re.compile(r"(?P<digits>[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+))(?:[eE](?P<power>[+-]?[0-9]+))?")
_USUAL = re.compile(
    r"(?P<digits>[0-9]{1,20}(?:\.[0-9]{1,20})?)(?:e(?P<power>[+-]?[0-9]{1,3}))? (?P<unit>[^\s0-9,'_]\S{0,20})"
)
_LONGEST_POWER = 5
_LARGEST_LEVEL = 6000.0
_KINDS = {bool: "true or false", list: "a list", dict: "a table", type(None): "nothing"}
_SLIPS = {"K": "k", "meg": "M", "Meg": "M", "MEG": "M"}


class QuantityError(ValueError):
    """A value that cannot be read as the quantity that is wanted there.

    str() is a full sentence without the file, the line and the key, which the caller adds.

    Attributes:
        reason: What is wrong ("the unit does not fit").
        found: What stood there, made safe to show ('"10 kHz", a frequency').
        expected: What would be right ('a current, for example "2.5 uA"').
    """

    def __init__(self, reason: str, found: str, expected: str) -> None:
        self.reason = reason
        self.found = found
        self.expected = expected
        super().__init__(f"Found {found}, expected {expected}: {reason}{'' if reason.endswith('?') else '.'}")


class _Parts(NamedTuple):
    """A written quantity, taken apart."""

    digits: str
    power: int
    unit: str


def parse(value: object, dimension: Dimension) -> float:
    """Read a quantity of one kind.

    Args:
        value: A TOML value: a number in SI base units, or a text with a unit ("2.5 uA").
        dimension: What it has to be.

    Returns: the value in SI base units of `dimension`.
    Raises: QuantityError, for anything that is not unmistakably such a quantity.
    """
    if isinstance(value, str):
        plain = _usual(value, dimension)
        if plain:
            return plain
    expected = f"{dimension.phrase}, for example {_quoted(dimension)}"
    if isinstance(value, str):
        parts = _split(value, expected)
        unit = _fitting_unit(value, parts, dimension, expected)
        result = _scaled(value, parts, unit, expected)
    else:
        result = _bare(value, expected)
    if dimension == TEMPERATURE and result < 0.0:
        raise QuantityError("a temperature cannot lie below absolute zero", _found(value), expected)
    return result


def parse_free(value: object) -> tuple[float, str]:
    """Read a quantity of any kind, for a name of the user's own.

    Args:
        value: A TOML value: a number, or a text with any unit of the table or none.

    Returns: the value in SI base units, and the unit as it was written ("kHz"; "" for none). `parse_unit(unit).base`
        names the unit that the value is in.
    Raises: QuantityError.
    """
    expected = 'a number with a known unit, for example "40 kHz"'
    if not isinstance(value, str):
        return _bare(value, expected), ""
    parts = _split(value, expected)
    if not parts.unit:
        return _scaled(value, parts, None, expected), ""
    if parts.unit == "m":
        raise QuantityError('"m" could be milli or metre here; write "mV", "mm" or "cm"', _found(value), expected)
    if is_bare_prefix(parts.unit):
        return _scaled(value, _prefixed(parts), None, expected), ""
    try:
        unit = parse_unit(parts.unit)
    except UnitError as error:
        raise QuantityError(str(error), _found(value), expected) from None
    return _scaled(value, parts, unit, expected), parts.unit


def format_quantity(value: float | None, dimension: Dimension, digits: int = 4, *, ascii: bool = False) -> str:  # noqa: A002
    """Write a quantity for a reader, with an SI prefix: "2.5 µA", "5.9 MHz", "120 µm²", "27 °C", "40.1 V/V".

    Args:
        value: In SI base units; None for a number that does not exist.
        dimension: What it is.
        digits: Significant digits; trailing zeros are left out. A temperature is rounded to 10**(3 - digits) °C.
        ascii: Use "u", "ohm", "rtHz", "degC" and "^2" for terminals that cannot show the signs.

    Returns: a text that `parse` reads back to the same value within the digits; "-" for None.
    Raises: ValueError if value is not finite: a number that does not exist is None.
    """
    if value is None:
        return "-"
    if not math.isfinite(value):
        raise ValueError(f"not a finite {dimension.name}: {value}")
    exact = Decimal(repr(float(value)))
    if dimension == TEMPERATURE and _CELSIUS_SPAN[0] <= value < _CELSIUS_SPAN[1]:
        celsius = _EXACT.subtract(exact, _ZERO_CELSIUS)
        text = f"{_plain(celsius.quantize(Decimal(1).scaleb(-max(0, digits - 3)), context=_EXACT))} °C"
    else:
        text = _engineering(Context(prec=digits).plus(exact), dimension)
    return _ascii(text) if ascii else _typographic(text)


def format_input(value: float, dimension: Dimension) -> str:
    """Write a quantity into a sheet: the shortest digits that read back as exactly the same double ("4 uA").

    Args:
        value: In SI base units, finite.
        dimension: What it is.

    Raises: ValueError if value is not finite.
    """
    if not math.isfinite(value):
        raise ValueError(f"not a finite {dimension.name}: {value}")
    exact = Decimal(repr(float(value)))
    if dimension == TEMPERATURE:
        celsius, kelvin = f"{_plain(_EXACT.subtract(exact, _ZERO_CELSIUS))} °C", f"{_plain(exact)} K"
        return celsius if len(celsius) <= len(kelvin) + 1 else kelvin
    return _engineering(exact, dimension)


# Reading


def _usual(text: str, dimension: Dimension) -> float | None:
    """The value of a text of the usual form, "2.5 uA", or None: most are, and need none of the questions below."""
    found = _USUAL.fullmatch(text)
    decade = None if found is None else _usual_decade(found["unit"], dimension)
    if found is None or decade is None:
        return None
    result = float(f"{found['digits']}e{int(found['power'] or 0) + decade}")
    return result if 0.0 < result < math.inf else None


@lru_cache(maxsize=512)
def _usual_decade(text: str, dimension: Dimension) -> int | None:
    """The power of ten of a whole unit that fits; None for one that asks for more than a power."""
    if text == "m" or is_bare_prefix(text):
        return None
    try:
        unit = parse_unit(text)
    except UnitError:
        return None
    return unit.decade if unit.kind == "product" and unit.exponents == dimension.exponents else None


def _split(text: str, expected: str) -> _Parts:
    """Take number and unit apart, or say what is wrong with the number."""
    if len(text) > LONGEST_TEXT:
        raise QuantityError(f"the text is longer than {LONGEST_TEXT} characters", _found(text), expected)
    spaced = plain_spaces(text).replace("\u2212", "-")
    start = len(spaced) - len(spaced.lstrip(" "))
    number = _NUMBER.match(spaced, start)
    if not spaced.strip(" "):
        raise QuantityError("the value is empty", _found(text), expected)
    if number is None:
        if re.match(r"[+-]?(inf|nan)", spaced.strip(" "), re.IGNORECASE):
            raise QuantityError("infinity and NaN are not values", _found(text), expected)
        raise QuantityError("the value does not begin with a number", _found(text), expected)
    rest = spaced[number.end() :]
    if re.match(r" ?,", rest):
        raise QuantityError("a comma is not read; write a decimal point and no digit grouping", _found(text), expected)
    if re.match(r" *[0-9_'\u2019]", rest) and not re.match(r" *1 ?/", rest):
        raise QuantityError("digits are not grouped; write the number in one piece", _found(text), expected)
    power = number["power"] or "0"
    if len(power.lstrip("+-0")) > _LONGEST_POWER:
        raise QuantityError("the number is out of range", _found(text), expected)
    return _Parts(number["digits"], int(power), text[number.end() :].strip("\t \u00a0\u2007\u2009\u202f"))


def _fitting_unit(value: str, parts: _Parts, dimension: Dimension, expected: str) -> Unit | None:
    """The unit, known to fit the dimension; None for no unit where none is needed."""
    if not parts.unit:
        if dimension.unit:
            raise QuantityError("the unit is missing", _found(value), expected)
        return None
    is_length = dimension.unit == "m"
    if parts.unit == "m" and not is_length:
        hint = "write the number with e-3" if dimension == NUMBER else "write the whole unit"
        if leading_power(dimension.unit) == 1:
            hint = f'for milli write "m{dimension.unit}"'
        raise QuantityError(f'"m" could be milli or metre here; {hint}', _found(value), expected)
    if is_bare_prefix(parts.unit):
        if dimension == TEMPERATURE or (dimension.unit and leading_power(dimension.unit) != 1):
            raise QuantityError("a prefix alone is ambiguous here; write the whole unit", _found(value), expected)
        decade = _prefixed(parts).power - parts.power
        return Unit(dimension.exponents, decade, dimension.unit)
    try:
        unit = parse_unit(parts.unit)
    except UnitError as error:
        hint = _meant(parts.unit, dimension)
        raise QuantityError(f"{error}{hint}", _found(value), expected) from None
    fits = unit.exponents == dimension.exponents
    if unit.kind == "decibel":
        fits = "dB" in dimension.also
    elif unit.kind == "rms":
        fits = fits and "rms" in dimension.also
    if not fits:
        hint = _meant(parts.unit, dimension)
        raise QuantityError(f"the unit does not fit{hint}", f"{_found(value)}, {_kind(unit)}", expected)
    return unit


def _prefixed(parts: _Parts) -> _Parts:
    """The number with its bare prefix worked into the power of ten."""
    symbol = "u" if parts.unit in "uµμ" else parts.unit
    return _Parts(parts.digits, parts.power + PREFIXES[symbol], "")


def _scaled(value: str, parts: _Parts, unit: Unit | None, expected: str) -> float:
    """Number times unit, rounded once from the exact decimal value."""
    power = parts.power + (unit.decade if unit else 0)
    number = f"{parts.digits}e{power}"
    lost = False
    if unit and unit.kind == "celsius":
        result = float(_EXACT.add(Decimal(number), _ZERO_CELSIUS))
    elif unit and unit.kind == "decibel":
        within = abs(float(number)) <= _LARGEST_LEVEL
        result = float(_LEVEL.power(10, _LEVEL.divide(Decimal(number), 20))) if within else math.inf
    else:
        result = float(number)
        lost = result == 0.0 and re.search("[1-9]", parts.digits) is not None
    if math.isinf(result) or lost:
        raise QuantityError("the number is out of range", _found(value), expected)
    return result + 0.0


def _bare(value: object, expected: str) -> float:
    """A TOML number, which is in SI base units already."""
    if isinstance(value, bool) or not isinstance(value, int | float):
        kind = _KINDS.get(type(value), "a date or time" if hasattr(value, "isoformat") else "another kind of value")
        raise QuantityError("this is not a quantity", kind, expected)
    try:
        result = float(value)
    except OverflowError:
        raise QuantityError("the number is out of range", "an integer beyond 1e308", expected) from None
    if not math.isfinite(result):
        raise QuantityError("infinity and NaN are not values", str(result), expected)
    return result + 0.0


# What a message says


def _found(value: object) -> str:
    """The value as a message shows it: short and harmless."""
    if isinstance(value, str):
        shown = clean(value)
        return f'"{shown[:60]}…"' if len(shown) > 60 else f'"{shown}"'
    return repr(value)


def _quoted(dimension: Dimension) -> str:
    """The example of a dimension as it would stand in a sheet."""
    return f'"{dimension.example}"' if dimension.unit else dimension.example


def _kind(unit: Unit) -> str:
    """What a unit measures, with its article."""
    if unit.kind == "decibel":
        return "a gain in decibels"
    if unit.kind == "rms":
        return "a noise voltage"
    if not any(unit.exponents):
        return "a ratio"
    for dimension in DIMENSIONS:
        if dimension.exponents == unit.exponents:
            return dimension.phrase
    return f"a quantity in {unit.base}"


def _meant(unit: str, dimension: Dimension) -> str:
    """A hint for units that differ from a fitting one in case, or are usual slips."""
    if dimension == TEMPERATURE and unit in {"C", "c", "k", "degrees", "deg", "°", "° K", "°K"}:
        return '; write "°C" or "K"'
    if unit in _SLIPS and leading_power(dimension.unit) == 1:
        return f'; did you mean "{_SLIPS[unit]}{dimension.unit}"?'
    wanted = dimension.shown or dimension.unit
    if leading_power(wanted) != 1:
        return ""
    folded = unit.replace("µ", "u").replace("μ", "u").casefold()
    candidates = (prefix + wanted for prefix in ("", "f", "p", "n", "u", "m", "k", "M", "G"))
    near = [f'"{candidate}"' for candidate in candidates if candidate.casefold() == folded]
    return f"; did you mean {' or '.join(near)}?" if near else ""


# Writing

_STEPS = {power: prefix for prefix, power in PREFIXES.items() if power % 3 == 0} | {0: ""}


def _engineering(exact: Decimal, dimension: Dimension) -> str:
    """The value, already rounded, with the prefix that keeps its digits before the point."""
    shown = dimension.shown or dimension.unit
    below = parse_unit(shown).decade if shown else 0
    scaled = exact.scaleb(-below, _EXACT)
    power = leading_power(shown)
    if not dimension.prefixed or dimension.plain or power not in {1, 2}:
        return f"{_plain(scaled)} {shown}".rstrip(" ").replace(" 1/", " /")
    squared = power == 2
    decades, prefix = _step(scaled, squared)
    text = _plain(scaled.scaleb(-decades, _EXACT))
    return f"{text} {prefix}{shown}"


def _step(scaled: Decimal, squared: bool) -> tuple[int, str]:
    """Power of ten and prefix for a mantissa from 1 to 1,000; 0.01 to 10,000 where the prefix is squared.

    The wider span keeps a square micrometre up to a hundredth of a square millimetre, as areas are usually given.
    """
    if not scaled:
        return 0, ""
    exponent = scaled.adjusted()
    power = 2 if squared else 1
    step = 3 * ((exponent + 2) // 6 if squared else exponent // 3)
    if step not in _STEPS:
        return 0, ""
    return step * power, _STEPS[step]


def _plain(number: Decimal) -> str:
    """Digits without trailing zeros, positional where that is short, else with an exponent that `parse` reads."""
    number = number.normalize(_EXACT)
    if not number:
        return "0"
    if -5 <= number.adjusted() < 7 and len(number.as_tuple().digits) <= 18:
        return format(number, "f")
    mantissa = number.scaleb(-number.adjusted(), _EXACT)
    return f"{mantissa:f}e{number.adjusted()}"


def _typographic(text: str) -> str:
    """The signs of the SI brochure for the spellings of the table."""
    text = text.replace("rtHz", "√Hz").replace("sqrt(Hz)", "√Hz").replace("^2", "²").replace("ohm", "Ω")
    return re.sub(r"\bu(?=[A-Za-zΩ])", "µ", text)


def _ascii(text: str) -> str:
    """The spellings of the table for the signs."""
    return text.replace("°C", "degC")
