"""Time to list and to read 1,000 revisions of 300 sheets: python -m tests.bench.history_of_many [REVISIONS SHEETS].

Set beside what git itself takes for the same list; printed, not asserted.
"""

import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

from tests.history.repositories import SHEET, found, git, save
from worksheet.history import record, revisions
from worksheet.history.own import own_files


def build(project: Path, revisions_wanted: int, sheets: int) -> None:
    """One commit of all sheets, and then commits that each change three of them."""
    (project / "sheets").mkdir(parents=True)
    git(project, "init", "-q", "-b", "main")
    feed = subprocess.Popen(["git", "fast-import", "--quiet"], cwd=project, stdin=subprocess.PIPE)
    assert feed.stdin is not None
    padding = "# a comment of some length, as sheets have them\n" * 60
    for number in range(revisions_wanted):
        changed = range(sheets) if number == 0 else {(number * step) % sheets for step in (1, 7, 31)}
        note = f"revision {number}"
        feed.stdin.write(
            f"commit refs/heads/main\ncommitter Ada <ada@example.org> {1_700_000_000 + 60 * number} +0000\n"
            f"data {len(note)}\n{note}\n".encode()
        )
        for sheet in changed:
            text = (SHEET.format(4 + number) + padding).encode()
            feed.stdin.write(f"M 100644 inline sheets/block_{sheet}.toml\ndata {len(text)}\n".encode() + text + b"\n")
    feed.stdin.close()
    assert feed.wait() == 0
    git(project, "checkout", "-q", "-f", "main")


def best(what: str, call: Callable[[], Any], times: int = 7) -> float:
    """Print and return the shortest of some runs. [s]"""
    spent = []
    for _ in range(times):
        start = time.perf_counter()
        call()
        spent.append(time.perf_counter() - start)
    print(f"{what:<64} {min(spent) * 1e3:8.1f} ms")
    return min(spent)


def main() -> None:
    """Build, then measure each reading and a record."""
    count, sheets = (int(sys.argv[1]), int(sys.argv[2])) if len(sys.argv) > 2 else (1000, 300)
    with tempfile.TemporaryDirectory() as folder:
        (Path(folder) / ".gitconfig").write_text("[user]\nname = Ada\nemail = ada@example.org\n", "utf-8")
        os.environ |= {"HOME": folder, "GIT_CONFIG_NOSYSTEM": "1"}
        project = Path(folder) / "project"
        build(project, count, sheets)
        print(f"{count} revisions, {sheets} sheets")
        place = found(project)
        listed = revisions.history(place)
        assert isinstance(listed, tuple)
        assert len(listed) == count
        program = (
            "from pathlib import Path; from worksheet.history import repository, revisions;"
            f"print(len(revisions.history(repository.find(Path({str(project)!r})))))"
        )
        log = ["git", "log", "--name-only", "--format=%H", "--", "sheets"]
        alone = best("git log --name-only", lambda: subprocess.run(log, cwd=project, capture_output=True, check=True))
        start = best("python start", lambda: subprocess.run([sys.executable, "-c", ""], check=True))
        whole = best(
            "history, from the start of python",
            lambda: subprocess.run([sys.executable, "-c", program], capture_output=True, check=True),
        )
        print(f"{'  over twice git log and a python start':<64} {whole / (2 * alone + start):8.2f}")
        best("find", lambda: found(project))
        best("history", lambda: revisions.history(place))
        best("history of one sheet", lambda: revisions.history(place, "sheets/block_7.toml"))
        hashes = [one.revision for one in listed]
        best("one file in every revision", lambda: revisions.read_versions(place, "sheets/block_7.toml", hashes))
        best("all files of one revision", lambda: revisions.read_files(place, hashes[-1]))
        best("all files of two revisions", lambda: list(revisions.read_revisions(place, [hashes[0], hashes[-1]])))
        best("all files of every revision", lambda: list(revisions.read_revisions(place, hashes)), times=1)
        best("what is not recorded yet: nothing", lambda: record.unrecorded(place, own_files(project)))
        numbers = iter(range(10_000, 20_000))

        def change() -> None:
            (project / "sheets/block_7.toml").write_text(SHEET.format(next(numbers)), "utf-8")
            save(project, "one sheet")

        best("record of one changed sheet, find and gone included", change)


if __name__ == "__main__":
    main()
