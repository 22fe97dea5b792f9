"""`biasbook stages`: the stages, their metrics and formulas."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, tell
from worksheet.model.problem import Problem

if TYPE_CHECKING:
    from worksheet.cli.output import Output


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("stages", help="the stages, their metrics and formulas")
    parser.add_argument("stage", nargs="?", metavar="STAGE", help="one stage, with everything about it")
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Show the stages. 0; 2 for a stage that does not exist."""
    from worksheet.model.text import nearest
    from worksheet.report import plain, stages_plain, stages_text
    from worksheet.stages import catalogue

    found = catalogue.stages() if args.stage is None else tuple(s for s in catalogue.stages() if s.key == args.stage)
    if not found:
        near = nearest(args.stage, catalogue.keys())
        hint = f"; did you mean {near!r}?" if near else ""
        message = f"found the stage {args.stage!r}, expected one of: {', '.join(catalogue.keys())}{hint}"
        problems = [Problem("command line", None, "STAGE", message)]
        tell(problems)
        if output.as_json:
            output.document(plain.only_problems(problems, stages=[]))
        return Status.BAD_INPUT
    if output.as_json:
        output.document(stages_plain.document(found, formulas=args.stage is not None))
    elif args.stage is None:
        output.lines(stages_text.listed(found, output.width))
    else:
        output.lines(stages_text.one(found[0], output.width))
    return Status.FINE
