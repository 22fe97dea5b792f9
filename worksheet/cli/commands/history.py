"""`biasbook history`: the revisions of a project or of one of its sheets."""

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
    parser = subparsers.add_parser("history", help="the revisions, newest first")
    parser.add_argument("project", nargs="?", default=".", help="project folder (default: this one)")
    parser.add_argument("sheet", nargs="?", metavar="SHEET", help="only revisions that touched this sheet")
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """List revisions. 0; 2 where there is no repository to ask."""
    from worksheet.report import plain, revisions_plain
    from worksheet.session import revisions

    listed = revisions.history(Path(args.project), args.sheet)
    if isinstance(listed, Problem):
        tell([listed])
        if output.as_json:
            output.document(plain.only_problems([listed], revisions=[]))
        return Status.BAD_INPUT
    if output.as_json:
        output.document(revisions_plain.history(listed))
    else:
        output.lines(revisions_plain.history_text(listed, output.width))
    return Status.FINE
