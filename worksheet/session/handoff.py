"""Handing blocks over: results gathered, pages made of them, and what moved since the last hand-off found."""

from __future__ import annotations

import datetime
from collections.abc import Iterator, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

from worksheet.history import own, revisions
from worksheet.history.outcome import Refused
from worksheet.model.problem import Problem
from worksheet.model.text import clean, nearest
from worksheet.project.case import CaseError
from worksheet.report.handoff.material import Block, Hand, HandOff, Origin, Since
from worksheet.review.deeper import Wanted
from worksheet.review.pictured import margins, response
from worksheet.review.results import Review, SheetReview
from worksheet.review.review import solve as solve_points
from worksheet.review.weakest import weakest
from worksheet.session import mapping
from worksheet.session.handoff_fits import fits_of
from worksheet.session.handoff_folder import Record, Written
from worksheet.session.needs import Needs
from worksheet.session.revisions import compared, history, repository_of
from worksheet.session.workbook import Workbook
from worksheet.solver import needed
from worksheet.solver import plane as planes
from worksheet.solver.relief import Relief, relief

_CELLS = (44, 32)


def hand_off(
    root: Path, folder: Path, sheets: Sequence[str], today: datetime.date, since: str | None = None
) -> Written | list[Problem]:
    """Write a hand-off.

    Args:
        root: The project folder.
        folder: Where the pages go; made where it is missing. Nothing is written anywhere else.
        sheets: Blocks to hand over, a page each; the whole project on one page where there are none.
        today: The day of the hand-off.
        since: A revision to compare with; None for the one that the last hand-off in this folder was made from.
    Returns: what was written, or every problem; nothing is written then
    """
    workbook = Workbook.read(root)
    project = workbook.project
    if project.file is None or project.process is None or workbook.evaluator is None:
        return list(project.problems)
    unknown = [_unknown(name, workbook) for name in sheets if name not in project.sheets]
    if unknown:
        return [problem for found in unknown for problem in found]
    record = Record.read(folder)
    if isinstance(record, Problem):
        return [record]
    review = workbook.review(today)
    names = [*dict.fromkeys(sheets)] or [s.sheet.name for s in review.sheets]
    blocked = [p for name in sheets if not any(s.sheet.name == name for s in review.sheets)
               for p in review.problems if p.file == f"sheets/{name}.toml"]  # fmt: skip
    if blocked:
        return blocked
    gathered = tuple(_blocks(workbook, review, names))
    origin = origin_of(root)
    if since is not None and isinstance(stated := compared(root, since, "working", today), Problem):
        return [stated]
    fits = tuple(fits_of(root, project.process)) if not sheets else ()
    known: dict[tuple[Origin, str], Since] = {}
    pages: dict[str, bytes] = {}
    stems = [f"handoff-{name}" for name in names] if sheets else ["handoff"]
    for place, stem in enumerate(stems):
        before = record.since(stem) if since is None else (Origin(since), "")
        if before is not None and before not in known:
            known[before] = _moved(root, before, today)
        made = HandOff(
            review=review,
            owner=project.file.owner,
            process=project.process.title or project.process.name,
            dated=today,
            origin=origin,
            since=None if before is None else known[before],
            blocks=gathered[place : place + 1] if sheets else gathered,
            fits=fits,
            conditions=_conditions(review, workbook),
            whole=not sheets,
        )
        pages.update(_written(stem, made))
        record.note(stem, origin, today)
    written = record.put(pages)
    return replace(written, problems=review.problems) if isinstance(written, Written) else written


def _unknown(name: str, workbook: Workbook) -> list[Problem]:
    """Why a sheet that was asked for cannot be handed over."""
    own_problems = [p for p in workbook.project.problems if p.file == f"sheets/{name}.toml"]
    if own_problems:
        return own_problems
    near = nearest(name, workbook.project.sheets)
    hint = f"; did you mean {near!r}?" if near else ""
    known = ", ".join(workbook.project.sheets) or "none"
    return [Problem("command line", None, "--sheet", f"found {clean(name)!r}, expected one of: {known}{hint}")]


def _written(stem: str, made: HandOff) -> dict[str, bytes]:
    from worksheet.report.handoff import html, markdown, spread
    from worksheet.report.handoff.pages import block_page, project_page
    from worksheet.report.handoff.sizes import lines

    page = project_page(made) if made.whole else block_page(made, made.blocks[0])
    plain = "".join(f"{line}\n" for found in made.blocks for line in lines(found))
    texts = {
        f"{stem}.html": html.write(page),
        f"{stem}.md": markdown.write(page),
        f"{stem}.csv": spread.write(page),
        f"{stem}-sizes.txt": plain,
    }
    return {name: text.encode() for name, text in texts.items()}


# What pages are made of


def _blocks(workbook: Workbook, review: Review, names: Sequence[str]) -> Iterator[Block]:
    ranked = workbook.deeper(review, Wanted(fragile=True)).fragile
    by_name = {s.sheet.name: s for s in review.sheets}
    for name in names:
        yield _block(workbook, by_name[name], ranked[name])


def _block(workbook: Workbook, result: SheetReview, ranked: Any) -> Block:
    from worksheet.solver.algebra import explain

    name, evaluator = result.sheet.name, workbook.evaluator
    assert evaluator is not None
    case = evaluator.case(name)
    points, _ = solve_points(evaluator, name)
    assert points is not None  # it was reviewed
    needs = Needs.at(workbook.project.root, evaluator, name)
    return Block(
        review=result,
        circuit=case.circuit,
        models={d.name: case.model(d).name if not (d.name == "bias" and result.sheet.bias.ideal) else "ideal"
                for d in case.circuit.devices},
        weak=weakest(result.sheet, workbook.project.process, ranked),
        solved=needs.solved if isinstance(needs, Needs) else None,
        keys=needs.keys if isinstance(needs, Needs) else {},
        hand=dict(_hands(needs)) if isinstance(needs, Needs) else {},
        algebra=tuple(explain(case, key) for key in result.sheet.targets),
        margins=margins(points),
        response=response(points),
        relief=_relief(needs) if isinstance(needs, Needs) else None,
        nominal=case.conditions.nominal,
        unsolved="" if isinstance(needs, Needs) else "; ".join(p.message for p in needs),
    )  # fmt: skip


def _hands(needs: Needs) -> Iterator[tuple[tuple[str, str], Hand]]:
    """The algebra of the bounds that set the ends of windows; the others would take most of the time."""
    for name, window in needs.solved.needed.items():
        region = window.region
        if region is None:
            continue
        for side, value, by in (("low", region.low, region.low_set_by), ("high", region.high, region.high_set_by)):
            setting = [b for b in window.bounds if b.target == by and b.side == side and b.value == value]
            if setting:
                yield (name, side), needs.hand(window, setting[0])


def _relief(needs: Needs) -> Relief | None:
    across, up = mapping.ACROSS, mapping.UP
    known = needed.trials_of(needs.case)
    bounds = {name: tuple(b.value for b in w.bounds) for name, w in needs.solved.needed.items()}
    try:
        spans = planes.around(known, across, bounds), planes.around(known, up, bounds)
        return relief(known, across, spans[0], up, spans[1], _CELLS)
    except (CaseError, KeyError):
        return None


def _conditions(review: Review, workbook: Workbook) -> str:
    file = workbook.project.file
    assert file is not None
    from worksheet.report import wording

    corners = ", ".join(file.processes)
    return f"{review.conditions} conditions: corners {corners}; nominal {wording.condition(review.nominal)}."


# What it is made from, and what moved


def origin_of(root: Path) -> Origin:
    """The newest revision, and whether the project's files hold more than it."""
    found = repository_of(root)
    if isinstance(found, Problem):
        return Origin()
    revision = revisions.resolve(found, "HEAD")
    if isinstance(revision, Refused):
        return Origin()
    held = revisions.read_files(found, revision)
    if isinstance(held, Refused):
        return Origin()
    now = {path: own.read_own(root, path) for path in own.own_files(root) if path.endswith(".toml")}
    then = {path: content for path, content in held.files.items() if path.endswith(".toml")}
    return Origin(revision, now != then)


def _moved(root: Path, before: tuple[Origin, str], today: datetime.date) -> Since:
    origin, dated = before
    if not origin.revision:
        return Since(origin, dated, why_not="the last hand-off was made from files that no revision held")
    found = compared(root, origin.revision, "working", today)
    if isinstance(found, Problem):
        return Since(origin, dated, why_not=found.message)
    listed = history(root)
    every = () if isinstance(listed, Problem) else listed
    place = next((k for k, one in enumerate(every) if one.revision == origin.revision), 0)
    return Since(origin, dated, found.comparison, every[:place])
