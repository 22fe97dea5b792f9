"""How git is run: with which settings, in which environment, and for how long.

A repository may have been received from anybody. So the git program is started with an argument list and never through
a shell, with standard input closed, a time limit and an environment of which git's own variables are dropped; every
setting by which a repository could name a program is overridden; and only plumbing is used, since `status` and `diff`
run filters and `commit` runs hooks. Hooks, filters and signing programs are therefore not run, also not the user's own.

No other file starts a program; what git is asked stands in repository.
"""

from __future__ import annotations

import os
import subprocess
from collections.abc import Mapping, Sequence
from pathlib import Path
from types import MappingProxyType

from worksheet.history.outcome import ADVICE, RefusedError, Why
from worksheet.model.text import clean

SECONDS = 60.0
"""Longest that one call of git may take. [s]"""

_OPTIONS = (
    "core.fsmonitor=false",
    "core.hooksPath=/dev/null",
    "gc.auto=0",
    "maintenance.auto=false",
    "core.pager=cat",
    "diff.external=",
    "core.quotePath=false",
    "log.showSignature=false",  # would start the signature program that the repository names
    "commit.gpgSign=false",
    "protocol.allow=never",  # nothing here has a reason to reach a remote
    "safe.bareRepository=explicit",  # a project folder laid out like a repository is none
    "user.useConfigOnly=true",  # rather ask than make up an address from the name of the machine
    "core.splitIndex=false",  # a copy of the index has to be whole
    "diff.relative=false",
    "diff.orderFile=/dev/null",
    "log.follow=false",
    "i18n.commitEncoding=UTF-8",
    "i18n.logOutputEncoding=UTF-8",
)
_KEPT = {
    "GIT_AUTHOR_NAME", "GIT_AUTHOR_EMAIL", "GIT_AUTHOR_DATE", "GIT_COMMITTER_NAME", "GIT_COMMITTER_EMAIL",
    "GIT_COMMITTER_DATE", "GIT_CONFIG_GLOBAL", "GIT_CONFIG_SYSTEM", "GIT_CONFIG_NOSYSTEM",
    "GIT_CEILING_DIRECTORIES", "GIT_DISCOVERY_ACROSS_FILESYSTEM",
}  # fmt: skip
_FIXED = {
    "GIT_TERMINAL_PROMPT": "0",
    "GIT_OPTIONAL_LOCKS": "0",
    "GIT_LITERAL_PATHSPECS": "1",
    "GIT_NO_REPLACE_OBJECTS": "1",
    "GIT_NO_LAZY_FETCH": "1",
    "GIT_ALLOW_PROTOCOL": "none",
    "LC_ALL": "C",
}
_PROGRAM = "git"
_KINDS = (
    ("dubious ownership", Why.UNSAFE),
    ("unsafe repository", Why.UNSAFE),
    ("must be run in a work tree", Why.BARE),
    ("cannot use bare repository", Why.BARE),
    ("Please tell me who you are", Why.NO_IDENTITY),
    ("auto-detection is disabled", Why.NO_IDENTITY),
    ("ident name", Why.NO_IDENTITY),
)


def run(
    folder: Path, arguments: Sequence[str], stdin: bytes = b"",
    environment: Mapping[str, str] = MappingProxyType({}), also_fails: Sequence[int] = (), keep: Sequence[int] = (),
) -> bytes:  # fmt: skip
    """Run git once.

    Args:
        folder: Where.
        arguments: The command.
        stdin: What it reads; without it standard input is closed.
        environment: Added to the filtered one.
        also_fails: Exit statuses other than 0 that are an answer.
        keep: Open files that stay open in git, so that a lock outlives us as long as git runs.

    Returns: what it printed.

    Raises: RefusedError.
    """
    options = [part for option in _OPTIONS for part in ("-c", option)]
    command = [_PROGRAM, "--no-pager", *options, *arguments]
    closed = None if stdin else subprocess.DEVNULL
    environment = _environment() | dict(environment)
    if not environment["PATH"]:  # an empty one would mean the folder that the project lies in
        raise RefusedError(Why.NO_PROGRAM, ADVICE[Why.NO_PROGRAM])
    try:
        done: subprocess.CompletedProcess[bytes] = subprocess.run(
            command, cwd=folder, env=environment, stdin=closed, input=stdin or None,
            capture_output=True, timeout=SECONDS, check=False, pass_fds=keep,
        )  # fmt: skip
    except subprocess.TimeoutExpired:
        message = f"git {arguments[0]} took longer than {SECONDS:.0f} s and was stopped: is the disk slow?"
        raise RefusedError(Why.TIMEOUT, message) from None
    except (OSError, ValueError) as error:
        if isinstance(error, FileNotFoundError) and error.filename == _PROGRAM:
            raise RefusedError(Why.NO_PROGRAM, ADVICE[Why.NO_PROGRAM]) from None
        raise RefusedError(Why.FAILED, f"git could not be started in {clean(str(folder))}: {error}.") from None
    if done.returncode == 0 or done.returncode in also_fails:
        return done.stdout
    said = clean(done.stderr.decode("utf-8", "replace").strip(), lines=True)
    why = next((kind for text, kind in _KINDS if text in said), Why.FAILED)
    raise RefusedError(why, ADVICE.get(why) or f"git {arguments[0]} failed: {said or f'exit {done.returncode}'}")


def _environment() -> dict[str, str]:
    """The user's environment without what would turn git to another repository, another program or another language."""
    kept = {name: value for name, value in os.environ.items() if not name.startswith("GIT_") or name in _KEPT}
    # An entry that is not absolute would find programs in whatever folder the project lies in.
    kept["PATH"] = os.pathsep.join(
        place for place in kept.get("PATH", os.defpath).split(os.pathsep) if place.startswith(os.sep)
    )
    kept.pop("LANGUAGE", None)
    return kept | _FIXED
