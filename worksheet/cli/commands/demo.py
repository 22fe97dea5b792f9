"""`biasbook demo`: a copy of the sample project, opened."""

from __future__ import annotations

import argparse
import importlib
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, say, tell

if TYPE_CHECKING:
    from worksheet.cli.output import Output


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("demo", help="copies a sample project and opens it")
    parser.add_argument(
        "dir",
        metavar="DIR",
        nargs="?",
        help="a folder that is new or empty (default: a new one under your temp folder)",
    )
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Copy the sample and open it; without a terminal, print its review. 0; 2 where it cannot be copied."""
    import tempfile

    from worksheet.model.problem import Problem
    from worksheet.session.samples import copy_sample

    try:
        folder = Path(args.dir if args.dir is not None else tempfile.mkdtemp(prefix="biasbook-demo-"))
    except OSError as error:
        tell([Problem("command line", None, "DIR", f"no folder could be made under the temp folder: {error}")])
        return Status.BAD_INPUT
    problems = copy_sample(folder)
    if problems:
        tell(problems)
        return Status.BAD_INPUT
    where = f"The sample project is in {folder}"
    # Neither front end knows the other: the app is found by its name at the moment it is wanted.
    if importlib.import_module("worksheet.tui.terminal").refusal() is None:
        say(f"{where}. It is yours to change.")
        status: int = importlib.import_module("worksheet.tui.app").run(folder, read_only=False)
        return status
    _print_review(folder, output)
    output.lines(["", f"{where}. In a terminal: biasbook open {folder}"])
    return Status.FINE


def _print_review(folder: Path, output: Output) -> None:
    import datetime

    from worksheet.report import review_text
    from worksheet.session.workbook import Workbook

    result = Workbook.read(folder).review(datetime.datetime.now().astimezone().date())
    tell(result.problems)
    output.lines(review_text.text(result, output.width))
