"""Cold start: from the start of the process to a screen with every block and its verdict, against an empty app.

    python tests/bench/open_app.py [RUNS]

Both start in the same pseudo-terminal of 80 columns and 24 lines, in turns, so that the machine's load falls on both.
The aim is a ratio of 1.6 at most.
"""

from __future__ import annotations

import os
import shutil
import statistics
import sys
import tempfile
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from tests.tui.book import SHEETS, write_book
from tests.tui.term import Term

EMPTY = """
import os
os.environ["TEXTUAL_ANIMATIONS"] = "none"
from textual.app import App
from textual.widgets import Static
class Empty(App):
    def compose(self):
        yield Static("ready")
Empty().run(mouse=False)
"""
BOOK = "import sys; from worksheet.cli.main import entry; sys.exit(entry())"


def first_paint(program: str, arguments: list[str], home: Path, shown: list[str]) -> float:
    """Milliseconds until the screen shows all the texts."""
    import tests.tui.term as terms

    terms.PROGRAM = program
    start = time.perf_counter()
    term = Term(arguments, home, (80, 24), {})
    while not all(text in term.text for text in shown):
        term.read(quiet=0.002, limit=0.01)
        assert time.perf_counter() - start < 30, term.text
    taken = time.perf_counter() - start
    os.kill(term.pid, 9)
    os.waitpid(term.pid, 0)
    os.close(term.descriptor)
    return taken * 1000


def main() -> None:
    """Print medians and their ratio."""
    runs = int(sys.argv[1]) if len(sys.argv) > 1 else 9
    with tempfile.TemporaryDirectory() as folder:
        home = Path(folder)
        root = write_book(home / "project")
        wanted = [*SHEETS, "missed, 0 unknown"]
        empty, first, again = [], [], []
        for _ in range(runs + 1):  # the first of each warms the page cache and does not count
            empty.append(first_paint(EMPTY, [], home, ["ready"]))
            shutil.rmtree(home / ".local", ignore_errors=True)  # forgets the picture that is kept
            first.append(first_paint(BOOK, ["open", str(root)], home, wanted))
            time.sleep(1.5)  # the copy that made the picture keeps it
            again.append(first_paint(BOOK, ["open", str(root)], home, wanted))
    one = statistics.median(empty[1:])
    for title, times in (("empty app", empty), ("first time", first), ("again", again)):
        middle = statistics.median(times[1:])
        print(f"{title:<11}{middle:6.0f} ms  ({min(times[1:]):.0f} to {max(times[1:]):.0f})  ratio {middle / one:.2f}")


if __name__ == "__main__":
    main()
