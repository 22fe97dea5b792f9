"""Fragility and yields beside a review, as plain JSON-ready data in its document."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from worksheet.review.deeper import Deeper
    from worksheet.review.fragility import Fragile
    from worksheet.review.yields import Yield

Plain = dict[str, Any]


def into_document(document: Plain, found: Deeper) -> Plain:
    """A review's document with what was asked for beside it."""
    for sheet in document["sheets"]:
        name = sheet["sheet"]
        if name in found.fragile:
            ranked = found.fragile[name]
            sheet["fragile"] = [_row(r) for r in ranked.nominal]
            sheet["fragile_worst"] = [_row(r) for r in ranked.worst]
            sheet["not_ranked"] = list(ranked.not_ranked)
        if name in found.yields:
            shares = found.yields[name]
            sheet.update(_share(shares.every))
            for target in sheet["targets"]:
                found_share = shares.targets.get(target["metric"])
                target.update(_share(found_share), variance=_parts(found_share))
    return document


def _row(row: Fragile) -> Plain:
    plain: Plain = {
        "target": row.target,
        "name": row.name,
        "value": row.value,
        "unit": row.unit,
        "sensitivity": row.sensitivity,
        "break_value": row.break_value,
        "room": row.room,
        "trust": row.trust,
    }
    if row.standard_error is not None:
        plain["standard_error"] = row.standard_error
    return plain


def _share(found: Yield | None) -> Plain:
    if found is None:
        return {"yield": None, "yield_low": None, "yield_high": None}
    return {"yield": found.share, "yield_low": found.low, "yield_high": found.high}


def _parts(found: Yield | None) -> list[Plain]:
    return [] if found is None else [{"of": part.owner, "share": part.share} for part in found.parts]
