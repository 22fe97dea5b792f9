"""Records and ordinary commits made at the same time in one repository, and a count of what came of them.

Each side writes growing numbers into files of its own, so that whatever is taken back shows as a number that falls.
"""

import os
import re
import subprocess
import threading
import time
from collections import Counter
from dataclasses import dataclass, field
from pathlib import Path

from tests.history.repositories import SHEET, git, make_project, make_repository, save, try_to_save
from worksheet.history import record
from worksheet.history.outcome import Refused


@dataclass
class Outcome:
    """What was counted.

    Attributes:
        records: Records made, "unchanged", or refused, by the kind of refusal.
        commits: Commits of the other side that went through, and that git refused.
        fallen: Revisions in which a number of either side is lower than in the one before.
        staged: What was staged at the end that belongs to neither side.
        fsck: What git has to say about its store.
    """

    records: Counter[str] = field(default_factory=Counter)
    commits: Counter[str] = field(default_factory=Counter)
    fallen: list[str] = field(default_factory=list)
    staged: list[str] = field(default_factory=list)
    fsck: str = ""
    revisions: int = 0


def run(folder: Path, seconds: float, committers: int = 1) -> Outcome:
    """Record in one thread and commit in others for a while, then count.

    Args:
        folder: Empty; the repository is made in it.
        seconds: How long. [s]
        committers: How many loops of `git add` and `git commit`.
    """
    top = make_repository(folder / "chip")
    project = make_project(top / "p")
    save(project, "begin")
    outcome, end = Outcome(), time.monotonic() + seconds

    def record_on() -> None:
        number = 10
        while time.monotonic() < end:
            number += 1
            (project / "sheets/buffer.toml").write_text(SHEET.format(number), "utf-8")
            made = try_to_save(project, f"record {number}")
            if isinstance(made, Refused):
                outcome.records[made.why.name] += 1
            else:
                outcome.records["recorded" if isinstance(made, record.Recorded) else "unchanged"] += 1

    def commit_on(name: str) -> None:
        number = 10
        while time.monotonic() < end:
            number += 1
            (top / name).write_text(f"{number}\n", "utf-8")
            done = [
                subprocess.run(
                    ["git", *arguments],
                    cwd=top,
                    capture_output=True,
                    stdin=subprocess.DEVNULL,
                    check=False,
                    env=os.environ,
                ).returncode
                for arguments in (("add", name), ("commit", "-q", "-m", f"{name} {number}"))
            ]
            outcome.commits["refused" if any(done) else "committed"] += 1

    threads = [threading.Thread(target=record_on)]
    threads += [threading.Thread(target=commit_on, args=(f"foreign-{number}",)) for number in range(committers)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    outcome.fallen = fallen(top)
    outcome.staged = [
        line for line in git(top, "diff", "--cached", "--name-only").splitlines() if not line.startswith("foreign-")
    ]
    outcome.fsck = git(top, "fsck", "--strict", "--no-dangling")
    outcome.revisions = int(git(top, "rev-list", "--count", "HEAD"))
    return outcome


def fallen(top: Path) -> list[str]:
    """Every change in which a number got lower or a file went away, oldest first."""
    found = []
    log = git(top, "log", "--reverse", "-p", "--unified=0", "--format=commit %h %s")
    commit = before = ""
    for line in log.splitlines():
        if line.startswith("commit "):
            commit, before = line, ""
        elif line.startswith("deleted file"):
            found.append(f"{commit}: {line}")
        elif re.match(r"[-+](?![-+])", line) and (number := re.search(r"\d+", line)):
            if line[0] == "-":
                before = number[0]
            elif before and int(number[0]) < int(before):
                found.append(f"{commit}: {before} to {number[0]}")
    return found
