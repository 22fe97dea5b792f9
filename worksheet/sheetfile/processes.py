"""A process file read into a Process: devices with every parameter, corners with what each moves."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Any

from worksheet.model.fitted_keys import FITTED
from worksheet.model.keys import Key, Table
from worksheet.model.process_keys import CORNER, DEVICE, PROCESS
from worksheet.model.sheet import DeviceModel, Process, Value
from worksheet.model.text import clean, nearest
from worksheet.sheetfile.annotated import annotated
from worksheet.sheetfile.locate import below
from worksheet.sheetfile.names import label_problem
from worksheet.sheetfile.reader import Reader, found
from worksheet.sheetfile.source import Source
from worksheet.sheetfile.values import READERS, missing, part_of, subtable, table

TYPICAL = "typical"
"""The corner that always exists and moves nothing."""

_IDEAL = "ideal"
_LEAST, _GREATEST = "min_", "max_"


def build(reader: Reader, source: Source, name: str) -> Process | None:
    """The process that a file states, or None with problems reported."""
    data = source.data
    fields = table(reader, PROCESS, data, "")
    devices = _devices(reader, data)
    corners = _corners(reader, data, devices)
    fitted = _fitted(reader, data, devices)
    if reader.problems:
        return None
    return Process(
        name=name,
        file=reader.shown,
        title=fields.get("title", ""),
        reference_temperature=fields["reference_temperature"],
        devices=MappingProxyType(devices),
        corners=MappingProxyType({TYPICAL: MappingProxyType({}), **corners}),
        fitted=MappingProxyType(fitted),
        lines=MappingProxyType(source.places.lines),
    )


def _entries(reader: Reader, data: Mapping[str, Any], part: Table) -> dict[str, Any]:
    """The freely named entries of a table, those with a usable name."""
    entries = subtable(reader, data.get(part.name, {}), part.name)
    usable = {}
    for name, entry in entries.items():
        taken = part.name == DEVICE.name and name == _IDEAL
        reason = "it stands for a source without a transistor" if taken else label_problem(name)
        if reason:
            reader.report(below(part.name, name), f"Found {found(name)}, which cannot name {part.names}: {reason}.")
        else:
            usable[name] = entry
    return usable


def _devices(reader: Reader, data: Mapping[str, Any]) -> dict[str, DeviceModel]:
    """Every [device.NAME]."""
    part = part_of(PROCESS, "device")
    devices = {}
    for name, raw in _entries(reader, data, part).items():
        where = below(part.name, name)
        devices[name] = _device(reader, name, subtable(reader, raw, where), where)
    if part.name in data and not devices and not reader.problems:
        reader.report(part.name, f"The table [{part.name}] is empty; expected one table a transistor type.")
    return devices


def _device(reader: Reader, name: str, raw: Mapping[str, Any], where: str) -> DeviceModel:
    """One device; with problems reported its values are those that could be read."""
    known = {key.name: key for key in DEVICE.keys}
    plain: dict[str, Any] = {key.name: key.default for key in DEVICE.keys if not key.annotated}
    values: dict[str, Value] = {}
    for inner, entry in raw.items():
        key = known.get(inner)
        if key is None:
            reader.unknown(where, inner, known)
        elif key.annotated:
            value = annotated(reader, key, entry, below(where, inner))
            if value is not None:
                values[inner] = value
        else:
            plain[inner] = READERS[key.kind](reader, key, entry, below(where, inner))
    missing(reader, DEVICE, raw, where)
    _defaults(DEVICE.keys, raw, values)
    _limits(reader, values, where)
    _coupling(reader, values, where)
    return DeviceModel(name=name, values=MappingProxyType(values), **plain)


def _defaults(keys: tuple[Key, ...], raw: Mapping[str, Any], values: dict[str, Value]) -> None:
    """Enter what was left out and has a default."""
    for key in keys:
        if key.annotated and key.name not in raw and isinstance(key.default, float):
            values[key.name] = Value(key.default, numbers=(key.default,))


def _limits(reader: Reader, values: Mapping[str, Value], where: str) -> None:
    """A least size is not above the greatest."""
    for least in values:
        greatest = _GREATEST + least.removeprefix(_LEAST)
        if not least.startswith(_LEAST) or greatest not in values:
            continue
        low, high = values[least].number, values[greatest].number
        if low is not None and high is not None and low > high:
            expected = f"at most {greatest}, {clean(values[greatest].text)}"
            reader.report(below(where, least), f"Found {clean(values[least].text)}, expected {expected}.")


def _coupling(reader: Reader, values: Mapping[str, Value], where: str) -> None:
    """Gate and drain together do not move the channel by more than the whole (physics: kappa + sigma is at most 1)."""
    gate, drain = values.get("kappa"), values.get("drain_coupling")
    if gate is None or drain is None or gate.number is None or drain.number is None:
        return
    total = gate.number + drain.number
    if total > 1.0:
        message = f"Found kappa + drain_coupling = {total:.6g}, expected at most 1: beyond it the model has no meaning."
        reader.report(below(where, "drain_coupling"), message)


def _corners(reader: Reader, data: Mapping[str, Any], devices: Mapping[str, DeviceModel]) -> dict[str, Any]:
    """Every [corner.NAME.DEVICE], as corner to device to change."""
    part = part_of(PROCESS, "corner")
    corners: dict[str, Any] = {}
    for name, raw in _entries(reader, data, part).items():
        where = below(part.name, name)
        changes = subtable(reader, raw, where)
        if name == TYPICAL and changes:
            reader.report(where, f'Found changes in the corner "{TYPICAL}", expected none: nothing moves in it.')
            continue
        moved = {}
        for device, change in changes.items():
            place = below(where, device)
            if device not in devices:
                _no_device(reader, place, device, devices)
                continue
            moved[device] = MappingProxyType(table(reader, CORNER, subtable(reader, change, place), place))
        corners[name] = MappingProxyType(moved)
    return corners


def _fitted(reader: Reader, data: Mapping[str, Any], devices: Mapping[str, DeviceModel]) -> dict[str, Any]:
    """Every [fitted.DEVICE]."""
    fitted = {}
    for device, raw in subtable(reader, data.get(FITTED.name, {}), FITTED.name).items():
        place = below(FITTED.name, device)
        if device not in devices:
            _no_device(reader, place, device, devices)
        else:
            fitted[device] = MappingProxyType(table(reader, FITTED, subtable(reader, raw, place), place))
    return fitted


def _no_device(reader: Reader, place: str, device: str, devices: Mapping[str, DeviceModel]) -> None:
    """Say that a table speaks of a device that is not there."""
    near = nearest(device, devices)
    hint = f"did you mean {near}?" if near else f"expected one of {', '.join(devices) or 'the devices'}."
    reader.report(place, f"Found the device {found(device)}, which has no table [device.…]; {hint}")
