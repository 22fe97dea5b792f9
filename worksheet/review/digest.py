"""The digest of everything that can change a sheet's results, and of nothing else."""

from __future__ import annotations

import hashlib
import json
from typing import Any

import numpy as np

from worksheet.model.project_keys import TEMPERATURE
from worksheet.model.sheet import Value
from worksheet.model.sheet_keys import ASSUMPTIONS, BIAS_KEYS, SHEET
from worksheet.project.case import Case
from worksheet.project.links import formulas_of

_LENGTH = 12
_PROPOSED_DIGITS = 6
_LINKED_DIGITS = 9
_DEFAULTS = {key.name: key.default for key in (*ASSUMPTIONS, *BIAS_KEYS) if isinstance(key.default, float)}
_PLAIN = tuple(key.name for key in SHEET.keys if key.moves_results)


def basis(case: Case) -> str:
    """Twelve hexadecimal digits over stage, devices and their parameters, bias, assumptions, own names, choices, solve,
    conditions, and values taken from other sheets.

    Numbers count by value: a proposed one to six digits, one from another sheet to nine. What is written out though it
    holds without, and a list of temperatures beside the conditions that it makes, count for nothing.
    """
    shared = _shared(case)
    text = _dumps({**_content(case), **dict.fromkeys(shared, _PLACE)})
    for key, part in shared.items():  # written already: put where it belongs
        text = text.replace(f'"{key}":{_PLACED}', f'"{key}":{part}', 1)
    return hashlib.sha256(text.encode()).hexdigest()[:_LENGTH]


_PLACE, _PLACED = "\x01", '"\\u0001"'
"""What stands in the place of a part that is written already; no text that counts can hold it."""

_dumps = json.JSONEncoder(sort_keys=True, separators=(",", ":")).encode


def _shared(case: Case) -> dict[str, str]:
    """What sheets of the same devices and conditions have in common, as JSON by key; written once for all of them."""
    conditions = case.conditions
    names = tuple(dict.fromkeys(case.model(device).name for device in case.circuit.devices))
    known = conditions.kept
    if names not in known:
        devices = {name: conditions.process.devices[name] for name in names}
        used = {c.process for c in conditions.conditions}
        content = {
            "devices": {
                name: [m.polarity, m.own_well, {k: _value(v) for k, v in m.values.items()}]
                for name, m in devices.items()
            },
            "corners": {
                corner: {name: dict(changes) for name, changes in of_devices.items() if name in devices}
                for corner, of_devices in conditions.process.corners.items()
                if corner in used
            },
            "reference_temperature": conditions.process.reference_temperature,
            "conditions": [[c.process, c.temperature, c.supply] for c in conditions.ordered],
        }
        known[names] = {key: _dumps(value) for key, value in content.items()}
    found: dict[str, str] = known[names]
    return found


def _content(case: Case) -> dict[str, Any]:
    """What is the sheet's own."""
    sheet = case.sheet
    return {
        **{key: getattr(sheet, key) for key in _PLAIN},
        "bias": [sheet.bias.device, {k: _value(v) for k, v in sheet.bias.values.items() if not _default(k, v)}],
        "assume": {k: _value(v) for k, v in sheet.assume.items() if k != TEMPERATURE.name and not _default(k, v)},
        "own": {k: _value(v) for k, v in sheet.own.items()},
        "choose": {k: _value(v) for k, v in sheet.choose.items() if not v.propose},
        "proposed": {k: _rounded(v, _PROPOSED_DIGITS) for k, v in case.filled.items()},
        "solve": [sheet.solve.keep, sheet.solve.inversion_coefficient, sheet.solve.over, sheet.solve.current_allowance],
        "links": _links(case),
    }


def _value(value: Value) -> list[Any]:
    formula = None if value.formula is None else repr(value.formula.tree)
    return [value.number, formula, sorted(value.numbers), value.low, value.high]


def _default(key: str, value: Value) -> bool:
    """Whether a value says what holds without it."""
    plain = value.formula is None and value.low is None and value.high is None
    return plain and value.number is not None and value.number == _DEFAULTS.get(key)


def _links(case: Case) -> dict[str, list[str]]:
    """Values taken from other sheets; a target's formula moves no result and does not count."""
    places = case.conditions.places
    names = {n for _, formula, of_target in formulas_of(case.sheet) if not of_target for n in formula.names if "." in n}
    return {
        name: [_rounded(x, _LINKED_DIGITS) for x in np.broadcast_to(values, (len(places),))[places]]
        for name in sorted(names)
        for values in [case.external(*name.split(".", 1))]
    }


def _rounded(number: float, digits: int) -> str:
    return f"{number:.{digits - 1}e}"
