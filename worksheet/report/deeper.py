"""Fragility and yields beside a review, as lines of text."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from worksheet.model.keys import TRUST
from worksheet.report import wording
from worksheet.report.table import Column, Table, lines
from worksheet.review.deeper import Deeper
from worksheet.review.fragility import Fragile, Fragility
from worksheet.review.results import Review
from worksheet.review.yields import Yield

_SHOWN = 12
_LEAST_PART = 0.005


def text(review: Review, found: Deeper, width: int) -> Iterator[str]:
    """What would have to be true for each block to fail, weakest trust first, and yields."""
    for sheet in review.sheets:
        name = sheet.sheet.name
        if name in found.fragile:
            yield ""
            yield f"{name}: what would have to be true for it to fail"
            yield from lines(_weakest(found.fragile[name]), width, "  ")
        if name in found.yields:
            shares = found.yields[name]
            yield ""
            yield f"{name}: yield at the nominal condition, 95 % interval"
            rows = [(target, share) for target, share in shares.targets.items()]
            every = [("all targets", shares.every)] if shares.every is not None else []
            columns = (
                Column("target"),
                Column("yield", right=True),
                Column("interval", right=True),
                Column("variance from", flexible=True),
            )
            yield from lines(Table(columns, tuple(_yield_row(*row) for row in (*rows, *every))), width, "  ")


def _yield_row(name: str, share: Yield) -> tuple[str, str, str, str]:
    parts = ", ".join(f"{part.owner} {part.share:.0%}" for part in share.parts if part.share >= _LEAST_PART)
    return name, f"{share.share:.2%}", f"{share.low:.2%} to {share.high:.2%}", parts


def _weakest(found: Fragility) -> Table:
    """The nearest break of each input, least trusted first, then least room."""
    nearest: dict[str, Fragile] = {}
    for row in found.worst:
        if row.room is not None and (row.name not in nearest or row.room < (nearest[row.name].room or 0.0)):
            nearest[row.name] = row
    order = sorted(nearest.values(), key=lambda r: (_trust(r.trust), r.room or 0.0))
    columns = (
        Column("input"),
        Column("trust"),
        Column("now", right=True),
        Column("breaks at", right=True),
        Column("room", right=True),
        Column("known", right=True),
        Column("target", flexible=True),
    )
    return Table(columns, tuple(_weak_row(row) for row in _most(order)))


def _most(rows: Sequence[Fragile]) -> Sequence[Fragile]:
    return rows[:_SHOWN]


def _trust(trust: str) -> int:
    return TRUST.index(trust) if trust in TRUST else -1


def _weak_row(row: Fragile) -> tuple[str, ...]:
    known = "-" if row.standard_error is None else f"{row.standard_error / abs(row.value):.2%}"
    room = "-" if row.room is None else f"{row.room:.1%}"
    shown = [wording.number(value, row.unit, digits=3) for value in (row.value, row.break_value)]
    return row.name, row.trust or "not said", *shown, room, known, row.target
