"""What the numeric engine is given: one circuit and its numbers, over conditions.

Every number is a scalar or an array whose last axis runs over conditions, the nominal one first; further axes in
front (samples, trial points, sheets of the same circuit) broadcast.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from worksheet.device.arrays import Array, Number
from worksheet.device.constants import thermal_voltage
from worksheet.device.parameters import Parameters
from worksheet.stages.circuit import Circuit

_SHORT = 1e-9


@dataclass(frozen=True, eq=False)
class Inputs:
    """Numbers of one circuit.

    Attributes:
        circuit: The stage with its options.
        temperature, supply: [K], [V]
        current: Bias current at this temperature. [A]
        devices: Parameters by device name, "bias" among them where the current source is a transistor.
        load_capacitance: [F]
        ideal_conductance, ideal_capacitance: Of an ideal current source. [S], [F]
        drive_resistance: [ohm]; read only where the circuit is driven through one.
        well_capacitance: [F]; read only with the bulk on the source.
        bias_overhead, saturation_margin, settling_tolerance, noise_from: [-], [V], [-], [Hz]
        step_size: Step at the input, None or 0 for small steps. [V]
        input_level, output_level: From ground, None or NaN where not assumed. [V]
        upside_down: Where the stage is of p-channel devices; None for what the circuit says everywhere.
    """

    circuit: Circuit
    temperature: Number
    supply: Number
    current: Number
    devices: Mapping[str, Parameters]
    load_capacitance: Number
    ideal_conductance: Number = 0.0
    ideal_capacitance: Number = 0.0
    drive_resistance: Number = 0.0
    well_capacitance: Number = 0.0
    bias_overhead: Number = 0.0
    saturation_margin: Number = 0.0
    settling_tolerance: Number = 1e-3
    noise_from: Number = 1.0
    step_size: Number | None = None
    input_level: Number | None = None
    output_level: Number | None = None
    upside_down: ArrayLike | None = None

    @property
    def mirrored(self) -> NDArray[np.bool_]:
        """Where the stage is the mirror image of what is drawn: p-channel ones."""
        return np.asarray(
            self.circuit.polarity == "p" if self.upside_down is None else self.upside_down, dtype=np.bool_
        )

    @property
    def resistance(self) -> Array:
        """Of the drive where the circuit is driven through one: at least a nanoohm, which a range that begins at 0 has.

        One network then serves all of a range's ends; what a nanoohm changes is of the size of rounding.
        """
        return np.maximum(self.drive_resistance, _SHORT)

    @property
    def thermal(self) -> Number:
        """U_T. [V]"""
        return thermal_voltage(self.temperature)


def at_conditions(inputs: Inputs, conditions: NDArray[np.intp]) -> Inputs:
    """The same at some of the conditions alone.

    Args:
        inputs: Over all conditions.
        conditions: Indices of those wanted, the nominal one first, at which levels are found.
    """

    def chosen(value: Any) -> Any:
        if isinstance(value, Parameters):
            return replace(value, **{f.name: chosen(getattr(value, f.name)) for f in fields(value)})
        many = isinstance(value, np.ndarray) and value.ndim > 0 and value.shape[-1] > 1
        return value[..., conditions] if many else value

    plain = {f.name: chosen(getattr(inputs, f.name)) for f in fields(inputs) if f.name not in ("circuit", "devices")}
    devices = {name: chosen(parameters) for name, parameters in inputs.devices.items()}
    return replace(inputs, devices=devices, **plain)


def given_or(given: Number | None, otherwise: Callable[[], Array]) -> Array:
    """What is given, and where nothing is (None or NaN) what is found instead."""
    if given is None:
        return otherwise()
    missing = np.isnan(given)
    return np.where(missing, otherwise(), given) if missing.any() else np.asarray(given)


def nominal(value: Number) -> Array:
    """The nominal condition's entry of a value over conditions, kept as an axis of length one."""
    array = np.asarray(value)
    return array if array.ndim == 0 else array[..., :1]
