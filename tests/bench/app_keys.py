"""Keys: how long until the last cell of the answer, how many bytes, with both drivers; idle; memory over many edits.

    python -m tests.bench.app_keys [EDITS]

The aim is 35 ms from a key that steps a choice to the last cell that it repaints. Bytes are those of one such key, with
some forty values of the sheet changing. The memory is that of a session which makes EDITS edits (10,000).
"""

from __future__ import annotations

import os
import resource
import select
import statistics
import sys
import tempfile
import time
from pathlib import Path

from tests.tui.book import write_book
from tests.tui.term import Term
from worksheet.session.edits import ChangeSheet, Put
from worksheet.session.session import Session

KEYS = 30
PAUSE = 0.04
"""Silence that parts the first answer from the next. [s]"""


def answer(term: Term, key: str) -> tuple[float, float, int]:
    """Milliseconds from a key to the end of the first answer and of the last one, and the bytes of both.

    The first holds the values and verdicts; what is needed follows when it is found, after a pause.
    """
    start = last = time.perf_counter()
    first = 0.0
    before = len(term.sent)
    os.write(term.descriptor, key.encode())
    while select.select([term.descriptor], [], [], 0.4)[0]:
        term.sent += os.read(term.descriptor, 65536)
        now = time.perf_counter()
        if now - last > PAUSE and not first and last > start:
            first = last - start
        last = now
    return (first or last - start) * 1000, (last - start) * 1000, len(term.sent) - before


def keys(root: Path, home: Path, environment: dict[str, str]) -> None:
    """Step a choice up and down, and move the cursor."""
    term = Term(["open", str(root)], home, (80, 24), environment)
    term.until("bucket_buffer")
    term.keys("enter")
    term.until("Targets")
    term.read(quiet=6.0, limit=40)
    term.keys("tab")
    term.read(quiet=1.0)
    for title, pressed in (("step", "+-"), ("cursor", ("\x1b[B", "\x1b[A"))):
        found = [answer(term, pressed[k % 2]) for k in range(KEYS)]
        first, last, sent = (statistics.median(one) for one in zip(*found, strict=True))
        print(f"  {title:<7} {first:6.1f} ms, with what is needed {last:6.1f} ms, {sent:7.0f} bytes")
    before = len(term.sent)
    term.read(quiet=5.0, limit=6)
    print(f"  idle    {len(term.sent) - before} bytes in 5 s")
    os.kill(term.pid, 9)
    os.waitpid(term.pid, 0)
    os.close(term.descriptor)


def memory(root: Path, edits: int) -> None:
    """Resident memory before and after many edits of one session."""
    session = Session(root)

    def used() -> float:
        pages = int(Path("/proc/self/statm").read_text("utf-8").split()[1])
        return pages * resource.getpagesize() / 1e6

    session.apply(ChangeSheet("bucket_buffer", (Put(("choose", "bias_current"), "3 uA"),), "bias current"))
    before, start = used(), time.perf_counter()
    for k in range(edits):
        value = f"{3 + (k % 1000) / 1000:.3f} uA"
        session.apply(ChangeSheet("bucket_buffer", (Put(("choose", "bias_current"), value),), "bias current"))
    taken = (time.perf_counter() - start) / edits * 1000
    print(f"{edits} edits: {before:.0f} MB before, {used():.0f} MB after; {taken:.1f} ms an edit, on disk")


def main() -> None:
    """Print everything."""
    edits = int(sys.argv[1]) if len(sys.argv) > 1 else 10_000
    with tempfile.TemporaryDirectory() as folder:
        home = Path(folder)
        for title, environment in (("the toolkit's driver", {}), ("changed cells only", {"BIASBOOK_CELLS": "1"})):
            print(title)
            keys(write_book(home / title.replace(" ", "_").replace("'", "")), home, environment)
        memory(write_book(home / "edits"), edits)


if __name__ == "__main__":
    main()
