"""Comparisons as JSON-ready data and as lines of text."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from worksheet.compare.cause import Cause
from worksheet.compare.compared import Comparison, Need, Result, SheetChange
from worksheet.compare.inputs import Moved
from worksheet.model.problem import Problem
from worksheet.model.text import clean
from worksheet.report import plain, wording
from worksheet.report.table import Column, Table, lines, wrapped

Plain = dict[str, Any]
_ID = 10
_SHOWN = 1e-6
"""Relative: a remainder below is rounding."""


def comparison(old: str, new: str, found: Comparison, problems: Sequence[Problem]) -> Plain:
    """A comparison as a document."""
    return {
        "schema": plain.SCHEMA,
        "old": old,
        "new": new,
        "same": found.same,
        "project": [moved_plain(m) for m in found.project],
        "process": [moved_plain(m) for m in found.process],
        "sheets": [_sheet(s) for s in found.sheets],
        "problems": plain.problems(problems),
    }


def moved_plain(moved: Moved) -> Plain:
    """One stated thing before and after, as data."""
    return {"key": moved.key, "old": moved.old, "new": moved.new, "unit": moved.unit}


def _sheet(sheet: SheetChange) -> Plain:
    return {
        "sheet": sheet.sheet,
        "status": sheet.status,
        "inputs": [moved_plain(m) for m in sheet.inputs],
        "results": [_result(r) for r in sheet.results],
        "through": list(sheet.through),
        "needed": [_need(n) for n in sheet.needed],
    }


def _need(need: Need) -> Plain:
    return {
        "variable": need.variable,
        "side": need.side,
        "unit": need.unit,
        "old": need.old,
        "new": need.new,
        "old_set_by": need.old_set_by or None,
        "new_set_by": need.new_set_by or None,
    }


def _cause(cause: Cause) -> Plain:
    parts = [{"key": part.key, "part": part.part} for part in cause.parts]
    return {"parts": parts, "remainder": cause.remainder, "reason": cause.reason}


def _result(result: Result) -> Plain:
    return {
        "metric": result.metric,
        "unit": result.unit,
        "old": result.old,
        "new": result.new,
        "old_verdict": result.old_verdict,
        "new_verdict": result.new_verdict,
        "old_margin": result.old_margin,
        "new_margin": result.new_margin,
        **({} if result.cause is None else {"cause": _cause(result.cause)}),
    }


def comparison_text(old: str, new: str, found: Comparison, width: int) -> Iterator[str]:
    """A comparison as a designer reads it: what was stated, and what that did."""
    names = [name if name == "working" else name[:_ID] for name in (old, new)]
    yield f"{names[0]} -> {names[1]}: {'nothing differs' if found.same else 'what differs'}"
    for title, moved in (("Project", found.project), ("Process file", found.process)):
        if moved:
            yield ""
            yield title
            yield from _stated(moved, width)
    for sheet in found.sheets:
        yield ""
        through = f", through {', '.join(sheet.through)}" if sheet.through else ""
        yield from wrapped(clean(f"{sheet.sheet} ({sheet.status}{through})"), width)
        yield from _stated(sheet.inputs, width)
        if sheet.results and sheet.status in ("changed", "affected"):
            yield from lines(_results(sheet.results), width, "  ")
            yield from _causes(sheet.results, width)
        for need in sheet.needed:
            yield from wrapped(needed(need), width, "  ")


def _causes(results: Sequence[Result], width: int) -> Iterator[str]:
    """Why targets moved: what each input did to them, the greatest first."""
    for r in results:
        if r.cause is not None and r.new_verdict is not None and (said := caused(r)):
            yield from wrapped(f"{r.metric}: {said}", width, "  ")


def caused(result: Result) -> str:
    """What each input did to a metric, in words; "" where one input did it all."""
    cause = result.cause
    if cause is None:
        return ""
    parts = [f"{one.key} {_signed(result, one.part)}" for one in cause.parts]
    if cause.reason is not None:
        parts.append(cause.reason)
    elif result.new is not None and abs(cause.remainder) > _SHOWN * abs(result.new):
        parts.append(f"together with what is not stated {_signed(result, cause.remainder)}")
    return ", ".join(parts) if len(parts) > 1 or cause.reason is not None else ""


def _signed(result: Result, part: float) -> str:
    text = wording.metric_number(result.metric, abs(part), result.unit, digits=3)
    return f"{'+' if part >= 0 else '-'}{text}"


def needed(need: Need) -> str:
    """One end of a need before and after, in words."""
    what, old, new = need_ends(need)
    return f"{what}: {old} -> {new}"


def need_ends(need: Need) -> tuple[str, str, str]:
    """What is needed, in words, and the end of it before and after with what sets it."""
    sign = "at least" if need.side == "low" else "at most"
    numbers = wording.told_apart("", need.old, need.new, need.unit, need.side)
    old, new = (
        "no end" if value is None else f"{number} ({by or 'process'})"
        for value, number, by in zip((need.old, need.new), numbers, (need.old_set_by, need.new_set_by), strict=True)
    )
    return f"needed {need.variable} {sign}", old, new


def _stated(moved: Sequence[Moved], width: int) -> Iterator[str]:
    for m in moved:
        yield from wrapped(movement(m), width, "  ")


def movement(moved: Moved) -> str:
    """One stated thing before and after, in words."""
    old, new = stated_ends(moved)
    return f"{moved.key}: {old} -> {new}"


def moved_since(revision: str, moved: Sequence[Moved]) -> str:
    """What moved since a revision that had certain inputs, in words; revision "" where none is known."""
    if not revision:
        return "no recorded revision has the inputs it was for"
    return f"since {revision[:_ID]} moved: {'; '.join(map(movement, moved)) or 'what other sheets give'}"


def stated_ends(moved: Moved) -> tuple[str, str]:
    """What was stated and what is, in words."""
    if isinstance(moved.old, float) and isinstance(moved.new, float) and moved.unit:
        return wording.told_apart("", moved.old, moved.new, moved.unit)
    return shown(moved.old, moved.unit), shown(moved.new, moved.unit)


def shown(value: Any, unit: str) -> str:
    """A stated thing in words; numbers in `unit`."""
    if value is None:
        return "not stated"
    if isinstance(value, list):
        return ", ".join(shown(one, unit) for one in value)
    if isinstance(value, float):
        return wording.number(value, unit) if unit else f"{value:.6g}"
    return clean(str(value))


def result_ends(result: Result) -> tuple[str, str]:
    """A metric before and after, in words."""
    return wording.told_apart(result.metric, result.old, result.new, result.unit)


def margins(result: Result) -> str:
    """The margin of a target before and after, "" where it stays or where there is none."""
    old, new = (wording.margin(one) for one in (result.old_margin, result.new_margin))
    return "" if old == new else f"{old} -> {new}"


def _results(results: Sequence[Result]) -> Table:
    columns = (
        Column("metric", flexible=True),
        Column("old", right=True),
        Column("new", right=True),
        Column("verdict"),
        Column("margin"),
    )
    rows = []
    for r in results:
        verdict = r.new_verdict or ""
        if r.old_verdict != r.new_verdict:
            verdict = f"{r.old_verdict or '-'} -> {r.new_verdict or '-'}"
        rows.append((r.metric, *result_ends(r), verdict, margins(r)))
    return Table(columns, tuple(rows))
