"""The table of targets that a sheet and a chain share."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TypeVar

from worksheet.report import wording
from worksheet.report.table import Column, Table
from worksheet.review.results import MISSED, UNKNOWN, TargetReview

_TARGETS = (
    Column("target", flexible=True),
    Column("wanted"),
    Column("nominal", right=True),
    Column("worst", right=True),
    Column("where"),
    Column("margin", right=True),
    Column("verdict", toned=True),
)
_Cell = TypeVar("_Cell", str, Column)
_WHERE = 4
WIDE = 110
"""From this width on the table says where the worst value is; below, a line under it does for what is not met."""


_DIGITS = 3


def targets_table(targets: Sequence[TargetReview], width: int) -> Table:
    """Targets of a sheet or a chain, with where they are worst where the paper is wide enough."""
    rows = tuple(_row(target) for target in targets)
    if width >= WIDE:
        return Table(_TARGETS, rows)
    return Table(_without_where(_TARGETS), tuple(_without_where(row) for row in rows))


def _without_where(row: tuple[_Cell, ...]) -> tuple[_Cell, ...]:
    return row[:_WHERE] + row[_WHERE + 1 :]


def _row(result: TargetReview) -> tuple[str, ...]:
    target = result.target
    return (
        target.name,
        wording.limits(target, result.unit),
        wording.metric_number(target.name, result.nominal, result.unit, digits=_DIGITS),
        wording.metric_number(target.name, result.worst, result.unit, digits=_DIGITS),
        wording.condition(result.worst_at),
        wording.margin(result.margin),
        result.verdict.upper() if result.verdict in (MISSED, UNKNOWN) else result.verdict,
    )
