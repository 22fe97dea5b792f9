"""`biasbook review`: spec against achieved, every sheet, every condition."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.arguments import count
from worksheet.cli.diagnostics import Status, tell

if TYPE_CHECKING:
    from worksheet.cli.output import Output


_MOST_SAMPLES = 1_000_000
_COLLECT_AFTER = 100_000
"""Objects made before loops among them are looked for: what a review makes stays, and has none."""


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("review", help="spec against achieved, every sheet, every condition")
    parser.add_argument("project", nargs="?", default=".", help="project folder (default: this one)")
    parser.add_argument("--details", action="store_true", help="also choices, operating points and metrics at nominal")
    parser.add_argument("--fragile", action="store_true", help="how far every input can move before a target breaks")
    parser.add_argument(
        "--samples",
        type=count(_MOST_SAMPLES, "samples"),
        default=0,
        metavar="N",
        help="yield over N samples of mismatch",
    )
    parser.add_argument("--seed", type=int, default=0, metavar="S", help="of the samples (default: 0)")
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Review a project. 0: all met or waived and in budget; 1: not; 2: bad input."""
    import datetime
    import gc

    from worksheet.review.deeper import Wanted
    from worksheet.session.workbook import Workbook

    gc.set_threshold(_COLLECT_AFTER)
    workbook = Workbook.read(Path(args.project))
    result = workbook.review(datetime.datetime.now().astimezone().date())
    beside = workbook.deeper(result, Wanted(args.fragile, args.samples, args.seed))
    tell(result.problems)
    if output.as_json:
        from worksheet.report import deeper_plain, plain

        output.document(deeper_plain.into_document(plain.review(result), beside))
    elif result.sheets or not result.problems:
        from worksheet.report import deeper, review_text

        output.lines(review_text.text(result, output.width, details=args.details))
        output.lines(deeper.text(result, beside, output.width))
    if result.problems:
        return Status.BAD_INPUT
    return Status.FINE if result.met else Status.NOT_MET
