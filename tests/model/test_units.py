"""The table of units against outside references: scipy.constants for prefixes, sympy's SI system for dimensions."""

import pytest
import scipy.constants
import sympy.physics.units as reference
from sympy.physics.units.systems.si import SI

from worksheet.model.dimension import DIMENSIONS, Dimension
from worksheet.model.text import clean
from worksheet.model.units import PREFIXES, SYMBOLS, UnitError, is_bare_prefix, parse_unit

# SI brochure, 9th edition, table 7, with the four prefixes of 2022 (CGPM resolution 3); symbols from memory, values
# from scipy.constants.
BROCHURE = {
    "Q": "quetta", "R": "ronna", "Y": "yotta", "Z": "zetta", "E": "exa", "P": "peta", "T": "tera", "G": "giga",
    "M": "mega", "k": "kilo", "h": "hecto", "da": "deka", "d": "deci", "c": "centi", "m": "milli", "u": "micro",
    "n": "nano", "p": "pico", "f": "femto", "a": "atto", "z": "zepto", "y": "yocto", "r": "ronto", "q": "quecto",
}  # fmt: skip
REFERENCE_UNITS = {
    "V": reference.volt, "A": reference.ampere, "s": reference.second, "m": reference.meter, "K": reference.kelvin,
    "Hz": reference.hertz, "F": reference.farad, "S": reference.siemens, "ohm": reference.ohm, "W": reference.watt,
    "C": reference.coulomb, "J": reference.joule,
}  # fmt: skip


def test_the_table_has_the_24_prefixes_of_the_si_brochure() -> None:
    assert len(PREFIXES) == 24
    assert {symbol: float(f"1e{power}") for symbol, power in PREFIXES.items()} == {
        symbol: getattr(scipy.constants, name) for symbol, name in BROCHURE.items()
    }


@pytest.mark.parametrize("prefix", PREFIXES)
def test_every_prefix_is_read_before_every_unit(prefix: str) -> None:
    for symbol, exponents in SYMBOLS.items():
        unit = parse_unit(prefix + symbol)
        assert (unit.exponents, unit.decade, unit.base) == (exponents, PREFIXES[prefix], symbol)


def test_no_two_spellings_collide() -> None:
    spellings = [prefix + symbol for prefix in ["", *PREFIXES] for symbol in SYMBOLS] + ["rtHz", "ppm", "degC", "dB"]
    assert len(set(spellings)) == len(spellings)


def _si_dimensions(unit: reference.Quantity) -> dict[str, float]:
    """Exponents of the SI base dimensions of a unit, as sympy's SI system derives them."""
    found = SI.get_dimension_system().get_dimensional_dependencies(unit.dimension)
    return {dimension.name.name: float(power) for dimension, power in found.items()}


@pytest.mark.parametrize("symbol", SYMBOLS)
def test_units_have_the_dimensions_that_the_si_gives_them(symbol: str) -> None:
    base = ("V", "A", "s", "m", "K")
    expected: dict[str, float] = {}
    for name, doubled in zip(base, SYMBOLS[symbol], strict=True):
        for dimension, power in _si_dimensions(REFERENCE_UNITS[name]).items():
            expected[dimension] = expected.get(dimension, 0.0) + power * doubled / 2
    assert {name: power for name, power in expected.items() if power} == _si_dimensions(REFERENCE_UNITS[symbol])


@pytest.mark.parametrize(
    ("text", "decade", "base"),
    [
        ("uA", -6, "A"),
        ("µA", -6, "A"),
        ("μA", -6, "A"),
        ("kΩ", 3, "ohm"),
        ("k\u2126", 3, "ohm"),
        ("MOhm", 6, "ohm"),
        ("fF/um^2", -3, "F/m^2"),
        ("fF/µm²", -3, "F/m^2"),
        ("fF / um2", -3, "F/m^2"),
        ("fF um^-2", -3, "F m^-2"),
        ("fF·µm⁻²", -3, "F m^-2"),
        ("mm^2", -6, "m^2"),
        ("um**2", -12, "m^2"),
        ("mV um", -9, "V m"),
        ("mV*um", -9, "V m"),
        ("mV\u00a0µm", -9, "V m"),
        ("% um", -8, "m"),
        ("nV/√Hz", -9, "V/sqrt(Hz)"),
        ("nV/rtHz", -9, "V/sqrt(Hz)"),
        ("nV/sqrt(Hz)", -9, "V/sqrt(Hz)"),
        ("nV/√(Hz)", -9, "V/sqrt(Hz)"),
        ("nV/Hz^0.5", -9, "V/sqrt(Hz)"),
        ("V^2 F", 0, "V^2 F"),
        ("V/us", 6, "V/s"),
        ("1/V", 0, "1/V"),
        ("/mV", 3, "1/V"),
        ("mV/°C", -3, "V/K"),
        ("Hz/W", 0, "Hz/W"),
        ("A/(V m)", 0, "A/(V m)"),
        ("%", -2, ""),
        ("%/V", -2, "1/V"),
        ("ppm", -6, ""),
    ],
)
def test_products_of_units_are_read(text: str, decade: int, base: str) -> None:
    unit = parse_unit(text)
    assert (unit.decade, unit.base, unit.kind) == (decade, base, "product")
    assert parse_unit(base).exponents == unit.exponents if base else not any(unit.exponents)


@pytest.mark.parametrize(("text", "kind", "base"), [
    ("°C", "celsius", "K"), ("degC", "celsius", "K"), ("℃", "celsius", "K"), ("ºC", "celsius", "K"),
    ("dB", "decibel", "V/V"), ("uV rms", "rms", "V"), ("Vrms", "rms", "V"),
])  # fmt: skip
def test_scales_that_are_no_products_have_a_kind(text: str, kind: str, base: str) -> None:
    assert (parse_unit(text).kind, parse_unit(text).base) == (kind, base)


@pytest.mark.parametrize(
    "text",
    [
        *("", " ", "ua", "KHz", "mdB", "m°C", "kppm", "uuA", "mkHz", "V/A/s", "V/m s", "V/(m", "V/m)", "V/()", "V*"),
        *("*V", "V**A", "V^0", "V^10", "V^1.5", "V^", "V-2", "V 1", "2V", "(V)", "√V", "√kHz", "Arms", "rms"),
        *("V rms rms", "V/", "/", "1/", "1", "V//A", "V\x1b[31m", "V\u202e", "V" * 61, "（V）"),
    ],
)
def test_other_texts_are_no_units(text: str) -> None:
    with pytest.raises(UnitError) as caught:
        parse_unit(text)
    assert clean(str(caught.value)) == str(caught.value)


def test_a_prefix_may_stand_alone_only_where_it_is_unmistakable() -> None:
    assert {prefix for prefix in PREFIXES if is_bare_prefix(prefix)} == set(PREFIXES) - {"m", "h", "da", "d", "c"}
    assert is_bare_prefix("µ")
    assert is_bare_prefix("μ")
    assert not is_bare_prefix("K")
    assert not is_bare_prefix("")


@pytest.mark.parametrize("dimension", DIMENSIONS, ids=lambda kind: kind.name)
def test_every_dimension_has_the_exponents_of_its_unit(dimension: Dimension) -> None:
    if dimension.unit:
        unit = parse_unit(dimension.unit)
        assert (unit.exponents, unit.decade, unit.base) == (dimension.exponents, 0, dimension.unit)
    shown = dimension.shown or dimension.unit
    assert not shown or parse_unit(shown).exponents == dimension.exponents
    assert dimension.plain == (not any(dimension.exponents))
