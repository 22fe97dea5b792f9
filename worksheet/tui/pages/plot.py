"""A plot in characters: sets of points with a mark each, on linear or logarithmic axes; it needs no colour."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from worksheet.tui.rows import HEAD, LABEL, PLAIN, QUIET, RULE, Line, Span, line
from worksheet.tui.signs import Signs

LEFT = 10
"""Columns for the labels of the upright axis, its line included."""

_BELOW = 3
_NICE = (1.0, 2.0, 5.0, 10.0)
_PREFIXES = {-15: "f", -12: "p", -9: "n", -6: "u", -3: "m", 0: "", 3: "k", 6: "M", 9: "G"}


@dataclass(frozen=True, eq=False, slots=True)
class Series:
    """Points with one mark; later series are drawn over earlier ones. Arrays of shape (points,)."""

    name: str
    mark: str
    role: str
    x: NDArray[np.float64]
    y: NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Axis:
    """What runs along an axis."""

    title: str
    log: bool = False


def plot(series: Sequence[Series], x: Axis, y: Axis, size: tuple[int, int], signs: Signs) -> list[Line]:
    """Lines of a plot of `size` columns and lines, axes and legend included."""
    columns, rows = max(size[0] - LEFT, 10), max(size[1] - _BELOW, 3)
    kept = [_kept(one, x, y) for one in series]
    if not any(len(a) for a, _ in kept):
        return [line(Span("There is no point to show.", QUIET))]
    x_span = _span(np.concatenate([a for a, _ in kept]), x)
    y_span = _span(np.concatenate([b for _, b in kept]), y)
    grid = [[" "] * columns for _ in range(rows)]
    roles = [[PLAIN] * columns for _ in range(rows)]
    for one, (a, b) in zip(series, kept, strict=True):
        for column, row in set(zip(_cells(a, x_span, columns).tolist(), _cells(b, y_span, rows).tolist(), strict=True)):
            grid[rows - 1 - row][column], roles[rows - 1 - row][column] = one.mark, one.role
    labels = _labels(y_span, y, rows)
    out = [_row(labels.get(rows - 1 - k, ""), cells, roles[k], signs) for k, cells in enumerate(grid)]
    out.append(_below(x_span, x, columns, signs))
    legend = [Span(f"{one.mark} {one.name}", one.role) for one, (a, _) in zip(series, kept, strict=True) if len(a)]
    out.append(line(Span(" " * (LEFT - 1)), Span(signs.text(f"{y.title} over {x.title}"), HEAD), *legend, gap=2))
    return out


def _kept(one: Series, x: Axis, y: Axis) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """The points of a series in the scale of the axes."""
    fine = np.isfinite(one.x) & np.isfinite(one.y)
    for values, axis in ((one.x, x), (one.y, y)):
        if axis.log:
            fine &= values > 0
    a, b = one.x[fine], one.y[fine]
    return (np.log10(a) if x.log else a), (np.log10(b) if y.log else b)


def _span(values: NDArray[np.float64], axis: Axis) -> tuple[float, float]:
    low, high = float(values.min()), float(values.max())
    if axis.log:
        first = math.floor(low + 1e-9)
        return float(first), float(max(math.ceil(high - 1e-9), first + 1))
    pad = (high - low) * 0.03 or abs(high) * 0.1 or 1.0
    return low - pad, high + pad


def _cells(values: NDArray[np.float64], span: tuple[float, float], count: int) -> NDArray[np.int64]:
    place = (values - span[0]) / (span[1] - span[0]) * count
    return np.clip(np.floor(place), 0, count - 1).astype(np.int64)


def ticks(span: tuple[float, float], axis: Axis, most: int) -> list[tuple[float, str]]:
    """Places in the scale of an axis with their labels, at most so many."""
    low, high = span
    if axis.log:
        every = max(math.ceil((high - low) / max(most - 1, 1)), 1)
        return [(float(k), _number(10.0**k)) for k in range(math.ceil(low - 1e-9), math.floor(high + 1e-9) + 1, every)]
    rough = (high - low) / max(most, 1)
    decade = 10.0 ** math.floor(math.log10(rough))
    step = next(nice * decade for nice in _NICE if nice * decade >= rough * (1 - 1e-9))
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    return [(k * step, _number(k * step)) for k in range(first, last + 1)]


def _number(value: float) -> str:
    """A number of a tick with an SI prefix: "20u"."""
    if value == 0:
        return "0"
    power = 3 * math.floor((math.log10(abs(value)) + 1e-9) / 3)
    if power not in _PREFIXES:
        return f"{value:.3g}"
    return f"{value / 10.0**power:.4g}{_PREFIXES[power]}"


def _labels(span: tuple[float, float], axis: Axis, rows: int) -> dict[int, str]:
    found = {}
    for place, label in ticks(span, axis, max(rows // 3, 2)):
        found[int(_cells(np.array([place]), span, rows)[0])] = label
    return found


def _row(label: str, cells: list[str], roles: list[str], signs: Signs) -> Line:
    spans = [Span(label.rjust(LEFT - 2), LABEL), Span(f" {'|' if signs.plain else '│'}", RULE)]
    start = 0
    for k in range(1, len(cells) + 1):
        if k == len(cells) or roles[k] != roles[start]:
            spans.append(Span("".join(cells[start:k]), roles[start]))
            start = k
    return line(*spans, gap=0)


def _below(span: tuple[float, float], axis: Axis, columns: int, signs: Signs) -> Line:
    """The line of labels under the plot."""
    text = [" "] * (columns + LEFT)
    for place, label in ticks(span, axis, max(columns // 10, 2)):
        at = LEFT + int(_cells(np.array([place]), span, columns)[0]) - len(label) // 2
        at = min(max(at, LEFT), len(text) - len(label))
        if all(one == " " for one in text[max(at - 1, 0) : at + len(label) + 1]):
            text[at : at + len(label)] = label
    return (Span(signs.text("".join(text).rstrip()), LABEL),)
