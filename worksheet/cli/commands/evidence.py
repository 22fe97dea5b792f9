"""`biasbook evidence`: what simulations and benches found, beside the calculation; more of it put into the sheets."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, say, tell
from worksheet.model.sheet_keys import EVIDENCE

if TYPE_CHECKING:
    from worksheet.cli.output import Output
    from worksheet.session.evidence import Cells


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("evidence", help="calculation against what was simulated and measured")
    parser.add_argument("project", nargs="?", default=".", help="project folder (default: this one)")
    parser.add_argument("--add", nargs=3, metavar=("SHEET", "METRIC", "VALUE"), help="put one more piece into a sheet")
    parser.add_argument("--from", dest="table", metavar="CSV", help="put a table of many in: all of it, or nothing")
    for key in EVIDENCE.keys:
        if key.name not in ("metric", "value"):
            parser.add_argument(
                f"--{key.name.replace('_', '-')}", default="", metavar="TEXT", help=f"for --add: {key.help}"
            )
    parser.add_argument("--csv", action="store_true", help="the list as CSV, SI units")
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """List evidence, or put more in. 0; 2 for bad input."""
    import datetime

    from worksheet.report import evidence_text
    from worksheet.report.csv_rows import csv_lines
    from worksheet.review.deviations import deviations, summaries
    from worksheet.session.evidence import put
    from worksheet.session.session import Session
    from worksheet.session.workbook import Workbook

    root, today = Path(args.project), datetime.datetime.now().astimezone().date()
    problems: list[Any] = []
    if args.add or args.table:
        cells = _cells(args, today)
        problems = [one for one in cells if not hasattr(one, "texts")]
        if not problems:
            bases = {one.sheet.name: one.basis for one in Workbook.read(root).review(today).sheets}
            problems = put(Session(root), cells, bases)
            if not problems:
                say(f"biasbook: put in {len(cells)} piece{'s' if len(cells) != 1 else ''} of evidence")
    workbook = Workbook.read(root)
    review = workbook.review(today)
    found = deviations(workbook.evaluator, review)
    problems = [*problems, *review.problems]
    tell(problems)
    if output.as_json:
        output.document(evidence_text.document(found, summaries(found), problems))
    elif args.csv:
        output.lines(csv_lines([evidence_text.COLUMNS, *map(evidence_text.row, found)]))
    elif workbook.project.file is not None and not problems:
        output.lines(evidence_text.text(found, summaries(found), output.width, _moved(root, found, today)))
    return Status.BAD_INPUT if problems else Status.FINE


def _moved(root: Path, found: Any, today: Any) -> dict[tuple[str, str], Any]:
    """What moved since stale evidence was found, by sheet and digest, as far as git knows."""
    from worksheet.session.since import Since

    stale = dict.fromkeys((one.sheet, one.evidence.basis) for one in found if one.stale)
    since = Since(root, today)
    return {key: moved for key in stale if (moved := since.moved(*key)) is not None}


def _cells(args: argparse.Namespace, today: Any) -> list[Cells] | list[Any]:
    """What is to be put in, as typed; or problems."""
    from worksheet.session.evidence import Cells, read_table

    found: list[Any] = read_table(Path(args.table)) if args.table else []
    if args.add:
        sheet, metric, value = args.add
        texts = {key.name: getattr(args, key.name, "") for key in EVIDENCE.keys if key.name not in ("metric", "value")}
        texts = {name: text for name, text in texts.items() if text}
        texts.setdefault("dated", today.isoformat())
        texts.setdefault("found_by", "simulation")
        found.append(Cells(sheet, {"metric": metric, "value": value, **texts}, "command line", None))
    return found
