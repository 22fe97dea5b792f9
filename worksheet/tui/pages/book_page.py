"""The project's page: every block with its stage, state, verdicts and tightest margin, and what the budgets say."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.model.problem import Problem
from worksheet.report import wording
from worksheet.review.results import MET, MISSED, UNKNOWN, WAIVED, BudgetReview, Review, SheetReview, TargetReview
from worksheet.session.snapshot import Snapshot
from worksheet.stages import catalogue
from worksheet.tui import rows
from worksheet.tui.pages import words
from worksheet.tui.rows import HEAD, LABEL, PLAIN, QUIET, RULE, VALUE, Line, Page, Row, Span, line
from worksheet.tui.signs import Signs

_COUNTED = ((MET, "met", 4), (MISSED, "missed", 6), (UNKNOWN, "unkn.", 5), (WAIVED, "waived", 6))
_NAME, _STAGE, _STATE, _MARGIN = 17, 15, 10, 7
_FIXED = _NAME + _STAGE + _STATE + _MARGIN + sum(width for _, _, width in _COUNTED) + 7
_WIDE = _FIXED + 24
"""Columns from which on the tightest target is named beside its margin."""

_BAR = 20
_DETAIL = 6
"""Most lines for the block under the cursor."""


def heading(columns: int) -> Line:
    """The line above the blocks."""
    counted = [Span(title, QUIET, width, right=True) for _, title, width in _COUNTED]
    spans = [Span("block", QUIET, _NAME), Span("stage", QUIET, _STAGE), Span("state", QUIET, _STATE), *counted]
    spans.append(Span("margin", QUIET, _MARGIN, right=True))
    if columns >= _WIDE:
        spans.append(Span("tightest target", QUIET))
    return line(Span(" "), *spans)


def page(snapshot: Snapshot, review: Review | None, columns: int, signs: Signs, wanted: str = "") -> Page:
    """One row a block.

    Args:
        snapshot: The book.
        review: Its results, None while there are none yet.
        columns: Room for a row.
        signs: Of the terminal.
        wanted: Only blocks that hold all its words anywhere.
    """
    results = {} if review is None else {one.sheet.name: one for one in review.sheets}
    made = [_row(snapshot, name, results.get(name), columns, signs, pending=review is None) for name in snapshot.names]
    asked = wanted.casefold().split()
    kept = [row for row, text in made if all(word in text for word in asked)]
    if not kept:
        said = "No block holds that." if asked else "There is no sheet yet. New starts one."
        kept = [Row("none", (line(Span(said, QUIET)),), stops=False)]
    return Page(tuple(kept))


def _row(
    snapshot: Snapshot, name: str, result: SheetReview | None, columns: int, signs: Signs, *, pending: bool
) -> tuple[Row, str]:
    """A block's row and the text that a search looks in."""
    data = snapshot.data(name)
    stage = str(data.get("stage", "-"))
    stated = str(data.get("state", "draft")) if data else "-"
    state = stated if result is None else result.state
    lead = [Span(signs.text(name), VALUE, _NAME), Span(signs.text(stage), LABEL, _STAGE)]
    lead.append(Span(signs.text(state), PLAIN, _STATE))
    if result is None:
        wrong = "" if pending else "has problems" if data else "cannot be read"
        spans = (*lead, Span(wrong or "...", rows.MISSED if wrong else QUIET))
        found = wrong
    else:
        spans = (*lead, *_counts(result), *_margin(result, columns, signs))
        found = " ".join(words.verdict(one.verdict) for one in result.targets)
    text = " ".join((name, str(data.get("title", "")), stage, state, found, str(data.get("owner", ""))))
    copied = (name, stage, state, *_copied(result))
    return Row(f"sheet.{name}", (line(*spans),), subject=("sheet", name), copied=copied), text.casefold()


def _counts(result: SheetReview) -> Iterator[Span]:
    for verdict, _, width in _COUNTED:
        count = result.count(verdict)
        role = words.VERDICT_ROLES[verdict] if count else QUIET
        yield Span(str(count) if count else "-", role, width, right=True)


def _margin(result: SheetReview, columns: int, signs: Signs) -> Iterator[Span]:
    tightest = words.tightest(result.targets)
    margin = None if tightest is None else tightest.margin
    role = PLAIN if tightest is None else words.VERDICT_ROLES[tightest.verdict]
    yield Span(wording.margin(margin), role, _MARGIN, right=True)
    if columns >= _WIDE and tightest is not None:
        yield Span(signs.text(tightest.target.name), PLAIN)


def _copied(result: SheetReview | None) -> tuple[str, ...]:
    if result is None:
        return ()
    tightest = words.tightest(result.targets)
    named = "" if tightest is None else f"{tightest.target.name} {wording.margin(tightest.margin)}"
    return (*(f"{result.count(verdict)} {verdict}" for verdict, _, _ in _COUNTED), named)


def title_lines(snapshot: Snapshot, review: Review | None, signs: Signs) -> tuple[Line, ...]:
    """Title, counts, conditions."""
    file = snapshot.project.file
    title = (file.title if file is not None else "") or snapshot.project.root.name or "Project"
    read_only = " (for reading only)" if snapshot.read_only else ""
    first = line(Span(signs.text(title + read_only), HEAD), Span(_counted(review), PLAIN), gap=2)
    if file is None:
        return first, line(Span("The project file cannot be read.", rows.MISSED))
    count = len(file.processes) * len(file.temperatures) * len(file.supplies)
    said = f"{count} conditions, nominal {wording.condition(file.nominal)}; process {file.process}"
    wrong = len(snapshot.project.problems)
    told = [Span("1 problem (!)" if wrong == 1 else f"{wrong} problems (!)", rows.MISSED)] if wrong else []
    return first, line(*told, Span(signs.text(said), QUIET), gap=2)


def _counted(review: Review | None) -> str:
    if review is None:
        return "working..."
    every = sum(len(one.targets) for one in review.sheets)
    found = [f"{sum(one.count(v) for one in review.sheets)} {v}" for v in (MISSED, UNKNOWN, WAIVED)]
    bad = f", {len(review.bad)} of them with problems" if review.bad else ""
    return f"{len(review.sheets) + len(review.bad)} blocks{bad}, {every} targets: {', '.join(found)}"


def detail_lines(result: SheetReview | None, problems: tuple[Problem, ...], room: int, signs: Signs) -> list[Line]:
    """What is seen of the block under the cursor: its title and its targets, or what is wrong with it."""
    if result is None:
        return [line(Span(signs.text(str(problem)), rows.MISSED)) for problem in problems[:room]]
    sheet = result.sheet
    stage = catalogue.find(sheet.stage)
    parts = [sheet.title, stage.title.lower() if stage is not None else "", f"{sheet.count} of it", sheet.owner]
    out = [line(Span(signs.text(", ".join(part for part in parts if part)), HEAD))]
    out += [_detail(one, signs) for one in result.targets[: max(room - 1, 0)]]
    return out


def _detail(one: TargetReview, signs: Signs) -> Line:
    return line(
        Span(signs.text(one.target.name), LABEL, 20),
        words.verdict_span(one.verdict, 7),
        Span(wording.margin(one.margin), PLAIN, 7, right=True),
        Span(signs.text(words.metric(one, one.worst)), PLAIN, 10, right=True),
        Span(signs.text(wording.limits(one.target, one.unit)), PLAIN, 16),
        Span(signs.text(words.worst_place(one.worst_at, one.worst_with)), QUIET),
    )


def budget_lines(budgets: tuple[BudgetReview, ...], signs: Signs) -> list[Line]:
    """Each budget: how much of it is taken, as a bar and in words."""
    return [_budget(one, signs) for one in budgets]


def _budget(one: BudgetReview, signs: Signs) -> Line:
    taken = 0.0 if one.worst is None or not one.maximum else one.worst / one.maximum
    filled = min(max(round(taken * _BAR), 0), _BAR)
    role = words.VERDICT_ROLES.get(one.verdict, PLAIN)
    limit = wording.metric_number(one.metric, one.maximum, one.unit)
    worst = wording.metric_number(one.metric, one.worst, one.unit)
    return line(
        Span(signs.text(one.metric), LABEL, 16),
        Span(signs.text(f"{worst} of {limit}"), PLAIN, 24),
        Span(("=" if signs.plain else "▬") * filled, role),
        Span(signs.across * (_BAR - filled), RULE),
        Span(f" {taken:.0%}", PLAIN, 6, right=True),
        Span("  "),
        words.verdict_span(one.verdict),
        gap=0,
    )


def detail_room(height: int) -> int:
    """Lines below the list for the block under the cursor, on a screen of some lines."""
    return min(_DETAIL, max(height - 12, 0))


def parts(snapshot: Snapshot, review: Review, size: tuple[int, int], signs: Signs) -> dict[str, list[Line]]:
    """The whole page by part of the screen, with the cursor on the first block: the first picture of a book."""
    columns, height = max(size[0] - 3, 20), size[1]
    found = page(snapshot, review, columns, signs)
    first = next((row for row in found.rows if row.stops), None)
    marked = [Span(f"{signs.pointer if row is first else ' '} ", HEAD) for row in found.rows]
    room, name = detail_room(height), first.subject[1] if first is not None else ""
    result = next((one for one in review.sheets if one.sheet.name == name), None)
    detail = detail_lines(result, snapshot.problems_of(name), room, signs)[:room]
    return {
        "title": list(title_lines(snapshot, review, signs)),
        "heading": [heading(columns)],
        "blocks": [(mark, *row.lines[0]) for mark, row in zip(marked, found.rows, strict=True)],
        "detail": [*detail, *[()] * (room - len(detail))],
        "budgets": budget_lines(review.budgets, signs),
    }
