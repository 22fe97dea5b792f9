"""The closed table of units and prefixes, and how a unit text is read.

Here belongs what a unit text means and nothing about numbers. The table is our own because general unit libraries read
"300 K" as 300,000 or lose a square root; every unit in it is a power of ten of V, A, s, m and K, so that scaling is
exact in decimal. Prefixes are the 24 of the SI brochure, 9th edition (2019), with the four of 2022 (CGPM resolution 3).
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

from worksheet.model.dimension import Exponents
from worksheet.model.text import clean

__all__ = ["PREFIXES", "SYMBOLS", "Unit", "UnitError", "is_bare_prefix", "leading_power", "parse_unit", "plain_spaces"]

PREFIXES: dict[str, int] = {
    "Q": 30,
    "R": 27,
    "Y": 24,
    "Z": 21,
    "E": 18,
    "P": 15,
    "T": 12,
    "G": 9,
    "M": 6,
    "k": 3,
    "h": 2,
    "da": 1,
    "d": -1,
    "c": -2,
    "m": -3,
    "u": -6,
    "n": -9,
    "p": -12,
    "f": -15,
    "a": -18,
    "z": -21,
    "y": -24,
    "r": -27,
    "q": -30,
}
"""Prefix to power of ten; micro is "u" here, both micro signs are turned into it before."""

SYMBOLS: dict[str, Exponents] = {
    "V": (2, 0, 0, 0, 0),
    "A": (0, 2, 0, 0, 0),
    "s": (0, 0, 2, 0, 0),
    "m": (0, 0, 0, 2, 0),
    "K": (0, 0, 0, 0, 2),
    "Hz": (0, 0, -2, 0, 0),
    "F": (-2, 2, 2, 0, 0),
    "S": (-2, 2, 0, 0, 0),
    "ohm": (2, -2, 0, 0, 0),
    "W": (2, 2, 0, 0, 0),
    "C": (0, 2, 2, 0, 0),
    "J": (2, 2, 2, 0, 0),
}
"""Units that take a prefix."""

_UNPREFIXED: dict[str, tuple[Exponents, int, str]] = {
    "rtHz": ((0, 0, -1, 0, 0), 0, "sqrt(Hz)"),
    "%": ((0, 0, 0, 0, 0), -2, ""),
    "ppm": ((0, 0, 0, 0, 0), -6, ""),
    "degC": ((0, 0, 0, 0, 2), 0, "K"),  # within a product a difference of temperature: mV/°C is mV/K
}
"""Exponents, power of ten and SI spelling of what never takes a prefix."""

LONGEST_UNIT = 60

_SPACES = dict.fromkeys(map(ord, "\t\u00a0\u2007\u2009\u202f"), " ")
_SPELLINGS = str.maketrans(
    {
        "µ": "u",
        "μ": "u",
        "Ω": "ohm",
        "\u2126": "ohm",
        "℃": "degC",
        "·": "*",
        "⋅": "*",
        "\u2212": "-",
        "²": "^2",
        "³": "^3",
        "º": "°",  # the ordinal sign that some keyboards have in its place
    }
)
_SUPERSCRIPT_MINUS = re.compile("⁻([¹²³])")
_ROOT_HERTZ = re.compile(r"(?:sqrt|√) ?\( ?Hz ?\)|√ ?Hz|Hz ?\^ ?\(?0\.5\)?")
_POWER_SIGN = re.compile(r" ?(?:\^|\*\*) ?")
_BETWEEN = re.compile(r" ?\* ?| ")
_PARENTHESES = re.compile(r"\( ?([^()]*?) ?\)")
_FACTOR = re.compile(r"(?P<symbol>[A-Za-z]+|%)(?:\^(?P<power>-?[1-9])|(?P<digit>[23]))?")


class UnitError(ValueError):
    """A unit text that the table does not know. str() is a clause such as 'the unit "ua" is not known'."""


@dataclass(frozen=True, slots=True)
class Unit:
    """What a unit text means: value in SI = number * 10**decade (+ 273.15 for Celsius), or 10**(number/20) for dB.

    Attributes:
        exponents: Twice the exponents of (V, A, s, m, K).
        decade: Power of ten between the written unit and SI.
        base: The same unit without prefixes, as JSON spells it: "F/m^2" for "fF/um^2", "K" for "°C".
        kind: "product" (of units), "celsius" (a temperature on that scale), "decibel" (20 log10 of a gain) or
            "rms" (a voltage that is marked as a root of a mean square).
    """

    exponents: Exponents
    decade: int
    base: str
    kind: Literal["product", "celsius", "decibel", "rms"] = "product"

    @property
    def factor(self) -> float:
        """10**decade as the nearest double. [SI unit per written unit]."""
        return float(f"1e{self.decade}")


def plain_spaces(text: str) -> str:
    """The text with no-break, thin and figure spaces and tabs as ordinary spaces; the length does not change."""
    return text.translate(_SPACES)


def is_bare_prefix(text: str) -> bool:
    """Whether the text is a prefix that may stand without a unit: a power of 1,000 that nothing else is written as.

    "m" is not among them (metre), nor are "h", "d", "c" and "da" (hour, day, and units nobody means).
    """
    text = text.translate(_SPELLINGS)
    return text != "m" and PREFIXES.get(text, 1) % 3 == 0


def leading_power(unit: str) -> int:
    """The power that a prefix before this unit would take: 1 for "F/m^2", 2 for "m^2"; 0 where none can stand there."""
    first = re.match(r"([A-Za-z]+)(?:\^(-?[0-9]))?", unit)
    return int(first[2] or 1) if first and first[1] in SYMBOLS else 0


@lru_cache(maxsize=1024)
def parse_unit(text: str) -> Unit:
    """Read a unit, such as "uA", "nV/√Hz", "fF/um^2", "% um", "°C" or "dB".

    Symbols multiply with a space, "*" or "·"; one "/" may follow, with one symbol or parentheses behind it.

    Raises: UnitError.
    """
    if len(text) > LONGEST_UNIT:
        raise UnitError(f"the unit is longer than {LONGEST_UNIT} characters")
    spelled = _SUPERSCRIPT_MINUS.sub(lambda found: "^-" + "123"["¹²³".index(found[1])], plain_spaces(text))
    spelled = re.sub(" +", " ", spelled.translate(_SPELLINGS)).strip(" ")
    spelled = spelled.replace("°C", "degC").replace("° C", "degC").replace("Ohm", "ohm")
    spelled = _POWER_SIGN.sub("^", spelled)
    spelled = _ROOT_HERTZ.sub("rtHz", spelled)
    if not spelled:
        raise UnitError("a unit is missing")
    if spelled == "degC":
        return Unit((0, 0, 0, 0, 2), 0, "K", "celsius")
    if spelled == "dB":
        return Unit((0, 0, 0, 0, 0), 0, "V/V", "decibel")
    if spelled.endswith("rms"):
        inner = parse_unit(spelled[:-3])
        if inner.exponents != SYMBOLS["V"] or inner.kind != "product":
            raise UnitError('only a voltage is marked "rms"')
        return Unit(inner.exponents, inner.decade, inner.base, "rms")
    return _product(clean(text), spelled)


def _product(text: str, spelled: str) -> Unit:
    """Multiply the symbols of a unit text up."""
    above, slash, below = (part.strip(" ") for part in spelled.partition("/"))
    if "/" in below or (" " in below and not _PARENTHESES.fullmatch(below)):
        raise UnitError(f'the unit "{text}" is ambiguous after "/"; put parentheses')
    numerator = _factors(text, above) if above not in {"", "1"} or not slash else []
    inside = _PARENTHESES.fullmatch(below)
    denominator = _factors(text, inside[1] if inside else below) if slash else []
    exponents = [0, 0, 0, 0, 0]
    decade = 0
    for sign, factors in ((1, numerator), (-1, denominator)):
        for own, own_decade, _, power in factors:
            exponents = [e + sign * power * o for e, o in zip(exponents, own, strict=True)]
            decade += sign * power * own_decade
    v, a, s, m, k = exponents
    return Unit((v, a, s, m, k), decade, _joined(_bases(numerator), _bases(denominator)))


def _factors(text: str, product: str) -> list[tuple[Exponents, int, str, int]]:
    """Exponents, power of ten, SI spelling and power of each symbol in a product."""
    factors = []
    for factor in _BETWEEN.split(product):
        parts = _FACTOR.fullmatch(factor)
        if parts is None:
            raise UnitError(f'the unit "{text}" is not known')
        factors.append((*_symbol(text, parts["symbol"]), int(parts["power"] or parts["digit"] or 1)))
    return factors


def _bases(factors: list[tuple[Exponents, int, str, int]]) -> list[str]:
    """The SI spellings of the symbols that have one."""
    return [base if power == 1 else f"{base}^{power}" for _, _, base, power in factors if base]


def _symbol(text: str, symbol: str) -> tuple[Exponents, int, str]:
    """Exponents, power of ten and SI spelling of one symbol with its prefix."""
    if symbol in SYMBOLS:
        return SYMBOLS[symbol], 0, symbol
    if symbol in _UNPREFIXED:
        return _UNPREFIXED[symbol]
    for length in (1, 2):
        prefix, base = symbol[:length], symbol[length:]
        if prefix in PREFIXES and base in SYMBOLS:
            return SYMBOLS[base], PREFIXES[prefix], base
    raise UnitError(f'the unit "{text}" is not known')


def _joined(above: list[str], below: list[str]) -> str:
    """The symbols as one text: "F/m^2", "1/V", "V m"."""
    if not below:
        return " ".join(above)
    denominator = below[0] if len(below) == 1 else f"({' '.join(below)})"
    return f"{' '.join(above) or '1'}/{denominator}"
