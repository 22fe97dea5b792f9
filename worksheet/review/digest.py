"""The digest of everything that can change a sheet's results, and of nothing else."""

from __future__ import annotations

import hashlib
import json
from typing import Any

import numpy as np

from worksheet.model.sheet import Condition, Value
from worksheet.model.sheet_keys import SHEET
from worksheet.project.case import Case
from worksheet.project.links import formulas_of

_LENGTH = 12
_PROPOSED_DIGITS = 6
_LINKED_DIGITS = 9


def basis(case: Case) -> str:
    """Twelve hexadecimal digits over stage, devices and their parameters, bias, assumptions, own names, choices, solve,
    conditions, and values taken from other sheets.

    Numbers count by value: a proposed one to six digits, one from another sheet to nine.
    """
    text = json.dumps(_content(case), sort_keys=True, separators=(",", ":"))
    return hashlib.sha256(text.encode()).hexdigest()[:_LENGTH]


def _content(case: Case) -> dict[str, Any]:
    sheet, conditions = case.sheet, case.conditions
    devices = {case.model(device).name: case.model(device) for device in case.circuit.devices}
    used = {c.process for c in conditions.conditions}
    return {
        **{key.name: getattr(sheet, key.name) for key in SHEET.keys if key.moves_results},
        "devices": {
            name: [m.polarity, m.own_well, {k: _value(v) for k, v in m.values.items()}] for name, m in devices.items()
        },
        "corners": {
            corner: {name: dict(changes) for name, changes in of_devices.items() if name in devices}
            for corner, of_devices in conditions.process.corners.items()
            if corner in used
        },
        "reference_temperature": conditions.process.reference_temperature,
        "bias": [sheet.bias.device, {k: _value(v) for k, v in sheet.bias.values.items()}],
        "assume": {k: _value(v) for k, v in sheet.assume.items()},
        "own": {k: _value(v) for k, v in sheet.own.items()},
        "choose": {k: _value(v) for k, v in sheet.choose.items() if not v.propose},
        "proposed": {k: _rounded(v, _PROPOSED_DIGITS) for k, v in case.filled.items()},
        "solve": [sheet.solve.keep, sheet.solve.inversion_coefficient, sheet.solve.over, sheet.solve.current_allowance],
        "conditions": [[c.process, c.temperature, c.supply] for c in _ordered(case)[0]],
        "links": _links(case),
    }


def _value(value: Value) -> list[Any]:
    formula = None if value.formula is None else repr(value.formula.tree)
    return [value.number, formula, sorted(value.numbers), value.low, value.high]


def _ordered(case: Case) -> tuple[list[Condition], list[int]]:
    """The conditions in an order that does not depend on how they are listed, nominal first; and their places."""
    every = case.conditions.conditions
    places = [0, *sorted(range(1, len(every)), key=lambda k: every[k])]
    return [every[k] for k in places], places


def _links(case: Case) -> dict[str, list[str]]:
    """Values taken from other sheets; a target's formula moves no result and does not count."""
    places = _ordered(case)[1]
    names = {n for _, formula, of_target in formulas_of(case.sheet) if not of_target for n in formula.names if "." in n}
    return {
        name: [_rounded(x, _LINKED_DIGITS) for x in np.broadcast_to(values, (len(places),))[places]]
        for name in sorted(names)
        for values in [case.external(*name.split(".", 1))]
    }


def _rounded(number: float, digits: int) -> str:
    return f"{number:.{digits - 1}e}"
