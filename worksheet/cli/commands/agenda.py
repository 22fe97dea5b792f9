"""`biasbook agenda`: what wants a decision before a block or the project can be signed off."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, tell

if TYPE_CHECKING:
    from worksheet.cli.output import Output


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("agenda", help="what wants a decision: missed, stale, waived, not accepted")
    parser.add_argument("project", nargs="?", default=".", help="project folder (default: this one)")
    parser.add_argument("sheet", nargs="*", metavar="SHEET", help="only these blocks")
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """List what wants a decision. 0: nothing; 1: something; 2: bad input."""
    import datetime

    from worksheet.model.problem import Problem
    from worksheet.report import agenda_text
    from worksheet.review.agenda import agenda
    from worksheet.session.since import Since
    from worksheet.session.workbook import Workbook

    today = datetime.datetime.now().astimezone().date()
    workbook = Workbook.read(Path(args.project))
    review = workbook.review(today)
    known = {*workbook.project.sheets, *workbook.project.bad}
    missing = [Problem(args.project, None, "", f"found no sheet {name}") for name in args.sheet if name not in known]
    problems = (*review.problems, *missing)
    items = [item for item in agenda(review, today) if not args.sheet or item.sheet in args.sheet]
    since = Since(Path(args.project), today)
    blocks = {item.sheet for item in items}
    moved = {
        one.sheet.name: [(found.past.about, found.revision, found.moved) for found in since.of(one)]
        for one in review.sheets
        if one.sheet.name in blocks
    }
    tell(problems)
    if output.as_json:
        output.document(agenda_text.document(items, moved, problems))
    elif workbook.project.file is not None:
        output.lines(agenda_text.text(items, moved, output.width))
    if problems:
        return Status.BAD_INPUT
    return Status.NOT_MET if items else Status.FINE
