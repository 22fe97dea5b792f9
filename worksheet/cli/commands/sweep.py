"""`biasbook sweep`: one quantity of a sheet against its metrics, with their targets."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.alternatives import describe, found_of, status, write
from worksheet.cli.diagnostics import Status

if TYPE_CHECKING:
    from worksheet.cli.output import Output


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("sweep", help="one quantity of a sheet against its metrics")
    describe(parser)
    parser.add_argument(
        "--of",
        required=True,
        metavar="NAME",
        help="a choice, assumption, own name, temperature, supply, process.DEVICE.PARAMETER or bias.KEY",
    )
    parser.add_argument("--from", dest="low", metavar="VALUE", help="first value (default: a tenth of the present one)")
    parser.add_argument("--to", dest="high", metavar="VALUE", help="last value (default: ten times the present one)")
    parser.add_argument("--points", type=int, default=41, metavar="N", help="how many values (default: 41)")
    parser.add_argument("--log", action="store_true", help="equal ratios between the values instead of equal steps")
    parser.add_argument(
        "--metric", action="append", default=[], metavar="METRIC", help="a metric or target (default: all targets)"
    )
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Sweep a quantity. 0: done; 2: bad input."""
    from worksheet.report import sweep_text
    from worksheet.session.alternatives import SweepAsked, sweep_of

    asked = SweepAsked(args.of, args.low, args.high, args.points, args.log, tuple(args.metric))
    found = found_of(args, output, lambda evaluator, name: sweep_of(evaluator, name, asked))
    if found is None:
        return Status.BAD_INPUT
    title = Path(args.sheet).stem
    written = write(
        args,
        output,
        sweep_text.rows(found),
        lambda: sweep_text.document(found, title),
        lambda: sweep_text.text(found, title, output.width),
    )
    return status(written)
