"""What was stated before and after: every value of project, process file and sheets by its dotted key."""

from __future__ import annotations

import datetime
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from worksheet.model import metrics
from worksheet.model.keys import Key
from worksheet.model.process_keys import CORNER_CHANGES, DEVICE_PARAMETERS
from worksheet.model.project_keys import SUPPLY, TEMPERATURE
from worksheet.model.sheet import Process, ProjectFile, Sheet, Value
from worksheet.model.sheet_keys import ASSUMPTIONS, BIAS_KEYS, SHEET, SOLVE_KEYS
from worksheet.project.links import values_of
from worksheet.project.variants import key_of_fingers
from worksheet.stages import catalogue

_BESIDE = ("low", "high", "standard_error", "source", "trust", "note", "checked_by", "checked")
_ENTRIES = {"evidence": "evidence", "waiver": "waivers", "remark": "remarks", "acceptance": "acceptances"}


@dataclass(frozen=True, slots=True)
class Moved:
    """One stated thing before and after; None where it was not stated. Numbers in SI units."""

    key: str
    old: Any
    new: Any
    unit: str = ""


Stated = Mapping[str, tuple[Any, str]]
"""(value, unit) by dotted key."""


def moved(old: Stated, new: Stated) -> tuple[Moved, ...]:
    """Everything that differs between two sets of statements, in the order of the newer one, then what is gone."""
    keys = [*new, *(key for key in old if key not in new)]
    found = []
    for key in keys:
        before, after = old.get(key, (None, "")), new.get(key, (None, ""))
        if before[0] != after[0]:
            found.append(Moved(key, before[0], after[0], after[1] or before[1]))
    return tuple(found)


def of_project(file: ProjectFile) -> Stated:
    """What biasbook.toml states."""
    conditions = {
        "conditions.process": (list(file.processes), ""),
        "conditions.temperature": (list(file.temperatures), _unit(TEMPERATURE)),
        "conditions.supply": (list(file.supplies), _unit(SUPPLY)),
        "conditions.nominal.process": (file.nominal.process, ""),
        "conditions.nominal.temperature": (file.nominal.temperature, _unit(TEMPERATURE)),
        "conditions.nominal.supply": (file.nominal.supply, _unit(SUPPLY)),
    }
    texts = {name: (getattr(file, name), "") for name in ("title", "owner", "process")}
    budgets = {f"budget.{name}.max": (value, _metric_unit(name)) for name, value in file.budgets.items()}
    requirements = {f"requirement.{number}": (text, "") for number, text in file.requirements.items()}
    return {**texts, **conditions, **budgets, **requirements, **_chains(file)}


def _chains(file: ProjectFile) -> Stated:
    found: dict[str, tuple[Any, str]] = {}
    for name, chain in file.chains.items():
        where = f"chain.{name}"
        found[f"{where}.sheets"] = (list(chain.sheets), "")
        found[f"{where}.title"] = (chain.title or None, "")
        found[f"{where}.settling_tolerance"] = (chain.settling_tolerance, "")
        for key, target in chain.targets.items():
            found.update(_fields(f"{where}.{key}", target, {"name", "line"}, _metric_unit(key)))
    return {key: entry for key, entry in found.items() if entry[0] is not None}


def of_process(process: Process) -> Stated:
    """What a process file states."""
    units = {key.name: _unit(key) for key in (*DEVICE_PARAMETERS, *CORNER_CHANGES)}
    found: dict[str, tuple[Any, str]] = {"reference_temperature": (process.reference_temperature, _unit(TEMPERATURE))}
    for name, device in process.devices.items():
        found[f"device.{name}.polarity"] = (device.polarity, "")
        found[f"device.{name}.own_well"] = (device.own_well, "")
        for parameter, value in device.values.items():
            found.update(_value(f"device.{name}.{parameter}", value, units.get(parameter, "")))
    for corner, devices in process.corners.items():
        for name, changes in devices.items():
            found.update({f"corner.{corner}.{name}.{k}": (v, units.get(k, "")) for k, v in changes.items()})
    return found


def of_sheet(sheet: Sheet) -> Stated:
    """What a sheet states: keys, values with what stands beside them, targets, and every entry of a list of tables."""
    stage = catalogue.find(sheet.stage)
    design: tuple[Key, ...] = () if stage is None else stage.design_keys(sheet.bias.ideal)
    units = {key.name: _unit(key) for key in (*design, *ASSUMPTIONS, *BIAS_KEYS)}
    found: dict[str, tuple[Any, str]] = {
        key.name: (getattr(sheet, key.name), "") for key in SHEET.keys if hasattr(sheet, key.name)
    }
    found["bias.device"] = (sheet.bias.device, "")
    for key, value in values_of(sheet).items():
        found.update(_value(key, value, value.unit or units.get(key.rsplit(".", 1)[-1], "")))
    for how in SOLVE_KEYS:
        found[f"solve.{how.name}"] = (getattr(sheet.solve, how.name), _unit(how))
    for name, target in sheet.targets.items():
        found.update(_fields(f"target.{name}", target, {"name", "line"}, _metric_unit(name) or target.unit or ""))
    for name, variant in sheet.variants.items():
        for key, value in variant.changes.items():
            found.update(_value(f"variant.{name}.{key}", value, value.unit or units.get(key, "")))
        found.update({f"variant.{name}.{key_of_fingers(of)}": (count, "") for of, count in variant.fingers.items()})
        found[f"variant.{name}.note"] = (variant.note, "")
    for array, attribute in _ENTRIES.items():
        for number, entry in enumerate(getattr(sheet, attribute)):
            unit = _metric_unit(getattr(entry, "metric", getattr(entry, "target", "")))
            found.update(_fields(f"{array}.{number}", entry, {"line"}, unit))
    return {key: entry for key, entry in found.items() if entry[0] not in (None, "", ())}


_TOML = {"minimum": "min", "maximum": "max", "yield_fraction": "yield"}
_MEASURED = {"minimum", "maximum", "value", "low", "high", "spread"}
"""Fields that are in the unit of the metric that the entry is about."""


def _metric_unit(name: str) -> str:
    """The unit of a metric, "" for a name that is none."""
    metric = metrics.find(name)
    return "" if metric is None else metric.dimension.unit


def _fields(
    prefix: str, entry: Any, left_out: set[str], unit: str = ""
) -> Iterator[tuple[str, tuple[Any, str]]]:  # fmt: skip
    for name in entry.__slots__:
        value = getattr(entry, name)
        if name not in left_out and value is not None and value != "":
            text = getattr(value, "text", None)
            plain = text if text is not None else value if isinstance(value, str | float | int) else str(value)
            yield f"{prefix}.{_TOML.get(name, name)}", (plain, unit if name in _MEASURED else "")


def _value(key: str, value: Value, unit: str) -> dict[str, tuple[Any, str]]:
    stated: Any = "propose" if value.propose else value.formula.text if value.formula is not None else value.number
    if stated is None and value.numbers:
        stated = list(value.numbers)
    beside = {
        f"{key}.{name}": (_text(one), unit) for name in _BESIDE if (one := getattr(value, name)) not in (None, "")
    }
    return {key: (stated, unit), **beside}


def _text(stated: Any) -> Any:
    return str(stated) if isinstance(stated, datetime.date) else stated


def _unit(key: Key) -> str:
    return "" if key.dimension is None else key.dimension.unit
