"""A program that is killed at any moment: what it said was done is on the disk, and every file is whole."""

from __future__ import annotations

import random
import re
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from tests.paths import TOP
from tests.tui.book import SHEETS, write_book
from worksheet.session.session import Session
from worksheet.sheetfile.read import parse_sheet

_EDITING = """
import sys
from pathlib import Path
from worksheet.session.edits import ChangeSheet, Put, RenameSheet
from worksheet.session.session import Session
session = Session(Path(sys.argv[1]))
number = int(sys.argv[2])
name = next(n for n in session.snapshot().names if n.startswith("drip"))
print("ready", flush=True)
while True:
    number += 1
    done = session.apply(ChangeSheet("sun_gate", (Put(("notes",), f"turn {number}"),), ""))
    assert done.accepted, done
    print("turn", number, flush=True)
    new = f"drip_{number}"
    done = session.apply(RenameSheet(name, new))
    assert done.accepted, done
    name = new
    print("name", name, flush=True)
"""


@pytest.mark.full
def test_what_was_said_to_be_done_survives_a_kill(tmp_path: Path) -> None:
    root = write_book(tmp_path / "book")
    rng = random.Random(7)
    said = 0
    for _ in range(25):
        process = subprocess.Popen(
            [sys.executable, "-c", _EDITING, str(root), str(said)], cwd=TOP, stdout=subprocess.PIPE, text=True
        )
        assert process.stdout is not None
        assert process.stdout.readline() == "ready\n"
        time.sleep(rng.uniform(0.02, 0.3))
        process.send_signal(signal.SIGKILL)
        out, _ = process.communicate(timeout=20)
        turns: list[str] = re.findall(r"turn (\d+)\n", str(out))
        said = max([said, *map(int, turns)])
        for path in sorted((root / "sheets").glob("*.toml")):
            sheet, problems = parse_sheet(path.read_bytes(), path.stem, path.name)
            assert sheet is not None, problems
        session = Session(root)
        assert session.snapshot().project.problems == (), "a formula finds its sheet at any moment"
        notes = str(session.snapshot().data("sun_gate").get("notes", "turn 0"))
        assert int(notes.removeprefix("turn ")) in (said, said + 1)
        said = int(notes.removeprefix("turn "))
        names = [name for name in session.snapshot().names if name not in SHEETS or name == "drip_amplifier"]
        assert len(names) in (1, 2), "killed in the middle of a rename a sheet stands under both names"
        linked = str(session.snapshot().data("supply_sense")["assume"])
        for name in names:
            if f"{name}." not in linked:
                (root / "sheets" / f"{name}.toml").unlink()
