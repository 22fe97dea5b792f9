"""What is needed, as a designer reads it in a terminal of 80 columns."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from typing import Any

from worksheet.model import metrics
from worksheet.model.dimension import AREA
from worksheet.model.keys import Key
from worksheet.model.quantity import format_quantity
from worksheet.model.text import clean
from worksheet.report import wording
from worksheet.report.table import Column, Table, lines, wrapped
from worksheet.solver.results import Bound, Conflict, Point, Region, Solved, Window

Hand = Callable[[Window, Bound], dict[str, Any]]
Keys = Mapping[str, Key]
_INDENT = "    "


def text(solved: Solved, title: str, keys: Keys, hand: Hand, width: int) -> Iterator[str]:
    """Lines of what solve says.

    Args:
        solved: What is needed.
        title: The sheet's title.
        keys: Design variables by name.
        hand: Gives a bound's method, formula, hand value and neglects.
        width: Columns of the terminal.
    """
    where = "in every condition" if solved.over == "all" else "at the nominal condition"
    yield from wrapped(f"{solved.sheet}{': ' + title if title else ''}, what is needed {where}", width)
    for window in solved.needed.values():
        yield ""
        yield from _window(window, keys[window.name], hand, width)
    yield ""
    yield from _points(solved, keys, width)
    if solved.conflict is not None:
        yield ""
        yield from _conflict(solved.conflict, keys, width)
    yield ""
    yield from wrapped(wording.STANDING, width)


def shown(key: Key, value: float | None) -> str:
    """A value of a design variable."""
    return "-" if value is None or key.dimension is None else format_quantity(value, key.dimension)


def _window(window: Window, key: Key, hand: Hand, width: int) -> Iterator[str]:
    kept = f", the {window.keep} kept" if window.keep else ""
    yield from wrapped(f"{key.title} {key.symbol}{kept}: now {shown(key, window.present)}", width, "  ")
    yield from wrapped(f"needed {_region(window.region, key)}", width, _INDENT)
    for region in window.also:
        yield from wrapped(f"also {_region(region, key)}", width, _INDENT)
    if window.cannot_help:
        yield from wrapped(f"cannot help {', '.join(window.cannot_help)}", width, _INDENT)
    for bound in window.bounds:
        yield from _bound(window, bound, key, hand, width)


def _region(region: Region | None, key: Key) -> str:
    if region is None:
        return "nothing: no value meets all that this variable can meet"
    low = f"at least {shown(key, region.low)} ({region.low_set_by})" if region.low_set_by else ""
    high = f"at most {shown(key, region.high)} ({region.high_set_by})" if region.high_set_by else ""
    return ", ".join(part for part in (low, high) if part) or "any value"


def _bound(window: Window, bound: Bound, key: Key, hand: Hand, width: int) -> Iterator[str]:
    sign = "≥" if bound.side == "low" else "≤"
    edge = ", where the metric ends" if bound.edge else ""
    yield from wrapped(
        f"{bound.target}: {sign} {shown(key, bound.value)} at {wording.condition(bound.at)}{edge}", width, _INDENT
    )
    said = hand(window, bound)
    formula = said.get("formula") if said.get("method") == "closed form" else (said.get("hand") or {}).get("formula")
    if not formula:
        return
    where = "".join(f", {text}" for text in said.get("where", ()))
    if said["method"] == "closed form":
        yield from wrapped(f"{key.symbol} {sign} {formula}{where}", width, _INDENT * 2)
        return
    estimate = said["hand"]
    named = [_neglect(name, estimate.get("effects", {}).get(name)) for name in estimate["neglects"]]
    neglects = f"{where}; neglects {', '.join(named)}" if named else where
    yield from wrapped(
        f"by hand {key.symbol} {sign} {formula} = {shown(key, estimate['value'])}{neglects}", width, _INDENT * 2
    )


def _neglect(name: str, share: float | None) -> str:
    """A neglect with what it does to the metric at the present point."""
    return name if share is None else f"{name} ({abs(share):.1%})"


def _points(solved: Solved, keys: Keys, width: int) -> Iterator[str]:
    if solved.recommended is None:
        yield from wrapped(f"No recommended point: {solved.reason}.", width)
        return
    columns = [Column("point"), *(Column(keys[n].symbol, right=True) for n in _order(solved.recommended, keys))]
    columns += [Column("IC", right=True), Column("gate area", right=True)]
    rows = [_point("recommended", solved.recommended, keys)]
    if solved.compact is not None:
        rows.append(_point("compact", solved.compact, keys))
    yield from lines(Table(tuple(columns), tuple(rows)), width, "  ")


def _order(point: Point, keys: Keys) -> list[str]:
    return [name for name in keys if name in point.values]


def _point(title: str, point: Point, keys: Keys) -> tuple[str, ...]:
    values = [shown(keys[name], point.values[name]) for name in _order(point, keys)]
    return (title, *values, f"{point.inversion_coefficient:.3g}", format_quantity(point.gate_area, AREA))


def _conflict(found: Conflict, keys: Keys, width: int) -> Iterator[str]:
    yield from wrapped(f"Conflict: {clean(found.explain)}.", width)
    for name, value in found.gives_way.items():
        metric = metrics.find(name)
        if value is not None:
            unit = metric.dimension.unit if metric is not None else ""
            yield from wrapped(
                f"{name} could reach {wording.metric_number(name, value, unit)} with the others held", width, "  "
            )
        else:
            yield from wrapped(f"{name} has no value that could be reached with the others held", width, "  ")
    for name, value in found.reachable_with.items():
        yield from wrapped(f"reachable with {keys[name].title.lower()} {shown(keys[name], value)}", width, "  ")
