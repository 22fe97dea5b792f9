"""The laws of one transistor as expressions in further levels, with the published work behind each."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from worksheet.engine.symbolic.definition import Definition
from worksheet.stages.stage import Transistor

if TYPE_CHECKING:
    from worksheet.engine.symbolic.algebra import Algebra

Law = Callable[["Algebra", Transistor], Any]

CHARGE_MODEL = "charge model of Enz, Krummenacher and Vittoz 1995; Enz and Vittoz 2006"
VELOCITY_MODEL = "Enz, Chicco and Pezzotta 2017, with velocity saturation"
TEXTBOOK = "Tsividis and McAndrew 2011"
HAND_RULE = "hand rule I/V_A for length modulation; slope of the charge model"
CODATA = "CODATA 2018 constants"


def define(a: Algebra, device: Transistor, value: str) -> Definition:
    """A law of one transistor.

    Args:
        a: The algebra that it is written in.
        device: The transistor.
        value: A key of LAWS.
    """
    law, source = LAWS[value]
    if value in _OF_VELOCITY and _saturates(a, device):
        source = VELOCITY_MODEL
    return Definition(f"{device.name}.{value}", law(a, device), source=source)


def _saturates(a: Algebra, d: Transistor) -> bool:
    return a.has(f"{d.name}.process.velocity_length")


def _specific_current(a: Algebra, d: Transistor) -> Any:
    return a.of(d, "square_current") * a.of(d, "width") / a.of(d, "length")


def _square_current(a: Algebra, d: Transistor) -> Any:
    warmth = a.leaf("temperature") / a.leaf("reference_temperature")
    moved = a.process(d, "specific_current") * a.corner(d, "specific_current_factor")
    return moved * warmth ** (2 - a.process(d, "mobility_exponent"))


def _inversion_coefficient(a: Algebra, d: Transistor) -> Any:
    return a.symbol("current") / a.of(d, "specific_current")


def _root(a: Algebra, d: Transistor) -> Any:
    import sympy

    inversion = a.of(d, "inversion_coefficient")
    if not _saturates(a, d):
        return sympy.sqrt(1 + 4 * inversion)
    return sympy.sqrt((a.of(d, "velocity") * inversion + 1) ** 2 + 4 * inversion)


def _charge(a: Algebra, d: Transistor) -> Any:
    return (_root(a, d) - 1) / 2


def _slope_factor(a: Algebra, d: Transistor) -> Any:
    if not _saturates(a, d):
        return 2 / (1 + _root(a, d))
    inversion, velocity = a.of(d, "inversion_coefficient"), a.of(d, "velocity")
    return (_root(a, d) - 1) / (inversion * (velocity * (velocity * inversion + 1) + 2))


def _velocity(a: Algebra, d: Transistor) -> Any:
    return a.process(d, "velocity_length") / a.of(d, "length")


def _drive(a: Algebra, d: Transistor) -> Any:
    import sympy

    return 2 * a.of(d, "charge") + sympy.log(a.of(d, "charge"))


def _drain_coupling(a: Algebra, d: Transistor) -> Any:
    shorter = a.process(d, "drain_coupling_length") / a.of(d, "length")
    reference = a.process(d, "drain_coupling") * a.corner(d, "drain_coupling_factor")
    return reference * shorter ** a.process(d, "drain_coupling_exponent")


def _gate_coupling_at_zero(a: Algebra, d: Transistor) -> Any:
    return a.process(d, "kappa") + a.corner(d, "kappa_shift")


def bends(a: Algebra, d: Transistor) -> bool:
    """Whether a device's gate coupling moves with its source voltage."""
    on_its_bulk = a.circuit.bulk_node(d) == d.source
    return a.has(f"{d.name}.process.surface_potential") and not on_its_bulk


def _gate_coupling(a: Algebra, d: Transistor) -> Any:
    import sympy

    if not bends(a, d):
        return _gate_coupling_at_zero(a, d)
    potential = a.process(d, "surface_potential")
    excess = 1 / a.of(d, "gate_coupling_at_zero") - 1
    return 1 / (1 + excess * sympy.sqrt(potential / (potential + a.of(d, "source_bulk_voltage"))))


def _threshold_voltage(a: Algebra, d: Transistor) -> Any:
    warmer = a.leaf("temperature") - a.leaf("reference_temperature")
    shifted = a.process(d, "threshold") + a.corner(d, "threshold_shift")
    return shifted - a.process(d, "threshold_drift") * warmer


def _scaled(parameter: str) -> Law:
    return lambda a, d: a.process(d, parameter) * a.corner(d, "capacitance_factor")


def _transconductance(a: Algebra, d: Transistor) -> Any:
    return a.of(d, "gate_coupling") * a.of(d, "source_conductance")


def _source_conductance(a: Algebra, d: Transistor) -> Any:
    return a.symbol("current") * a.of(d, "slope_factor") / a.symbol("thermal_voltage")


def _drain_conductance(a: Algebra, d: Transistor) -> Any:
    modulation = a.process(d, "length_modulation") * a.symbol("current") / a.of(d, "length")
    if not a.has(f"{d.name}.process.drain_coupling"):
        return modulation
    return a.of(d, "drain_coupling") * a.of(d, "source_conductance") + modulation


def _bulk_conductance(a: Algebra, d: Transistor) -> Any:
    return a.of(d, "source_conductance") - a.of(d, "transconductance") - a.of(d, "drain_conductance")


def _efficiency(a: Algebra, d: Transistor) -> Any:
    return a.of(d, "transconductance") / a.symbol("current")


def _transit_frequency(a: Algebra, d: Transistor) -> Any:
    import sympy

    gate = ("gate_source_capacitance", "gate_bulk_capacitance", "gate_drain_capacitance")
    return a.of(d, "transconductance") / (2 * sympy.pi * sum(a.of(d, name) for name in gate))


def _channel(a: Algebra, d: Transistor) -> Any:
    return a.of(d, "gate_capacitance") * a.of(d, "width") * a.of(d, "length")


def _intrinsic(a: Algebra, d: Transistor) -> Any:
    q = a.of(d, "charge")
    return _channel(a, d) * q * (2 * q + 3) / (3 * (q + 1) ** 2)


def _overlap(a: Algebra, d: Transistor) -> Any:
    return a.of(d, "overlap_capacitance") * a.of(d, "width")


def _junction(a: Algebra, d: Transistor) -> Any:
    return a.of(d, "junction_capacitance") * a.of(d, "width")


def _gate_source(a: Algebra, d: Transistor) -> Any:
    return a.of(d, "intrinsic_capacitance") + _overlap(a, d)


def _gate_bulk(a: Algebra, d: Transistor) -> Any:
    return (1 - a.of(d, "gate_coupling")) * (_channel(a, d) - a.of(d, "intrinsic_capacitance"))


def _source_bulk(a: Algebra, d: Transistor) -> Any:
    return _junction(a, d) + (1 / a.of(d, "gate_coupling") - 1) * a.of(d, "intrinsic_capacitance")


def _saturation_voltage(a: Algebra, d: Transistor) -> Any:
    import sympy

    quarter = sympy.Rational(1, 4)
    return a.symbol("thermal_voltage") * (2 * sympy.sqrt(a.of(d, "inversion_coefficient") + quarter) + 3)


def _white_factor(a: Algebra, d: Transistor) -> Any:
    q = a.of(d, "charge")
    return (4 * q + 3) / (6 * (q + 1))


def _white_density(a: Algebra, d: Transistor) -> Any:
    thermal = 4 * a.leaf("constant.boltzmann") * a.leaf("temperature")
    return thermal * a.of(d, "white_factor") * a.of(d, "source_conductance")


def _flicker_density(a: Algebra, d: Transistor) -> Any:
    if not a.has(f"{d.name}.process.flicker"):
        return a.leaf(f"{d.name}.process.flicker")
    return a.of(d, "transconductance") ** 2 * a.process(d, "flicker") / _channel(a, d)


LAWS: dict[str, tuple[Law, str]] = {
    "specific_current": (_specific_current, CHARGE_MODEL),
    "square_current": (_square_current, f"{TEXTBOOK}: mobility falls as T^-b"),
    "inversion_coefficient": (_inversion_coefficient, CHARGE_MODEL),
    "charge": (_charge, CHARGE_MODEL),
    "slope_factor": (_slope_factor, CHARGE_MODEL),
    "velocity": (_velocity, VELOCITY_MODEL),
    "drive": (_drive, CHARGE_MODEL),
    "drain_coupling": (_drain_coupling, "drain coupling falls with length (DIBL)"),
    "gate_coupling_at_zero": (_gate_coupling_at_zero, CHARGE_MODEL),
    "gate_coupling": (_gate_coupling, CHARGE_MODEL),
    "threshold_voltage": (_threshold_voltage, f"{TEXTBOOK}: threshold falls with temperature"),
    "gate_capacitance": (_scaled("gate_capacitance"), "process file and corner"),
    "overlap_capacitance": (_scaled("overlap_capacitance"), "process file and corner"),
    "junction_capacitance": (_scaled("junction_capacitance"), "process file and corner"),
    "transconductance": (_transconductance, CHARGE_MODEL),
    "source_conductance": (_source_conductance, CHARGE_MODEL),
    "drain_conductance": (_drain_conductance, HAND_RULE),
    "bulk_conductance": (_bulk_conductance, "the four conductances sum to zero"),
    "transconductance_efficiency": (_efficiency, CHARGE_MODEL),
    "transit_frequency": (_transit_frequency, TEXTBOOK),
    "intrinsic_capacitance": (_intrinsic, CHARGE_MODEL),
    "gate_source_capacitance": (_gate_source, CHARGE_MODEL),
    "gate_drain_capacitance": (_overlap, "overlap"),
    "gate_bulk_capacitance": (_gate_bulk, CHARGE_MODEL),
    "source_bulk_capacitance": (_source_bulk, CHARGE_MODEL),
    "drain_bulk_capacitance": (_junction, "junction"),
    "saturation_voltage": (_saturation_voltage, "Enz and Vittoz 2006, one of several published forms"),
    "white_factor": (_white_factor, CHARGE_MODEL),
    "white_density": (_white_density, f"{CHARGE_MODEL}; {TEXTBOOK}"),
    "flicker_density": (_flicker_density, TEXTBOOK),
}
"""Every law with its source, by key."""

_OF_VELOCITY = ("charge", "slope_factor")


def _thermal_voltage(a: Algebra) -> Definition:
    share = a.leaf("constant.boltzmann") / a.leaf("constant.elementary_charge")
    return Definition("thermal_voltage", share * a.leaf("temperature"), source=CODATA)


def _current(a: Algebra) -> Definition:
    if not a.has("bias_temperature_exponent"):
        return Definition("current", a.symbol("bias_current"), source="the current source sets it")
    warmth = a.leaf("temperature") / a.leaf("nominal_temperature")
    law = a.symbol("bias_current") * warmth ** a.leaf("bias_temperature_exponent")
    return Definition("current", law, source="the sheet's own law of the bias current over temperature")


OF_CIRCUIT: dict[str, Callable[[Algebra], Definition]] = {"thermal_voltage": _thermal_voltage, "current": _current}
"""What holds of all transistors of the circuit."""
