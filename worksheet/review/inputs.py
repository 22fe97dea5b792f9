"""Every input of a sheet by its qualified name: what fragility ranks, and how each is moved."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from worksheet.model import metrics
from worksheet.model.keys import Key
from worksheet.model.process_keys import DEVICE_PARAMETERS
from worksheet.model.project_keys import SUPPLY, TEMPERATURE
from worksheet.model.sheet_keys import ASSUMPTIONS, BIAS_KEYS, OWN
from worksheet.project.case import Case
from worksheet.project.links import formulas_of
from worksheet.solver.subject import scalar

_NOT_RANKED = {
    "drain_coupling_exponent",
    "flicker_exponent",
    "mobility_exponent",
    "bias_temperature_exponent",
    "settling_tolerance",
    "noise_from",
    "min_length",
    "max_length",
    "min_width",
    "max_width",
    "grid",
    "max_voltage",
}
"""Limits, grids, exponents and tolerances."""


@dataclass(frozen=True, slots=True)
class Input:
    """One input of a sheet.

    Attributes:
        name: Qualified: "assume.load_capacitance", "process.nfet.kappa", "bias.output_conductance", "supply".
        move: The name under which a case moves it.
        value: Where it stands. [unit]
        unit: SI unit; an own name's as written.
        trust: What the user said of it; "" where nothing.
        standard_error: Of a fitted parameter, None where none is stated. [unit]
        low, high: Within which it can be searched; None for no limit. [unit]
    """

    name: str
    move: str
    value: float
    unit: str
    trust: str = ""
    standard_error: float | None = None
    low: float | None = None
    high: float | None = None


def inputs_of(case: Case) -> list[Input]:
    """All inputs that can be ranked, those that stand at 0 included."""
    return [*_sheet(case), *_bias(case), *_linked(case), *_process(case), *_conditions(case)]


def _sheet(case: Case) -> Iterator[Input]:
    sheet = case.sheet
    keys = {
        key.name: key for key in (*case.stage.design_keys(sheet.bias.ideal), *ASSUMPTIONS) if key.dimension is not None
    }
    for table, values in (("assume", sheet.assume), ("own", sheet.own), ("choose", sheet.choose)):
        for name, value in values.items():
            key = keys.get(name, OWN if table == "own" else None)
            if key is None or name in _NOT_RANKED or value.formula is not None or value.propose:
                continue
            unit = value.unit if table == "own" else _unit(key)
            yield Input(
                f"{table}.{name}", name, value.number or 0.0, unit, value.trust, value.standard_error, key.low, key.high
            )
    for name in case.open_keys:
        yield Input(f"choose.{name}", name, scalar(case.value(name)), _unit(keys[name]))
    for key in ASSUMPTIONS:
        taken = case.stage.refusal(key.name, sheet.bulk, sheet.bias.ideal) is None
        if taken and key.default == 0.0 and key.name not in sheet.assume and key.name not in _NOT_RANKED:
            yield Input(f"assume.{key.name}", key.name, 0.0, _unit(key))


def _bias(case: Case) -> Iterator[Input]:
    if not case.sheet.bias.ideal:
        return
    for key in BIAS_KEYS:
        if key.dimension is not None:
            value = case.sheet.bias.values.get(key.name)
            if value is None or value.formula is None:
                number = 0.0 if value is None else value.number or 0.0
                trust = "" if value is None else value.trust
                yield Input(f"bias.{key.name}", f"bias.{key.name}", number, _unit(key), trust, None, key.low, key.high)


def _linked(case: Case) -> Iterator[Input]:
    """Values that the sheet takes directly from other sheets."""
    plain = [formula for _, formula, of_target in formulas_of(case.sheet) if not of_target]
    for name in dict.fromkeys(n for formula in plain for n in formula.names if "." in n):
        sheet, part = name.split(".", 1)
        metric = metrics.find(part)
        unit = metric.dimension.unit if metric is not None else ""
        yield Input(name, name, scalar(np.asarray(case.external(sheet, part))), unit)


def _process(case: Case) -> Iterator[Input]:
    models = {case.model(device).name: case.model(device) for device in case.circuit.devices}
    for name, model in models.items():
        for key in DEVICE_PARAMETERS:
            if key.dimension is None or key.name in _NOT_RANKED:
                continue
            value = model.values[key.name]
            full = f"process.{name}.{key.name}"
            yield Input(
                full, full, value.number or 0.0, _unit(key), value.trust, value.standard_error, key.low, key.high
            )


def _conditions(case: Case) -> Iterator[Input]:
    nominal = case.conditions.nominal
    yield Input("temperature", "temperature", nominal.temperature, _unit(TEMPERATURE), low=200.0, high=500.0)
    yield Input("supply", "supply", nominal.supply, _unit(SUPPLY))


def _unit(key: Key) -> str:
    return "" if key.dimension is None else key.dimension.unit
