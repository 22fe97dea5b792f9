"""Chains of the project file: signal paths through sheets, and what each must achieve as a whole.

Whether the sheets exist is looked at when all of them are read.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from types import MappingProxyType
from typing import Any, cast

from worksheet.model import metrics
from worksheet.model.keys import Key, Table
from worksheet.model.project_keys import CHAIN_METRICS, PROJECT
from worksheet.model.sheet import Chain, Target
from worksheet.model.text import clean, is_identifier, nearest
from worksheet.sheetfile.locate import below
from worksheet.sheetfile.reader import Reader, found
from worksheet.sheetfile.targets import read_target
from worksheet.sheetfile.values import READERS, missing, part_of, subtable

CHAIN = part_of(PROJECT, "chain")
_ENTRY = cast(Table, CHAIN.entry)
_LIMITS = cast(Table, _ENTRY.entry)
_SHEETS = cast(Key, _ENTRY.key("sheets"))
_ONE = replace(_SHEETS, example="element_buffer")
MOST_STAGES = 12
"""Sheets that a chain may have: beyond, its settling is not reckoned to the digits that a review promises."""

_LONGEST = 100


def read_chains(reader: Reader, data: Mapping[str, Any]) -> dict[str, Chain]:
    """Every [chain.NAME]."""
    chains = {}
    for name, raw in subtable(reader, data.get(CHAIN.name, {}), CHAIN.name).items():
        where = below(CHAIN.name, name)
        if not is_identifier(name) or len(name) > _LONGEST:
            message = "expected letters, digits and underscores, not beginning with a digit, no Python keyword"
            reader.report(where, f"Found the chain name {found(name)}: {message}.")
        chain = _chain(reader, name, subtable(reader, raw, where), where)
        if chain is not None:
            chains[name] = chain
    return chains


def _chain(reader: Reader, name: str, raw: Mapping[str, Any], where: str) -> Chain | None:
    before = reader.count
    fields: dict[str, Any] = {}
    targets: dict[str, Target] = {}
    known = {key.name: key for key in _ENTRY.keys}
    for inner, entry in raw.items():
        key, place = known.get(inner), below(where, inner)
        if key is _SHEETS:
            fields[inner] = _sheets(reader, entry, place)
        elif key is not None:
            fields[inner] = READERS[key.kind](reader, key, entry, place)
        elif inner in CHAIN_METRICS:
            target = _limits(reader, inner, entry, place)
            if target is not None:
                targets[inner] = target
        else:
            near = nearest(inner, [*known, *CHAIN_METRICS])
            hint = f"did you mean {near}?" if near else f"expected one of {', '.join([*known, *CHAIN_METRICS])}."
            reader.report(place, f"Found the unknown key {clean(inner)}; {hint}")
    missing(reader, _ENTRY, raw, where)
    if reader.count > before:
        return None
    return Chain(name, targets=MappingProxyType(targets), line=reader.places.line(where), **fields)


def _sheets(reader: Reader, raw: object, where: str) -> tuple[str, ...]:
    """The names along the path; repetitions are kept."""
    if not isinstance(raw, list) or not raw:
        reader.refuse(where, raw, f"a list of sheets, for example {_SHEETS.example}")
        return ()
    if len(raw) > MOST_STAGES:
        reader.report(where, f"Found {len(raw)} sheets in one chain, expected at most {MOST_STAGES}.")
    names = (READERS[_ONE.kind](reader, _ONE, one, f"{where}.{k}") for k, one in enumerate(raw[:MOST_STAGES]))
    return tuple(name for name in names if name is not None)


def _limits(reader: Reader, name: str, raw: object, where: str) -> Target | None:
    """What the whole path must achieve in one metric."""
    metric = metrics.find(name)
    assert metric is not None  # CHAIN_METRICS are metrics
    if not isinstance(raw, dict):
        reader.refuse(where, raw, f"a table, for example {name} = {{ min = ... }}")
        return None
    known = [key.name for key in _LIMITS.keys]
    unknown = [inner for inner in raw if inner not in known]
    for inner in unknown:
        reader.unknown(where, inner, known)
    return None if unknown else read_target(reader, name, raw, where, metric.dimension)
