"""`biasbook front`: the least current and area that meet every target, and where the sheet stands."""

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
    parser = subparsers.add_parser("front", help="the least current and area that meet every target")
    describe(parser)
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Find the front of a sheet. 0: there is one; 1: no point meets every target; 2: bad input."""
    from worksheet.report import front_text
    from worksheet.session.alternatives import front_of

    found = found_of(args, output, front_of)
    if found is None:
        return Status.BAD_INPUT
    title = Path(args.sheet).stem
    written = write(
        args,
        output,
        front_text.rows(found),
        lambda: front_text.document(found, title),
        lambda: front_text.text(found, title, output.width),
    )
    return status(written, found.reason is None)
