"""`biasbook review`: spec against achieved, every sheet, every condition."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, tell

if TYPE_CHECKING:
    from worksheet.cli.output import Output


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("review", help="spec against achieved, every sheet, every condition")
    parser.add_argument("project", nargs="?", default=".", help="project folder (default: this one)")
    parser.add_argument("--details", action="store_true", help="also choices, operating points and metrics at nominal")
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Review a project. 0: all met or waived and in budget; 1: not; 2: bad input."""
    import datetime

    from worksheet.report import plain, review_text
    from worksheet.session.workbook import Workbook

    result = Workbook.read(Path(args.project)).review(datetime.datetime.now().astimezone().date())
    tell(result.problems)
    if output.as_json:
        output.document(plain.review(result))
    elif result.sheets or not result.problems:
        output.lines(review_text.text(result, output.width, details=args.details))
    if result.problems:
        return Status.BAD_INPUT
    return Status.FINE if result.met else Status.NOT_MET
