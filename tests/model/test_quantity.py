"""Quantities read and written, case by case: what is read, what is refused and in which words."""

import datetime as dt
import math

import pytest

from worksheet.model import dimension as kinds
from worksheet.model.dimension import DIMENSIONS, Dimension
from worksheet.model.quantity import QuantityError, format_input, format_quantity, parse, parse_free
from worksheet.model.text import clean
from worksheet.model.units import parse_unit

READ = [
    ("10 uA", kinds.CURRENT, 1e-05),
    ("2.5 µA", kinds.CURRENT, 2.5e-6),
    ("2.5 μA", kinds.CURRENT, 2.5e-6),
    ("+2.5uA", kinds.CURRENT, 2.5e-6),
    ("-.5 nA", kinds.CURRENT, -0.5e-9),
    ("\u22125. V", kinds.VOLTAGE, -5.0),
    (" 5\u00a0V ", kinds.VOLTAGE, 5.0),
    ("5\u202fV", kinds.VOLTAGE, 5.0),
    ("1e-3 V", kinds.VOLTAGE, 0.001),
    ("1E3 mV", kinds.VOLTAGE, 1.0),
    ("1e\u22123 V", kinds.VOLTAGE, 0.001),
    ("0 V", kinds.VOLTAGE, 0.0),
    ("10k", kinds.RESISTANCE, 1e4),
    ("10 u", kinds.CURRENT, 1e-05),
    ("10 µ", kinds.CURRENT, 1e-05),
    ("5 M", kinds.SLEW_RATE, 5e6),
    ("10k", kinds.NUMBER, 1e4),
    ("5m", kinds.LENGTH, 5.0),
    ("1 % um", kinds.LENGTH, 1e-8),
    ("0.7", kinds.NUMBER, 0.7),
    ("5 %", kinds.NUMBER, 0.05),
    ("300 ppm", kinds.NUMBER, 3e-4),
    ("20 mV/V", kinds.NUMBER, 0.02),
    ("90 %", kinds.GAIN, 0.9),
    ("65 V/V", kinds.GAIN, 65.0),
    ("2 mV/V", kinds.GAIN, 0.002),
    ("40 dB", kinds.GAIN, 100.0),
    ("-40 dB", kinds.GAIN, 0.01),
    ("0 dB", kinds.GAIN, 1.0),
    ("27 °C", kinds.TEMPERATURE, 300.15),
    ("-40 °C", kinds.TEMPERATURE, 233.15),
    ("125 degC", kinds.TEMPERATURE, 398.15),
    ("27 ℃", kinds.TEMPERATURE, 300.15),
    ("-273.15 °C", kinds.TEMPERATURE, 0.0),
    ("300 K", kinds.TEMPERATURE, 300.0),
    ("0.8 mV/°C", kinds.VOLTAGE_PER_TEMPERATURE, 0.0008),
    ("1.2 nV/√Hz", kinds.NOISE_DENSITY, 1.2e-9),
    ("1.2 nV/rtHz", kinds.NOISE_DENSITY, 1.2e-9),
    ("80 uV", kinds.NOISE_VOLTAGE, 8e-05),
    ("80 uVrms", kinds.NOISE_VOLTAGE, 8e-05),
    ("80 uV rms", kinds.NOISE_VOLTAGE, 8e-05),
    ("4 mV um", kinds.MATCHING_VOLTAGE, 4e-9),
    ("8.5 fF/um^2", kinds.CAPACITANCE_PER_AREA, 0.0085),
    ("0.35 fF/um", kinds.CAPACITANCE_PER_LENGTH, 3.5e-10),
    ("0.02 mm^2", kinds.AREA, 2e-8),
    ("1 um²", kinds.AREA, 1e-12),
    ("0 um/V", kinds.LENGTH_PER_VOLTAGE, 0.0),
    ("3e-24 V^2 F", kinds.FLICKER, 3e-24),
    ("25 /V", kinds.PER_VOLTAGE, 25.0),
    ("25 1/V", kinds.PER_VOLTAGE, 25.0),
    ("25 S/A", kinds.PER_VOLTAGE, 25.0),
    ("2 V/us", kinds.SLEW_RATE, 2e6),
    (4, kinds.CURRENT, 4.0),
    (0.7, kinds.NUMBER, 0.7),
    (300, kinds.TEMPERATURE, 300.0),
]


@pytest.mark.parametrize(("value", "dimension", "expected"), READ)
def test_quantities_are_read_as_the_nearest_double(value: object, dimension: Dimension, expected: float) -> None:
    found = parse(value, dimension)
    assert type(found) is float
    assert found == expected
    assert math.copysign(1.0, found) == math.copysign(1.0, expected)


@pytest.mark.parametrize("dimension", DIMENSIONS, ids=lambda kind: kind.name)
def test_the_example_in_a_message_is_itself_read(dimension: Dimension) -> None:
    assert parse(dimension.example, dimension) > 0.0


REFUSED = [
    ("10 kHz", kinds.CURRENT, "the unit does not fit."),
    ("40 dB", kinds.CURRENT, "the unit does not fit."),
    ("40 dB", kinds.NUMBER, "the unit does not fit."),
    ("5 %", kinds.CURRENT, "the unit does not fit."),
    ("80 uV rms", kinds.VOLTAGE, "the unit does not fit."),
    ("27 °C", kinds.VOLTAGE, "the unit does not fit."),
    ("12 V^2/Hz", kinds.NOISE_DENSITY, "the unit does not fit."),
    ("12 um", kinds.AREA, "the unit does not fit."),
    ("10 K", kinds.CURRENT, 'the unit does not fit; did you mean "kA"?'),
    ("27 C", kinds.TEMPERATURE, 'the unit does not fit; write "°C" or "K".'),
    ("10", kinds.CURRENT, "the unit is missing."),
    ("1e-6", kinds.CURRENT, "the unit is missing."),
    ("0.65", kinds.GAIN, "the unit is missing."),
    ("5 m", kinds.CURRENT, '"m" could be milli or metre here; for milli write "mA".'),
    ("5m", kinds.NUMBER, '"m" could be milli or metre here; write the number with e-3.'),
    ("5 m", kinds.AREA, '"m" could be milli or metre here; write the whole unit.'),
    ("10k", kinds.AREA, "a prefix alone is ambiguous here; write the whole unit."),
    ("300 k", kinds.TEMPERATURE, "a prefix alone is ambiguous here; write the whole unit."),
    ("10k", kinds.PER_VOLTAGE, "a prefix alone is ambiguous here; write the whole unit."),
    ("10 h", kinds.TIME, 'the unit "h" is not known.'),
    ("10 ua", kinds.CURRENT, 'the unit "ua" is not known; did you mean "uA"?'),
    ("10 Khz", kinds.FREQUENCY, 'the unit "Khz" is not known; did you mean "kHz"?'),
    ("10 mhz", kinds.FREQUENCY, 'the unit "mhz" is not known; did you mean "mHz" or "MHz"?'),
    ("1meg", kinds.RESISTANCE, 'the unit "meg" is not known; did you mean "Mohm"?'),
    ("5 V/m s", kinds.VOLTAGE, 'the unit "V/m s" is ambiguous after "/"; put parentheses.'),
    ("1,5 uA", kinds.CURRENT, "a comma is not read; write a decimal point and no digit grouping."),
    ("1,000 Hz", kinds.FREQUENCY, "a comma is not read; write a decimal point and no digit grouping."),
    ("1 000 Hz", kinds.FREQUENCY, "digits are not grouped; write the number in one piece."),
    ("1\u202f000 Hz", kinds.FREQUENCY, "digits are not grouped; write the number in one piece."),
    ("1_000 Hz", kinds.FREQUENCY, "digits are not grouped; write the number in one piece."),
    ("1'000 Hz", kinds.FREQUENCY, "digits are not grouped; write the number in one piece."),
    ("1e400 A", kinds.CURRENT, "the number is out of range."),
    ("1e400 °C", kinds.TEMPERATURE, "the number is out of range."),
    ("1e99999999999999999999 A", kinds.CURRENT, "the number is out of range."),
    ("1e308 GA", kinds.CURRENT, "the number is out of range."),
    ("1e-400 A", kinds.CURRENT, "the number is out of range."),
    ("7000 dB", kinds.GAIN, "the number is out of range."),
    ("inf A", kinds.CURRENT, "infinity and NaN are not values."),
    ("-Infinity", kinds.CURRENT, "infinity and NaN are not values."),
    ("nan", kinds.NUMBER, "infinity and NaN are not values."),
    ("", kinds.CURRENT, "the value is empty."),
    ("\u00a0", kinds.CURRENT, "the value is empty."),
    ("uA", kinds.CURRENT, "the value does not begin with a number."),
    ("about 5 uA", kinds.CURRENT, "the value does not begin with a number."),
    ("- 5 uA", kinds.CURRENT, "the value does not begin with a number."),
    ("٣ uA", kinds.CURRENT, "the value does not begin with a number."),
    ("0x10 A", kinds.CURRENT, 'the unit "x10 A" is not known.'),
    ("5 uA!", kinds.CURRENT, 'the unit "uA!" is not known.'),
    ("5 A\x1b[31m", kinds.CURRENT, 'the unit "A\ufffd[31m" is not known.'),
    ("-300 °C", kinds.TEMPERATURE, "a temperature cannot lie below absolute zero."),
    (-5, kinds.TEMPERATURE, "a temperature cannot lie below absolute zero."),
    ("1" * 201, kinds.NUMBER, "the text is longer than 200 characters."),
    ("5 " + "V" * 61, kinds.VOLTAGE, "the unit is longer than 60 characters."),
    (True, kinds.NUMBER, "this is not a quantity."),
    ([1], kinds.CURRENT, "this is not a quantity."),
    ({"value": 1}, kinds.CURRENT, "this is not a quantity."),
    (None, kinds.CURRENT, "this is not a quantity."),
    (dt.date(2026, 11, 2), kinds.CURRENT, "this is not a quantity."),
    (math.inf, kinds.CURRENT, "infinity and NaN are not values."),
    (math.nan, kinds.CURRENT, "infinity and NaN are not values."),
    (10**400, kinds.CURRENT, "the number is out of range."),
    (-(10**5000), kinds.CURRENT, "the number is out of range."),
]


@pytest.mark.parametrize(("value", "dimension", "reason"), REFUSED, ids=range(len(REFUSED)))
def test_everything_else_is_refused_with_its_reason(value: object, dimension: Dimension, reason: str) -> None:
    with pytest.raises(QuantityError) as caught:
        parse(value, dimension)
    error = caught.value
    assert str(error) == f"Found {error.found}, expected {error.expected}: {reason}"
    assert error.expected.startswith(f"{dimension.phrase}, for example ")
    assert clean(str(error)) == str(error)
    assert len(str(error)) < 300


SENTENCES = [
    (
        "10 kHz",
        kinds.CURRENT,
        'Found "10 kHz", a frequency, expected a current, for example "2.5 uA": the unit does not fit.',
    ),
    (
        "40 dB",
        kinds.NUMBER,
        'Found "40 dB", a gain in decibels, expected a number without a unit, for example 0.7: the unit does not fit.',
    ),
    (
        "1 K/s",
        kinds.AREA,
        'Found "1 K/s", a quantity in K/s, expected an area, for example "120 um^2": the unit does not fit.',
    ),
    (
        True,
        kinds.CURRENT,
        'Found true or false, expected a current, for example "2.5 uA": this is not a quantity.',
    ),
]


@pytest.mark.parametrize(("value", "dimension", "message"), SENTENCES)
def test_a_message_is_a_whole_sentence(value: object, dimension: Dimension, message: str) -> None:
    with pytest.raises(QuantityError) as caught:
        parse(value, dimension)
    assert str(caught.value) == message


def test_decibels_are_twenty_times_the_decimal_logarithm() -> None:
    # 20 log10: doubling is 6.0206 dB, half power 3.0103 dB (from memory, any handbook; log10(2) = 0.30103).
    assert parse("6.0206 dB", kinds.GAIN) == pytest.approx(2.0, rel=1e-6)
    assert parse("-3.0103 dB", kinds.GAIN) == pytest.approx(math.sqrt(0.5), rel=1e-6)


def test_published_capacitances_and_coefficients_are_read_in_their_printed_units() -> None:
    # Oxide of 4.09 nm with 3.9 times 8.854 pF/m gives 8.443 fF/um^2 (open PDK documentation, Apache 2.0).
    oxide = 3.9 * 8.854e-12 / parse("4.09 nm", kinds.LENGTH)
    assert parse("8.443 fF/um^2", kinds.CAPACITANCE_PER_AREA) == pytest.approx(oxide, rel=1e-4)
    # A 0.18 um process has about 5 mV um: over 12.55 um by 3.59 um that is 0.7449 mV (process documentation).
    area = parse("12.55 um", kinds.LENGTH) * parse("3.59 um", kinds.LENGTH)
    assert parse("5 mV um", kinds.MATCHING_VOLTAGE) / math.sqrt(area) == pytest.approx(0.7449e-3, rel=1e-4)


FREE = [
    ("40 kHz", 4e4, "kHz", "Hz"),
    ("3 nV/√Hz", 3e-9, "nV/√Hz", "V/sqrt(Hz)"),
    ("27 °C", 300.15, "°C", "K"),
    ("40 dB", 100.0, "dB", "V/V"),
    ("5 %", 0.05, "%", ""),
    ("1e11 Hz/W", 1e11, "Hz/W", "Hz/W"),
]


@pytest.mark.parametrize(("value", "expected", "unit", "base"), FREE)
def test_a_value_of_any_kind_keeps_its_written_unit(value: object, expected: float, unit: str, base: str) -> None:
    assert parse_free(value) == (expected, unit)
    assert parse_unit(unit).base == base


@pytest.mark.parametrize(("value", "expected"), [("40", 40.0), ("10k", 1e4), (3, 3.0), (2.5, 2.5)])
def test_a_value_of_any_kind_may_have_no_unit(value: object, expected: float) -> None:
    assert parse_free(value) == (expected, "")


@pytest.mark.parametrize("value", ["5 m", "5 parsec", "1,5 V", "", "inf", True, math.nan, [], "1e999 V"])
def test_a_value_of_any_kind_is_refused_in_the_same_words(value: object) -> None:
    with pytest.raises(QuantityError, match=r'^Found .* expected a number with a known unit, for example "40 kHz": .'):
        parse_free(value)


WRITTEN = [
    (2.5e-6, kinds.CURRENT, "2.5 µA", "2.5 uA"),
    (9.99949e-4, kinds.CURRENT, "999.9 µA", "999.9 uA"),
    (9.9996e-4, kinds.CURRENT, "1 mA", "1 mA"),
    (5.9e6, kinds.FREQUENCY, "5.9 MHz", "5.9 MHz"),
    (1e4, kinds.RESISTANCE, "10 kΩ", "10 kohm"),
    (101.25, kinds.GAIN, "101.2 V/V", "101.2 V/V"),
    (0.7, kinds.NUMBER, "0.7", "0.7"),
    (123456789.0, kinds.NUMBER, "1.235e8", "1.235e8"),
    (1.2e-10, kinds.AREA, "120 µm²", "120 um^2"),
    (9.9994e-9, kinds.AREA, "9999 µm²", "9999 um^2"),
    (9.9999e-9, kinds.AREA, "0.01 mm²", "0.01 mm^2"),
    (2e-8, kinds.AREA, "0.02 mm²", "0.02 mm^2"),
    (5.5e-14, kinds.AREA, "0.055 µm²", "0.055 um^2"),
    (300.15, kinds.TEMPERATURE, "27 °C", "27 degC"),
    (233.15, kinds.TEMPERATURE, "-40 °C", "-40 degC"),
    (273.14, kinds.TEMPERATURE, "0 °C", "0 degC"),
    (12e-9, kinds.NOISE_DENSITY, "12 nV/√Hz", "12 nV/rtHz"),
    (8e-5, kinds.NOISE_VOLTAGE, "80 µV", "80 uV"),
    (2e6, kinds.SLEW_RATE, "2 V/µs", "2 V/us"),
    (4e-9, kinds.MATCHING_VOLTAGE, "4 mV µm", "4 mV um"),
    (8.5e-3, kinds.CAPACITANCE_PER_AREA, "8.5 fF/µm²", "8.5 fF/um^2"),
    (3.5e-10, kinds.CAPACITANCE_PER_LENGTH, "350 aF/µm", "350 aF/um"),
    (3e-24, kinds.FLICKER, "3e-24 V² F", "3e-24 V^2 F"),
    (25.0, kinds.PER_VOLTAGE, "25 /V", "25 /V"),
    (-1.5e-3, kinds.VOLTAGE, "-1.5 mV", "-1.5 mV"),
    (0.0, kinds.CURRENT, "0 A", "0 A"),
    (-0.0, kinds.CURRENT, "0 A", "0 A"),
    (1e-35, kinds.CURRENT, "1e-35 A", "1e-35 A"),
    (None, kinds.CURRENT, "-", "-"),
]


@pytest.mark.parametrize(("value", "dimension", "signs", "spelled"), WRITTEN, ids=range(len(WRITTEN)))
def test_quantities_are_written_for_a_reader(
    value: float | None, dimension: Dimension, signs: str, spelled: str
) -> None:
    assert format_quantity(value, dimension) == signs
    assert format_quantity(value, dimension, ascii=True) == spelled


@pytest.mark.parametrize("value", [math.inf, -math.inf, math.nan])
def test_a_number_that_does_not_exist_is_not_written_as_one(value: float) -> None:
    with pytest.raises(ValueError, match="not a finite current"):
        format_quantity(value, kinds.CURRENT)
    with pytest.raises(ValueError, match="not a finite current"):
        format_input(value, kinds.CURRENT)


@pytest.mark.parametrize(("value", "dimension", "expected"), [
    (4e-6, kinds.CURRENT, "4 uA"),
    (1e-05, kinds.CURRENT, "10 uA"),
    (0.1 + 0.2, kinds.VOLTAGE, "300.00000000000004 mV"),
    (300.15, kinds.TEMPERATURE, "27 °C"),
    (5e-7, kinds.LENGTH, "500 nm"),
    (1.2e-10, kinds.AREA, "120 um^2"),
    (1.2e-9, kinds.NOISE_DENSITY, "1.2 nV/rtHz"),
    (1e4, kinds.RESISTANCE, "10 kohm"),
    (0.7, kinds.NUMBER, "0.7"),
])  # fmt: skip
def test_what_goes_into_a_sheet_is_the_shortest_exact_text(value: float, dimension: Dimension, expected: str) -> None:
    assert format_input(value, dimension) == expected
