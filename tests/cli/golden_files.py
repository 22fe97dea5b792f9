"""Golden files: what the commands say of the sample, kept beside the tests. Run this module to write them anew.

    python -m tests.cli.golden_files

Read the difference before it is committed: these files are what a user sees.
"""

from __future__ import annotations

from pathlib import Path

from tests.paths import TOP
from tests.support import run

GOLDEN = Path(__file__).parent / "golden"
SAMPLE = str(TOP / "sample_projects" / "tide_gauge")
COMMANDS = {
    "review.txt": ("review", SAMPLE),
    "review_details.txt": ("review", SAMPLE, "--details"),
    "review.json": ("review", SAMPLE, "--json"),
    "stages.txt": ("stages",),
    "stages_common_gate.txt": ("stages", "common-gate"),
    "stages.json": ("stages", "--json"),
}
"""What is kept, and the command that says it. The clock does not come in: the sample's waiver has no end."""


def said(name: str) -> str:
    """What a command says now."""
    return run(*COMMANDS[name]).out


if __name__ == "__main__":
    GOLDEN.mkdir(exist_ok=True)
    for file in COMMANDS:
        (GOLDEN / file).write_text(said(file), encoding="utf-8")
