"""The app in a real pseudo-terminal of several kinds: keys as bytes, the file as it then stands."""

from __future__ import annotations

import os
import signal
import sys
import time
import tomllib
from collections.abc import Iterator
from pathlib import Path

import pexpect
import pyte
import pytest

from tests.paths import TOP
from tests.tui.book import write_book

pytestmark = pytest.mark.full

SIZES = ((80, 24), (120, 40))
TERMS = ("xterm-256color", "screen", "tmux-256color")


class Shown:
    """A running app and the screen that it draws."""

    def __init__(self, root: Path, size: tuple[int, int], term: str, **more: str) -> None:
        self.root = root
        self.screen = pyte.Screen(*size)
        self.stream = pyte.ByteStream(self.screen)
        environment = {**os.environ, "TERM": term, "LANG": "C.UTF-8", "XDG_STATE_HOME": str(root.parent / "state")}
        environment |= {"XDG_CONFIG_HOME": str(root.parent / "configuration"), "PYTHONPATH": str(TOP), **more}
        program = "import sys; from worksheet.cli.main import entry; sys.exit(entry())"
        arguments = ["-c", program, "open", str(root)]
        self.child = pexpect.spawn(sys.executable, arguments, env=environment, dimensions=(size[1], size[0]))

    def until(self, *texts: str) -> str:
        """Read until the screen shows all the texts."""
        end = time.monotonic() + 30
        while time.monotonic() < end:
            try:
                self.stream.feed(self.child.read_nonblocking(65536, 0.05))
            except pexpect.TIMEOUT:
                pass
            except pexpect.EOF:
                break
            if all(text in self.text for text in texts):
                return self.text
        raise AssertionError(f"{texts} never came:\n{self.text}")

    @property
    def text(self) -> str:
        """The screen."""
        return "\n".join(self.screen.display)

    def send(self, keys: str) -> None:
        """Bytes of keys."""
        self.child.send(keys)

    def ended(self) -> tuple[int | None, int | None]:
        """Exit status and signal, once it has ended."""
        end = time.monotonic() + 15
        while self.child.isalive():
            assert time.monotonic() < end, "it is still running"
            try:
                self.stream.feed(self.child.read_nonblocking(65536, 0.05))
            except (pexpect.TIMEOUT, pexpect.EOF):
                time.sleep(0.02)
        return self.child.exitstatus, self.child.signalstatus


@pytest.fixture
def root(tmp_path: Path) -> Path:
    """A project folder of the test's own."""
    return write_book(tmp_path / "project")


@pytest.fixture
def opened(root: Path) -> Iterator[Shown]:
    """The app over it, with its results."""
    shown = Shown(root, (80, 24), "xterm-256color")
    shown.until("bucket_buffer", "+5.5%")
    yield shown
    shown.child.close(force=True)


def _current(root: Path) -> str:
    text = (root / "sheets" / "bucket_buffer.toml").read_text("utf-8")
    found: str = tomllib.loads(text)["choose"]["bias_current"]
    return found


@pytest.mark.parametrize("term", TERMS)
@pytest.mark.parametrize("size", SIZES)
def test_an_edit_a_step_and_undo_in_every_terminal(root: Path, size: tuple[int, int], term: str) -> None:
    shown = Shown(root, size, term)
    shown.until("bucket_buffer", "+5.5%")
    shown.send("\r")
    shown.until("Bucket sensor buffer", "Targets")
    shown.send("\x1b[B" * 4)
    shown.until("Edit")
    shown.send("\r")
    time.sleep(0.3)
    shown.send("5 uA\r")
    shown.until("choose.bias_current 5 uA", "9 µW")
    assert _current(root) == "5 uA"
    shown.send("+")
    shown.until("5.25 uA")
    shown.send("zz")
    shown.until("taken back: choose.bias_current 5 uA")
    assert _current(root) == "4 uA"
    shown.send("q")
    assert shown.ended() == (0, None)


def test_every_step_typed_is_on_disk_when_the_program_is_killed(opened: Shown, root: Path) -> None:
    opened.send("\r")
    opened.until("Targets")
    opened.send("\x1b[B" * 4)
    opened.send("+")
    opened.until("4.2 uA in")
    os.kill(opened.child.pid, signal.SIGKILL)
    opened.ended()
    assert _current(root) == "4.2 uA"
    assert sorted(p.suffix for p in (root / "sheets").iterdir()) == [".toml"] * 8


def test_titles_full_of_escapes_do_nothing(root: Path) -> None:
    path = root / "sheets" / "sun_gate.toml"
    evil = '"\\u001b]0;owned\\u0007[@click=app.exit]x[/y] \\u202e"'
    path.write_text(path.read_text("utf-8").replace('"Sun cell current input"', evil), "utf-8")
    shown = Shown(root, (80, 24), "xterm-256color", NO_COLOR="1")
    shown.until("sun_gate")
    shown.send("\x1b[B" * 5 + "\r")
    shown.until("[@click=app.exit]x[/y]")
    assert shown.screen.title != "owned"
    shown.send("q")
    assert shown.ended() == (0, None)
