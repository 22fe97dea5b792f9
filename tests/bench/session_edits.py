"""How long a change takes until it is on disk and reviewed, and what ten thousand of them leave in memory.

python -m tests.bench.session_edits
"""

from __future__ import annotations

import statistics
import tempfile
import time
import tracemalloc
from pathlib import Path

from tests.session.opened import TODAY, typed
from tests.tui.book import write_book
from worksheet.session.session import Session

CHANGES = 1_000
"""Of them; memory is stated for ten thousand."""


def main() -> None:
    """Print milliseconds and megabytes."""
    with tempfile.TemporaryDirectory() as folder:
        session = Session(write_book(Path(folder) / "book"))
        session.review(session.snapshot(), TODAY)
        taken: list[float] = []
        reviewed: list[float] = []
        for number in range(200):
            start = time.perf_counter()
            assert typed(session, "bucket_buffer", ("choose", "bias_current"), f"{4 + number / 1000:g} uA").accepted
            middle = time.perf_counter()
            session.review(session.snapshot(), TODAY)
            taken.append(middle - start)
            reviewed.append(time.perf_counter() - middle)
        print(f"change on disk   {1e3 * statistics.median(taken):6.1f} ms")
        print(f"reviewed anew    {1e3 * statistics.median(reviewed):6.1f} ms")
        start = time.perf_counter()
        for _ in range(1000):
            session.refresh()
        print(f"look for others  {time.perf_counter() - start:6.3f} ms")
        tracemalloc.start()
        for number in range(CHANGES):
            typed(session, "bucket_buffer", ("choose", "bias_current"), f"{5 + number / 10_000:g} uA")
        kept, _ = tracemalloc.get_traced_memory()
        tracemalloc.stop()
        print(f"10,000 changes   {kept / CHANGES * 10_000 / 1e6:6.1f} MB kept")
        start = time.perf_counter()
        for _ in range(200):
            assert session.undo().accepted
        print(f"taken back       {1e3 * (time.perf_counter() - start) / 200:6.1f} ms")


if __name__ == "__main__":
    main()
