"""Time of `history` over 1,000 revisions of 300 sheets, and of `compare`: python -m tests.bench.revisions_speed.

Beside them, in the same run, what git takes for the list and what a Python start takes; printed, not asserted.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time
from pathlib import Path

from tests.bench import many_sheets
from tests.bench.history_of_many import build
from tests.history.repositories import git
from tests.paths import TOP

_RUNS = 5


def spent(command: list[str], folder: Path) -> float:
    """The least wall time of a command. [s]"""
    found = []
    for _ in range(_RUNS):
        start = time.perf_counter()
        subprocess.run(command, cwd=folder, check=False, stdout=subprocess.DEVNULL, stdin=subprocess.DEVNULL)
        found.append(time.perf_counter() - start)
    return min(found)


def program(*arguments: str) -> list[str]:
    """The command line from this tree."""
    code = f"import sys; sys.path.insert(0, {str(TOP)!r}); from worksheet.cli.main import entry; sys.exit(entry())"
    return [sys.executable, "-c", code, *arguments]


def main() -> None:
    """Build both projects, and print the table."""
    with tempfile.TemporaryDirectory() as place:
        many, two = Path(place) / "many", Path(place) / "two"
        build(many, 1_000, 300)
        (many / "biasbook.toml").write_text('schema = 1\ntitle = "many"\n', "utf-8")
        listed = spent(["git", "log", "--name-only"], many)
        python = spent([sys.executable, "-c", "pass"], many)
        ours = spent(program("history", str(many), "--json"), many)
        print(f"git log --name-only {listed * 1e3:.0f} ms, a Python start {python * 1e3:.0f} ms")
        print(f"history {ours * 1e3:.0f} ms, {ours / (2 * (listed + python)):.2f} of twice both together")
        many_sheets.write(two, 300, 27)
        git(two, "init", "-q")
        git(two, "add", ".")
        git(two, "-c", "user.name=A", "-c", "user.email=a@example.org", "commit", "-q", "-m", "one")
        for sheet in sorted((two / "sheets").iterdir())[:3]:
            sheet.write_text(sheet.read_text("utf-8").replace('title = "', 'title = "moved '), "utf-8")
        for options in ((), ("--causes",), ("--no-causes",)):
            print(f"compare {' '.join(options)} {spent(program('compare', str(two), *options), two) * 1e3:.0f} ms")


if __name__ == "__main__":
    main()
