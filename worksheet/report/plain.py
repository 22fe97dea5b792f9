"""Results as plain JSON-ready data, by the contract's shapes: SI base units, None with a reason where no number is."""

from __future__ import annotations

import datetime
from collections.abc import Sequence
from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from worksheet.model.problem import Problem

if TYPE_CHECKING:  # a command that reviews nothing loads no review
    from worksheet.model.sheet import Condition, Remark
    from worksheet.review.chained import ChainReview
    from worksheet.review.results import BudgetReview, Cause, Review, SheetReview, TargetReview

SCHEMA = 1
Plain = dict[str, Any]


def problems(found: Sequence[Problem]) -> list[Plain]:
    """Problems as data."""
    return [{"file": p.file, "line": p.line, "key": p.key, "message": p.message} for p in found]


def condition(at: Condition | None) -> Plain | None:
    """A condition as data."""
    return None if at is None else {"process": at.process, "temperature": at.temperature, "supply": at.supply}


def review(result: Review) -> Plain:
    """A whole review as data."""
    return {
        "schema": SCHEMA,
        "project": result.title,
        "met": result.met,
        "sheets": [sheet(s) for s in result.sheets],
        "budget": [budget(b) for b in result.budgets],
        "chains": [chain(c) for c in result.chains],
        "uncovered": [{"id": number, "text": said} for number, said in result.uncovered.items()],
        "problems": problems(result.problems),
    }


def sheet(result: SheetReview) -> Plain:
    """One sheet's review as data."""
    return {
        "sheet": result.sheet.name,
        "title": result.sheet.title,
        "stage": result.sheet.stage,
        "state": result.state,
        "stated_state": result.sheet.state,
        "state_reason": result.state_reason,
        "count": result.sheet.count,
        "basis": result.basis,
        "choose": {k: {"value": c.value, "unit": c.unit, "origin": c.origin} for k, c in result.choices.items()},
        "own": {k: {"value": v.number, "unit": v.unit} for k, v in result.sheet.own.items() if v.number is not None},
        "operating_point": {device: dict(values) for device, values in result.operating_point.items()},
        "metrics": {k: _number(n.value, n.unit, n.reason) for k, n in result.metrics.items()},
        "validity": [
            {"device": v.device, "what": v.what, "short_by": v.short_by, "unit": v.unit, "at": condition(v.at)}
            for v in result.validity
        ],
        "targets": [target(t) for t in result.targets],
        "notes": [{"about": n.about, "text": n.text} for n in result.notes],
        "remarks": [remark(r) for r in result.sheet.remarks],
        "collisions": [
            {"key": c.key, "base": c.base, "ours": c.ours, "theirs": c.theirs} for c in result.sheet.collisions
        ],
    }


def remark(said: Remark) -> Plain:
    """What somebody said about a sheet, as data."""
    return {
        "by": said.by,
        "text": said.text,
        "about": said.about,
        "to": said.to,
        "dated": _day(said.dated),
        "settled": _day(said.settled),
        "settled_by": said.settled_by,
        "answer": said.answer,
    }


def _day(dated: datetime.date | None) -> str | None:
    return None if dated is None else dated.isoformat()


def _number(value: float | None, unit: str, reason: str | None) -> Plain:
    plain: Plain = {"value": value, "unit": unit}
    if value is None:
        plain["reason"] = reason
    return plain


def target(result: TargetReview) -> Plain:
    """One target's review as data."""
    wanted = result.target
    return {
        "metric": wanted.name,
        "unit": result.unit,
        "min": wanted.minimum,
        "max": wanted.maximum,
        "at": wanted.at,
        "guard": wanted.guard,
        "id": wanted.id,
        "source": wanted.source,
        "nominal": result.nominal,
        "worst": result.worst,
        "worst_at": condition(result.worst_at),
        "worst_with": dict(result.worst_with),
        "invalid": result.invalid,
        "margin": result.margin,
        "verdict": result.verdict,
        "reason": result.reason,
        "breaks_first": [{"at": condition(b.at), "room": b.room} for b in result.breaks_first],
        "cause": _cause(result.cause),
        "evidence": [
            {"value": e.value, "found_by": e.found_by, "stale": e.stale, "verdict": e.verdict} for e in result.evidence
        ],
    }


def _cause(found: Cause | None) -> Plain | None:
    if found is None:
        return None
    plain: Plain = {"axis": found.axis, "at": condition(found.at), "room": found.room}
    if found.moved:
        plain["with"] = dict(found.moved)
    return plain


def chain(result: ChainReview) -> Plain:
    """One chain's review as data."""
    stated = result.chain
    return {
        "chain": stated.name,
        "title": stated.title,
        "sheets": list(stated.sheets),
        "settling_tolerance": stated.settling_tolerance,
        "met": result.met,
        "reason": result.reason,
        "metrics": {
            key: {
                **_number(*found.nominal),
                "low": found.low,
                "low_at": condition(found.low_at),
                "high": found.high,
                "high_at": condition(found.high_at),
            }
            for key, found in result.metrics.items()
        },
        "targets": [target(t) for t in result.targets],
        "takes": [asdict(share) for share in result.stages],
        "invalid": result.invalid,
        "notes": [{"about": n.about, "text": n.text} for n in result.notes],
    }


def budget(result: BudgetReview) -> Plain:
    """One budget's review as data."""
    return {
        "metric": result.metric,
        "unit": result.unit,
        "max": result.maximum,
        "nominal": result.nominal,
        "worst": result.worst,
        "verdict": result.verdict,
    }


def only_problems(found: Sequence[Problem], **rest: Any) -> Plain:
    """The document of a command that could do nothing but say what is wrong."""
    return {"schema": SCHEMA, **rest, "problems": problems(found)}
