"""What is needed, as JSON-ready data by the contract's shape."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from worksheet.report.plain import SCHEMA, condition
from worksheet.solver.results import Bound, Conflict, Point, Region, Solved, Window

Plain = dict[str, Any]
Hand = Callable[[Window, Bound], Plain]
"""Gives method, formula and hand value of a bound."""


def document(solved: Solved, hand: Hand) -> Plain:
    """The whole document of one sheet.

    Args:
        solved: What is needed.
        hand: Gives a bound's method, formula and hand value, by the algebra.
    """
    return {
        "schema": SCHEMA,
        "sheet": solved.sheet,
        "feasible": solved.feasible,
        "over": solved.over,
        "reason": solved.reason,
        "needed": {name: window(w, hand) for name, w in solved.needed.items()},
        "recommended": point(solved.recommended),
        "compact": point(solved.compact),
        "proposed": dict(solved.proposed),
        "self_loading": {target: dict(enough) for target, enough in solved.self_loading.items()},
        "conflict": conflict(solved.conflict),
        "problems": [],
    }


def window(found: Window, hand: Hand) -> Plain:
    """One variable's window."""
    region = found.region or Region(None, None, None, None)
    plain: Plain = {"unit": found.unit, "present": found.present, **_region(region)}
    if found.region is None:
        plain["empty"] = True
    if found.keep:
        plain["keep"] = found.keep
    plain["also"] = [_region(r) for r in found.also]
    plain["cannot_help"] = list(found.cannot_help)
    plain["bounds"] = [bound(found, b, hand) for b in found.bounds]
    return plain


def _region(region: Region) -> Plain:
    return {"low": region.low, "low_set_by": region.low_set_by, "high": region.high, "high_set_by": region.high_set_by}


def bound(of: Window, found: Bound, hand: Hand) -> Plain:
    """One bound."""
    return {
        "target": found.target,
        "side": found.side,
        "limit": found.limit,
        "value": found.value,
        "kind": "edge" if found.edge else "crossing",
        "valid": found.valid,
        **hand(of, found),
        "at": condition(found.at),
        "with": dict(found.moves_with),
    }


def point(found: Point | None) -> Plain | None:
    """A proposed point."""
    if found is None:
        return None
    return {**found.values, "inversion_coefficient": found.inversion_coefficient, "gate_area": found.gate_area}


def conflict(found: Conflict | None) -> Plain | None:
    """A conflict."""
    if found is None:
        return None
    return {
        "variable": found.variable,
        "targets": list(found.targets),
        "gives_way": dict(found.gives_way),
        "wanted": dict(found.wanted),
        "reachable_with": dict(found.reachable_with),
        "explain": found.explain,
    }
