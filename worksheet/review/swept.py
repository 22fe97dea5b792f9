"""What of a sheet can be swept: its choices, assumptions and own names, process parameters, temperature and supply."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from worksheet.model.dimension import Dimension
from worksheet.model.keys import Key
from worksheet.model.process_keys import DEVICE_PARAMETERS
from worksheet.model.project_keys import SUPPLY, TEMPERATURE
from worksheet.model.quantity import QuantityError, parse, parse_free
from worksheet.model.sheet_keys import BIAS_KEYS, OWN
from worksheet.model.text import clean, nearest
from worksheet.model.units import parse_unit
from worksheet.project.case import Case
from worksheet.solver.subject import scalar
from worksheet.solver.variables import variables

_SLACK = 1e-9


@dataclass(frozen=True, slots=True)
class Axis:
    """A quantity that can be swept.

    Attributes:
        name: As the user calls it: "width", "process.nfet.kappa", "temperature".
        move: The name under which a case moves it.
        key: Its description; without a dimension for an own name.
        unit: SI unit; of an own name the base of the written one.
        present: Where it stands at the nominal condition. [unit]
        low, high: Closed limits beyond its key's range: of the process, for sizes. [unit]
    """

    name: str
    move: str
    key: Key
    unit: str
    present: float
    low: float | None = None
    high: float | None = None

    def read(self, text: str) -> float:
        """A value of it as typed. [unit] ValueError with what is wrong."""
        try:
            if self.key.dimension is not None:
                value = parse(_plain(text), self.key.dimension)
            else:
                value, unit = parse_free(_plain(text))
                base = parse_unit(unit).base if unit else ""
                if unit and base != self.unit:
                    raise ValueError(f'Found "{clean(text)}", expected a value in {self.unit or "no unit"}.')
        except QuantityError as error:
            raise ValueError(str(error)) from error
        reason = self.outside(value)
        if reason is not None:
            raise ValueError(f'Found "{clean(text)}", expected {reason}.')
        return value

    def outside(self, value: float) -> str | None:
        """What is expected where a value lies outside, else None. [unit]"""
        reason = self.key.outside(value)
        if reason is not None:
            return reason
        if self.low is not None and value < self.low * (1 - _SLACK):
            return f"at least {self.low:g} {self.unit}, the least that the process allows"
        if self.high is not None and value > self.high * (1 + _SLACK):
            return f"at most {self.high:g} {self.unit}, the most that the process allows"
        return None


def _plain(text: str) -> str | float:
    """A bare number is in SI base units, as in a file."""
    try:
        return float(text)
    except ValueError:
        return text


def axes(case: Case) -> dict[str, Axis]:
    """Everything of a sheet that can be swept, by name."""
    return {axis.name: axis for axis in (*_sheet(case), *_conditions(case), *_process(case), *_linked(case))}


def find(case: Case, name: str) -> Axis:
    """The axis of a name, plain or with its table before it. LookupError with what is wrong."""
    known = axes(case)
    for table in ("choose", "assume", "own"):
        name = name.removeprefix(f"{table}.")
    if name in known:
        return known[name]
    near = nearest(name, known)
    hint = f"did you mean {near}?" if near else f"expected one of {', '.join(known)}."
    raise LookupError(f"Found the unknown quantity {clean(name)}; {hint}")


def _sheet(case: Case) -> Iterator[Axis]:
    sheet, bounds = case.sheet, variables(case)
    keys = (*case.stage.design_keys(sheet.bias.ideal), *case.stage.assumption_keys(sheet.bulk))
    for key in keys:
        if key.dimension is None or key.name in ("supply", "temperature"):
            continue
        stated = case.stated(key.name)
        if stated is None and key.default is None and key.name not in case.filled:
            continue
        bound = bounds.get(key.name)
        low, high = (bound.low, bound.high) if bound is not None and bound.bounded else (None, None)
        yield _axis(key.name, key.name, key, scalar(case.value(key.name)), low, high)
    for name, value in sheet.own.items():
        base = parse_unit(value.unit).base if value.unit else ""
        yield Axis(name, name, OWN, base, scalar(case.value(name)))
    for key in BIAS_KEYS if sheet.bias.ideal else ():
        if key.dimension is not None:
            move = f"bias.{key.name}"
            yield _axis(move, move, key, scalar(case.value(move)))


def _axis(name: str, move: str, key: Key, present: float, low: float | None = None, high: float | None = None) -> Axis:
    dimension: Dimension | None = key.dimension
    return Axis(name, move, key, "" if dimension is None else dimension.unit, present, low, high)


def _conditions(case: Case) -> Iterator[Axis]:
    nominal = case.conditions.nominal
    yield _axis("temperature", "temperature", replace(TEMPERATURE, listed=False), nominal.temperature)
    yield _axis("supply", "supply", replace(SUPPLY, listed=False), nominal.supply)


def _process(case: Case) -> Iterator[Axis]:
    for model in {case.model(device).name: case.model(device) for device in case.circuit.devices}.values():
        for key in DEVICE_PARAMETERS:
            if key.dimension is not None and not key.name.startswith(("min_", "max_")) and key.name != "grid":
                name = f"process.{model.name}.{key.name}"
                yield _axis(name, name, key, model.values[key.name].number or 0.0)


def _linked(case: Case) -> Iterator[Axis]:
    """Values that the sheet takes directly from other sheets."""
    from worksheet.model import metrics
    from worksheet.project.links import formulas_of

    plain = [formula for _, formula, of_target in formulas_of(case.sheet) if not of_target]
    for name in dict.fromkeys(n for formula in plain for n in formula.names if "." in n):
        metric = metrics.find(name.split(".", 1)[1])
        key = replace(OWN, dimension=None if metric is None else metric.dimension)
        yield _axis(name, name, key, scalar(np.asarray(case.external(*name.split(".", 1)))))
