"""The end that nobody asked for: hang-up, termination, a terminal that goes away.

The toolkit handles neither signal, spins where its input ends, and freezes where the far side stops reading, so this
stands outside its event loop: plain signal handlers and a thread that watches the terminal. Every accepted edit is on
disk already and every character typed is in the journal, so all that is left to do is to let a write that is under
way finish, to put the terminal back as it was, and to leave.
"""

from __future__ import annotations

import contextlib
import fcntl
import os
import select
import signal
import termios
import threading
from types import FrameType
from typing import Any

RESET = (
    b"\x1b[?1000l\x1b[?1002l\x1b[?1003l\x1b[?1015l\x1b[?1006l\x1b[?1016l"  # mouse reports
    b"\x1b[?1004l\x1b[?2004l\x1b[?2048l\x1b[?2026l"  # focus, paste, size reports, held frames
    b"\x1b[<u\x1b[?7h\x1b[?1049l\x1b[?25h\x1b[0m"  # keys, wrapping, the other screen, cursor, colours
)
"""Ends every mode that the app may have switched on."""

SIGNALS = (signal.SIGHUP, signal.SIGTERM)
_PATIENCE = 2.0
"""Longest wait for a write that is under way. [s]"""

_LOST = select.POLLHUP | select.POLLERR | select.POLLNVAL


class Guard:
    """Watches over one run of the app.

    Attributes:
        writing: Held by whoever writes to the project; the end waits for it.
    """

    def __init__(self, source: int = 0, screen: int = 2) -> None:
        """Take the descriptors of the input and of the screen."""
        self.writing = threading.Lock()
        self._source, self._screen = source, screen
        self._attributes: list[Any] | None = None
        self._before: dict[signal.Signals, Any] = {}
        self._stopped = threading.Event()

    def start(self) -> None:
        """Keep the terminal's settings, take the signals, watch the line."""
        with contextlib.suppress(termios.error):
            self._attributes = termios.tcgetattr(self._source)
        for number in SIGNALS:
            self._before[number] = signal.signal(number, self._on_signal)
        threading.Thread(target=self._watch, name="line-watch", daemon=True).start()

    def stop(self) -> None:
        """The app has ended by itself: give the signals back."""
        self._stopped.set()
        for number, handler in self._before.items():
            signal.signal(number, handler)

    def _on_signal(self, number: int, frame: FrameType | None) -> None:
        del frame
        # Waiting happens in a thread: the main thread, where this runs, may be the one that writes.
        threading.Thread(target=self.end, args=(128 + number,), name="end", daemon=True).start()

    def _watch(self) -> None:
        poll = select.poll()
        poll.register(self._source, 0)  # a lost line is reported without being asked for
        while not self._stopped.is_set():
            if any(event & _LOST for _, event in poll.poll(1000)):
                self.end(128 + signal.SIGHUP)

    def end(self, status: int) -> None:
        """Leave at once with this exit status, the terminal as it was."""
        self.writing.acquire(timeout=_PATIENCE)
        try:
            self.restore()
        finally:
            os._exit(status)

    def restore(self) -> None:
        """Put the terminal back. Never waits for a far side that does not read."""
        with contextlib.suppress(OSError, termios.error):
            flags = fcntl.fcntl(self._screen, fcntl.F_GETFL)
            fcntl.fcntl(self._screen, fcntl.F_SETFL, flags | os.O_NONBLOCK)
            with contextlib.suppress(termios.error):
                termios.tcflush(self._screen, termios.TCOFLUSH)
            if self._attributes is not None:
                termios.tcsetattr(self._source, termios.TCSANOW, self._attributes)
            with contextlib.suppress(OSError):
                os.write(self._screen, RESET)
            fcntl.fcntl(self._screen, fcntl.F_SETFL, flags)
