"""A sheet as one of its variants has it, and what does not fit when it is."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from types import MappingProxyType

from worksheet.model.problem import Problem
from worksheet.model.sheet import Process, Sheet, Variant
from worksheet.model.sheet_keys import FINGERS, VARIANT
from worksheet.project import check
from worksheet.stages import catalogue
from worksheet.stages.stage import MAIN


def table_of(sheet: Sheet, key: str) -> str:
    """The table in which a variant's key stands in the sheet, or would: "assume", "own" or "choose"."""
    for table, values in (("assume", sheet.assume), ("own", sheet.own), ("choose", sheet.choose)):
        if key in values:
            return table
    stage = catalogue.find(sheet.stage)
    design = () if stage is None else stage.design_keys(sheet.bias.ideal)
    return "choose" if any(one.name == key for one in design) else "assume"


def with_variant(sheet: Sheet, variant: Variant) -> Sheet:
    """The sheet with a variant's values in place of its own; everything else, targets too, as it is."""
    assume, own, choose = dict(sheet.assume), dict(sheet.own), dict(sheet.choose)
    tables = {"assume": assume, "own": own, "choose": choose}
    for key, value in variant.changes.items():
        tables[table_of(sheet, key)][key] = value
    return replace(
        sheet,
        assume=MappingProxyType(assume),
        own=MappingProxyType(own),
        choose=MappingProxyType(choose),
        fingers=MappingProxyType({**sheet.fingers, **variant.fingers}),
    )


def key_of_fingers(device: str) -> str:
    """How a file calls the fingers of a device."""
    return FINGERS.name if device == MAIN else f"{device}_{FINGERS.name}"


def variant_problems(sheet: Sheet, process: Process) -> Iterator[Problem]:
    """What a variant makes not fit: a size beyond the process, or a second level where a stage takes one."""
    if not sheet.variants:
        return
    known = {problem.message for problem in check.sheet_problems(sheet, process)}
    for variant in sheet.variants.values():
        for problem in check.sheet_problems(with_variant(sheet, variant), process):
            if problem.message not in known:
                inner = problem.key.rpartition(".")[2]
                here = f"{VARIANT.name}.{variant.name}"
                key = f"{here}.{inner}" if inner in variant.changes else here
                yield Problem(problem.file, sheet.lines.get(key, variant.line), key, problem.message)
