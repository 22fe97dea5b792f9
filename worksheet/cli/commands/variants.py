"""`biasbook variants`: a sheet and its variants side by side."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING, Any

from worksheet.cli.alternatives import describe, found_of, status, write
from worksheet.cli.diagnostics import Status

if TYPE_CHECKING:
    from worksheet.cli.output import Output


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("variants", help="a sheet's variants side by side")
    describe(parser)
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Lay the variants of a sheet side by side. 0: done; 2: bad input."""
    import datetime

    from worksheet.report import variants_text
    from worksheet.session.alternatives import variants_of

    today = datetime.datetime.now().astimezone().date()
    found = found_of(args, output, lambda evaluator, name: variants_of(evaluator, name, today))
    if found is None:
        return Status.BAD_INPUT
    written = write(
        args,
        output,
        variants_text.rows(found),
        lambda: variants_text.document(found),
        lambda: variants_text.text(found, output.width),
    )
    return status(written and not any(column.problems for column in found.columns))
