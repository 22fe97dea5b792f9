"""`biasbook minutes`: what was decided since a revision, as a page kept with the project and in a new revision."""

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
    parser = subparsers.add_parser("minutes", help="what was decided since a revision; --close keeps and records it")
    parser.add_argument("project", nargs="?", default=".", help="project folder (default: this one)")
    parser.add_argument("old", nargs="?", default="HEAD", help="the revision the meeting began with (default: HEAD)")
    parser.add_argument("--present", default="", metavar="NAMES", help="who was there")
    parser.add_argument("--close", action="store_true", help="write the page to evidence/minutes and record a revision")
    parser.add_argument("-m", "--note", default="", help="of the revision")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Print or keep the minutes. 0; 2 where the revision or the project cannot be read."""
    import datetime

    from worksheet.session import meeting

    root, today = Path(args.project), datetime.datetime.now().astimezone().date()
    start = meeting.since(root, args.old, today)
    if isinstance(start, Problem):
        tell([start])
        return Status.BAD_INPUT
    if not args.close:
        output.lines(meeting.minutes(root, start, today, args.present)[0].splitlines())
        return Status.FINE
    closed = meeting.close(root, start, today, present=args.present, note=args.note)
    if isinstance(closed, Problem):
        tell([closed])
        return Status.BAD_INPUT
    for remark in closed.remarks:
        say(f"biasbook: {remark}")
    output.lines([f"{closed.file}: {len(closed.decided)} decisions", f"recorded {closed.revision or 'nothing'}"])
    return Status.FINE
