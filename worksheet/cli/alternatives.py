"""What the commands about one sheet's alternatives share: finding the sheet, and where their tables go."""

from __future__ import annotations

import argparse
from collections.abc import Callable, Iterable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

from worksheet.cli.diagnostics import Status, tell

if TYPE_CHECKING:
    from worksheet.cli.output import Output
    from worksheet.model.problem import Problem
    from worksheet.project.evaluate import Evaluator

STANDARD = "-"
_Found = TypeVar("_Found")


def describe(parser: argparse.ArgumentParser) -> None:
    """The arguments that these commands have in common."""
    parser.add_argument("sheet", metavar="SHEET.toml", help="a sheet of a project: PROJECT/sheets/NAME.toml")
    parser.add_argument("--csv", metavar="FILE", help="write a table in SI units; - for standard output")
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")


def found_of(
    args: argparse.Namespace, output: Output, find: Callable[[Evaluator, str], _Found | list[Problem]]
) -> _Found | None:
    """What was found for the sheet that was named; None where problems were told instead."""
    from worksheet.report import plain
    from worksheet.session.alternatives import opened

    place = opened(Path(args.sheet))
    found = place if isinstance(place, list) else find(*place)
    if not isinstance(found, list):
        return found
    tell(found)
    if output.as_json:
        output.document(plain.only_problems(found, sheet=Path(args.sheet).stem))
    return None


def write(
    args: argparse.Namespace,
    output: Output,
    rows: Iterable[Sequence[Any]],
    document: Callable[[], dict[str, Any]],
    text: Callable[[], Iterable[str]],
) -> bool:
    """Write what was asked for: the table, the document, or the text. Whether the table's file could be written."""
    from worksheet.model.problem import Problem
    from worksheet.report.csv_rows import csv_lines

    if args.csv is not None and args.csv != STANDARD:
        try:
            Path(args.csv).write_text("".join(f"{line}\r\n" for line in csv_lines(rows)), encoding="utf-8", newline="")
        except OSError as error:
            tell([Problem(args.csv, None, "", f"the table cannot be written: {error.strerror}")])
            return False
    if output.as_json:
        output.document(document())
    elif args.csv == STANDARD:
        output.lines(csv_lines(rows))
    else:
        output.lines(text())
    return True


def status(written: bool, fine: bool = True) -> Status:
    """How the command ends."""
    return Status.BAD_INPUT if not written else Status.FINE if fine else Status.NOT_MET
