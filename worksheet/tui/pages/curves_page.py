"""An extraction in the app: its summary as rows, and each of its views as a plot in characters."""

from __future__ import annotations

import math

from worksheet.extract.data import Extraction
from worksheet.extract.views import FITTED, LEFT_OUT, MEASURED, Family, View
from worksheet.model import dimension as dim
from worksheet.model.quantity import format_quantity
from worksheet.report import extraction_text
from worksheet.tui import rows
from worksheet.tui.pages.plot import Axis, Series, plot
from worksheet.tui.rows import HEAD, LABEL, PLAIN, QUIET, VALUE, Line, Page, Row, Span, line
from worksheet.tui.signs import Signs

SUMMARY = "summary"
"""The first view: parameters, errors, rows left out, hand values, warnings."""

_MARKS = {MEASURED: ("o", VALUE), FITTED: ("+", LABEL), LEFT_OUT: (".", QUIET)}


def summary(result: Extraction, columns: int, signs: Signs) -> Page:
    """The extraction in words and tables, as on the command line."""
    made = []
    for k, text in enumerate(extraction_text.text(result, columns)):
        role = rows.MISSED if text.startswith("- ") else PLAIN if text.startswith(" ") else HEAD
        made.append(Row(f"line.{k}", (line(Span(signs.text(text), role)),), stops=bool(text), copied=(text,)))
    return Page(tuple(made))


def view_lines(result: Extraction, view: View, family: Family, size: tuple[int, int], signs: Signs) -> list[Line]:
    """One view of one family of curves."""
    series = [Series(one.kind, *_MARKS[one.kind], one.x, one.y) for one in view.points(result, family)]
    return plot(series, Axis(view.x, view.x_log), Axis(view.y, view.y_log), size, signs)


def family_text(family: Family) -> str:
    """A family in words: length, source voltage, temperature."""
    length = "" if math.isnan(family.length) else f"L {format_quantity(family.length, dim.LENGTH, 3)}, "
    source = format_quantity(family.source, dim.VOLTAGE, 3)
    return f"{length}V_S {source}, {format_quantity(family.temperature, dim.TEMPERATURE, 4)}"
