"""The project file read into a ProjectFile: conditions, budgets, requirements and chains."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Any, cast

from worksheet.model import metrics
from worksheet.model.dimension import Dimension
from worksheet.model.keys import Key
from worksheet.model.project_keys import PROJECT
from worksheet.model.sheet import ProjectFile
from worksheet.model.text import clean, nearest
from worksheet.sheetfile.annotated import listed
from worksheet.sheetfile.chains import read_chains
from worksheet.sheetfile.locate import below
from worksheet.sheetfile.names import label_problem
from worksheet.sheetfile.reader import Reader, found
from worksheet.sheetfile.source import Source
from worksheet.sheetfile.values import READERS, missing, number, part_of, subtable, table

_LIMIT = "max"  # the one key of a budget
_BUDGET = part_of(PROJECT, "budget")
_BUDGET_KEY = cast(Key, _BUDGET.entry)
_REQUIREMENT = part_of(PROJECT, "requirement")
_REQUIREMENT_KEY = cast(Key, _REQUIREMENT.entry)


def build(reader: Reader, source: Source) -> ProjectFile | None:
    """The project that a file states, or None with problems reported."""
    data = source.data
    fields = table(reader, PROJECT, data, "")
    process = fields.get("process")
    reason = process and label_problem(process)
    if reason:
        reader.report("process", f"Found {found(process)}, which cannot name a process file: {reason}.")
    conditions = _conditions(reader, data)
    budgets = _budgets(reader, data)
    requirements = _requirements(reader, data)
    chains = read_chains(reader, data)
    if reader.problems:
        return None
    return ProjectFile(
        file=reader.shown,
        title=fields.get("title", ""),
        owner=fields.get("owner", ""),
        process=fields["process"],
        processes=conditions["process"],
        temperatures=conditions["temperature"],
        supplies=conditions["supply"],
        nominal=conditions["nominal"],
        budgets=MappingProxyType(budgets),
        requirements=MappingProxyType(requirements),
        chains=MappingProxyType(chains),
        lines=MappingProxyType(source.places.lines),
    )


def _conditions(reader: Reader, data: Mapping[str, Any]) -> dict[str, Any]:
    """The lists of [conditions] and its nominal condition."""
    part = part_of(PROJECT, "conditions")
    raw = subtable(reader, data.get(part.name, {}), part.name)
    known = {key.name: key for key in part.keys}
    fields = {}
    for name, entry in raw.items():
        key = known.get(name)
        if key is None:
            reader.unknown(part.name, name, known)
            continue
        read = listed if key.listed else READERS[key.kind]
        fields[name] = read(reader, key, entry, below(part.name, name))
    if part.name in data:
        missing(reader, part, raw, part.name)
    return fields


def _budgets(reader: Reader, data: Mapping[str, Any]) -> dict[str, float]:
    """The limits of [budget], by metric."""
    budgets = {}
    additive = [metric.key for metric in metrics.all_metrics() if metric.additive]
    for name, entry in subtable(reader, data.get(_BUDGET.name, {}), _BUDGET.name).items():
        where = below(_BUDGET.name, name)
        metric = metrics.find(name)
        if metric is None or not metric.additive:
            kind = "the unknown metric" if metric is None else "a metric that does not add up over sheets,"
            near = nearest(name, additive)
            hint = f"did you mean {near}?" if near else f"expected one of {', '.join(additive)}."
            reader.report(where, f"Found {kind} {clean(name)}; {hint}")
            continue
        limit = _limit(reader, entry, where, metric.dimension)
        if limit is not None:
            budgets[name] = limit
    return budgets


def _requirements(reader: Reader, data: Mapping[str, Any]) -> dict[str, str]:
    """What [requirement] states, by number."""
    read = READERS[_REQUIREMENT_KEY.kind]
    stated = subtable(reader, data.get(_REQUIREMENT.name, {}), _REQUIREMENT.name)
    texts = {name: read(reader, _REQUIREMENT_KEY, raw, below(_REQUIREMENT.name, name)) for name, raw in stated.items()}
    return {clean(name): text for name, text in texts.items() if text is not None}


def _limit(reader: Reader, raw: object, where: str, dimension: Dimension) -> float | None:
    """The limit of one budget."""
    example = f'"{dimension.example}"'
    if not isinstance(raw, dict):
        reader.refuse(where, raw, f"a table, for example {{ {_LIMIT} = {example} }}")
        return None
    for inner in raw:
        if inner != _LIMIT:
            reader.unknown(where, inner, [_LIMIT])
    if _LIMIT not in raw:
        reader.report(below(where, _LIMIT), f"The key is missing; expected a limit, for example {example}.")
        return None
    return number(reader, _BUDGET_KEY, raw[_LIMIT], below(where, _LIMIT), dimension)
