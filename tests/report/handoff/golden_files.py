"""Golden files: what a hand-off of the sample says, kept beside the tests. Run this module to write them anew.

    python -m tests.report.handoff.golden_files

Read the difference before it is committed: these files are what a colleague reads. Kept are the Markdown of the whole
project, and of one block the text of its page, its table and its plain sizes; pictures belong to the plotting library.
"""

from __future__ import annotations

import re
import shutil
import tempfile
from pathlib import Path

from tests.report.handoff.conftest import SAMPLE, handed
from tests.report.handoff.reading import Page

GOLDEN = Path(__file__).parent / "golden"
BLOCK = "electrode_buffer"


def said(folder: Path) -> dict[str, str]:
    """What is kept of a folder with a hand-off of the project and of the block, by the names of the golden files."""
    stem = f"handoff-{BLOCK}"
    text = Page((folder / f"{stem}.html").read_text("utf-8")).text
    return {
        "project.md": (folder / "handoff.md").read_text("utf-8"),
        "block.txt": re.sub(r"\s*\n\s*", "\n", text).strip() + "\n",
        "block.csv": (folder / f"{stem}.csv").read_text("utf-8").replace("\r\n", "\n"),
        "block-sizes.txt": (folder / f"{stem}-sizes.txt").read_text("utf-8"),
    }


if __name__ == "__main__":
    with tempfile.TemporaryDirectory() as temporary:
        root, into = Path(temporary) / "tide_gauge", Path(temporary) / "out"
        shutil.copytree(SAMPLE, root)
        handed(root, into)
        handed(root, into, BLOCK)
        GOLDEN.mkdir(exist_ok=True)
        for file, content in said(into).items():
            (GOLDEN / file).write_text(content, encoding="utf-8", newline="")
