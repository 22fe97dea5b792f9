"""`biasbook history`: the revisions of a project or of one of its sheets."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from importlib import import_module
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.arguments import count
from worksheet.cli.diagnostics import Status, tell
from worksheet.model.problem import Problem

if TYPE_CHECKING:
    from worksheet.cli.output import Output


_MOST_REVISIONS = 1_000_000


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("history", help="the revisions, newest first")
    parser.add_argument("project", nargs="?", default=".", help="project folder (default: this one)")
    parser.add_argument("sheet", nargs="?", metavar="SHEET", help="only revisions that touched this sheet")
    parser.add_argument("--value", metavar="KEY", help="every change of one value of the sheet, such as choose.width")
    parser.add_argument("--metric", metavar="NAME", help="a metric or target of the sheet over the revisions")
    parser.add_argument(
        "--most",
        type=count(_MOST_REVISIONS, "revisions"),
        default=60,
        metavar="N",
        help="revisions for --metric (default: 60)",
    )
    parser.add_argument("--csv", action="store_true", help="for --value and --metric: as CSV, SI units")
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """List revisions. 0; 2 where there is no repository to ask."""
    import threading

    from worksheet.session import listing

    if args.value or args.metric:
        return _traced(args, output)
    threading.Thread(target=import_module, args=("worksheet.report.history_text",)).start()  # while git looks
    listed = listing.history(Path(args.project), args.sheet)
    if isinstance(listed, Problem):
        tell([listed])
        if output.as_json:
            from worksheet.report import plain

            output.document(plain.only_problems([listed], revisions=[]))
        return Status.BAD_INPUT
    from worksheet.report import history_text

    if output.as_json:
        output.document(history_text.history(listed))
    else:
        output.lines(history_text.history_text(listed, output.width))
    return Status.FINE


def _traced(args: argparse.Namespace, output: Output) -> int:
    """One value or one metric of a sheet over the revisions."""
    import datetime

    from worksheet.report import plain, tracing_text
    from worksheet.report.csv_rows import csv_lines
    from worksheet.session import tracing

    root, today = Path(args.project), datetime.datetime.now().astimezone().date()
    found: Any
    if args.sheet is None or (args.value and args.metric):
        found = Problem("command line", None, "", "expected PROJECT SHEET and one of --value and --metric")
    elif args.value:
        found = tracing.value(root, args.sheet, args.value)
    else:
        found = tracing.metric(root, args.sheet, args.metric, today, args.most)
    if isinstance(found, Problem):
        tell([found])
        if output.as_json:
            output.document(plain.only_problems([found], history=[]))
        return Status.BAD_INPUT
    name = args.value or args.metric
    columns: Sequence[str]
    if args.value:
        entries = [(one.revision, one.value, one.unit) for one in found]
        columns, rows = tracing_text.VALUE_COLUMNS, tracing_text.value_rows(entries)
        text = tracing_text.value_text(entries, output.width)
    else:
        points = [(one.revision, one.nominal, one.worst, one.unit, one.verdict) for one in found]
        columns, rows = tracing_text.METRIC_COLUMNS, tracing_text.metric_rows(points)
        text = tracing_text.metric_text(name, points, output.width)
    if output.as_json:
        output.document(tracing_text.document(name, columns, rows))
    elif args.csv:
        output.lines(csv_lines([columns, *rows]))
    else:
        output.lines(text)
    return Status.FINE
