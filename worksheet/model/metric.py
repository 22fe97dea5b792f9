"""What a metric is: its description, why a number of it may not exist, and what its rule may ask of a solved stage."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from enum import IntEnum
from typing import Any, Protocol

from worksheet.model.dimension import Dimension


class Reason(IntEnum):
    """Why a number does not exist. 0 is reserved for a number that does."""

    NONE = 0
    FEED_THROUGH = 1
    GAIN_BELOW_1 = 2
    UNLIMITED = 3
    LONG_CHANNEL_ONLY = 4
    NO_GAIN = 5
    NO_DRAIN_COUPLING = 6
    UNSTABLE = 7
    NOT_A_NUMBER = 8
    NO_CONDUCTANCE = 9
    NO_CAPACITANCE = 10

    @property
    def text(self) -> str:
        """The reason in words, as in JSON."""
        return _REASON_TEXT[self]

    def verdict(self, side: str) -> str:
        """What it means for a target's "min" or "max": "met", "missed" or "unknown" (physics: section 3's table)."""
        return _VERDICTS.get((self, side), "unknown")


_REASON_TEXT = {
    Reason.NONE: "",
    Reason.FEED_THROUGH: "feed-through",
    Reason.GAIN_BELOW_1: "gain below 1",
    Reason.UNLIMITED: "unlimited",
    Reason.LONG_CHANNEL_ONLY: "large-signal settling holds for the long channel only",
    Reason.NO_GAIN: "no gain",
    Reason.NO_DRAIN_COUPLING: "no drain coupling",
    Reason.UNSTABLE: "no settled response",
    Reason.NOT_A_NUMBER: "not a number",
    Reason.NO_CONDUCTANCE: "no output conductance",
    Reason.NO_CAPACITANCE: "no capacitance",
}

_VERDICTS = {
    (Reason.FEED_THROUGH, "min"): "missed",
    (Reason.FEED_THROUGH, "max"): "missed",
    (Reason.GAIN_BELOW_1, "min"): "missed",
    (Reason.GAIN_BELOW_1, "max"): "met",
    (Reason.UNLIMITED, "min"): "met",
    (Reason.UNLIMITED, "max"): "missed",
}


class SolvedDevice(Protocol):
    """What a rule may ask of one transistor; arrays or expressions. Units as in model.operating."""

    current: Any
    transconductance: Any
    width: Any
    length: Any
    matching_threshold: Any
    matching_factor: Any


class NoiseSource(Protocol):
    """A source of noise current. `white` [A^2/Hz]; `referred` is abs(Z(0)/H(0))^2 [ohm^2 V^2/V^2]."""

    white: Any
    referred: Any


class Solution(Protocol):
    """What a rule may ask of a solved stage. Indexing by a metric's key gives that metric."""

    current: Any
    supply: Any
    bias_overhead: Any
    output_capacitance: Any
    output_low: Any
    output_high: Any
    input_low: Any
    input_high: Any
    transistors: Sequence[SolvedDevice]
    noise_sources: Sequence[NoiseSource]
    white_noise_power: Any
    flicker_noise_power: Any

    def __getitem__(self, key: str) -> Any:
        """Another metric, by key."""
        ...

    def sqrt(self, value: Any) -> Any:
        """Square root."""
        ...

    def referred_to_input(self, device: SolvedDevice) -> Any:
        """abs(Z(0)/H(0))^2 of a transistor's current. [V^2/A^2]"""
        ...

    def dc_gain(self) -> Any:
        """abs(H(0)). [V/V]"""
        ...

    def bandwidth(self) -> Any:
        """Lowest frequency of -3 dB. [Hz]"""
        ...

    def pole_frequency(self) -> Any:
        """Lowest pole. [Hz]"""
        ...

    def unity_gain_frequency(self) -> Any:
        """Lowest frequency of unit magnitude. [Hz]"""
        ...

    def output_resistance(self) -> Any:
        """Z_o(0). [ohm]"""
        ...

    def input_capacitance(self) -> Any:
        """Slope of Im(Y_in), or the terminal's own. [F]"""
        ...

    def supply_rejection(self) -> Any:
        """abs(A_in/A_supply). [V/V]"""
        ...

    def settling_time(self) -> Any:
        """Settling of a small or a stated step. [s]"""
        ...

    def noise_corner(self) -> Any:
        """Where flicker equals white noise. [Hz]"""
        ...

    def peaking(self) -> Any:
        """Greatest magnitude over DC magnitude. [-]"""
        ...


@dataclass(frozen=True)
class Metric:
    """One metric.

    Attributes:
        key: Name in sheets and JSON.
        title, symbol, help: For people.
        dimension: Its unit.
        rule: Gives it from a Solution.
        better: "high" or "low", where more or less of it is usually wanted; "" where that depends.
        additive: Whether it adds up over blocks, so that a project may budget it.
        needs_level: The level that a stage must take for the metric to be defined; "" for none.
        of_yield: The metric of which this one is the bound at a target's yield; "" for none.
        relation: The published relation behind it, for the algebra view.
    """

    key: str
    title: str
    symbol: str
    dimension: Dimension
    help: str
    rule: Callable[[Any], Any]
    better: str = ""
    additive: bool = False
    needs_level: str = ""
    of_yield: str = ""
    relation: str = ""
