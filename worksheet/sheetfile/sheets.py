"""A sheet read into a Sheet: its tables one by one, and how they hang together."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import fields as dataclass_fields
from types import MappingProxyType
from typing import Any, cast

from worksheet.model.keys import Key, Kind
from worksheet.model.sheet import Bias, Sheet, Solve, Value
from worksheet.model.sheet_keys import FINGERS, SHEET
from worksheet.model.text import clean, nearest
from worksheet.sheetfile import formulas
from worksheet.sheetfile.annotated import annotated
from worksheet.sheetfile.locate import below
from worksheet.sheetfile.names import own_name_problem
from worksheet.sheetfile.reader import Reader, found
from worksheet.sheetfile.source import Source
from worksheet.sheetfile.taken import (
    ASSUME,
    BIAS,
    CHOOSE,
    LOAD,
    OWN,
    PARTS,
    SOLVE,
    TARGET,
    Taken,
    elsewhere,
    refusal,
    taken,
)
from worksheet.sheetfile.targets import (
    read_acceptances,
    read_collisions,
    read_evidence,
    read_remarks,
    read_targets,
    read_waivers,
)
from worksheet.sheetfile.values import READERS, subtable, table
from worksheet.sheetfile.variants import read_variants
from worksheet.stages import catalogue
from worksheet.stages.stage import MAIN, Stage

_FIELDS = {field.name for field in dataclass_fields(Sheet)}
_BULK = next(key for key in SHEET.keys if key.name == "bulk")
_OWN_KEY = cast(Key, PARTS[OWN].entry)


def build(reader: Reader, source: Source, name: str) -> Sheet | None:
    """The sheet that a file states, or None with problems reported.

    Args:
        reader: Takes the problems.
        source: The file.
        name: The sheet's name.
    """
    data = source.data
    fields = _top(reader, data)
    bias = _bias(reader, data)
    bulk = fields.get(_BULK.name) if _BULK.name in data else _BULK.default
    keys = taken(_stage(reader, fields.get("stage")), cast("str | None", bulk), None if bias is None else bias.ideal)
    assume, imposed = _values(reader, keys, data, ASSUME, {**keys.assumptions, **keys.design})
    choose, chosen = _values(reader, keys, data, CHOOSE, keys.design)
    _once(reader, keys, data)
    _levels(reader, keys, data)
    own = _own(reader, data)
    solve = table(reader, PARTS[SOLVE], subtable(reader, data.get(SOLVE, {}), SOLVE), SOLVE)
    targets, dimensions = read_targets(reader, keys.stage, own, data.get(TARGET, {}))
    variants = read_variants(reader, keys, own, choose, data)
    evidence = read_evidence(reader, keys.stage, bias is None or bias.ideal, dimensions, data)
    waivers = read_waivers(reader, dimensions, data)
    remarks = read_remarks(reader, data)
    acceptances = read_acceptances(reader, data)
    collisions = read_collisions(reader, data)
    values = {ASSUME: assume, CHOOSE: choose, OWN: own, BIAS: bias.values if bias else {}}
    formulas.check_values(reader, keys, values)
    formulas.check_targets(reader, keys, own, targets)
    if reader.problems:
        return None
    return Sheet(
        name=name,
        file=reader.shown,
        bias=bias or Bias(),
        assume=MappingProxyType(assume),
        own=MappingProxyType(own),
        choose=MappingProxyType(choose),
        fingers=MappingProxyType({**imposed, **chosen}),
        solve=Solve(**solve),
        targets=MappingProxyType(targets),
        evidence=evidence,
        waivers=waivers,
        remarks=remarks,
        acceptances=acceptances,
        collisions=collisions,
        variants=MappingProxyType(variants),
        lines=MappingProxyType(source.places.lines),
        **{key: value for key, value in fields.items() if key in _FIELDS},
    )


def _top(reader: Reader, data: Mapping[str, Any]) -> dict[str, Any]:
    """The keys before the first table."""
    fixed = {key.name for key in SHEET.keys}
    for key in data:
        if key not in fixed and key not in PARTS:
            reader.unknown("", key, [*(one.name for one in SHEET.keys), *PARTS], elsewhere)
    return table(reader, SHEET, {key: value for key, value in data.items() if key in fixed}, "")


def _stage(reader: Reader, name: str | None) -> Stage | None:
    stage = catalogue.find(name) if name is not None else None
    if name is not None and stage is None:
        near = nearest(name, catalogue.keys())
        hint = f'did you mean "{near}"?' if near else f"expected one of {', '.join(catalogue.keys())}."
        reader.report("stage", f"Found the unknown stage {found(name)}; {hint}")
    return stage


def _bias(reader: Reader, data: Mapping[str, Any]) -> Bias | None:
    """The current source; None where its device cannot be told."""
    known = {key.name: key for key in PARTS[BIAS].keys}
    device: str | None = Bias().device
    values: dict[str, Value] = {}
    for inner, entry in subtable(reader, data.get(BIAS, {}), BIAS).items():
        key = known.get(inner)
        where = below(BIAS, inner)
        if key is None:
            reader.unknown(BIAS, inner, known, elsewhere)
        elif not key.annotated:
            device = READERS[key.kind](reader, key, entry, where)
        else:
            value = annotated(reader, key, entry, where)
            if value is not None:
                values[inner] = value
    if device is None:
        return None
    bias = Bias(device, MappingProxyType(values))
    if not bias.ideal:
        reason = f"it belongs to an ideal current source, and the device {clean(device)} has its own"
        for inner in values:
            reader.unknown(BIAS, inner, (), lambda _: reason)
    return bias


def _values(
    reader: Reader, keys: Taken, data: Mapping[str, Any], part: str, known: Mapping[str, Key]
) -> tuple[dict[str, Value], dict[str, int]]:
    """The values of [assume] or [choose], and the fingers of each device."""
    values: dict[str, Value] = {}
    fingers: dict[str, int] = {}
    for inner, entry in subtable(reader, data.get(part, {}), part).items():
        key = known.get(inner)
        where = below(part, inner)
        if key is None:
            reader.unknown(part, inner, known, lambda name: refusal(keys, name, part))
        elif key.kind is Kind.WHOLE:
            count = READERS[key.kind](reader, key, entry, where)
            if count is not None:
                fingers[inner.removesuffix(FINGERS.name).removesuffix("_") or MAIN] = count
        else:
            value = annotated(reader, key, entry, where, propose=part == CHOOSE)
            if value is not None:
                values[inner] = value
    return values, fingers


def _once(reader: Reader, keys: Taken, data: Mapping[str, Any]) -> None:
    """A design variable is imposed or chosen, not both; the load is one of them."""
    assume, choose = (raw if isinstance(raw := data.get(name), dict) else {} for name in (ASSUME, CHOOSE))
    for inner in choose:
        if inner in keys.design and inner in assume:
            line = reader.places.line(below(ASSUME, inner))
            message = f"Found {inner} here and in [{ASSUME}] on line {line}, expected it in one of them."
            reader.report(below(CHOOSE, inner), message)
    if keys.stage and LOAD not in assume and LOAD not in choose:
        key = keys.design[LOAD]
        message = f'expected {key.title.lower()} here or in [{CHOOSE}], for example "{key.example}".'
        reader.report(below(ASSUME, LOAD), f"The key is missing; {message}")


def _levels(reader: Reader, keys: Taken, data: Mapping[str, Any]) -> None:
    """A stage that takes one level at a time is given one."""
    assume = data.get(ASSUME)
    if keys.stage is None or not keys.stage.one_level or not isinstance(assume, dict):
        return
    given = [level for level in assume if level in keys.stage.levels]
    if len(given) > 1:
        message = f"expected one of them: in a {keys.stage.title.lower()} each follows from the other."
        reader.report(below(ASSUME, given[-1]), f"Found {' and '.join(given)}, {message}")


def _own(reader: Reader, data: Mapping[str, Any]) -> dict[str, Value]:
    """The user's own names."""
    own = {}
    for inner, entry in subtable(reader, data.get(OWN, {}), OWN).items():
        where = below(OWN, inner)
        reason = own_name_problem(inner)
        if reason:
            reader.report(where, f"Found the own name {found(inner)}: {reason}.")
        value = annotated(reader, _OWN_KEY, entry, where)
        if value is not None:
            own[inner] = value
    return own
