"""The program in a terminal of its own: a real pseudo-terminal, an emulator that keeps the screen, keys by name."""

from __future__ import annotations

import fcntl
import os
import pty
import re
import select
import signal
import struct
import sys
import termios
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import pyte

from tests.paths import TOP

KEYS = {
    "enter": "\r",
    "tab": "\t",
    "escape": "\x1b",
    "up": "\x1b[A",
    "down": "\x1b[B",
    "right": "\x1b[C",
    "left": "\x1b[D",
    "backspace": "\x7f",
    "f1": "\x1bOP",
}
PROGRAM = "import sys; from worksheet.cli.main import entry; sys.exit(entry())"
_UNKNOWN = re.compile(
    rb"\x1b\[>[\d;]*[um]|\x1b\[<u|\x1b\[=\d*;?\d*u|\x1b\[\?[\d;]*\$p|\x1b\]\d+;[^\x07\x1b]*(\x07|\x1b\\)"
)
"""What the emulator does not know and would show as text."""


class Term:
    """One run of the program.

    Attributes:
        screen: What the terminal shows.
        sent: Every byte that the program sent.
    """

    def __init__(self, arguments: list[str], home: Path, size: tuple[int, int], environment: dict[str, str]) -> None:
        self.screen = pyte.Screen(*size)
        self._stream = pyte.ByteStream(self.screen)
        self.sent = b""
        self.pid, self.descriptor = pty.fork()
        if self.pid == 0:
            kept = {"PATH": os.environ["PATH"], "HOME": str(home), "LANG": "C.UTF-8", "TERM": "xterm-256color"}
            os.chdir(TOP)
            os.execve(sys.executable, [sys.executable, "-c", PROGRAM, *arguments], kept | environment)
        self.before = termios.tcgetattr(self.descriptor)
        self.resize(size)

    # What it shows

    def read(self, quiet: float = 0.3, limit: float = 20.0) -> None:
        """Take what the program sends until it has been quiet for a while."""
        end = time.monotonic() + limit
        while time.monotonic() < end and select.select([self.descriptor], [], [], quiet)[0]:
            try:
                chunk = os.read(self.descriptor, 65536)
            except OSError:
                return
            if not chunk:
                return
            self.sent += chunk
            self._stream.feed(_UNKNOWN.sub(b"", chunk))

    def until(self, text: str, limit: float = 20.0) -> None:
        """Read until the screen shows a text."""
        end = time.monotonic() + limit
        while text not in self.text:
            assert time.monotonic() < end, f"{text!r} never came:\n{self.text}"
            self.read(quiet=0.05, limit=1.0)

    @property
    def text(self) -> str:
        """The screen as text."""
        return "\n".join(line.rstrip() for line in self.screen.display)

    # What is done to it

    def keys(self, *names: str) -> None:
        """Press keys by name, or single characters."""
        for name in names:
            os.write(self.descriptor, KEYS.get(name, name).encode())
            self.read(quiet=0.15, limit=3.0)

    def type(self, text: str) -> None:
        """Type a text at once."""
        os.write(self.descriptor, text.encode())
        self.read(quiet=0.2, limit=3.0)

    def resize(self, size: tuple[int, int]) -> None:
        """Give the terminal another size, in columns and lines."""
        columns, lines = size
        self.screen.resize(lines, columns)
        fcntl.ioctl(self.descriptor, termios.TIOCSWINSZ, struct.pack("HHHH", lines, columns, 0, 0))

    def signal(self, number: signal.Signals) -> None:
        """Send the program a signal."""
        os.kill(self.pid, number)

    def settings(self) -> list[Any]:
        """The terminal's settings as they are now."""
        return termios.tcgetattr(self.descriptor)

    def ended(self, limit: float = 10.0) -> int:
        """Wait for the end; the exit status, or 128 and the number of the signal."""
        end = time.monotonic() + limit
        while True:
            found, status = os.waitpid(self.pid, os.WNOHANG)
            if found:
                code = os.waitstatus_to_exitcode(status)
                return code if code >= 0 else 128 - code
            assert time.monotonic() < end, "it does not end"
            time.sleep(0.02)

    def seconds_used(self) -> float:
        """Processor time of the program so far. [s]"""
        fields = Path(f"/proc/{self.pid}/stat").read_text("utf-8").rpartition(")")[2].split()
        return (int(fields[11]) + int(fields[12])) / os.sysconf("SC_CLK_TCK")


@contextmanager
def running(
    root: Path,
    *options: str,
    home: Path,
    size: tuple[int, int] = (80, 24),
    environment: dict[str, str] | None = None,
) -> Iterator[Term]:
    """The app over a project, killed at the end where it still runs."""
    term = Term(["open", str(root), *options], home, size, environment or {})
    try:
        yield term
    finally:
        try:
            os.kill(term.pid, signal.SIGKILL)
            os.waitpid(term.pid, 0)
        except (ProcessLookupError, ChildProcessError):
            pass
        os.close(term.descriptor)
