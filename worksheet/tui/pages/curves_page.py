"""An extraction in the app: its summary as rows, and each of its views as a plot in characters."""

from __future__ import annotations

import math
from collections.abc import Callable

from worksheet.extract.data import Extraction
from worksheet.extract.views import FITTED, LEFT_OUT, MEASURED, Axis, Family, View
from worksheet.model import dimension as dim
from worksheet.model.quantity import format_quantity
from worksheet.report import extraction_text, wording
from worksheet.report.chart import Marks, chart, scale_of
from worksheet.tui import rows
from worksheet.tui.rows import HEAD, PLAIN, QUIET, Line, Page, Row, Span, line
from worksheet.tui.signs import Signs

_SIGNS = {MEASURED: "o", FITTED: "+", LEFT_OUT: "."}


def summary(result: Extraction, columns: int, signs: Signs) -> Page:
    """The extraction in words and tables, as on the command line."""
    made = []
    for k, text in enumerate(extraction_text.text(result, columns)):
        role = rows.MISSED if text.startswith("- ") else PLAIN if text.startswith(" ") else HEAD
        made.append(Row(f"line.{k}", (line(Span(signs.text(text), role)),), stops=bool(text), copied=(text,)))
    return Page(tuple(made))


def view_lines(result: Extraction, view: View, family: Family, size: tuple[int, int], signs: Signs) -> list[Line]:
    """One view of one family of curves, with a key below it, in `size` columns and lines."""
    found = [one for one in view.points(result, family) if len(one.x)]
    seen = [(x, y) for one in found for x, y in zip(one.x.tolist(), one.y.tolist(), strict=True) if _shown(view, x, y)]
    if not seen:
        return [line(Span("There is no point to show.", QUIET))]
    axes = [scale_of([one[k] for one in seen], logarithmic=axis.logarithmic) for k, axis in enumerate((view.x, view.y))]
    marks = [Marks(_SIGNS[one.kind], one.kind, one.x.tolist(), one.y.tolist()) for one in found]
    drawn = chart(marks, axes[0], axes[1], (_words(view.x), _words(view.y)), (size[0], size[1] - 1))
    key = "  ".join(f"{mark.sign} {mark.title}" for mark in marks)
    return [
        *((Span(signs.text(text), PLAIN),) for text in drawn),
        line(Span(signs.text(f"{view.y.title} over {view.x.title}"), HEAD), Span(key, PLAIN), gap=2),
    ]


def _shown(view: View, x: float, y: float) -> bool:
    """Whether a point exists on both axes."""
    return not (view.x.logarithmic and x <= 0) and not (view.y.logarithmic and y <= 0)


def _words(axis: Axis) -> Callable[[float], str]:
    return lambda value: wording.number(value, axis.unit, digits=2)


def family_text(family: Family) -> str:
    """A family in words: length, source voltage, temperature."""
    length = "" if math.isnan(family.length) else f"L {format_quantity(family.length, dim.LENGTH, 3)}, "
    source = format_quantity(family.source, dim.VOLTAGE, 3)
    return f"{length}V_S {source}, {format_quantity(family.temperature, dim.TEMPERATURE, 4)}"
