"""`biasbook solve`: what is needed, window by window, with the algebra."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, tell

if TYPE_CHECKING:
    from worksheet.cli.output import Output
    from worksheet.session.needs import Needs


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("solve", help="what is needed, window by window, with the algebra")
    parser.add_argument("sheet", metavar="SHEET.toml", help="a sheet of a project: PROJECT/sheets/NAME.toml")
    parser.add_argument(
        "--over", choices=("nominal", "all"), help="conditions that count (default: the sheet's own choice)"
    )
    parser.add_argument("--for", dest="target", metavar="TARGET", help="only the bounds of this target")
    parser.add_argument(
        "--of", dest="unknown", metavar="UNKNOWN", help="only the window of this design variable or assumption"
    )
    parser.add_argument(
        "--take", action="store_true", help="write the recommended point into the sheet, on the layout grid"
    )
    parser.add_argument(
        "--why", metavar="NUMBER", help="only the algebra of one number: a metric, a figure, DEVICE.VALUE, an input"
    )
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Solve a sheet. 0: feasible; 1: not; 2: bad input."""
    from worksheet.report import plain
    from worksheet.session.needs import Needs

    if args.why:
        return _why(args, output)
    found = Needs.of(Path(args.sheet), args.over, args.target, args.unknown)
    problems = found if isinstance(found, list) else found.take() if args.take else []
    if problems:
        tell(problems)
        if output.as_json:
            output.document(plain.only_problems(problems, sheet=Path(args.sheet).stem))
        return Status.BAD_INPUT
    assert isinstance(found, Needs)  # a list would have held a problem
    return _show(found, output)


def _show(found: Needs, output: Output) -> int:
    from worksheet.report import solve_plain, solve_text

    if output.as_json:
        output.document(solve_plain.document(found.solved, found.hand))
    else:
        text = solve_text.text(found.solved, found.title, found.keys, found.hand, output.width, found.asked)
        output.lines(text)
    return Status.FINE if found.solved.feasible else Status.NOT_MET


def _why(args: argparse.Namespace, output: Output) -> int:
    """The algebra of one number at the nominal condition. 0; 2 where the sheet has no such number."""
    from worksheet.report import algebra_text, plain
    from worksheet.session.explaining import explained

    found = explained(Path(args.sheet), args.why)
    if isinstance(found, list):
        tell(found)
        if output.as_json:
            output.document(plain.only_problems(found, sheet=Path(args.sheet).stem))
        return Status.BAD_INPUT
    if output.as_json:
        output.document(algebra_text.document(found))
    else:
        output.lines(algebra_text.explanation(found, output.width))
    return Status.FINE
