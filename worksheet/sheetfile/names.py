"""What may be a name: of a sheet, of the user's own values and figures, of devices, corners and files.

A name that a formula could read in two ways, or that a path could turn into another folder, is refused where it is
given, not where it is used.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from types import MappingProxyType
from typing import cast

from worksheet.model import metrics
from worksheet.model.formula import RESERVED
from worksheet.model.keys import Table
from worksheet.model.sheet_keys import SHEET, VARIANT
from worksheet.model.text import clean, is_identifier
from worksheet.stages import catalogue
from worksheet.stages.stage import Stage

_LABEL = re.compile(r"[^\W_]\w*(?:[-.]\w+)*|_\w+")
_OWN = re.compile(r"[A-Za-z_][A-Za-z0-9_]*")
_NUMBERS = ("bias", "assume", "choose", "solve")  # tables whose keys a formula reads, or looks as if it read
_FIXED = frozenset(
    key.name
    for table in (*(one for one in SHEET.tables if one.name in _NUMBERS), cast(Table, VARIANT.entry))
    for key in table.keys
)
_LONGEST = 100


def sheet_name_problem(name: str) -> str | None:
    """Say what is wrong with the name of a sheet, or None: it becomes a name in the formulas of other sheets."""
    shown = clean(name[:_LONGEST])
    if name in RESERVED:
        return f'Found the sheet name "{shown}", which formulas read as a function or a constant: give it another name.'
    if not is_identifier(name):
        return (
            f'Found the sheet name "{shown}", expected letters, digits and underscores, not beginning with a digit, '
            "and no word of the Python language."
        )
    if len(name) > _LONGEST:
        return f'Found the sheet name "{shown}…", expected at most {_LONGEST} characters.'
    return None


def own_name_problem(name: str) -> str | None:
    """Say what is wrong with a name of the user's own ([own], or a figure in [target]), or None."""
    if name in RESERVED:
        return "it shadows a function or a constant of formulas"
    if metrics.find(name) is not None:
        return "it shadows the metric of that name"
    if not _OWN.fullmatch(name) or not is_identifier(name) or len(name) > _LONGEST:
        return "expected letters, digits and underscores, not beginning with a digit, no Python keyword"
    if name in _FIXED or any(name in keys for keys in stage_keys().values()):
        return "it shadows the key of that name"
    return None


def stage_keys() -> Mapping[str, frozenset[str]]:
    """The design variables of each stage, those of a transistor as the current source included."""
    stages = catalogue.stages()
    if _cache.stages != stages:  # mostly the same tables, told by identity
        _cache.stages = stages
        _cache.keys = {one.key: frozenset(key.name for key in one.design_keys(ideal_bias=False)) for one in stages}
    return _cache.keys


class _Cache:
    """What was last derived from the catalogue, and from which stages."""

    stages: tuple[Stage, ...] = ()
    keys: Mapping[str, frozenset[str]] = MappingProxyType({})


_cache = _Cache()


def label_problem(name: str) -> str | None:
    """Say what is wrong with the name of a device, a corner or a process file, or None."""
    if _LABEL.fullmatch(name) and len(name) <= _LONGEST:
        return None
    return "expected letters, digits, underscores and inner hyphens or dots"
