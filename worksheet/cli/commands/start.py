"""`biasbook start`: a new project with a commented process file and one sheet."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, tell
from worksheet.model.problem import Problem

if TYPE_CHECKING:
    from worksheet.cli.output import Output

_FIRST = "source-follower"


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("start", help="a new project with a commented process file and one sheet")
    parser.add_argument("dir", metavar="DIR", help="a folder that is new or empty")
    parser.add_argument("--stage", default=_FIRST, help=f"stage of the first sheet (default: {_FIRST})")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Write a new project. 0; 2 where the folder is not empty or cannot be written."""
    from worksheet.model.text import clean
    from worksheet.session import starter
    from worksheet.stages import catalogue

    stage = catalogue.find(args.stage)
    if stage is None:
        message = f"found the stage {args.stage!r}, expected one of: {', '.join(catalogue.keys())}"
        problems = [Problem("command line", None, "--stage", message)]
    else:
        problems = starter.start(Path(args.dir), stage)
    tell(problems)
    if problems:
        return Status.BAD_INPUT
    output.lines(
        [
            f"A new project is in {clean(args.dir)}.",
            f"Put your process's numbers into {starter.PROCESS_FILE}, then: biasbook review {clean(args.dir)}",
        ]
    )
    return Status.FINE
