"""Foreign text and a foreign world: escapes in titles, a note of a megabyte, others writing, disks that fail."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import threading
import time
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from tests.tui.book import write_book
from tests.tui.term import Term, running

pytestmark = pytest.mark.full

SHEET = "bucket_buffer"
TITLES = {
    "markup": "[/V] [red]x[/red] [@click=app.exit(3)]y[/] [uA]",
    "escapes": "\\u001b]0;taken\\u0007\\u001b[2J\\u001b[31mred\\u009b31m\\u009d0;x\\u009c",
    "hidden": "a\\u202eb\\u200bc\\u2066d\\ufeff\\U000E0041",
    "wide": "漢字カナ ＷＩＤＥ e\\u0301 🙂",
}


def stated(root: Path) -> dict[str, Any]:
    return tomllib.loads((root / "sheets" / f"{SHEET}.toml").read_text("utf-8"))


def change(root: Path, old: str, new: str) -> None:
    path = root / "sheets" / f"{SHEET}.toml"
    text = path.read_text("utf-8")
    assert old in text
    beside = path.with_name("beside")
    beside.write_text(text.replace(old, new, 1), "utf-8")
    beside.replace(path)


def enter(term: Term, text: str) -> None:
    """Put a bias current into the first sheet, the cursor being on it."""
    term.keys("enter")
    for _ in range(12):
        term.keys("backspace")
    term.type(text)
    term.keys("enter")


def said(term: Term) -> str:
    """The screen as one line, whatever was wrapped."""
    return " ".join(term.text.lower().split())


def at_the_current(term: Term) -> None:
    term.until(SHEET)
    term.keys("enter")
    term.until("Targets")
    term.keys("tab")
    term.until("Bias current")


@pytest.mark.parametrize("kind", TITLES)
def test_text_of_a_sheet_is_shown_and_nothing_else(root: Path, tmp_path: Path, kind: str) -> None:
    for old in ("Bucket sensor buffer", "M. Okafor", "Drives the row wires", "floor plan, rev 3", "run 118"):
        change(root, old, TITLES[kind])
    with running(root, home=tmp_path) as term:
        at_the_current(term)
        for _ in range(12):
            term.keys("tab", "down")
        term.keys("?")
        term.keys("escape", " ", "escape", "q")
        assert term.ended() == 0
        for sign in (b"\x1b]0;", b"\xc2\x9b", b"\xc2\x9d", "\u202e".encode(), "\u200b".encode(), b"Traceback"):
            assert sign not in term.sent
    assert stated(root)["title"] == tomllib.loads(f'x = "{TITLES[kind]}"')["x"]


def test_a_note_of_a_megabyte_is_carried_along(root: Path, tmp_path: Path) -> None:
    note = "A long story. " * 75_000
    change(root, "Drives the row wires of the bucket array.", note)
    with running(root, home=tmp_path) as term:
        at_the_current(term)
        enter(term, "5 uA")
        term.read(quiet=1.0)
        term.keys("q")
        assert term.ended() == 0
    assert stated(root)["choose"]["bias_current"] == "5 uA"
    assert stated(root)["notes"] == note


def test_another_program_writes_ten_times_a_second(root: Path, tmp_path: Path) -> None:
    """It changes the title; the user changes the current; at the end both are there and the run is sound."""
    stop = threading.Event()
    written: list[int] = []

    def write() -> None:
        path = root / "sheets" / f"{SHEET}.toml"
        while not stop.wait(0.1):
            text = path.read_text("utf-8")
            beside = path.with_name(".other")
            beside.write_text(re.sub('title = ".*"', f'title = "Number {len(written)}"', text), "utf-8")
            if path.read_text("utf-8") == text:  # an honest writer looks again before it replaces
                beside.replace(path)
                written.append(1)

    with running(root, home=tmp_path) as term:
        at_the_current(term)
        other = threading.Thread(target=write)
        other.start()
        try:
            for k in range(10):
                enter(term, f"{4 + k / 10} uA")
                time.sleep(0.2)
        finally:
            stop.set()
            other.join()
        assert len(written) > 5
        enter(term, "7 uA")
        term.read(quiet=1.5)
        assert f"Number {len(written) - 1}"[:9] in term.text
        term.keys("q")
        assert term.ended() == 0
    assert stated(root)["choose"]["bias_current"] == "7 uA"
    assert stated(root)["title"] == f"Number {len(written) - 1}"


def test_a_folder_that_goes_away_and_comes_back(root: Path, tmp_path: Path) -> None:
    with running(root, home=tmp_path) as term:
        at_the_current(term)
        away = root.with_name("away")
        root.rename(away)
        term.read(quiet=1.5)
        enter(term, "5 uA")
        term.keys("escape")
        away.rename(root)
        term.read(quiet=1.5)
        assert stated(root)["choose"]["bias_current"] == "4 uA"
        term.keys("escape", "escape")
        term.until(SHEET)
        assert b"Traceback" not in term.sent
        term.keys("q")
        assert term.ended() == 0


def test_opened_for_reading_nothing_changes(root: Path, tmp_path: Path) -> None:
    before = {path: path.read_bytes() for path in (root / "sheets").iterdir()}
    with running(root, "--read-only", home=tmp_path) as term:
        term.until("for reading only")
        term.keys("x", "d", "r", "n", "enter")
        term.until("Targets")
        term.keys("tab", "+", "-", "5", "a", "x", "p", "z", "enter", "escape")
        term.keys("q")
        term.read(quiet=0.5)
    assert {path: path.read_bytes() for path in (root / "sheets").iterdir()} == before


@pytest.fixture
def mounted(tmp_path: Path) -> Iterator[Path]:
    """A small disk in memory, where the system lets the test have one."""
    place = tmp_path / "disk"
    place.mkdir()
    done = subprocess.run(
        ["mount", "-t", "tmpfs", "-o", "size=600k", "tmpfs", str(place)], capture_output=True, check=False
    )
    if done.returncode:
        pytest.skip("a disk of its own needs the right to mount one")
    yield place
    subprocess.run(["umount", "-l", str(place)], check=True)


def test_a_full_disk_is_told_and_loses_nothing(mounted: Path, tmp_path: Path) -> None:
    root = write_book(mounted / "project")
    with running(root, home=tmp_path) as term:
        at_the_current(term)
        with (mounted / "filler").open("wb", buffering=0) as filler:
            try:
                while True:
                    filler.write(b"x" * 512)
            except OSError:
                pass
        enter(term, "5 uA")
        term.read(quiet=0.8)
        assert "space left on device" in said(term)
        assert stated(root)["choose"]["bias_current"] == "4 uA"
        (mounted / "filler").unlink()
        term.keys("enter")
        term.read(quiet=1.0)
        assert stated(root)["choose"]["bias_current"] == "5 uA"
        term.keys("q")
        assert term.ended() == 0
    assert sorted(p.name for p in (root / "sheets").iterdir() if p.suffix != ".toml") == []


def test_a_disk_for_reading_only_is_told(mounted: Path, tmp_path: Path) -> None:
    root = write_book(mounted / "project")
    subprocess.run(["mount", "-o", "remount,ro", str(mounted)], check=True)
    with running(root, home=tmp_path) as term:
        at_the_current(term)
        enter(term, "5 uA")
        term.read(quiet=0.8)
        assert "only file system" in said(term)
        term.keys("escape", "q")
        assert term.ended() == 0
    assert stated(root)["choose"]["bias_current"] == "4 uA"
    assert os.access(root, os.R_OK)
    assert shutil.disk_usage(root).total
