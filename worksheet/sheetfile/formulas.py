"""Whether the names in a sheet's formulas exist on it. Names of other sheets are looked up when all sheets are read."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from worksheet.model import metrics
from worksheet.model.formula import Formula
from worksheet.model.keys import Kind
from worksheet.model.sheet import Target, Value
from worksheet.model.text import clean, nearest
from worksheet.sheetfile.locate import below
from worksheet.sheetfile.reader import Reader
from worksheet.sheetfile.taken import ASSUME, OWN, TARGET, Taken, numbers, refusal


def check_values(reader: Reader, keys: Taken, parts: Mapping[str, Mapping[str, Value]]) -> None:
    """Report names in the formulas of values that are no value of this sheet.

    Args:
        reader: Takes the problems.
        keys: What the sheet may hold.
        parts: Table to key to value.
    """
    formulas = [
        (below(part, name), value.formula)
        for part, values in parts.items()
        for name, value in values.items()
        if value.formula is not None
    ]
    if keys.stage is None or not formulas:
        return
    known = {*parts[OWN], *numbers(keys)}
    for where, formula in formulas:
        used = [name for name in formula.names if metrics.find(name)]
        for name in used:
            reader.report(
                where, f"Found the metric {name} in the formula of a value; only the formula of a target reads it."
            )
        _check(reader, keys, where, (name for name in formula.names if name not in used), known)


def check_targets(reader: Reader, keys: Taken, own: Mapping[str, Value], targets: Mapping[str, Target]) -> None:
    """Report names in the formulas of targets that are neither a value nor a metric of this sheet."""
    formulas: list[tuple[str, Formula]] = [(name, one.formula) for name, one in targets.items() if one.formula]
    if keys.stage is None or not formulas:
        return
    known = {*own, *numbers(keys), *metrics.keys()}
    for name, formula in formulas:
        where = below(below(TARGET, name), "formula")
        _check(reader, keys, where, formula.names, known)
        for used in formula.names:
            reason = keys.stage.absent_metric(used)
            if reason:
                reader.report(where, f"Found {used} in the formula: {reason}.")


def _check(reader: Reader, keys: Taken, where: str, used: Iterable[str], known: Iterable[str]) -> None:
    """Report names without a dot that stand for nothing."""
    for name in used:
        if "." in name or name in known:
            continue
        counted = name in keys.design and keys.design[name].kind is Kind.WHOLE
        reason = "it is a count, which no formula reads" if counted else refusal(keys, name, ASSUME)
        near = None if reason else nearest(name, known)
        hint = f": {reason}." if reason else f"; did you mean {near}?" if near else "; own names stand in [own]."
        reader.report(where, f"Found the unknown name {clean(name)} in the formula{hint}")
