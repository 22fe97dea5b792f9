"""What a block needs: the window of every design variable, what sets its ends, and the algebra of these."""

from __future__ import annotations

from typing import Any

from worksheet.model.text import clean
from worksheet.report import wording
from worksheet.report.handoff import pictures
from worksheet.report.handoff.material import Block
from worksheet.report.handoff.tree import Builder, Cell, Points, end, joined, number, text
from worksheet.report.solve_text import far_off
from worksheet.solver.results import Point, Region, Window

_LONGEST = 130
"""Characters of a formula that is written out."""

_SIGNS = {"low": "≥", "high": "≤"}


def windows(found: Block, into: Builder) -> None:
    """The section of needed windows."""
    into.head("Needed windows", "windows")
    if found.solved is None:
        into.say(f"Nothing could be solved: {found.unsolved}.")
        return
    where = "in every condition" if found.solved.over == "all" else "at the nominal condition"
    if not found.solved.needed:
        into.say("No target bounds a design variable.")
    columns = ("variable", "now", "at least", "set by", "at most", "set by", "beside")
    rows = tuple(_row(found, window) for window in found.solved.needed.values())
    into.table(f"Where every target holds {where}, the other variables held", columns, rows, (1, 2, 4))
    ends = [(w, side) for w in found.solved.needed.values() for side in ("low", "high") if (w.name, side) in found.hand]
    said = [cell for window, side in ends if (cell := _hand(found, window, side)) is not None]
    without = [f"{found.keys[w.name].symbol} {_SIGNS[side]}" for w, side in ends if _hand(found, w, side) is None]
    if without:
        said.append(text(f"No formula short enough for a page: {', '.join(without)}. Their numbers are exact."))
    if said:
        into.add(Points(tuple(said)))
    _points(found, into)
    conflict = found.solved.conflict
    if conflict is not None:
        into.say(f"Conflict: {clean(conflict.explain)}.", strong=True)
    picture = pictures.window_map(found)
    if picture is not None:
        into.add(picture)


def _title(found: Block, name: str) -> str:
    key = found.keys[name]
    return f"{key.title} {key.symbol}" if key.symbol and key.symbol not in key.title.split() else key.title


def _row(found: Block, window: Window) -> tuple[Cell, ...]:
    of = f"solve/{found.name}/needed/{window.name}"
    region = window.region or Region(None, None, None, None)
    beside = [f"the {window.keep} kept" if window.keep else ""]
    beside.append("" if window.region is not None else "no value at which all holds that it can help")
    beside += [f"also {_region(window, other)}" for other in window.also]
    beside.append(f"cannot help {', '.join(window.cannot_help)}" if window.cannot_help else "")
    low, high = (
        end(value, window.unit, f"{of}/{side}", side) if by else text("-")
        for side, value, by in (("low", region.low, region.low_set_by), ("high", region.high, region.high_set_by))
    )
    return (
        text(_title(found, window.name)),
        number(window.present, window.unit, f"{of}/present"),
        low,
        text(region.low_set_by or "-"),
        high,
        text(region.high_set_by or "-"),
        text("; ".join(part for part in beside if part)),
    )


def _region(window: Window, region: Region) -> str:
    ends = [
        f"{_SIGNS[side]} {wording.number(wording.safe(value, side), window.unit)} ({by})"
        for side, value, by in (("low", region.low, region.low_set_by), ("high", region.high, region.high_set_by))
        if by and value is not None
    ]
    return " and ".join(ends) or "any value"


def _hand(found: Block, window: Window, side: str) -> Cell | None:
    """The algebra of a bound that sets an end of a window; None where there is none that is short."""
    said = found.hand[window.name, side]
    if len(_whole(said)) > _LONGEST:
        return None
    set_by = window.region and (window.region.low_set_by if side == "low" else window.region.high_set_by)
    lead = f"{set_by}: {found.keys[window.name].symbol} {_SIGNS[side]} "
    if said["method"] == "closed form":
        return text(f"{lead}{said['formula']}{_beside(said)}")
    estimate = said["hand"]
    if estimate is None:
        return None
    of = f"solve/{found.name}/needed/{window.name}/hand/{side}"
    value = number(estimate["value"], window.unit, of)
    exact = window.region and (window.region.low if side == "low" else window.region.high)
    off = far_off(estimate["value"], exact) if exact else ""
    neglects = f"; neglects {', '.join(estimate['neglects'])}" if estimate["neglects"] else ""
    return joined(text(f"{lead}{estimate['formula']} = "), value, text(f" by hand{off}{_beside(said)}{neglects}"))


def _whole(said: Any) -> str:
    estimate = said["hand"] or {}
    return f"{said['formula'] or estimate.get('formula', '')}{_beside(said)}"


def _beside(said: Any) -> str:
    where = "; ".join(said.get("where", ()))
    return f", {where}" if where else ""


def _points(found: Block, into: Builder) -> None:
    solved = found.solved
    assert solved is not None
    if solved.recommended is None:
        into.say(f"No recommended point: {solved.reason}.")
        return
    names = [name for name in found.keys if name in solved.recommended.values]
    columns = ("point", *(_title(found, name) for name in names), "IC of the main device", "gate area")
    points = [("recommended", solved.recommended), ("compact", solved.compact)]
    rows = tuple(_point(found, title, point, names) for title, point in points if point is not None)
    into.table("Points that are proposed", columns, rows, tuple(range(1, len(columns))))


def _point(found: Block, title: str, point: Point, names: list[str]) -> tuple[Cell, ...]:
    of = f"solve/{found.name}/{title}"
    values = (number(point.values[n], _unit(found, n), f"{of}/{n}") for n in names)
    return (
        text(title),
        *values,
        number(point.inversion_coefficient, "", f"{of}/inversion_coefficient"),
        number(point.gate_area, "m^2", f"{of}/gate_area"),
    )


def _unit(found: Block, name: str) -> str:
    dimension = found.keys[name].dimension
    return "" if dimension is None else dimension.unit
