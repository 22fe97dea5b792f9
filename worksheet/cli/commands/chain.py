"""`biasbook chain`: signal paths through several sheets, and what each sheet takes of them."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, tell

if TYPE_CHECKING:
    from worksheet.cli.output import Output


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("chain", help="signal paths through several sheets")
    parser.add_argument("project", nargs="?", default=".", help="project folder (default: this one)")
    parser.add_argument("chain", nargs="?", metavar="CHAIN", help="only this chain")
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Review the chains of a project. 0: all limits met; 1: not; 2: bad input."""
    import datetime

    from worksheet.report import chains_text, plain, wording
    from worksheet.session.alternatives import chains_of
    from worksheet.session.workbook import Workbook

    today = datetime.datetime.now().astimezone().date()
    found, problems = chains_of(Workbook.read(Path(args.project)).review(today), args.chain)
    tell(problems)
    if output.as_json:
        document = {"schema": plain.SCHEMA, "chains": [plain.chain(chain) for chain in found]}
        output.document({**document, "problems": plain.problems(problems)})
    else:
        for chain in found:
            output.lines(chains_text.chain(chain, output.width))
            output.lines([""])
        if not found and not problems:
            output.lines(["no chains; a table [chain.NAME] in biasbook.toml names one"])
        output.lines([wording.STANDING] if found else [])
    if problems:
        return Status.BAD_INPUT
    return Status.FINE if all(chain.met for chain in found) else Status.NOT_MET
