"""`biasbook record`: saves a revision of the project's own files."""

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
    parser = subparsers.add_parser("record", help="saves a revision of the project's own files, in git")
    parser.add_argument("project", nargs="?", default=".", help="project folder (default: this one)")
    parser.add_argument("-m", "--note", required=True, help="what changed and why")
    parser.add_argument("--name", help="who records, where git does not know")
    parser.add_argument("--email", help="the e-mail address that goes with --name")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Record a project. 0, also where nothing had changed; 2 where nothing could be recorded."""
    import datetime

    from worksheet.history.outcome import Person
    from worksheet.project.discover import load
    from worksheet.session import revisions

    root = Path(args.project)
    if load(root).file is None:
        tell(load(root).problems)
        return Status.BAD_INPUT
    person = Person(args.name, args.email or "") if args.name else None
    made = revisions.record(root, args.note, datetime.datetime.now().astimezone().date(), person)
    if isinstance(made, Problem):
        tell([made])
        return Status.BAD_INPUT
    for remark in made.remarks:
        say(f"biasbook: {remark}")
    output.lines([f"recorded {made.revision}" if made.revision else "nothing has changed since the newest revision"])
    return Status.FINE
