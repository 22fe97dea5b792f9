"""The design variables of a sheet: what each stands at, and how far the process lets it go."""

from __future__ import annotations

from dataclasses import dataclass, replace

from worksheet.model.dimension import DIMENSIONS, NUMBER, Dimension
from worksheet.model.keys import Key
from worksheet.model.quantity import parse
from worksheet.model.sheet import DeviceModel
from worksheet.model.sheet_keys import GEOMETRY, OWN, SOLVE_KEYS
from worksheet.solver.subject import Subject, own_unit, scalar

_CURRENT_SPAN = (1e-6, 1e6)
_CAPACITANCE_SPAN = (1e-6, 1e6)
_LEAST_CAPACITANCE = 1e-15

INVERSION = next(key for key in SOLVE_KEYS if key.name == "inversion_coefficient")
"""The main device's inversion coefficient as a variable: the current is held and the width follows."""


@dataclass(frozen=True, slots=True)
class Variable:
    """One design variable.

    Attributes:
        key: Its description; Key.name names it.
        present: Where it stands. [unit of the key]
        low, high: How far it is looked at. [unit of the key]
        bounded: Whether low and high are limits of the process.
        grid: Layout grid, None where it has none. [m]
    """

    key: Key
    present: float
    low: float
    high: float
    bounded: bool
    grid: float | None = None

    @property
    def name(self) -> str:
        """Its key's name."""
        return self.key.name


def variables(subject: Subject) -> dict[str, Variable]:
    """All design variables of a sheet that has a number for each, by name."""
    found = {}
    devices = {device.key(name): (device, name) for device in subject.circuit.devices for name in GEOMETRY}
    for key in subject.stage.design_keys(subject.sheet.bias.ideal):
        if key.dimension is None:
            continue
        present = scalar(subject.value(key.name))
        if key.name in devices:
            device, name = devices[key.name]
            model = subject.model(device)
            ends = model.number(f"min_{name}"), model.number(f"max_{name}")
            if name == "length":
                ends = max(ends[0], shortest_coupled(subject, model)), ends[1]
            found[key.name] = Variable(key, present, *ends, bounded=True, grid=model.number("grid"))
        elif key.name == "bias_current":
            specific = specific_current(subject)
            low, high = (min(present, specific) * _CURRENT_SPAN[0], max(present, specific) * _CURRENT_SPAN[1])
            found[key.name] = Variable(key, present, low, high, bounded=False)
        else:
            size = present if present > 0 else _LEAST_CAPACITANCE
            found[key.name] = Variable(
                key, present, size * _CAPACITANCE_SPAN[0], size * _CAPACITANCE_SPAN[1], bounded=False
            )
    return found


def on_request(subject: Subject, name: str) -> Variable | None:
    """The inversion coefficient, an assumption or an own name as a variable; None where there is none of that name.

    An assumption that stands at 0 has no decades around it and is looked at from far below to its usual size.
    """
    if name == INVERSION.name:
        present = inversion(subject)
        return Variable(INVERSION, present, present * 1e-6, present * 1e6, bounded=False)
    key = next((k for k in subject.stage.assumption_keys(subject.sheet.bulk) if k.name == name and not k.listed), None)
    if key is None and name in subject.sheet.own:
        unit = own_unit(subject.sheet.own[name])
        known = next((d for d in DIMENSIONS if unit and d.unit == unit), NUMBER)
        dimension = known if known.unit == unit else Dimension("own", unit, NUMBER.exponents, plain=False, example=unit)
        key = replace(OWN, name=name, title=f"Own name {name}", symbol=name, dimension=dimension)
    if key is None or (subject.stated(name) is None and key.default is None):
        return None
    present = scalar(subject.value(name))
    size = abs(present) or _typical(key)
    low = max(size * 1e-6, (key.low or 0.0) * (1 + 1e-12))
    high = size * 1e6 if key.high is None else min(size * 1e6, key.high * (1 - 1e-12))
    return Variable(key, present, low, high, bounded=False)


def _typical(key: Key) -> float:
    """The size of the example that the key is described with. [unit of the key]"""
    if key.dimension is None or not key.example:
        return 1.0
    try:
        return abs(parse(float(key.example) if key.dimension.plain else key.example, key.dimension)) or 1.0
    except ValueError:
        return 1.0


def shortest_coupled(subject: Subject, model: DeviceModel) -> float:
    """Least length at which kappa + drain coupling is at most 1 in every corner. [m]"""
    shortest = 0.0
    sigma, reference = model.number("drain_coupling"), model.number("drain_coupling_length")
    exponent = model.number("drain_coupling_exponent")
    for changes in ({}, *(devices.get(model.name, {}) for devices in subject.conditions.process.corners.values())):
        room = 1.0 - model.number("kappa") - changes.get("kappa_shift", 0.0)
        coupling = sigma * changes.get("drain_coupling_factor", 1.0)
        if exponent > 0 and room > 0 and coupling > 0:
            shortest = max(shortest, reference * (coupling / room) ** (1.0 / exponent))
    return shortest


def specific_current(subject: Subject) -> float:
    """I_spec of the main device at the nominal condition. [A]"""
    main = subject.stage.transistors[0].name
    return scalar(subject.inputs.devices[main].specific)


def square_current(subject: Subject) -> float:
    """I_sq of the main device at the nominal condition. [A]"""
    main = subject.stage.transistors[0].name
    return scalar(subject.inputs.devices[main].specific_current)


def inversion(subject: Subject) -> float:
    """Inversion coefficient of the main device at the nominal condition. [-]"""
    return scalar(subject.value("bias_current")) / specific_current(subject)
