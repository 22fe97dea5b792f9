"""The command line: arguments read, the command run, its exit status handed back."""

from __future__ import annotations

import argparse
import gc
import os
import sys
from collections.abc import Sequence
from importlib import import_module
from typing import NoReturn

from worksheet import __version__
from worksheet.cli.diagnostics import Status, say, tell
from worksheet.cli.output import Output, close_quietly
from worksheet.model.problem import Problem

COMMANDS = (
    "open",
    "demo",
    "start",
    "review",
    "solve",
    "variants",
    "sweep",
    "front",
    "chain",
    "stages",
    "extract",
    "record",
    "history",
    "compare",
    "merge",
    "evidence",
    "agenda",
    "minutes",
    "handoff",
)
"""Modules of worksheet.cli.commands, in the order of the help."""


class _UsageError(Exception):
    """The arguments are off."""


class _Parser(argparse.ArgumentParser):
    def error(self, message: str) -> NoReturn:
        raise _UsageError(f"{message} (see {self.prog} --help)")


def _parser(arguments: Sequence[str]) -> argparse.ArgumentParser:
    """The parser; where the command is named, of that command alone, so that no other has to be loaded."""
    names = arguments[:1] if arguments and arguments[0] in COMMANDS else COMMANDS
    parser = _Parser(
        prog="biasbook",
        description="Calculation sheets for analog stages: what is needed, what is achieved, what binds.",
    )
    parser.add_argument("--version", action="version", version=f"biasbook {__version__}")
    parser.set_defaults(command=_no_command)
    subparsers = parser.add_subparsers(title="commands", metavar="COMMAND", parser_class=_Parser)
    for name in names:
        import_module(f"worksheet.cli.commands.{name}").add(subparsers)
    return parser


def _no_command(args: argparse.Namespace, output: Output) -> int:
    """The app, for the folder that the command is called in."""
    from worksheet.cli.commands import open as open_command

    return open_command.run(argparse.Namespace(**vars(args), project=".", read_only=False), output)


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command.

    Args:
        argv: Arguments without the program's name; those of the process where None.
    Returns: exit status, see diagnostics.Status
    """
    arguments = list(sys.argv[1:] if argv is None else argv)
    output = Output("--json" in arguments)
    try:
        parsed = _parser(arguments).parse_args(arguments)
        status: int = parsed.command(parsed, output)
    except _UsageError as usage:
        return _bad_usage(str(usage), output)
    except SystemExit as stop:  # how argparse ends --help and --version, after it said what was asked for
        return int(stop.code or Status.FINE)
    except BrokenPipeError:
        close_quietly()
        return Status.FINE
    except KeyboardInterrupt:
        say("biasbook: interrupted")
        return 130
    return status


def _bad_usage(message: str, output: Output) -> int:
    problem = Problem("command line", None, "", message)
    tell([problem])
    if output.as_json:
        item = {"file": problem.file, "line": problem.line, "key": problem.key, "message": problem.message}
        output.document({"schema": 1, "problems": [item]})
    return Status.BAD_INPUT


def entry() -> int:
    """What the installed command calls, in a process of its own: what that process can save itself stands here."""
    os.environ.setdefault(
        "OPENBLAS_NUM_THREADS", "1"
    )  # matrices of three rows: threads would only be started and ended
    status = main()
    gc.freeze()  # leaving, Python looks through all that is left for loops, several times
    return status
