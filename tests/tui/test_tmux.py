"""The app inside tmux, a terminal multiplexer: keys through it, the screen as it draws it, the file afterwards."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import time
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from tests.paths import TOP
from tests.tui.book import write_book

pytestmark = [
    pytest.mark.full,
    pytest.mark.skipif(shutil.which("tmux") is None, reason="tmux is not installed"),
]

PROGRAM = "import sys; from worksheet.cli.main import entry; sys.exit(entry())"
BLOCK = "sun_gate"


class Pane:
    """One pane of a tmux server of its own."""

    def __init__(self, folder: Path, root: Path, size: tuple[int, int], term: str) -> None:
        self._tmux = ["tmux", "-L", f"biasbook-{os.getpid()}-{folder.name}", "-f", "/dev/null"]
        self._environment = {
            "PATH": os.environ["PATH"],
            "HOME": str(folder),
            "LANG": "C.UTF-8",
            "TERM": "xterm-256color",
        }
        command = f"cd {TOP} && {sys.executable} -c '{PROGRAM}' open {root}; stty -a; echo ended $?"
        columns, lines = map(str, size)
        self.call(
            "new-session", "-d", "-x", columns, "-y", lines, "sh", "-c", f"export TERM={term}; {command}; sleep 60"
        )

    def call(self, *arguments: str) -> str:
        """One tmux command; what it printed."""
        done = subprocess.run(
            [*self._tmux, *arguments], env=self._environment, capture_output=True, text=True, check=True,
            stdin=subprocess.DEVNULL,
        )  # fmt: skip
        return done.stdout

    def press(self, *keys: str) -> None:
        """Keys by their tmux names, or texts."""
        for key in keys:
            self.call("send-keys", key)
            time.sleep(0.25)

    @property
    def text(self) -> str:
        """What the pane shows."""
        return self.call("capture-pane", "-p")

    def until(self, text: str) -> None:
        """Wait until the pane shows a text."""
        end = time.monotonic() + 30
        while text not in self.text:
            assert time.monotonic() < end, f"{text!r} never came:\n{self.text}"
            time.sleep(0.1)


@pytest.fixture(params=[((80, 24), "screen-256color"), ((120, 40), "tmux-256color"), ((80, 24), "screen")])
def pane(request: pytest.FixtureRequest, tmp_path: Path) -> Iterator[tuple[Pane, Path]]:
    """The invented book in tmux."""
    root = write_book(tmp_path / "project")
    size, term = request.param
    opened = Pane(tmp_path, root, size, term)
    yield opened, root
    subprocess.run([*opened._tmux, "kill-server"], check=False, capture_output=True)


def stated(root: Path, sheet: str = BLOCK) -> dict[str, Any]:
    return tomllib.loads((root / "sheets" / f"{sheet}.toml").read_text("utf-8"))


def test_a_sheet_is_worked_on_through_tmux(pane: tuple[Pane, Path]) -> None:
    shown, root = pane
    shown.until(BLOCK)
    time.sleep(2.0)  # until the screens proper have taken the first picture's place
    shown.press("f", "sun", "Enter", "Enter")
    shown.until("dc_gain")
    shown.press("Tab")
    shown.until("▶ Bias current")
    shown.press("+")
    shown.until("2.1 u")
    assert stated(root)["choose"]["bias_current"] == "2.1 uA"
    shown.press("z")
    shown.until("taken back")
    assert stated(root)["choose"]["bias_current"] == "2 uA"
    shown.press("Enter", "BSpace", "BSpace", "BSpace", "BSpace", "3 uA", "Enter")
    shown.until("3 uA")
    assert stated(root)["choose"]["bias_current"] == "3 uA"
    shown.press("a", "target", "Enter")
    shown.until("type to search")
    shown.press("power", "Enter")
    shown.until("Target power")
    shown.press("Down", "9 uW", "Enter")
    for _ in range(12):
        if "Target power" not in shown.text or "power" in stated(root)["target"]:
            break
        shown.press("Enter")
        time.sleep(0.8)
    shown.until("power")
    assert stated(root)["target"]["power"]["max"] == "9 uW"
    shown.press("m")
    shown.until("C_L I")
    shown.press("Escape")
    shown.until("Choices")
    shown.press("w")
    time.sleep(1.0)
    shown.press("Escape", "r")
    shown.until("Rename")
    shown.press("BSpace", "BSpace", "BSpace", "BSpace", "door", "Enter")
    shown.until("sun_door")
    assert (root / "sheets" / "sun_door.toml").exists()
    assert not (root / "sheets" / f"{BLOCK}.toml").exists()
    shown.press("q")
    shown.until("ended 0")
    words = shown.text.replace(";", " ").split()
    assert {"icanon", "echo", "isig", "icrnl", "opost"} <= set(words)
