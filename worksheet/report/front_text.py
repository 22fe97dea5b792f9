"""The front of current against area drawn for a terminal, as a table, and as data."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from worksheet.model import dimension as dim
from worksheet.model.quantity import format_quantity
from worksheet.report import wording
from worksheet.report.chart import Marks, chart, scale_of
from worksheet.report.table import Column, Table, lines, wrapped
from worksheet.review.front import Front
from worksheet.solver.results import Point

HEIGHT = 14
_DIGITS = 3
_KEYS = (
    ("bias_current", dim.CURRENT),
    ("width", dim.LENGTH),
    ("length", dim.LENGTH),
    ("load_capacitance", dim.CAPACITANCE),
)


def text(found: Front, title: str, width: int, height: int = HEIGHT) -> Iterator[str]:
    """Lines of a front: the drawing, the points, and where the sheet stands."""
    free = " and ".join(found.free) or "nothing"
    yield from wrapped(f"{title}: bias current against gate area; free: {free}", width)
    yield ""
    if found.reason is not None:
        yield from wrapped(f"no point to show: {found.reason}", width)
    else:
        yield from drawing(found, width, height)
        yield ""
        yield from lines(table(found), width, "  ")
    yield ""
    yield from wrapped(standing(found), width)
    yield from wrapped(wording.STANDING, width)


def drawing(found: Front, width: int, height: int) -> Iterator[str]:
    """The points that meet every target, and the present one."""
    every = [*found.points, found.present]
    current, area = [p.values["bias_current"] for p in every], [p.gate_area for p in every]
    marks = [
        Marks("o", "meets all targets", current[:-1], area[:-1]),
        Marks("X", "present", current[-1:], area[-1:]),
    ]
    words = (lambda v: format_quantity(v, dim.CURRENT, _DIGITS), lambda v: format_quantity(v, dim.AREA, _DIGITS))
    yield from chart(
        marks, scale_of(current, logarithmic=True), scale_of(area, logarithmic=True), words, (width, height)
    )
    yield "o meets every target, with no other in both less; X present"


def table(found: Front) -> Table:
    """The points, least current first, the present one last."""
    heads = (Column(""), *(Column(key.replace("_", " "), right=True) for key, _ in _KEYS))
    columns = (*heads, Column("IC", right=True), Column("gate area", right=True))
    rows = [_row("", p) for p in found.points]
    return Table(columns, (*rows, _row("present", found.present)))


def _row(name: str, point: Point) -> tuple[str, ...]:
    values = (format_quantity(point.values[key], dimension, _DIGITS) for key, dimension in _KEYS)
    return (
        name,
        *values,
        f"{point.inversion_coefficient:.{_DIGITS}g}",
        format_quantity(point.gate_area, dim.AREA, _DIGITS),
    )


def standing(found: Front) -> str:
    """Where the present choice stands against the front."""
    if found.missed:
        return f"The present choice misses {', '.join(found.missed)}."
    better = found.beats
    if better is None:
        return "The present choice meets every target."
    current, area = better.values["bias_current"], better.gate_area
    less = (
        1 - now / then
        for now, then in ((current, found.present.values["bias_current"]), (area, found.present.gate_area))
    )
    saved_current, saved_area = (f"{share:.0%}" for share in less)
    return (
        "The present choice meets every target; a point of the front does so with "
        f"{saved_current} less current and {saved_area} less area."
    )


def rows(found: Front) -> Iterator[list[Any]]:
    """Heading and rows of a table in SI units."""
    yield ["", *(f"{key} [{dimension.unit}]" for key, dimension in _KEYS), "inversion_coefficient", "gate_area [m^2]"]
    for name, one in [*(("front", p) for p in found.points), ("present", found.present)]:
        yield [name, *(one.values[key] for key, _ in _KEYS), one.inversion_coefficient, one.gate_area]


def document(found: Front, sheet: str) -> dict[str, Any]:
    """A front as data, in SI units."""
    return {
        "schema": 1,
        "sheet": sheet,
        "free": list(found.free),
        "reason": found.reason,
        "points": [_plain(one) for one in found.points],
        "present": {**_plain(found.present), "missed": list(found.missed)},
        "problems": [],
    }


def _plain(one: Point) -> dict[str, Any]:
    values = {key: one.values[key] for key, _ in _KEYS}
    return {**values, "inversion_coefficient": one.inversion_coefficient, "gate_area": one.gate_area}
