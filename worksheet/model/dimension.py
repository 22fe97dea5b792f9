"""The kinds of quantity that a sheet can hold: what a number measures and which unit it carries.

Here belongs what is true of a kind of quantity wherever it appears: its name, the SI unit that JSON and CSV print,
its exponents, and the unit a designer reads it in. Reading and writing the text is the job of `quantity`; the symbols
and prefixes are in `units`.
"""

from __future__ import annotations

from dataclasses import dataclass

__all__ = [
    "AREA",
    "CAPACITANCE",
    "CAPACITANCE_PER_AREA",
    "CAPACITANCE_PER_LENGTH",
    "CHARGE",
    "CONDUCTANCE",
    "CURRENT",
    "DIMENSIONS",
    "ENERGY",
    "FLICKER",
    "FREQUENCY",
    "GAIN",
    "LENGTH",
    "LENGTH_PER_VOLTAGE",
    "MATCHING_VOLTAGE",
    "NOISE_DENSITY",
    "NOISE_VOLTAGE",
    "NUMBER",
    "PER_VOLTAGE",
    "POWER",
    "RESISTANCE",
    "SLEW_RATE",
    "TEMPERATURE",
    "TIME",
    "VOLTAGE",
    "VOLTAGE_PER_TEMPERATURE",
    "Dimension",
    "Exponents",
]

Exponents = tuple[int, int, int, int, int]
"""Twice the exponents of volt, ampere, second, metre, kelvin: doubled, so that the square root of a hertz is exact."""


@dataclass(frozen=True, slots=True)
class Dimension:
    """One kind of quantity.

    Attributes:
        name: What it is called in a sentence, without an article ("current").
        unit: SI unit as JSON and CSV spell it ("A"); empty for a number without a unit.
        exponents: Twice the exponents of (V, A, s, m, K).
        plain: True where it is a ratio, written without an SI prefix.
        example: A text that is read as this kind, for messages.
        shown: Unit on which readable output is built, where that is not `unit` ("F/um^2").
        prefixed: Whether readable output puts an SI prefix before `shown`.
        also: Notations that are read beside products of units: "dB", "°C", "rms".
    """

    name: str
    unit: str
    exponents: Exponents
    plain: bool = False
    example: str = ""
    shown: str = ""
    prefixed: bool = True
    also: tuple[str, ...] = ()

    @property
    def phrase(self) -> str:
        """The name with its article: "a current", "an area"."""
        if not self.unit and self.plain:
            return "a number without a unit"
        return f"{'an' if self.name[:1] in 'aeiou' else 'a'} {self.name}"


_NONE: Exponents = (0, 0, 0, 0, 0)

NUMBER = Dimension("number", "", _NONE, plain=True, example="0.7", prefixed=False)
GAIN = Dimension("gain", "V/V", _NONE, plain=True, example="40 dB", prefixed=False, also=("dB",))
VOLTAGE = Dimension("voltage", "V", (2, 0, 0, 0, 0), example="1.8 V")
CURRENT = Dimension("current", "A", (0, 2, 0, 0, 0), example="2.5 uA")
TIME = Dimension("time", "s", (0, 0, 2, 0, 0), example="200 ns")
LENGTH = Dimension("length", "m", (0, 0, 0, 2, 0), example="0.5 um")
AREA = Dimension("area", "m^2", (0, 0, 0, 4, 0), example="120 um^2")
TEMPERATURE = Dimension("temperature", "K", (0, 0, 0, 0, 2), example="27 °C", prefixed=False, also=("°C",))
FREQUENCY = Dimension("frequency", "Hz", (0, 0, -2, 0, 0), example="5 MHz")
CAPACITANCE = Dimension("capacitance", "F", (-2, 2, 2, 0, 0), example="1.2 pF")
CONDUCTANCE = Dimension("conductance", "S", (-2, 2, 0, 0, 0), example="40 uS")
RESISTANCE = Dimension("resistance", "ohm", (2, -2, 0, 0, 0), example="10 kohm")
POWER = Dimension("power", "W", (2, 2, 0, 0, 0), example="20 uW")
CHARGE = Dimension("charge", "C", (0, 2, 2, 0, 0), example="10 fC")
ENERGY = Dimension("energy", "J", (2, 2, 2, 0, 0), example="3 pJ")
SLEW_RATE = Dimension("slew rate", "V/s", (2, 0, -2, 0, 0), example="2 V/us", shown="V/us")
NOISE_DENSITY = Dimension("noise density", "V/sqrt(Hz)", (2, 0, 1, 0, 0), example="12 nV/rtHz", shown="V/rtHz")
NOISE_VOLTAGE = Dimension("noise voltage", "V", (2, 0, 0, 0, 0), example="80 uV", also=("rms",))
CAPACITANCE_PER_AREA = Dimension(
    "capacitance per area", "F/m^2", (-2, 2, 2, -4, 0), example="8.5 fF/um^2", shown="F/um^2"
)
CAPACITANCE_PER_LENGTH = Dimension(
    "capacitance per width", "F/m", (-2, 2, 2, -2, 0), example="0.35 fF/um", shown="F/um"
)
LENGTH_PER_VOLTAGE = Dimension("length per voltage", "m/V", (-2, 0, 0, 2, 0), example="0.05 um/V")
FLICKER = Dimension("flicker coefficient", "V^2 F", (2, 2, 2, 0, 0), example="3e-24 V^2 F", prefixed=False)
MATCHING_VOLTAGE = Dimension("matching coefficient", "V m", (2, 0, 0, 2, 0), example="4 mV um", shown="V um")
VOLTAGE_PER_TEMPERATURE = Dimension("voltage per temperature", "V/K", (2, 0, 0, 0, -2), example="0.8 mV/K")
PER_VOLTAGE = Dimension("transconductance efficiency", "1/V", (-2, 0, 0, 0, 0), example="20 /V", prefixed=False)

DIMENSIONS: tuple[Dimension, ...] = (
    NUMBER,
    GAIN,
    VOLTAGE,
    CURRENT,
    TIME,
    LENGTH,
    AREA,
    TEMPERATURE,
    FREQUENCY,
    CAPACITANCE,
    CONDUCTANCE,
    RESISTANCE,
    POWER,
    CHARGE,
    ENERGY,
    SLEW_RATE,
    NOISE_DENSITY,
    NOISE_VOLTAGE,
    CAPACITANCE_PER_AREA,
    CAPACITANCE_PER_LENGTH,
    LENGTH_PER_VOLTAGE,
    FLICKER,
    MATCHING_VOLTAGE,
    VOLTAGE_PER_TEMPERATURE,
    PER_VOLTAGE,
)
"""Every kind, the commoner first where two have the same exponents (voltage before noise voltage)."""
