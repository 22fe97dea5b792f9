"""`biasbook open`: the terminal app."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, tell

if TYPE_CHECKING:
    from worksheet.cli.output import Output


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser("open", help="the terminal app; biasbook alone means `open .`")
    parser.add_argument(
        "project", metavar="PROJECT", nargs="?", default=".", help="the project folder (default: this one)"
    )
    parser.add_argument("--read-only", action="store_true", help="show everything, change nothing")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Open the app. 0; 2 where there is no project or the terminal cannot show it."""
    del output
    import importlib
    import os.path

    root = Path(args.project)
    if not os.path.isfile(root / "biasbook.toml"):  # noqa: PTH113 (false for names that no file can have); what says why is slow to load, so it is asked where it is needed only
        from worksheet.project.discover import not_a_project

        problem = not_a_project(root)
        if problem is not None:
            tell([problem])
            return Status.BAD_INPUT

    # Neither front end knows the other: the app is found by its name at the moment it is wanted.
    status: int = importlib.import_module("worksheet.tui.start").start(root, read_only=args.read_only)
    return status
