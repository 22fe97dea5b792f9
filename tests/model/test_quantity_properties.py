"""Quantities over random numbers and texts: reading against exact fractions, writing against reading."""

import math
from collections.abc import Callable
from fractions import Fraction

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from worksheet.model.dimension import AREA, CURRENT, DIMENSIONS, GAIN, TEMPERATURE, Dimension
from worksheet.model.quantity import QuantityError, format_input, format_quantity, parse, parse_free
from worksheet.model.text import clean
from worksheet.model.units import PREFIXES, SYMBOLS, Unit, UnitError, parse_unit

ORDINARY = st.floats(min_value=1e-25, max_value=1e25).flatmap(lambda size: st.sampled_from([size, -size]))
ANY_DOUBLE = st.floats(allow_nan=False, allow_infinity=False)
KINDS = st.sampled_from([dimension for dimension in DIMENSIONS if dimension != TEMPERATURE])
HOSTILE = st.text(alphabet="0123456789.eE+-−,_' \u00a0\t\n()*/^·√²°%µμΩkKmMuVAHzdBCrts\x1b\u202e\ud800", max_size=30)


@given(
    whole=st.integers(0, 10**20),
    places=st.text("0123456789", max_size=12),
    power=st.integers(-40, 40),
    prefix=st.sampled_from(["", *PREFIXES]),
    symbol=st.sampled_from(list(SYMBOLS)),
    negative=st.booleans(),
)
@example(whole=10, places="", power=0, prefix="u", symbol="A", negative=False)
def test_scaling_is_decimal(whole: int, places: str, power: int, prefix: str, symbol: str, negative: bool) -> None:
    """float(Fraction) is correctly rounded, so the double must be the nearest one."""
    digits = f"{'-' if negative else ''}{whole}.{places or '0'}"
    exact = Fraction(digits) * Fraction(10) ** (power + PREFIXES.get(prefix, 0))
    value, unit = parse_free(f"{digits}e{power} {prefix}{symbol}") if prefix + symbol != "m" else (float(exact), "m")
    assert value == float(exact)
    assert unit == prefix + symbol


@given(tenths=st.integers(-2731, 20_000))
def test_celsius_is_shifted_in_decimal(tenths: int) -> None:
    assert parse(f"{tenths / 10} °C", TEMPERATURE) == float(Fraction(tenths, 10) + Fraction("273.15"))


@given(value=ANY_DOUBLE, dimension=KINDS)
@example(value=5e-324, dimension=CURRENT)
@example(value=1.7976931348623157e308, dimension=AREA)
@example(value=2.2250738585072014e-308, dimension=GAIN)
def test_what_is_written_into_a_sheet_reads_back_as_the_same_double(value: float, dimension: Dimension) -> None:
    assert parse(format_input(value, dimension), dimension) == value


@given(value=st.floats(min_value=0.0, allow_infinity=False))
def test_temperatures_read_back_as_the_same_double(value: float) -> None:
    assert parse(format_input(value, TEMPERATURE), TEMPERATURE) == value


@given(value=ORDINARY, dimension=KINDS, digits=st.integers(2, 12), ascii_only=st.booleans())
def test_what_a_reader_sees_reads_back_within_its_digits(
    value: float, dimension: Dimension, digits: int, ascii_only: bool
) -> None:
    text = format_quantity(value, dimension, digits, ascii=ascii_only)
    assert parse(text, dimension) == pytest.approx(value, rel=0.51 * 10 ** (1 - digits))
    assert not ascii_only or text.isascii()


@given(value=st.floats(min_value=0.0, max_value=1e300), digits=st.integers(3, 8), ascii_only=st.booleans())
def test_a_temperature_reads_back_within_its_decimals(value: float, digits: int, ascii_only: bool) -> None:
    text = format_quantity(value, TEMPERATURE, digits, ascii=ascii_only)
    tolerance = 0.51 * 10 ** (3 - digits) if 1.0 <= value < 1e6 else 0.51 * 10 ** (1 - digits) * value
    assert abs(parse(text, TEMPERATURE) - value) <= tolerance
    assert not ascii_only or text.isascii()


@given(value=st.floats(min_value=1e-29, max_value=9.99e32), digits=st.integers(3, 9))
def test_a_prefix_keeps_one_to_three_digits_before_the_point(value: float, digits: int) -> None:
    mantissa = float(format_quantity(value, CURRENT, digits).split(" ")[0])
    assert 1.0 <= mantissa < 1000.0


@given(value=st.floats(min_value=1e-22, max_value=1e6), digits=st.integers(4, 9))
def test_an_area_stays_between_a_hundredth_and_ten_thousand(value: float, digits: int) -> None:
    mantissa = float(format_quantity(value, AREA, digits).split(" ")[0])
    assert 0.01 <= mantissa < 10_000.0


PIECES = st.sampled_from(["V", "mV", "um^2", "nm^3", "V^-1", "sqrt(Hz)", "%", "ohm", "kHz", "K"])


@given(value=ORDINARY, above=PIECES | st.just("1"), below=PIECES, first=st.booleans())
def test_a_kind_of_the_users_own_is_written_so_that_it_reads_back(
    value: float, above: str, below: str, first: bool
) -> None:
    known = parse_unit(f"{above}/{below}" if first or above == "1" else above)
    kind = Dimension("figure", known.base, known.exponents, plain=not known.base, example="1")
    assert parse(format_input(value, kind), kind) == value
    for ascii_only in (False, True):
        text = format_quantity(value, kind, ascii=ascii_only)
        assert parse(text, kind) == pytest.approx(value, rel=0.51e-3)


def _outcome(read: Callable[[], object]) -> tuple[object, str]:
    """What was read, or the message of the refusal; any other exception is a failure."""
    try:
        return read(), ""
    except (QuantityError, UnitError) as error:
        return None, str(error)


@given(text=HOSTILE | st.text(max_size=300), dimension=st.sampled_from(DIMENSIONS))
def test_no_text_does_anything_but_be_read_or_refused(text: str, dimension: Dimension) -> None:
    for value, message in (
        _outcome(lambda: parse(text, dimension)),
        _outcome(lambda: parse_free(text)[0]),
    ):
        assert (value is None) == bool(message)
        assert value is None or (isinstance(value, float) and math.isfinite(value))
        assert clean(message) == message
        assert len(message) < 500


@given(text=HOSTILE)
def test_no_unit_text_does_anything_but_be_read_or_refused(text: str) -> None:
    unit, message = _outcome(lambda: parse_unit(text))
    assert clean(message) == message
    if isinstance(unit, Unit) and unit.base:
        assert parse_unit(unit.base).exponents == unit.exponents
