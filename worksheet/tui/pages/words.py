"""Small words that every page uses: values as typed, verdicts, numbers of few digits."""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from typing import Any

from worksheet.model.project_keys import CONDITION
from worksheet.model.sheet import Condition
from worksheet.report import wording
from worksheet.review.results import MET, MISSED, UNKNOWN, WAIVED, TargetReview
from worksheet.tui import rows

DIGITS = 3
VERDICT_ROLES = {MET: rows.MET, MISSED: rows.MISSED, UNKNOWN: rows.UNKNOWN, WAIVED: rows.WAIVED}


def typed(value: Any) -> str:
    """A TOML value as it is typed into a field; a table by the value or formula that it states, or by its condition."""
    if value is None:
        return ""
    if isinstance(value, Mapping):
        stated = value.get("value", value.get("formula"))
        parts = [value[key.name] for key in CONDITION.keys if key.name in value]
        return ", ".join(map(typed, parts)) if stated is None else typed(stated)
    if isinstance(value, list):
        return ", ".join(typed(one) for one in value)
    if isinstance(value, datetime.date):
        return value.isoformat()
    if isinstance(value, float):
        return str(getattr(value, "text", repr(float(value))))
    return str(value)


def verdict(word: str) -> str:
    """A verdict as it is read at a glance: what is bad stands in capitals."""
    return word.upper() if word in (MISSED, UNKNOWN) else word


def verdict_span(word: str, width: int = 0) -> rows.Span:
    """A verdict in its colour."""
    return rows.Span(verdict(word), VERDICT_ROLES.get(word, rows.PLAIN), width)


def metric(result: TargetReview, value: float | None) -> str:
    """A number of a target's metric."""
    return wording.metric_number(result.target.name, value, result.unit, digits=DIGITS)


def worst_place(at: Condition | None, ends: Mapping[str, float]) -> str:
    """Where something is worst, in words; "" where it is nowhere."""
    if at is None:
        return ""
    tail = "".join(f", {name} at an end of its range" for name in ends)
    return f"at {wording.condition(at)}{tail}"


def tightest(targets: tuple[TargetReview, ...]) -> TargetReview | None:
    """The target with the least margin; waived ones count only where there is no other."""
    known = [one for one in targets if one.margin is not None]
    open_ones = [one for one in known if one.verdict != WAIVED] or known
    return min(open_ones, key=lambda one: one.margin if one.margin is not None else 0.0, default=None)


def margin_strip(targets: tuple[TargetReview, ...], columns: int) -> list[rows.Span]:
    """The margin of every target in one line, for watching them while something else is stepped.

    In the order of the sheet where all fit, else the tightest first and as many as have room.
    """
    found = [_margin_piece(one) for one in targets]
    if sum(len(piece.text) + 2 for piece in found) > columns:
        ranked = sorted(targets, key=lambda one: one.margin if one.margin is not None else float("inf"))
        found, rest = [], [_margin_piece(one) for one in ranked]
        while rest and sum(len(piece.text) + 2 for piece in [*found, rest[0]]) <= columns:
            found.append(rest.pop(0))
    return found


def _margin_piece(one: TargetReview) -> rows.Span:
    said = "" if one.verdict == MET else f" {verdict(one.verdict)}"
    return rows.Span(f"{one.target.name} {wording.margin(one.margin)}{said}", VERDICT_ROLES[one.verdict])
