"""Variants side by side: as text, as rows, and as data."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from worksheet.model.text import clean
from worksheet.report import plain, wording
from worksheet.report.table import Column, Table, lines, wrapped
from worksheet.review import variants
from worksheet.review.results import MISSED, UNKNOWN, TargetReview
from worksheet.review.variants import SideBySide

_DIGITS = 3
_FIRST, _EACH = 20, 19
"""Columns of a terminal that names take, and each variant."""

PRESENT = "as it stands"
_METRICS = (("supply_current", "A", "current"), ("gate_area", "m^2", "area"))


def text(found: SideBySide, width: int) -> Iterator[str]:
    """Lines of a comparison: what each changes, every target's worst with its verdict, current and area."""
    yield from wrapped(f"{found.sheet.name}: {_counted(found)}", width)
    for column in found.columns:
        if column.note:
            yield from wrapped(f"{column.name}: {clean(column.note)}", width, "  ")
    for part in tables(found, width):
        yield ""
        yield from lines(part, width, "  ")
    for column in found.columns:
        for problem in column.problems:
            yield from wrapped(f"{title(column)}: {clean(problem.message)}", width, "  ")
    yield ""
    yield from wrapped(wording.STANDING, width)


def _counted(found: SideBySide) -> str:
    count = len(found.columns) - 1
    if not count:
        return "no variants; a table [variant.NAME] in the sheet names one"
    return f"{count} variant{'s' if count != 1 else ''} beside what it states"


def title(column: variants.Column) -> str:
    """The heading of a column."""
    return column.name or PRESENT


def tables(found: SideBySide, width: int) -> Iterator[Table]:
    """One row a changed value, a target, current and area; one column a variant, the sheet itself first in each table.

    Args:
        found: What is laid side by side.
        width: Columns of the terminal; variants that do not fit beside the others stand in a further table.
    """
    beside = max((width - _FIRST) // _EACH - 1, 1)
    rows, others = list(body(found)), range(1, len(found.columns))
    for start in range(1, max(len(found.columns), 2), beside):
        shown = [0, *others[start - 1 : start - 1 + beside]]
        heads = (Column("", flexible=True), *(Column(title(found.columns[k]), right=True) for k in shown))
        yield Table(heads, tuple((name, *(cells[k] for k in shown)) for name, cells in rows))


def body(found: SideBySide) -> Iterator[tuple[str, tuple[str, ...]]]:
    """The rows of the comparison: a name, and a cell for every column."""
    for qualified in found.changed:
        key = qualified.partition(".")[2]
        yield key, tuple(column.shown(key) or "-" for column in found.columns)
    for device, key in found.fingers.items():
        yield key, tuple(str(column.sheet.fingers.get(device, 1)) for column in found.columns)
    for name in found.sheet.targets:
        yield name, tuple(_target(_of(column, name)) for column in found.columns)
    for key, unit, attribute in _METRICS:
        cells = (wording.metric_number(key, getattr(c, attribute), unit, digits=_DIGITS) for c in found.columns)
        yield f"{key}, nominal", tuple(cells)


def _of(column: variants.Column, name: str) -> TargetReview | None:
    every = () if column.review is None else column.review.targets
    return next((target for target in every if target.target.name == name), None)


def _target(result: TargetReview | None) -> str:
    """The worst value and the verdict in one cell."""
    if result is None:
        return "-"
    worst = wording.metric_number(result.target.name, result.worst, result.unit, digits=_DIGITS)
    return f"{worst} {result.verdict.upper() if result.verdict in (MISSED, UNKNOWN) else result.verdict}"


def rows(found: SideBySide) -> Iterator[list[Any]]:
    """Heading and rows of a table in SI units, one row a variant."""
    head: list[Any] = ["variant", *found.changed, *found.fingers.values()]
    for name in found.sheet.targets:
        unit = next((t.unit for c in found.columns if (t := _of(c, name)) is not None), "")
        head += [f"{name} worst [{unit}]" if unit else f"{name} worst", f"{name} verdict"]
    yield [*head, *(f"{key} [{unit}]" for key, unit, _ in _METRICS)]
    for column in found.columns:
        row: list[Any] = [title(column), *(_stated(column, qualified) for qualified in found.changed)]
        row += [column.sheet.fingers.get(device, 1) for device in found.fingers]
        for name in found.sheet.targets:
            target = _of(column, name)
            row += [None, ""] if target is None else [target.worst, target.verdict]
        yield [*row, *(getattr(column, attribute) for _, _, attribute in _METRICS)]


def _stated(column: variants.Column, qualified: str) -> Any:
    """A changed value: a number in SI units, "propose", the text of a formula, or None."""
    key = qualified.partition(".")[2]
    value = column.sheet.assume.get(key) or column.sheet.choose.get(key) or column.sheet.own.get(key)
    if value is None:
        return None
    if len(value.numbers) > 1:
        return list(value.numbers)
    return value.text if value.number is None else value.number


def document(found: SideBySide) -> dict[str, Any]:
    """A comparison as data, in SI units."""
    return {
        "schema": 1,
        "sheet": found.sheet.name,
        "changed": list(found.changed),
        "variants": [_plain(found, column) for column in found.columns],
        "problems": [],
    }


def _plain(found: SideBySide, column: variants.Column) -> dict[str, Any]:
    return {
        "variant": column.name or None,
        "note": column.note,
        "values": {
            **{qualified: _stated(column, qualified) for qualified in found.changed},
            **{key: column.sheet.fingers.get(device, 1) for device, key in found.fingers.items()},
        },
        "supply_current": column.current,
        "gate_area": column.area,
        "targets": [] if column.review is None else [plain.target(target) for target in column.review.targets],
        "problems": plain.problems(column.problems),
    }
