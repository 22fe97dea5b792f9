"""What stands behind a sheet's verdicts at the nominal condition: choices, operating points and every metric."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.model import metrics, operating
from worksheet.model.quantity import format_quantity
from worksheet.report import wording
from worksheet.report.table import Column, Table, lines
from worksheet.review.results import SheetReview

_INDENT = "  "
_DIGITS = 3


def details(sheet: SheetReview, width: int) -> Iterator[str]:
    """Lines of one sheet, to stand below its targets."""
    for table in (_choices(sheet), _operating_points(sheet), _metrics(sheet)):
        yield ""
        yield from lines(table, width, _INDENT)


def _choices(sheet: SheetReview) -> Table:
    columns = (Column("choice"), Column("value", right=True), Column("origin"))
    rows = tuple((name, wording.number(c.value, c.unit, digits=_DIGITS), c.origin) for name, c in sheet.choices.items())
    return Table(columns, rows)


def _operating_points(sheet: SheetReview) -> Table:
    devices = tuple(sheet.operating_point)
    columns = (Column("operating point", flexible=True), *(Column(device, right=True) for device in devices))
    rows = []
    for value in operating.OPERATING_POINT:
        found = [sheet.operating_point[device].get(value.key) for device in devices]
        shown = [format_quantity(x, value.dimension, _DIGITS) if isinstance(x, float) else "-" for x in found]
        rows.append((value.key, *shown))
        if value.key == "inversion_coefficient":
            rows.append(("region", *(str(sheet.operating_point[device].get("region", "-")) for device in devices)))
    return Table(columns, tuple(rows))


def _metrics(sheet: SheetReview) -> Table:
    columns = (Column("metric at nominal"), Column("value", right=True), Column("what it is", flexible=True))
    rows = []
    for name, number in sheet.metrics.items():
        metric = metrics.find(name)
        title = metric.title if metric is not None else ""
        rows.append((name, wording.metric_number(name, number.value, number.unit, number.reason, _DIGITS), title))
    return Table(columns, tuple(rows))
