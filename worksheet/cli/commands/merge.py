"""`biasbook merge`: merges sheets value by value, as git's merge driver; `--install` puts it in its place."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, say, tell
from worksheet.model.problem import Problem

if TYPE_CHECKING:
    from worksheet.cli.output import Output


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("merge", help="merges sheets value by value, as git's merge driver")
    parser.add_argument(
        "place", nargs="+", metavar="FILE", help="BASE OURS THEIRS [NAME]; with --install the project folder"
    )
    parser.add_argument("--install", action="store_true", help="have git merge this project's files with it")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Merge one file over OURS. 0: nothing left to settle; 1: something is, marked in the file; 2: bad input."""
    if args.install:
        return _install(args.place, output)
    if not 3 <= len(args.place) <= 4:
        tell([Problem("command line", None, "", "expected BASE OURS THEIRS [NAME], or --install PROJECT")])
        return Status.BAD_INPUT
    from worksheet.session.merging import merge

    base, ours, theirs = map(Path, args.place[:3])
    found = merge(base, ours, theirs, (args.place[3:] or [str(ours)])[0])
    if isinstance(found, Problem):
        tell([found])
        return Status.BAD_INPUT
    for key in found.left:
        say(f"biasbook: {args.place[-1]}: {key}: both sides changed it; the review and the app show both")
    return Status.FINE if found.clean else Status.NOT_MET


def _install(places: list[str], output: Output) -> int:
    from worksheet.session.merging import install

    if len(places) != 1:
        tell([Problem("command line", None, "", "expected one project folder after --install")])
        return Status.BAD_INPUT
    found = install(Path(places[0]), f"{_program()} merge")
    if isinstance(found, Problem):
        tell([found])
        return Status.BAD_INPUT
    output.lines(["git merges this project's files by value now" if found else "it was installed already"])
    return Status.FINE


def _program() -> str:
    """How a shell calls this program, wherever git is called from."""
    import shlex
    import shutil
    import sys

    found = shutil.which("biasbook")
    code = "from worksheet.cli.main import entry; raise SystemExit(entry())"
    return shlex.join([found] if found else [sys.executable, "-c", code])
