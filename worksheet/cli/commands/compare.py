"""`biasbook compare`: what changed between two revisions, inputs and results."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, tell
from worksheet.model.problem import Problem

if TYPE_CHECKING:
    from worksheet.cli.output import Output


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("compare", help="what changed between two revisions, inputs and results")
    parser.add_argument("project", nargs="?", default=".", help="project folder (default: this one)")
    parser.add_argument(
        "old", nargs="?", help="a hash or a prefix, a branch or tag, HEAD~1 (default: the newest revision)"
    )
    parser.add_argument("new", nargs="?", default="working", help='another one, or "working": the files as they stand')
    parser.add_argument(
        "--causes",
        action=argparse.BooleanOptionalAction,
        help="what each changed input did, and what is needed now (default: where at most 30 sheets moved)",
    )
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Compare two states. 0: same; 1: differs; 2: bad input."""
    import datetime

    from worksheet.report import plain, revisions_plain
    from worksheet.session import revisions

    today = datetime.datetime.now().astimezone().date()
    found = revisions.compared(Path(args.project), args.old, args.new, today, args.causes)
    if isinstance(found, Problem):
        tell([found])
        if output.as_json:
            output.document(plain.only_problems([found]))
        return Status.BAD_INPUT
    tell(found.problems)
    if output.as_json:
        output.document(revisions_plain.comparison(found.old, found.new, found.comparison, found.problems))
    else:
        output.lines(revisions_plain.comparison_text(found.old, found.new, found.comparison, output.width))
    if found.problems:
        return Status.BAD_INPUT
    return Status.FINE if found.comparison.same else Status.NOT_MET
