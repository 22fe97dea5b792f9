"""A review as a designer reads it in a terminal of 80 columns."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.model.text import clean
from worksheet.report import chains_text, details_text, wording
from worksheet.report.table import Column, Table, lines, wrapped
from worksheet.report.targets_text import WIDE, targets_table
from worksheet.review.results import MET, MISSED, UNKNOWN, Review, SheetReview, TargetReview
from worksheet.stages import catalogue

_DIGITS = 3


def text(result: Review, width: int, *, details: bool = False) -> Iterator[str]:
    """Lines of a review, no wider than `width` columns where words allow it.

    Args:
        result: What was found.
        width: Columns of the terminal.
        details: Whether choices, operating points and metrics at the nominal condition are wanted too.
    """
    yield from wrapped(f"{result.title or 'Project'}: {_counted(result)}", width)
    if result.nominal is not None:
        yield f"{result.conditions} conditions; nominal {wording.condition(result.nominal)}"
    for sheet in result.sheets:
        yield ""
        yield from _sheet(sheet, width)
        if details:
            yield from details_text.details(sheet, width)
    for chain in result.chains:
        yield ""
        yield from chains_text.chain(chain, width)
    if result.budgets:
        yield ""
        yield "Budgets, all blocks times their count"
        yield from lines(_budgets(result), width, "  ")
    if result.uncovered:
        yield ""
        yield "Requirements that no target names"
        for number, said in result.uncovered.items():
            yield from wrapped(f"{number}: {clean(said)}", width, "  ")
    yield ""
    if any(v.what == "max_voltage" for sheet in result.sheets for v in sheet.validity):
        yield from wrapped(wording.CAUTION, width)
    yield from wrapped(wording.STANDING, width)


def _counted(result: Review) -> str:
    missed = sum(s.count(MISSED) for s in result.sheets)
    unknown = sum(s.count(UNKNOWN) for s in result.sheets)
    every = sum(len(s.targets) for s in result.sheets)
    blocks = f"{len(result.sheets)} block{'s' if len(result.sheets) != 1 else ''}"
    bad = f", {len(result.bad)} that cannot be read" if result.bad else ""
    return f"{blocks}{bad}; {every} targets, {missed} missed, {unknown} unknown"


def _sheet(sheet: SheetReview, width: int) -> Iterator[str]:
    stage = catalogue.find(sheet.sheet.stage)
    kind = stage.title.lower() if stage is not None else sheet.sheet.stage
    count = f", {sheet.sheet.count} of it" if sheet.sheet.count != 1 else ""
    title = f": {clean(sheet.sheet.title)}" if sheet.sheet.title else ""
    yield from wrapped(f"{sheet.sheet.name}{title} ({kind}, {sheet.state}{count})", width)
    if sheet.targets:
        yield from lines(targets_table(sheet.targets, width), width, "  ")
    else:
        yield "  no targets"
    for target in sheet.targets:
        said = _said(target, width)
        if said:
            yield from wrapped(f"{target.target.name}: {said}", width, "  ")
    if sheet.state_reason is not None:
        yield from wrapped(f"{sheet.state}: {clean(sheet.state_reason)}", width, "  ")
    yield from _validity(sheet, width)
    for note in sheet.notes:
        yield from wrapped(f"{note.about}: {note.text}", width, "  ")
    for collision in sheet.sheet.collisions:
        given = f"ours {collision.ours or 'nothing'}, theirs {collision.theirs or 'nothing'}"
        yield from wrapped(clean(f"unsettled merge: {collision.key}: {given}; the sheet holds ours"), width, "  ")
    for remark in sheet.sheet.remarks:
        if remark.open:
            about, to = (f" about {remark.about}" if remark.about else ""), (f", to {remark.to}" if remark.to else "")
            yield from wrapped(clean(f"open remark{about} by {remark.by}{to}: {remark.text}"), width, "  ")


def _said(result: TargetReview, width: int) -> str:
    """Why a target is not met, where it is worst and which evidence is stale; "" where the table says enough."""
    stale = sum(e.stale for e in result.evidence)
    evidence = f"stale, found for other inputs: {stale} of {len(result.evidence)} pieces of evidence" if stale else ""
    if result.verdict == MET:
        return evidence
    where = "" if width >= WIDE or result.worst_at is None else f"worst at {wording.condition(result.worst_at)}"
    ends = ", ".join(f"{name} at an end of its range" for name in result.worst_with)
    return "; ".join(part for part in (result.reason, where, ends, evidence) if part)


def _validity(sheet: SheetReview, width: int) -> Iterator[str]:
    kinds = dict.fromkeys((v.device, v.what) for v in sheet.validity)
    for device, what in kinds:
        entries = [v for v in sheet.validity if (v.device, v.what) == (device, what)]
        worst = max(entries, key=lambda v: v.short_by)
        said = {
            "saturation": "short of saturation",
            "max_voltage": "past its voltage rating",
            "range": "outside its range",
        }[what]
        yield from wrapped(
            f"not valid: {device} {said} by {wording.number(worst.short_by, worst.unit, digits=_DIGITS)} "
            f"at {wording.condition(worst.at)}"
            + (f", and at {len(entries) - 1} more conditions" if len(entries) > 1 else ""),
            width,
            "  ",
        )


def _budgets(result: Review) -> Table:
    columns = (
        Column("budget"),
        Column("limit", right=True),
        Column("nominal", right=True),
        Column("worst", right=True),
        Column("verdict", toned=True),
    )
    rows = tuple(
        (
            b.metric,
            wording.metric_number(b.metric, b.maximum, b.unit),
            wording.metric_number(b.metric, b.nominal, b.unit),
            wording.metric_number(b.metric, b.worst, b.unit),
            b.verdict.upper() if b.verdict in (MISSED, UNKNOWN) else b.verdict,
        )
        for b in result.budgets
    )
    return Table(columns, rows)
