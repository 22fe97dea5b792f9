"""`biasbook handoff`: a block or the project for a colleague, as HTML, Markdown, CSV and plain sizes."""

from __future__ import annotations

import argparse
import os
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, tell

if TYPE_CHECKING:
    from worksheet.cli.output import Output


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("handoff", help="a block or the project for a colleague: HTML, Markdown, CSV")
    parser.add_argument("project", nargs="?", default=".", help="project folder (default: this one)")
    parser.add_argument("-o", "--output", required=True, metavar="DIR", help="where the pages go")
    parser.add_argument(
        "--sheet", action="extend", nargs="+", default=[], metavar="NAME", help="a page for each of these blocks"
    )
    parser.add_argument(
        "--since", metavar="REVISION", help="say what moved since this (default: the last hand-off in DIR)"
    )
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Write a hand-off. 0; 2 where something of the project is wrong, or the pages cannot be written."""
    import datetime

    from worksheet.session.handoff import hand_off
    from worksheet.session.handoff_folder import Written

    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    today = datetime.datetime.now().astimezone().date()
    folder = Path(args.output)
    made = hand_off(Path(args.project), folder, args.sheet, today, args.since)
    if not isinstance(made, Written):
        tell(made)
        return Status.BAD_INPUT
    tell(made.problems)
    output.lines(str(folder / name) for name in made.files)
    return Status.BAD_INPUT if made.problems else Status.FINE
