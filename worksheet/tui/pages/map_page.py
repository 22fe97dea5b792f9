"""The map of the window in characters: bias current across, load capacitance up, both in logarithms.

Cells in which everything holds are filled. A boundary is drawn with the letter of what sets it, which names it along
its whole course without any colour, also where there are sixteen colours or none; capitals where it bounds nothing,
because something else fails on both sides. Every cell is looked at at its corners, so that a boundary lies in the very
cell that shows it. Braille dots give finer lines than letters, but no names, and nothing at all in ASCII.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from worksheet.model import metrics
from worksheet.model.dimension import Dimension
from worksheet.model.quantity import format_quantity
from worksheet.report import wording
from worksheet.report.table import width_of
from worksheet.solver.plane import Plane
from worksheet.solver.plane import Span as Stretch
from worksheet.solver.trials import MAX_VOLTAGE, SATURATION, Constraint, Mask
from worksheet.solver.variables import Variable
from worksheet.tui.rows import HEAD, LABEL, MET, MISSED, PLAIN, QUIET, RULE, WAIVED, Line, Span
from worksheet.tui.signs import Signs

LEFT = 9
"""Columns for the labels of the upright axis, its line included."""

FOCUS = "focus"
"""The role of the cell that the cross stands on."""

_BELOW = 2
_LETTERS = "abcdefghijklmnopqrstuvwxyz"
_LIMITS = {SATURATION: "all saturated and in range", MAX_VOLTAGE: "no rating passed"}
_LEGEND_LINES = 3


@dataclass(frozen=True)
class Marks:
    """Where things stand, by place (bias current, load capacitance). SI units.

    Attributes:
        present: The sheet as it is.
        proposal: What is proposed, None where nothing is.
        cross: Where the user points.
    """

    present: tuple[float, float]
    proposal: tuple[float, float] | None
    cross: tuple[float, float]


def cells(columns: int, height: int, constraints: int) -> tuple[int, int]:
    """Cells across and up that fit beside and above the axes, with room for the legend."""
    return max(columns - LEFT, 10), max(height - _BELOW - min(constraints, _LEGEND_LINES), 4)


def lines(plane: Plane, marks: Marks, columns: int, signs: Signs) -> list[Line]:
    """The map with its axes and its legend."""
    up, across = plane.holds.shape
    grid = _cells(plane, signs)
    _mark(plane, marks, grid, signs)
    labels = _labels(plane.y_span, up, _dimension(plane.y), least=2)
    picture: list[Line] = []
    for y in reversed(range(up)):
        label = Span(signs.text(labels.get(y, "")), LABEL, LEFT - 1, right=True)
        tick = "+" if signs.plain and y in labels else "┤" if y in labels else signs.down
        picture.append((label, Span(tick, RULE), *_pieces(grid[y])))
    return [*picture, *_foot(plane, across, signs), *legend(plane, columns, signs)]


def _cells(plane: Plane, signs: Signs) -> list[list[tuple[str, str]]]:
    """The sign and the role of every cell, lowest row first."""
    holds, crossed, binding = plane.holds, plane.crossed, plane.binding
    fill = ":" if signs.plain else "░"
    up, across = holds.shape
    grid: list[list[tuple[str, str]]] = []
    for y in range(up):
        row = [(fill, MET) if holds[y, x] else (" ", PLAIN) for x in range(across)]
        for x in range(across):
            if binding[:, y, x].any():
                row[x] = (_LETTERS[int(np.argmax(binding[:, y, x])) % len(_LETTERS)], WAIVED)
            elif crossed[:, y, x].any():
                row[x] = (_LETTERS[int(np.argmax(crossed[:, y, x])) % len(_LETTERS)].upper(), QUIET)
        grid.append(row)
    return grid


def _mark(plane: Plane, marks: Marks, grid: list[list[tuple[str, str]]], signs: Signs) -> None:
    """Put the marks onto the cells."""
    for place, sign in ((marks.proposal, "o" if signs.plain else "◇"), (marks.present, present_sign(signs))):
        at = None if place is None else cell_of(plane, place)
        if at is not None:
            grid[at[1]][at[0]] = (sign, HEAD)
    at = cell_of(plane, marks.cross)
    if at is not None:
        grid[at[1]][at[0]] = (grid[at[1]][at[0]][0].replace(" ", "+"), FOCUS)


def present_sign(signs: Signs) -> str:
    """The sign where the sheet stands."""
    return "O" if signs.plain else "◆"


def cell_of(plane: Plane, place: tuple[float, float]) -> tuple[int, int] | None:
    """Cell across and up of a place, None where the map does not show it."""
    up, across = plane.holds.shape
    x, y = plane.x_span.cell(place[0], across), plane.y_span.cell(place[1], up)
    return None if x is None or y is None else (x, y)


def _pieces(row: Sequence[tuple[str, str]]) -> Line:
    """Neighbours of one role as one piece."""
    out: list[Span] = []
    for sign, role in row:
        if out and out[-1].role == role:
            out[-1] = Span(out[-1].text + sign, role)
        else:
            out.append(Span(sign, role))
    return tuple(out)


def _dimension(variable: Variable) -> Dimension:
    assert variable.key.dimension is not None  # the variables of a map have one
    return variable.key.dimension


def _labels(span: Stretch, count: int, dimension: Dimension, least: int) -> dict[int, str]:
    """Labels by cell: decades first, then 2 and 5 between them where there is room."""
    found: dict[int, str] = {}
    for steps in ((1.0,), (2.0, 5.0)):
        for value in _round_values(span, steps):
            cell = span.cell(value, count)
            if cell is not None and all(abs(cell - other) >= least for other in found):
                found[cell] = format_quantity(value, dimension, 1)
    return found


def _round_values(span: Stretch, steps: tuple[float, ...]) -> list[float]:
    first, last = int(np.floor(np.log10(span.low))), int(np.ceil(np.log10(span.high)))
    values = [float(f"{step:g}e{power}") for power in range(first, last + 1) for step in steps]
    return [value for value in values if span.low <= value <= span.high]


def _foot(plane: Plane, across: int, signs: Signs) -> list[Line]:
    """The lower axis with its labels."""
    labels = _labels(plane.x_span, across, _dimension(plane.x), least=10)
    axis, text = [signs.across] * across, [" "] * (across + 1)
    for cell, label in sorted(labels.items()):
        shown = signs.text(label)
        axis[cell] = "+" if signs.plain else "┴"
        start = max(min(cell - width_of(shown) // 2, across - width_of(shown)), 0)
        text[start : start + len(shown)] = list(shown)
    name = f"{plane.y.key.symbol} {plane.x.key.symbol}"
    corner = "+" if signs.plain else "└"
    return [
        (Span(name, QUIET, LEFT - 1, right=True), Span(corner + "".join(axis), RULE)),
        (Span(" " * LEFT), Span("".join(text).rstrip(), LABEL)),
    ]


def legend(plane: Plane, columns: int, signs: Signs) -> list[Line]:
    """Which letter is which boundary; only those that are seen."""
    seen = _somewhere(plane.crossed)
    bounds = _somewhere(plane.binding)
    out: list[list[Span]] = [[]]
    for k, constraint in enumerate(plane.constraints):
        if seen[k]:
            letter = _LETTERS[k % len(_LETTERS)]
            text = f"{letter if bounds[k] else letter.upper()} {signs.text(_named(constraint))}   "
            if out[-1] and sum(width_of(piece.text) for piece in out[-1]) + width_of(text) > columns:
                out.append([])
            out[-1].append(Span(text, PLAIN if bounds[k] else QUIET))
    if not out[-1]:
        nothing = "everything holds everywhere here" if plane.holds.any() else "nothing holds anywhere here"
        out[-1].append(Span(nothing, QUIET))
    return [tuple(one) for one in out]


def _somewhere(where: Mask) -> list[bool]:
    """Of masks over cells, whether each holds anywhere."""
    return [bool(one.any()) for one in where]


def _named(constraint: Constraint) -> str:
    """A constraint in words: "bandwidth ≥ 2 MHz"."""
    target = constraint.target
    if target is None:
        return _LIMITS[constraint.name]
    limit, sign = (target.minimum, "≥") if constraint.side == "low" else (target.maximum, "≤")
    metric = metrics.find(target.name)
    unit = target.unit if metric is None or target.formula is not None else metric.dimension.unit
    return f"{constraint.name} {sign} {wording.metric_number(target.name, limit, unit, digits=3)}"


def place_lines(plane: Plane, marks: Marks, missed: Sequence[str], signs: Signs) -> list[Line]:
    """Where the cross stands and what does not hold there; where the sheet stands."""
    state = Span(signs.text(f"misses {', '.join(missed)}"), MISSED) if missed else Span("all holds", MET)
    first = (Span(signs.text(f"cross  {_place(plane, marks.cross)}   "), PLAIN), state)
    second = [Span(signs.text(f"{present_sign(signs)} now  {_place(plane, marks.present)}   "), QUIET)]
    if marks.proposal is not None:
        sign = "o" if signs.plain else "◇"
        second.append(Span(signs.text(f"{sign} proposal  {_place(plane, marks.proposal)}"), QUIET))
    return [first, tuple(second)]


def _place(plane: Plane, place: tuple[float, float]) -> str:
    x, y = (format_quantity(value, _dimension(v), 3) for v, value in zip((plane.x, plane.y), place, strict=True))
    return f"{plane.x.key.symbol} {x}, {plane.y.key.symbol} {y}"
