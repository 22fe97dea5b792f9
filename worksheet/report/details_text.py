"""What stands behind a sheet's verdicts at the nominal condition: choices, operating points and every metric."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.model import metrics, operating
from worksheet.model.dimension import TEMPERATURE, VOLTAGE
from worksheet.model.quantity import format_quantity
from worksheet.report import wording
from worksheet.report.table import Column, Table, lines
from worksheet.review.results import Cause, SheetReview

_INDENT = "  "
_DIGITS = 3


def details(sheet: SheetReview, width: int) -> Iterator[str]:
    """Lines of one sheet, to stand below its targets."""
    for table in (_breaking(sheet), _choices(sheet), _operating_points(sheet), _metrics(sheet)):
        yield ""
        yield from lines(table, width, _INDENT)


def _breaking(sheet: SheetReview) -> Table:
    """Which conditions break each target first, and the single change that costs most."""
    columns = (
        Column("target"),
        Column("breaks first at", flexible=True),
        Column("room", right=True),
        Column("mostly from"),
    )
    rows = []
    for target in sheet.targets:
        for number, one in enumerate(target.breaks_first):
            name = target.target.name if number == 0 else ""
            rows.append((name, wording.condition(one.at), _room(one.room), _cause(target.cause) if number == 0 else ""))
    return Table(columns, tuple(rows))


def _room(room: float | None) -> str:
    return "none" if room is None else f"{room:+.1%}"


def _cause(cause: Cause | None) -> str:
    if cause is None:
        return "-"
    if cause.moved:
        return f"range of {', '.join(cause.moved)}"
    if cause.axis == "process":
        return cause.at.process
    dimension = TEMPERATURE if cause.axis == "temperature" else VOLTAGE
    return f"{cause.axis} {format_quantity(getattr(cause.at, cause.axis), dimension, _DIGITS)}"


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
